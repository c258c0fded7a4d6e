"""How often preparing notices what is there, and what is not: outliers, features, overlaps of runs.

    python scripts/noticing.py [SOLIDS]

draws random solids (invented data, seeded; 300 of each kind by default) and prints a table: false flags on clean data,
and the share of glitches, peaks, steps, upturns and offsets that are found. The docstrings quote it.
"""

from __future__ import annotations

import sys
from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from latticefit.models import build_model, heat_capacity
from latticefit.preparing.features import suspected_features
from latticefit.preparing.outliers import outliers
from latticefit.preparing.overlap import run_overlaps
from latticefit.preparing.scatter import local_scatter
from latticefit.records import Feature, Measurement, Reading, RunSettings, Sample, SampleSettings

GLITCH, PEAK, STEP, OFFSET = 6.0, 0.10, 0.03, 0.025


@dataclass(frozen=True)
class Grid:
    """Temperatures of a file: from, to (K), how many, evenly spaced in ln T or in T."""

    low: float
    high: float
    points: int
    logarithmic: bool = True

    def draw(self, random: np.random.Generator) -> np.ndarray:
        """Return the temperatures, each moved at random by up to 0.2 %."""
        even = np.geomspace if self.logarithmic else np.linspace
        T = even(self.low, self.high, self.points) * (1 + 0.002 * random.uniform(-1, 1, self.points))
        return np.sort(T)

    def __str__(self) -> str:
        return f"{self.points:3d} points, {self.low:g}-{self.high:g} K, even in {'ln T' if self.logarithmic else 'T'}"


GRIDS = (
    Grid(2, 300, 100),
    Grid(2, 300, 300),
    Grid(2, 300, 250, False),
    Grid(50, 300, 120, False),
    Grid(1.8, 20, 100),
    Grid(0.4, 20, 150),
)
SPARSE = (Grid(2, 300, 40), Grid(4, 300, 25))


def solid(random: np.random.Generator) -> Callable[[np.ndarray], np.ndarray]:
    """Draw a solid: Debye term, up to three Einstein terms, half of them metals, most with Cp - Cv."""
    count = int(random.integers(0, 4))
    theta = random.uniform(100, 500)
    terms, values = "debye", [theta, random.uniform(2, 6)]
    if count:
        terms += " + einstein" if count == 1 else f" + {count} einstein"
    for each in sorted(random.uniform(0.4, 3, count) * theta):
        values += [float(each), random.uniform(0.3, 4)]
    modes = sum(values[1::2])
    if random.random() < 0.5:
        terms += " + electronic"
        values.append(random.uniform(0.5e-3, 8e-3))
    cp_cv = "nernst-lindemann" if random.random() < 0.7 else "none"
    if cp_cv != "none":
        values.append(random.uniform(0.5e-6, 5e-6) * 3 / modes)
    model, vector = build_model(terms, cp_cv), np.array(values)
    return lambda T: heat_capacity(model, T, vector)


def anomaly(kind: str, T: np.ndarray, random: np.random.Generator) -> tuple[np.ndarray, float]:
    """Return the relative excess of a peak like that of a second-order transition, or of a step, and where it lies."""
    at = float(T[random.integers(T.size // 6, 5 * T.size // 6)]) * 1.001
    off = T / at - 1
    if kind == "step":
        return STEP * (off > 0), at
    return PEAK * np.where(off < 0, np.exp(np.minimum(off, 0) / 0.1), np.exp(-np.maximum(off, 0) / 0.03)), at


def scatter_of(T: np.ndarray, C: np.ndarray) -> float:
    """Return the local scatter, as a run without a stated sigma has it."""
    return local_scatter(T, C) or 0.01


def outlier_row(grid: Grid, noise: float, solids: int) -> str:
    """Count false flags on clean data, glitches of six sigma that are found, and flags on a peak and a step."""
    false, found, on_peak, on_step = 0, 0, 0, 0
    for seed in range(solids):
        random = np.random.default_rng(seed)
        curve, T = solid(random), grid.draw(random)
        exact = curve(T)
        C = exact * (1 + noise * random.standard_normal(T.size))
        false += int((outliers(T, C) != 0).sum())
        glitch, i = C.copy(), int(random.integers(0, T.size))
        glitch[i] = exact[i] * (1 + GLITCH * noise * random.choice([-1.0, 1.0]))
        found += bool(outliers(T, glitch)[i])
        for kind in ("peak", "step"):
            excess, at = anomaly(kind, T, random)
            near = np.abs(np.log(T / at)) < 0.3
            flags = int((outliers(T, C * (1 + excess))[near] != 0).sum())
            on_peak, on_step = on_peak + flags * (kind == "peak"), on_step + flags * (kind == "step")
    parts = [f"{each / solids:8.3f}" for each in (false, found, on_peak, on_step)]
    return f"{grid!s:44} {100 * noise:4.1f} % {''.join(parts)}"


def feature_row(grid: Grid, noise: float, solids: int) -> str:
    """Count clean files with any feature, and peaks, steps and upturns that are found where they are."""
    false, peaks, steps, upturns = 0, 0, 0, 0
    for seed in range(solids):
        random = np.random.default_rng(seed)
        curve, T = solid(random), grid.draw(random)
        C = curve(T) * (1 + noise * random.standard_normal(T.size))
        false += bool(suspected_features(T, C, scatter_of(T, C)))
        for kind in ("peak", "step"):
            excess, at = anomaly(kind, T, random)
            changed = C * (1 + excess)
            hit = any(_at(each, kind, at) for each in suspected_features(T, changed, scatter_of(T, changed)))
            peaks, steps = peaks + (hit and kind == "peak"), steps + (hit and kind == "step")
        tail = C + 2 * curve(T[:1]) * (T[0] / T) ** 2  # twice as large as the lattice at the lowest point
        upturns += any(each.kind == "upturn" for each in suspected_features(T, tail, scatter_of(T, tail)))
    parts = [f"{each / solids:8.3f}" for each in (false, peaks, steps, upturns)]
    return f"{grid!s:44} {100 * noise:4.1f} % {''.join(parts)}"


def correlated_row(grid: Grid, noise: float, solids: int) -> str:
    """Count clean files with any feature where the noise of neighbours goes together, correlation 0.5."""
    false = 0
    for seed in range(solids):
        random = np.random.default_rng(seed)
        curve, T = solid(random), grid.draw(random)
        error = random.standard_normal(T.size)
        for i in range(1, T.size):
            error[i] = 0.5 * error[i - 1] + 0.75**0.5 * error[i]
        C = curve(T) * (1 + noise * error)
        false += bool(suspected_features(T, C, scatter_of(T, C)))
    return f"{grid!s:44} {100 * noise:4.1f} % {false / solids:8.3f}"


def _at(found: Feature, kind: str, at: float) -> bool:
    return found.kind == kind and found.temperature_low <= 1.05 * at and found.temperature_high >= 0.95 * at


def overlap_row(points: tuple[int, int], noise: tuple[float, float], solids: int) -> str:
    """Recover the ratio of two runs, 0.4-20 K and 1.8-300 K, of which the first is 2.5 % high."""
    pulls, ratios = [], []
    for seed in range(solids):
        random = np.random.default_rng(seed)
        curve = solid(random)
        T = [Grid(0.4, 20, points[0]).draw(random), Grid(1.8, 300, points[1]).draw(random)]
        runs = np.repeat([0, 1], points)
        joined, u = np.concatenate(T), np.repeat(noise, points)
        C = curve(joined) * np.where(runs == 0, 1 + OFFSET, 1.0)
        sigma, order = u * C, np.argsort(joined)
        C = C * (1 + u * random.standard_normal(C.size))
        (found,) = run_overlaps(two_runs(joined), joined[order], C[order], sigma[order], runs[order])
        pulls.append((found.ratio - 1 - OFFSET) / found.u)
        ratios.append(found.ratio)
    size, name = np.abs(pulls), f"{points[0]} and {points[1]} points, {100 * noise[0]:g} and {100 * noise[1]:g} %"
    shares = f"{np.mean(size < 1):8.3f}{np.mean(size < 2):8.3f}{np.mean(size < 3):8.3f}"
    return f"{name:44} {np.mean(ratios):8.4f} {np.std(ratios):8.4f} {shares}"


def two_runs(T: np.ndarray) -> Measurement:
    """Return a measurement that only lends its labels."""
    reading = Reading("", "a.csv", "", "a", "", "", "", "", "", None, "K", "J/(mol K)", T.size, RunSettings("a.csv"))
    nothing = np.zeros(0)
    return Measurement(
        Sample("invented"),
        nothing,
        nothing,
        None,
        np.zeros(0, dtype=np.intp),
        np.zeros(0, dtype=np.intp),
        "Cp",
        "mol",
        "",
        (reading, replace(reading, label="b")),
        (),
        (),
        SampleSettings(),
    )


def main() -> None:
    """Print the three tables."""
    solids = int(sys.argv[1]) if len(sys.argv) > 1 else 300
    print(f"Outliers, {solids} solids: flags per clean file, glitches of 6 sigma found, flags on a peak, on a step")
    for grid in (*GRIDS, *SPARSE):
        for noise in (0.003, 0.01):
            print(outlier_row(grid, noise, solids), flush=True)
    print(f"\nFeatures, {solids} solids: clean files with any, 10 % peaks, 3 % steps, upturns found")
    for grid in (*GRIDS, *SPARSE):
        for noise in (0.003, 0.005, 0.01):
            print(feature_row(grid, noise, solids), flush=True)
    print("\nFeatures suspected in clean files whose noise is correlated by 0.5 from point to point")
    for grid in GRIDS:
        print(correlated_row(grid, 0.01, solids), flush=True)
    print(f"\nOverlap of two runs, true ratio {1 + OFFSET}: mean and scatter of the ratio, share within 1, 2, 3 u")
    for points, noise in (
        ((60, 120), (0.005, 0.005)),
        ((60, 120), (0.02, 0.003)),
        ((30, 60), (0.01, 0.01)),
        ((200, 300), (0.01, 0.01)),
    ):
        print(overlap_row(points, noise, solids), flush=True)


if __name__ == "__main__":
    main()

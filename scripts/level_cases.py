"""How often the level check is right: correct files that it suspects, and slips that it names, on invented solids.

    python scripts/level_cases.py [COUNT] [SEED]

makes COUNT invented solids (200) for correct files and for each kind of slip: Debye and Einstein mixtures, or acoustic
modes with sine dispersion and optic bands; 1 to 10 atoms, Tmax/theta_D[m=2] from 0.3 to 1.5, noise of 0.3 to 1 %,
Cp - Cv of 0.5 to 6 % at theta, an electronic part in four of ten. Each is written to a file as its slip would have it,
read, and examined as `latticefit inspect` and `latticefit fit` do it.
"""

from __future__ import annotations

import sys
import tempfile
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

from latticefit.constants import GAS_CONSTANT
from latticefit.diagnosing import examine_level
from latticefit.functions import debye_heat_capacity, einstein_heat_capacity
from latticefit.reading import read_measurement
from latticefit.records import FloatArray, LevelFinding, RunSettings, SampleSettings
from latticefit.sample import parse_formula

COUNT, SEED = 200, 4
ELEMENTS = ("Ne", "Ar", "Kr", "Xe")  # no solid of theirs has modes too stiff to be excited
WATER = 18.015


@dataclass(frozen=True)
class Solid:
    """An invented solid: its formula, atoms, theta_D[m=2] in K, and the modes behind its heat capacity."""

    formula: str
    atoms: float
    theta: float
    debye: FloatArray  # rows of theta, modes
    einstein: FloatArray
    gamma: float
    expansion: float  # A of Cp - Cv = A Cp^2 T

    @property
    def molar_mass(self) -> float:
        """g/mol."""
        return 1e3 * parse_formula(self.formula).molar_mass

    def heat_capacity(self, T: FloatArray) -> FloatArray:
        """Cp in J/(mol K) at T in K."""
        parts = ((debye_heat_capacity, self.debye), (einstein_heat_capacity, self.einstein))
        harmonic = sum(np.asarray(f(rows[:, :1] / T)).T @ rows[:, 1] for f, rows in parts) * GAS_CONSTANT
        return np.asarray(2 * harmonic / (1 + np.sqrt(1 - 4 * self.expansion * T * harmonic)) + self.gamma * T)


def invented(rng: np.random.Generator, waters: float = 0.0) -> Solid:
    """Return a solid at random, a hydrate with that many waters of crystallisation."""
    formula, atoms = _formula(rng, waters)
    theta = rng.uniform(80.0, 500.0)
    if rng.random() < 0.5:
        shares = rng.dirichlet(np.ones(rng.integers(1, 5)))
        shares[0] = max(shares[0], 0.15)
        modes = 3 * atoms * shares / shares.sum()
        debye = np.array([[theta, modes[0]]])
        einstein = np.column_stack([theta * rng.uniform(0.45, 2.2, modes.size - 1), modes[1:]])
    else:
        debye, einstein = np.empty((0, 2)), _dispersive(rng, theta, atoms)
    second = np.sum(debye[:, 0] ** 2 * debye[:, 1]) + 5 / 3 * np.sum(einstein[:, 0] ** 2 * einstein[:, 1])
    measure = float(np.sqrt(second / (3 * atoms)))
    gamma = rng.uniform(0.003, 0.03) * 3 * atoms * GAS_CONSTANT / measure if rng.random() < 0.4 else 0.0
    expansion = rng.uniform(0.005, 0.06) / (measure * 3 * atoms * GAS_CONSTANT)
    return Solid(formula, atoms, measure, debye, einstein, gamma, expansion)


def _formula(rng: np.random.Generator, waters: float) -> tuple[str, float]:
    kinds = rng.choice(ELEMENTS, size=int(rng.integers(2 if waters else 1, 4)), replace=False)
    counts = rng.integers(1, 4, size=kinds.size)
    dry = "".join(f"{kind}{count if count > 1 else ''}" for kind, count in zip(kinds, counts, strict=True))
    return (f"{dry}*{waters:g}H2O" if waters else dry), float(counts.sum() + 3 * waters)


def _dispersive(rng: np.random.Generator, theta: float, atoms: float) -> FloatArray:
    """Three acoustic branches with sine dispersion, and optic bands, as oscillators."""
    q, weight = np.polynomial.legendre.leggauss(60)
    q, weight = (q + 1) / 2, weight / 2 * 3 * ((q + 1) / 2) ** 2
    rows = [np.column_stack([theta * rng.uniform(0.7, 1.3) * np.sin(np.pi / 2 * q), weight]) for _ in range(3)]
    if atoms > 1:
        count = int(rng.integers(1, 5))
        shares = rng.dirichlet(np.ones(count)) * 3 * (atoms - 1)
        for centre, share in zip(theta * rng.uniform(0.7, 2.4, count), shares, strict=True):
            rows.append(np.column_stack([centre * np.linspace(0.9, 1.1, 7), np.full(7, share / 7)]))
    return np.concatenate(rows)


@dataclass(frozen=True)
class Slipped:
    """A file as a slip would have it: the values per J/(mol K) of the solid, their header, what is said of the sample.

    `names` is what the explanation must say of it.
    """

    factor: float
    unit: str
    names: str
    sample: dict[str, object] = field(default_factory=dict)


Kind = Callable[[Solid, np.random.Generator], Slipped]
MASS = 12.3  # mg


def kinds() -> dict[str, tuple[float, Kind]]:
    """Every kind of slip by name: the waters of its solids, and what it does to the file."""

    def of(formula: str, **more: object) -> dict[str, object]:
        return {"formula": formula, **more}

    def dry(solid: Solid) -> str:
        return solid.formula.split("*")[0]

    def grams(value: float) -> str:
        return f"{value:.6g} g/mol"

    def dry_mass(solid: Solid) -> str:
        return grams(1e3 * parse_formula(dry(solid)).molar_mass)

    return {
        "correct, per mole": (0, lambda s, r: Slipped(1, "J/(mol K)", "", of(s.formula))),
        "correct, per gram": (0, lambda s, r: Slipped(1 / s.molar_mass, "J/(g K)", "", of(s.formula))),
        "J for mJ": (0, lambda s, r: Slipped(1e3, "J/(mol K)", "mJ/(mol K)", of(s.formula))),
        "mJ for J": (0, lambda s, r: Slipped(1, "mJ/(mol K)", "J/(mol K)", of(s.formula))),
        "J for uJ, per sample": (
            0,
            lambda s, r: Slipped(1e6 * 1e-3 * MASS / s.molar_mass, "J/K", "uJ/K", of(s.formula, mass=f"{MASS} mg")),
        ),
        "J for cal": (0, lambda s, r: Slipped(1 / 4.184, "J/(mol K)", "cal/(mol K)", of(s.formula))),
        "cal for J": (0, lambda s, r: Slipped(1, "cal/(mol K)", "J/(mol K)", of(s.formula))),
        "mol for g": (0, lambda s, r: Slipped(1 / s.molar_mass, "J/(mol K)", "J/(g K)", of(s.formula))),
        "g for mol": (0, lambda s, r: Slipped(1, "J/(g K)", "J/(mol K)", of(s.formula))),
        "g for kg": (0, lambda s, r: Slipped(1e3 / s.molar_mass, "J/(g K)", "J/(kg K)", of(s.formula))),
        "formula for atom": (0, lambda s, r: Slipped(1 / s.atoms, "J/(mol K)", "J/(mol-atom K)", of(s.formula))),
        "atom for formula": (0, lambda s, r: Slipped(1, "J/(mol-atom K)", "J/(mol K)", of(s.formula))),
        "J for R": (0, lambda s, r: Slipped(1 / GAS_CONSTANT, "J/(mol K)", "values in R", of(s.formula))),
        "mass mg for g": (
            0,
            lambda s, r: Slipped(1e-3 * MASS / s.molar_mass, "J/K", "a mass 1000", of(s.formula, mass=f"{MASS} g")),
        ),
        "molar mass of half": (
            0,
            lambda s, r: Slipped(
                1 / s.molar_mass,
                "J/(g K)",
                "molar mass of 1/2",
                of(s.formula, molar_mass=grams(s.molar_mass / 2)),
            ),
        ),
        "molar mass without water": (
            1,
            lambda s, r: Slipped(
                1 / s.molar_mass, "J/(g K)", "molar mass without its", of(s.formula, molar_mass=dry_mass(s))
            ),
        ),
        "formula without water, per gram": (
            1,
            lambda s, r: Slipped(1 / s.molar_mass, "J/(g K)", f"'{s.formula}'", of(dry(s))),
        ),
        "formula without water, per mole": (1, lambda s, r: Slipped(1, "J/(mol K)", f"'{s.formula}'", of(dry(s)))),
        "sample that lost its water": (
            0,
            lambda s, r: Slipped(
                1 / s.molar_mass, "J/(g K)", "has lost its", of(f"{s.formula}*{int(r.integers(1, 7))}H2O")
            ),
        ),
    }


@dataclass(frozen=True)
class Outcome:
    """What the check found of one case; `named` is the place of the right slip among the explanations, from 1."""

    reach: float
    finding: LevelFinding
    named: int | None


def cases(name: str, count: int, seed: int, folder: Path) -> Iterator[Outcome]:
    """Examine invented files of one kind."""
    hydrate, kind = kinds()[name]
    for number in range(count):
        rng = np.random.default_rng([seed, number])
        solid = invented(rng, float(rng.integers(1, 7)) if hydrate else 0.0)
        while solid.atoms == 1 and "atom" in name:
            solid = invented(rng)
        slipped = kind(solid, rng)
        reach = rng.uniform(0.3, 1.5)
        path = folder / "case.csv"
        path.write_text(_text(solid, slipped, reach * solid.theta, rng), encoding="utf-8")
        measurement = read_measurement(SampleSettings(**slipped.sample), (RunSettings(path.name),), folder)  # type: ignore[arg-type]
        finding = examine_level(measurement)
        said = [f"{each.words} {each.remedy}" for each in finding.explanations]
        named = next((place for place, words in enumerate(said, 1) if slipped.names and slipped.names in words), None)
        yield Outcome(reach, finding, named)


def _text(solid: Solid, slipped: Slipped, top: float, rng: np.random.Generator) -> str:
    low = min(float(rng.choice([2.0, 5.0, 10.0, 20.0, 50.0, 80.0])), 0.3 * top)
    size, noise = int(rng.integers(30, 200)), rng.uniform(0.003, 0.01)
    T = np.geomspace(low, top, size) if rng.random() < 0.5 else np.linspace(low, top, size)
    exact = slipped.factor * solid.heat_capacity(T)
    C = exact * (1 + noise * rng.standard_normal(size))
    sigma = rng.random() < 0.5
    head = f"T (K),Cp ({slipped.unit}){f',sigma ({slipped.unit})' if sigma else ''}"
    rows = [f"{t:.4f},{c:.7g}{f',{s:.3g}' if sigma else ''}" for t, c, s in zip(T, C, noise * exact, strict=True)]
    return "\n".join(["# invented data", head, *rows]) + "\n"


def row(name: str, outcomes: list[Outcome]) -> str:
    """One line of the table."""
    total = len(outcomes)
    high = [each for each in outcomes if each.reach > 0.5]

    def share(found: int, of: int) -> str:
        return f"{100 * found / of:5.1f}" if of else "    -"

    suspicious = sum(each.finding.verdict == "suspicious" for each in outcomes)
    impossible = sum(each.finding.verdict == "impossible" for each in outcomes)
    named = sum(each.named is not None for each in outcomes)
    first = sum(each.named == 1 for each in outcomes)
    named_high = sum(each.named is not None for each in high)
    numbers = [share(suspicious, total), share(impossible, total), share(named, total), share(first, total)]
    return f"{name:34}{total:5d}  {'  '.join(numbers)}  {share(named_high, len(high))}"


def main() -> None:
    """Print the table."""
    count = int(sys.argv[1]) if len(sys.argv) > 1 else COUNT
    seed = int(sys.argv[2]) if len(sys.argv) > 2 else SEED
    print(f"{'percent of the cases':34}cases  susp.  imposs.  named  first  named, Tmax > theta/2")
    with tempfile.TemporaryDirectory() as folder:
        for name in kinds():
            print(row(name, list(cases(name, count, seed, Path(folder)))), flush=True)


if __name__ == "__main__":
    main()

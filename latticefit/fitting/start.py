"""Start values without a guess: a search over all temperatures of all terms at once.

For given characteristic temperatures the model is linear in its amplitudes (mode counts, gamma, and to first order
the Cp-Cv coefficient), so every combination of temperatures on a coarse grid is solved from one matrix of scalar
products; the best combinations, and a few others drawn at random, are then refined by bounded least squares
(separable least squares: G. H. Golub and V. Pereyra, SIAM J. Numer. Anal. 10, 413 (1973)).
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import combinations, product

import numpy as np
from numpy.typing import NDArray

from ..models import Model, Parametrisation
from ..records import FloatArray
from .solve import Solution, minimise

__all__ = ["SearchResult", "search"]

_MOST_COMBINATIONS = 30_000
_REFINED = 10
_DRAWN = 4
_MOST_POINTS = 160
_ROUGH, _ROUGH_MOST = 1e-5, 60  # tolerance and evaluations of the first refinement, on thinned points
_ROUNDS, _GAIN = 3, 0.5  # rescans of one temperature at a time, while chi-square falls by at least this
_SCAN_POINTS, _APART = 36, 0.1
_REPORTED = 4.0  # distinct minima within this of the best are counted


@dataclass(frozen=True)
class SearchResult:
    """The best minimum found, how many local fits were made, and how many distinct minima are as good."""

    best: Solution
    starts_tried: int
    distinct_minima: int


def _grid(par: Parametrisation, position: int, T: FloatArray, size: int, offset: float) -> FloatArray:
    """Temperatures from below the data to where a term has no weight in them, evenly spaced in ln theta."""
    low = max(par.low[position], 1.2 * float(T[0]), 0.02 * float(T[-1]))
    high = min(par.high[position], 8.0 * float(T[-1]))
    if not low < high:
        low, high = float(par.low[position]), float(par.high[position])
    steps = (np.arange(size) + 0.5 + offset) / size
    return np.asarray(low * (high / low) ** np.clip(steps, 0.0, 1.0))


@dataclass(frozen=True)
class _Scales:
    """Candidate values of every scale parameter, shape (combinations, number of scales), and their positions."""

    positions: tuple[int, ...]
    values: FloatArray


def _scales(par: Parametrisation, start: dict[int, float], T: FloatArray) -> _Scales:
    model = par.model
    positions = tuple(i for i, spec in enumerate(model.specs) if spec.role == "scale")
    groups: dict[str, list[int]] = {}
    for each in model.placed:
        for i in range(each.slice.start, each.slice.stop):
            if i in positions:
                searched = i in par.free and i not in start
                groups.setdefault(each.term.name if searched else model.names[i], []).append(i)
    size = _grid_size([len(g) for g in groups.values()])
    blocks: list[list[tuple[float, ...]]] = []
    order: list[int] = []
    for number, members in enumerate(groups.values()):
        order.extend(members)
        first = members[0]
        if first in start:
            blocks.append([(start[first],)])
        elif first not in par.free:
            blocks.append([(float(par.base[first]),)])
        else:
            # grids of different kinds of term are offset: a Debye and an Einstein term at one theta are degenerate
            grid = _grid(par, first, T, size, 0.25 if number % 2 else -0.25)
            blocks.append(list(combinations(grid, len(members))))
    rows = [sum(parts, ()) for parts in product(*blocks)]
    return _Scales(tuple(order), np.array(rows, dtype=float))


def _grid_size(members: list[int]) -> int:
    """Largest grid, from 28 points down, whose combinations stay affordable."""
    for size in range(28, 6, -1):
        count = 1
        for k in members:
            ways = 1
            for j in range(k):
                ways = ways * (size - j) // (j + 1)
            count *= ways
        if count <= _MOST_COMBINATIONS:
            return size
    return 7


def _thin(T: FloatArray, measured: FloatArray, sigma: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Every so-many-th point, with sigma lowered accordingly: the search needs no more."""
    step = max(1, T.size // _MOST_POINTS)
    return T[::step], measured[::step], sigma[::step] / np.sqrt(step)


@dataclass(frozen=True)
class _Linear:
    """The problem that is linear in the amplitudes: columns, right side, and which column serves which amplitude."""

    amplitudes: tuple[int, ...]
    columns: FloatArray  # (number of columns, n), weighted
    target: FloatArray  # (n,), weighted, held amplitudes not taken out
    picks: NDArray[np.intp]  # (combinations, amplitudes): column of each amplitude


def _amplitude_column(model: Model, position: int, scales: dict[int, float], T: FloatArray) -> FloatArray:
    """Heat capacity per unit of one amplitude, at given scales, J/(mol K)."""
    for each in model.placed:
        if each.slice.start <= position < each.slice.stop:
            values = [scales.get(i, 1.0 if i == position else 0.0) for i in range(each.slice.start, each.slice.stop)]
            return each.term.heat_capacity(T, *values)
    raise AssertionError(f"parameter {position} belongs to no term")


def _linear(par: Parametrisation, scales: _Scales, T: FloatArray, measured: FloatArray, sigma: FloatArray) -> _Linear:
    model = par.model
    amplitudes = tuple(i for i, spec in enumerate(model.specs) if spec.role == "amplitude")
    columns: list[FloatArray] = []
    known: dict[tuple[object, ...], int] = {}
    picks = np.empty((len(scales.values), len(amplitudes)), dtype=np.intp)
    for a, position in enumerate(amplitudes):
        owner = next((p for p in model.placed if p.slice.start <= position < p.slice.stop), None)
        own = [k for k, s in enumerate(scales.positions) if owner and owner.slice.start <= s < owner.slice.stop]
        unique, inverse = np.unique(scales.values[:, own], axis=0, return_inverse=True)
        numbers = []
        for row in unique:
            key = ("cp_cv",) if owner is None else (owner.term.name, position - owner.slice.start, *row)
            if key not in known:
                known[key] = len(columns)
                if owner is None:
                    columns.append(model.cp_cv.start_basis(T, measured) / sigma)
                else:
                    at = {scales.positions[k]: float(v) for k, v in zip(own, row, strict=True)}
                    columns.append(_amplitude_column(model, position, at, T) / sigma)
            numbers.append(known[key])
        picks[:, a] = np.array(numbers)[inverse.ravel()]
    return _Linear(amplitudes, np.array(columns), measured / sigma, picks)


def _solve_all(par: Parametrisation, linear: _Linear) -> tuple[FloatArray, FloatArray]:
    """Amplitudes (combinations, a) and chi-square of every combination; infinite where a mode count is negative.

    Amplitudes outside the mode sum (gamma, Cp-Cv) that come out below their lower bound are set to it and the rest
    solved again.
    """
    count = len(linear.picks)
    loose = [k for k, i in enumerate(linear.amplitudes) if i in par.free or i == par.tied]
    extra = [k for k in loose if linear.amplitudes[k] not in par.model.modes]
    best = np.full(count, np.inf)
    amplitudes = np.full((count, len(linear.amplitudes)), np.nan)
    for held_back in _subsets(extra):
        active = [k for k in loose if k not in held_back]
        found, chi_square = _solve_subset(par, linear, active)
        positions = np.array([linear.amplitudes[k] for k in active], dtype=np.intp)
        allowed = np.all((found[:, active] >= par.low[positions]) & (found[:, active] <= par.high[positions]), axis=1)
        better = allowed & (chi_square < best)
        best[better] = chi_square[better]
        amplitudes[better] = found[better]
    return amplitudes, best


def _subsets(items: list[int]) -> list[tuple[int, ...]]:
    return [chosen for size in range(len(items) + 1) for chosen in combinations(items, size)]


def _solve_subset(par: Parametrisation, linear: _Linear, active: list[int]) -> tuple[FloatArray, FloatArray]:
    """Solve all combinations for the `active` amplitudes; the others are held or at their lower bound."""
    count = len(linear.picks)
    amplitudes = np.zeros((count, len(linear.amplitudes)))
    for k, i in enumerate(linear.amplitudes):
        if k not in active:
            amplitudes[:, k] = par.low[i] if np.isnan(par.base[i]) else par.base[i]
    gram = linear.columns @ linear.columns.T
    projected = linear.columns @ linear.target
    picks = linear.picks
    passive = [k for k in range(len(linear.amplitudes)) if k not in active]
    matrix = gram[picks[:, active, None], picks[:, None, active]]
    right = projected[picks[:, active]]
    cross = gram[picks[:, active, None], picks[:, None, passive]]
    right = right - np.einsum("nij,nj->ni", cross, amplitudes[:, passive])
    summed = [n for n, k in enumerate(active) if linear.amplitudes[k] in par.model.modes]
    amplitudes[:, active] = _solve_batch(par, linear, matrix, right, summed, amplitudes, passive)
    own = gram[picks[:, :, None], picks[:, None, :]]
    quadratic = np.einsum("ni,nij,nj->n", amplitudes, own, amplitudes)
    chi_square = linear.target @ linear.target - 2 * np.einsum("ni,ni->n", amplitudes, projected[picks]) + quadratic
    return amplitudes, chi_square


def _solve_batch(
    par: Parametrisation,
    linear: _Linear,
    matrix: FloatArray,
    right: FloatArray,
    summed: list[int],
    amplitudes: FloatArray,
    passive: list[int],
) -> FloatArray:
    """Solve the normal equations of all combinations, with a Lagrange multiplier where the mode sum is held."""
    count, k = right.shape
    scale = np.sqrt(np.maximum(np.einsum("nii->ni", matrix), 1e-300))
    scaled = matrix / scale[:, :, None] / scale[:, None, :] + 1e-12 * np.eye(k)
    if par.tied is None:
        return np.asarray(np.linalg.solve(scaled, (right / scale)[:, :, None])[:, :, 0] / scale)
    taken = sum(amplitudes[:, p] for p in passive if linear.amplitudes[p] in par.model.modes)
    system = np.zeros((count, k + 1, k + 1))
    system[:, :k, :k] = scaled
    system[:, k, summed] = system[:, summed, k] = 1 / scale[:, summed]
    unit = np.maximum(system[:, k, :k].max(axis=1), 1e-300)
    system[:, k, :k] /= unit[:, None]
    system[:, :k, k] /= unit[:, None]
    rights = np.concatenate([right / scale, ((par.modes_total - taken) / unit)[:, None]], axis=1)
    return np.asarray(np.linalg.solve(system, rights[:, :, None])[:, :k, 0] / scale)


def _fallback(par: Parametrisation, linear: _Linear, scales: _Scales) -> tuple[FloatArray, FloatArray]:
    """Equal shares of the modes everywhere: used when no combination has all amplitudes positive."""
    total = par.modes_total if par.tied is not None else float(np.max(linear.target) / np.max(linear.columns))
    shares = np.array(
        [total / len(par.model.modes) if i in par.model.modes else max(par.low[i], 1e-9) for i in linear.amplitudes]
    )
    amplitudes = np.tile(shares, (len(scales.values), 1))
    own = np.einsum("na,nap->np", amplitudes, linear.columns[linear.picks])
    return amplitudes, np.asarray(((linear.target - own) ** 2).sum(axis=1))


def _candidates(
    par: Parametrisation, start: dict[int, float], data: tuple[FloatArray, FloatArray, FloatArray], seed: int
) -> list[FloatArray]:
    """Full parameter vectors of the best combinations and of a few drawn at random, best first."""
    scales = _scales(par, start, data[0])
    linear = _linear(par, scales, *data)
    amplitudes, chi_square = _solve_all(par, linear)
    if not np.isfinite(chi_square).any():
        amplitudes, chi_square = _fallback(par, linear, scales)
    order = np.argsort(chi_square)
    order = order[np.isfinite(chi_square[order])]
    chosen = _spread(scales.values[order], _REFINED)
    rest = np.setdiff1d(np.arange(order.size), chosen)
    drawn = np.random.default_rng(seed).choice(rest, size=min(_DRAWN, rest.size), replace=False) if rest.size else rest
    vectors = []
    for k in [*chosen, *drawn]:
        values = np.where(np.isnan(par.base), 0.0, par.base)
        values[list(scales.positions)] = scales.values[order[k]]
        values[list(linear.amplitudes)] = amplitudes[order[k]]
        for i, value in start.items():
            values[i] = value
        vectors.append(values)
    return vectors


def _spread(scales: FloatArray, most: int) -> list[int]:
    """Positions of the first rows that are not next-door neighbours of an earlier one: half best, half spread."""
    chosen = list(range(min(most // 2, len(scales))))
    for k in range(len(chosen), len(scales)):
        if len(chosen) >= most:
            break
        if all(np.abs(np.log(scales[k] / scales[j])).max() > 0.35 for j in chosen):
            chosen.append(k)
    return chosen


def _distinct(solutions: list[Solution], scale_positions: list[int]) -> int:
    """Distinct minima within a chi-square of 4 of the best, equal terms taken as interchangeable."""
    best = min(each.chi_square for each in solutions)
    seen: list[FloatArray] = []
    for each in solutions:
        thetas = np.sort(each.values[scale_positions])
        if each.chi_square - best < _REPORTED and not any(
            np.allclose(np.log(thetas), np.log(other), atol=0.03) for other in seen
        ):
            seen.append(thetas)
    return len(seen)


def search(
    parametrisation: Parametrisation,
    T: FloatArray,
    measured: FloatArray,
    sigma: FloatArray,
    start: dict[str, float],
    seed: int = 0,
) -> SearchResult:
    """Find the minimum of chi-square without a guess.

    Parameters
    ----------
    parametrisation : Parametrisation
    T, measured, sigma : ndarray, shape (n,)
        K ascending, J/(mol K), J/(mol K).
    start : dict
        Start values that the user gave, by name: their temperatures are not searched.
    seed : int
        For the starts that are drawn at random.
    """
    model = parametrisation.model
    given = {model.index(name): value for name, value in start.items()}
    thin = _thin(T, measured, sigma)
    rough = [
        minimise(parametrisation, vector, *thin, tolerance=_ROUGH, most=_ROUGH_MOST)
        for vector in _candidates(parametrisation, given, thin, seed)
    ]
    rough += _rescanned(parametrisation, min(rough, key=_chi_square), given, thin)
    rough.sort(key=_chi_square)
    near = [each for each in rough if each.chi_square <= rough[0].chi_square + 10 * _REPORTED][:_REFINED]
    fine = [minimise(parametrisation, each.values, T, measured, sigma, tolerance=1e-9) for each in near]
    best = min(fine, key=_chi_square)
    scale_positions = [i for i, spec in enumerate(model.specs) if spec.role == "scale"]
    return SearchResult(best, len(rough), _distinct(fine, scale_positions))


def _chi_square(solution: Solution) -> float:
    return solution.chi_square


def _rescanned(
    par: Parametrisation,
    best: Solution,
    start: dict[int, float],
    data: tuple[FloatArray, FloatArray, FloatArray],
) -> list[Solution]:
    """Minima found by moving one temperature of the best minimum at a time over the whole grid.

    A fit that strays to equal Debye and Einstein temperatures stays there, because the two terms are degenerate at
    equality; this takes it off again.
    """
    found: list[Solution] = []
    loose = [i for i, s in enumerate(par.model.specs) if s.role == "scale" and i in par.free and i not in start]
    for _ in range(_ROUNDS if len(loose) > 1 else 0):
        fresh: list[Solution] = []
        for position in loose:
            for vector in _scan(par, best.values, position, data):
                fresh.append(minimise(par, vector, *data, tolerance=_ROUGH, most=_ROUGH_MOST))
        found += fresh
        if not fresh:
            break
        better = min(fresh, key=_chi_square)
        if better.chi_square > best.chi_square - _GAIN:
            break
        best = better
    return found


def _scan(
    par: Parametrisation, values: FloatArray, position: int, data: tuple[FloatArray, FloatArray, FloatArray]
) -> list[FloatArray]:
    """The two best parameter vectors with one temperature moved well away from where it is."""
    positions = tuple(i for i, spec in enumerate(par.model.specs) if spec.role == "scale")
    grid = _grid(par, position, data[0], _SCAN_POINTS, 0.0)
    grid = grid[np.abs(np.log(grid / values[position])) > _APART]
    if grid.size == 0:
        return []
    rows = np.tile(values[list(positions)], (grid.size, 1))
    rows[:, positions.index(position)] = grid
    scales = _Scales(positions, rows)
    linear = _linear(par, scales, *data)
    amplitudes, chi_square = _solve_all(par, linear)
    order = np.argsort(chi_square)
    order = order[np.isfinite(chi_square[order])]
    vectors = []
    for k in [order[i] for i in _spread(rows[order], 2)]:
        vector = values.copy()
        vector[list(positions)] = rows[k]
        vector[list(linear.amplitudes)] = amplitudes[k]
        vectors.append(vector)
    return vectors

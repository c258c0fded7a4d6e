"""The scatter of a measurement without a model: what sigma is when none is stated."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from ..constants import NORMAL_MEDIAN, REPEAT_FACTOR
from ..records import FloatArray
from .lattice_trend import lattice_trend

__all__ = [
    "FEWEST_POINTS",
    "Scatter",
    "Spread",
    "local_scatter",
    "neighbour_span",
    "pooled_scatter",
    "repeat_sets",
    "spread_of_sets",
]

_NEIGHBOURS: Final = 7
_LEAST_FREEDOM: Final = 1e-6

_WIDEST_SET: Final = 1.009  # a longer chain of such points is no set
_APART: Final = 4.0  # sets lie at least this many times further apart than the points within them
_APART_EACH: Final = 2.0  # and each set this many times further from its neighbours than its own points
_SHARE: Final = 0.4  # of the steps that lie within sets, in a run that was measured in repeats
_STEEPEST: Final = 6.0  # slope of ln C against ln T that is believed of the means of sets
FEWEST_POINTS: Final = 10
"""Points (or sets of repeats) below which a run says nothing about its scatter."""

WIDEST_SPAN: Final = 6.0
"""Factor in T that seven neighbours may span: over more they curve more than a parabola, 2 to 7 % for 0.5 %."""


@dataclass(frozen=True)
class Scatter:
    """Relative scatter (None where it cannot be estimated) and whether repeats were averaged for it."""

    scatter: float | None
    sets: bool


@dataclass(frozen=True)
class Spread:
    """Relative scatter of points in sets of repeats.

    `squares` is the sum of squared relative deviations from the means of `sets` sets, slope in T removed, with
    `freedom` degrees of freedom; `size` the mean number of points of a set. `between` is the local scatter of the
    means about a smooth curve, None where it cannot be estimated.
    """

    squares: float
    freedom: int
    sets: int
    size: float
    between: float | None

    @property
    def within(self) -> float:
        """Pooled relative standard deviation of one point within its set."""
        return math.sqrt(self.squares / self.freedom)

    @property
    def shared(self) -> bool | None:
        """Whether the means differ by more than the spread within explains; None where that cannot be told.

        The local scatter of n means is uncertain by about 1.4/sqrt(n): 2.5 times that is allowed for.
        """
        if self.between is None:
            return None
        return self.between > (1 + 3.5 / math.sqrt(self.sets)) * self.within / math.sqrt(self.size)


def repeat_sets(temperature: FloatArray, asked: bool = False) -> NDArray[np.intp] | None:
    """Number the sets of repeats of a run measured in duplicates, triplicates ...; None where it was not.

    Repeats share what disturbs a set, so their spread says nothing about the scatter between sets. Ascending
    temperatures belong to one set while neighbours differ by less than 0.3 %; a set that lies hardly further from its
    neighbours than its own points from each other, or that grows into a chain, is none. It is a run of repeats when
    the sets lie much further apart than the points within them and, unless somebody `asked` for sets, most points
    stand in sets. A point outside the sets has a number of its own.
    """
    steps = np.diff(np.log(temperature))
    inside = steps < math.log(REPEAT_FACTOR)
    inside = _without_chains(steps, inside)
    if not inside.any() or inside.all() or (not asked and inside.sum() < _SHARE * steps.size):
        return None
    if np.median(steps[~inside]) < _APART * max(float(np.median(steps[inside])), 1e-12):
        return None
    return np.concatenate([[0], np.cumsum(~inside)])


def _without_chains(steps: FloatArray, inside: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """Take the steps out of sets that are chains or stand too close to their neighbours."""
    edges = np.flatnonzero(np.diff(np.concatenate([[0], inside.astype(np.int8), [0]])))
    kept = inside.copy()
    for first, end in zip(edges[::2], edges[1::2], strict=True):
        gap = min(steps[first - 1] if first else math.inf, steps[end] if end < steps.size else math.inf)
        too_close = gap < _APART_EACH * steps[first:end].max()
        if too_close or steps[first:end].sum() > math.log(_WIDEST_SET):
            kept[first:end] = steps[first:end] == 0  # equal temperatures are repeats however close the next ones lie
    return kept


def spread_of_sets(
    temperature: FloatArray, heat_capacity: FloatArray, run: NDArray[np.intp], asked: bool = False
) -> Spread | None:
    """Pool the spread within sets of repeats over all runs; None where no point stands in a set.

    Parameters
    ----------
    temperature, heat_capacity : ndarray, shape (n,)
        Ascending temperature in K; heat capacity in any unit, above 0.
    run : ndarray of int, shape (n,)
    asked : bool
        As in `repeat_sets`.
    """
    squares, freedom, between = 0.0, 0, []
    points = sets = 0
    for each in np.unique(run):
        T, C = temperature[run == each], heat_capacity[run == each]
        numbers = repeat_sets(T, asked) if T.size > 1 else None
        if numbers is None:
            continue
        mean_t, mean_c, deviation = _set_means(T, C, numbers)
        count = np.bincount(numbers)
        squares, freedom = squares + float(deviation @ deviation), freedom + int(T.size - count.size)
        points, sets = points + int(count[count > 1].sum()), sets + int((count > 1).sum())
        if mean_t.size >= FEWEST_POINTS and neighbour_span(mean_t) <= WIDEST_SPAN:
            between.append((mean_t.size, _scatter_of_means(mean_t, mean_c)))
    known = [(count, each) for count, each in between if each is not None]
    total = sum(count for count, _ in known)
    pooled = math.sqrt(sum(count * each**2 for count, each in known) / total) if known else None
    return Spread(squares, freedom, sets, points / sets, pooled) if freedom else None


def _scatter_of_means(temperature: FloatArray, heat_capacity: FloatArray) -> float | None:
    """Return the local scatter of means of sets: few and far apart, so that their curve is taken out first."""
    trend = lattice_trend(temperature, heat_capacity)
    scatter = local_scatter(temperature, heat_capacity / trend.at(temperature))
    freedom = max(temperature.size - trend.functions, 1) / temperature.size
    return None if scatter is None else scatter / math.sqrt(freedom)


def _set_means(
    temperature: FloatArray, heat_capacity: FloatArray, sets: NDArray[np.intp]
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return the means of sets, and what each point deviates from its own in ln C, the slope of the means removed."""
    count = np.bincount(sets)
    log_t, log_c = np.log(temperature), np.log(heat_capacity)
    mean_t, mean_c = np.bincount(sets, weights=log_t) / count, np.bincount(sets, weights=log_c) / count
    slope = np.clip(np.gradient(mean_c, mean_t), -_STEEPEST, _STEEPEST)
    return np.exp(mean_t), np.exp(mean_c), log_c - mean_c[sets] - slope[sets] * (log_t - mean_t[sets])


@dataclass(frozen=True)
class _Averaged:
    """Sets of repeats as single points; `inside` is what their spread adds to the variance of one point."""

    temperature: FloatArray
    heat_capacity: FloatArray
    sets: bool
    inside: float


def _averaged(temperature: FloatArray, heat_capacity: FloatArray) -> _Averaged:
    sets = repeat_sets(temperature)
    if sets is None:
        return _Averaged(temperature, heat_capacity, False, 0.0)
    mean_t, mean_c, deviation = _set_means(temperature, heat_capacity, sets)
    within = float(deviation @ deviation) / max(int(temperature.size - mean_t.size), 1)
    size = temperature.size / mean_t.size
    return _Averaged(mean_t, mean_c, True, within * (1 - 1 / size))


def pooled_scatter(temperature: FloatArray, heat_capacity: FloatArray, run: NDArray[np.intp]) -> Scatter:
    """Estimate the relative scatter within each run and pool it, weighted by points.

    Parameters
    ----------
    temperature, heat_capacity : ndarray, shape (n,)
        Ascending temperature in K; heat capacity in any unit, above 0.
    run : ndarray of int, shape (n,)
        A step between runs is no scatter, so each is looked at alone.
    """
    found: list[tuple[int, float]] = []
    any_sets = False
    for each in np.unique(run):
        averaged = _averaged(temperature[run == each], heat_capacity[run == each])
        if averaged.temperature.size < FEWEST_POINTS or neighbour_span(averaged.temperature) > WIDEST_SPAN:
            continue
        scatter = local_scatter(averaged.temperature, averaged.heat_capacity)
        if scatter is not None:
            found.append((averaged.temperature.size, math.hypot(scatter, math.sqrt(averaged.inside))))
            any_sets = any_sets or averaged.sets
    if not found:
        return Scatter(None, False)
    weights = sum(count for count, _ in found)
    return Scatter(math.sqrt(sum(count * each**2 for count, each in found) / weights), any_sets)


def neighbour_span(temperature: FloatArray) -> float:
    """Median over the points of the factor in T that the 7 nearest neighbours span; `temperature` ascending, K."""
    size = min(_NEIGHBOURS, temperature.size)
    return float(np.median(temperature[size - 1 :] / temperature[: temperature.size - size + 1]))


def local_scatter(temperature: FloatArray, heat_capacity: FloatArray) -> float | None:
    """Estimate the relative standard deviation of a heat capacity from its own local scatter.

    Parameters
    ----------
    temperature, heat_capacity : ndarray, shape (n,)
        Ascending temperature in K, equal ones allowed; heat capacity in any unit, above 0.

    Returns
    -------
    float or None
        sigma/C, the same at every point; None where no point says anything about it.

    Notes
    -----
    At each point the deviation of ln C from a quadratic in ln T through its 7 nearest neighbours in order (itself
    included), divided by sqrt(1 - leverage); 1.4826 times the median of the absolute values, the consistent estimate
    of a normal standard deviation. Repeats at one temperature lower the degree that a neighbourhood determines: the
    singular value decomposition then fits what is left. A point that its own fit must pass through says nothing and
    is left out.
    """
    count = temperature.size
    if count <= 1:
        return None
    size = min(_NEIGHBOURS, count)
    log_t, log_c = np.log(temperature), np.log(heat_capacity)
    starts = np.clip(np.arange(count) - size // 2, 0, count - size)
    members = starts[:, None] + np.arange(size)
    x, y = log_t[members], log_c[members]
    x = x - x.mean(axis=1, keepdims=True)
    spread = np.abs(x).max(axis=1, keepdims=True)
    x = np.divide(x, spread, out=np.zeros_like(x), where=spread > 1e-12)
    design = np.stack([np.ones_like(x), x, x * x], axis=-1)
    basis, singular, _ = np.linalg.svd(design, full_matrices=False)
    basis = basis * (singular > 1e-9 * singular[:, :1])[:, None, :]
    own = np.arange(count) - starts
    row = basis[np.arange(count), own]
    fitted = np.einsum("ik,ijk,ij->i", row, basis, y)
    freedom = 1.0 - np.einsum("ik,ik->i", row, row)
    useful = freedom > _LEAST_FREEDOM
    if not useful.any():
        return None
    deviation = (log_c - fitted)[useful] / np.sqrt(freedom[useful])
    scatter = NORMAL_MEDIAN * float(np.median(np.abs(deviation)))
    return scatter if math.isfinite(scatter) else None

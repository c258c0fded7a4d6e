"""The scatter of a measurement without a model: what sigma is when none is stated."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from ..records import FloatArray

__all__ = ["Scatter", "local_scatter", "neighbour_span", "pooled_scatter", "repeat_sets"]

_NEIGHBOURS: Final = 7
_NORMAL_MEDIAN: Final = 1.4826  # standard deviation of a normal distribution over the median of its absolute values
_LEAST_FREEDOM: Final = 1e-6


_REPEAT: Final = 1.003  # points closer than this factor in T may be repeats of one set
_APART: Final = 4.0  # sets lie at least this many times further apart than the points within them


@dataclass(frozen=True)
class Scatter:
    """Relative scatter (None where it cannot be estimated) and whether repeats were averaged for it."""

    scatter: float | None
    sets: bool


def repeat_sets(temperature: FloatArray) -> NDArray[np.intp] | None:
    """Number the sets of repeats of a run measured in duplicates, triplicates ...; None where it was not.

    Repeats share what disturbs a set, so their spread says nothing about the scatter between sets. Ascending
    temperatures belong to one set while neighbours differ by less than 0.3 %; it is a run of repeats when most
    points stand in sets and the sets lie much further apart than the points within them.
    """
    steps = np.diff(np.log(temperature))
    inside = steps < math.log(_REPEAT)
    if inside.sum() < 0.4 * steps.size or inside.all():
        return None
    if np.median(steps[~inside]) < _APART * max(float(np.median(steps[inside])), 1e-12):
        return None
    return np.concatenate([[0], np.cumsum(~inside)])


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
    count = np.bincount(sets)
    mean_t = np.exp(np.bincount(sets, weights=np.log(temperature)) / count)
    mean_c = np.exp(np.bincount(sets, weights=np.log(heat_capacity)) / count)
    # a set's own slope in T is taken out before its spread is looked at
    log_t, log_c = np.log(temperature) - np.log(mean_t)[sets], np.log(heat_capacity) - np.log(mean_c)[sets]
    slope = np.gradient(np.log(mean_c), np.log(mean_t))[sets]
    freedom = max(int(temperature.size - count.size), 1)
    within = float(((log_c - slope * log_t) ** 2).sum()) / freedom
    size = temperature.size / count.size
    return _Averaged(mean_t, mean_c, True, within * (1 - 1 / size))


def pooled_scatter(
    temperature: FloatArray, heat_capacity: FloatArray, run: NDArray[np.intp], fewest: int, widest: float
) -> Scatter:
    """Estimate the relative scatter within each run and pool it, weighted by points.

    Parameters
    ----------
    temperature, heat_capacity : ndarray, shape (n,)
        Ascending temperature in K; heat capacity in any unit, above 0.
    run : ndarray of int, shape (n,)
        A step between runs is no scatter, so each is looked at alone.
    fewest : int
        Points (or sets of repeats) below which a run says nothing.
    widest : float
        Factor in T that seven neighbours may span.
    """
    found: list[tuple[int, float]] = []
    any_sets = False
    for each in np.unique(run):
        averaged = _averaged(temperature[run == each], heat_capacity[run == each])
        if averaged.temperature.size < fewest or neighbour_span(averaged.temperature) > widest:
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
    scatter = _NORMAL_MEDIAN * float(np.median(np.abs(deviation)))
    return scatter if math.isfinite(scatter) else None

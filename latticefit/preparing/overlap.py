"""How the runs of one sample compare where both were measured."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from ..records import FloatArray, Measurement, RunOverlap
from .lattice_trend import lattice_trend

__all__ = ["FEW_PAIRS", "run_overlaps", "worst_overlaps"]

FEW_PAIRS: Final = 12
"""Pairs of runs that are all shown, in the order of the runs; of more the worst are."""

_FEWEST: Final = 3  # points of each run in the common range
_SIDE: Final = 4  # neighbours on each side that a value between points is taken from
_KEPT: Final = 200  # pairs, where there are more


@dataclass(frozen=True)
class _Run:
    """Points of one run by ascending temperature."""

    temperature: FloatArray
    heat_capacity: FloatArray
    relative: FloatArray


@dataclass(frozen=True)
class _Compared:
    """Points of a sparser run beside a denser one.

    `difference` is ln(C/C of the other run) with its variance, shape (m,), `members` and `share` the points of the
    other run that it was taken from and the part of each, shape (m, at most 8).
    """

    difference: FloatArray
    variance: FloatArray
    members: NDArray[np.intp]
    share: FloatArray


def run_overlaps(
    measurement: Measurement,
    temperature: FloatArray,
    heat_capacity: FloatArray,
    sigma: FloatArray,
    run: NDArray[np.intp],
) -> tuple[RunOverlap, ...]:
    """Compare every two runs that have at least three points each in a common range.

    Parameters
    ----------
    measurement : Measurement
        For the labels of its runs.
    temperature, heat_capacity, sigma : ndarray, shape (n,)
        The points that count, ascending temperature in K, any one unit.
    run : ndarray of int, shape (n,)

    Returns
    -------
    tuple of RunOverlap
        In the order of the runs.

    Notes
    -----
    A step of 2.5 % between runs of 30 to 300 points with 0.3 to 2 % noise is recovered without bias; it lies within u
    in 67 to 70 %, within 2 u in 93 to 96 % of 300 cases each (scripts/noticing.py).
    """
    if len(measurement.readings) == 1:
        return ()
    labels = [reading.label for reading in measurement.readings]
    order = np.argsort(run, kind="stable")
    parts = np.split(order, np.searchsorted(run[order], np.arange(1, len(labels))))
    relative = sigma / heat_capacity
    runs = [_Run(*(each[part] for each in (temperature, heat_capacity, relative))) for part in parts]
    begin, end = _common(runs)
    found: dict[tuple[int, int], RunOverlap] = {}
    for number in range(len(runs)):
        for few, log_ratio, u in _beside(runs, number, begin, end):
            pair = min(few, number), max(few, number)
            ratio = math.exp(log_ratio if pair[0] == few else -log_ratio)
            T = runs[few].temperature[begin[few, number] : end[few, number]]
            ends = float(T[0]), float(T[-1])
            found[pair] = RunOverlap(labels[pair[0]], labels[pair[1]], ratio, ratio * u, *ends, int(T.size))
    return tuple(found[pair] for pair in sorted(found))


def worst_overlaps(overlaps: tuple[RunOverlap, ...]) -> tuple[RunOverlap, ...]:
    """Return up to 12 pairs of runs as they are; of more those 200 that differ by most standard uncertainties."""
    if len(overlaps) <= FEW_PAIRS:
        return overlaps
    return tuple(sorted(overlaps, key=lambda each: -abs(each.ratio - 1) / each.u)[:_KEPT])


def _common(runs: list[_Run]) -> tuple[NDArray[np.intp], NDArray[np.intp]]:
    """Return from which to which point each run (row) lies in the range that it has in common with each (column)."""
    first = np.array([each.temperature[0] if each.temperature.size else np.inf for each in runs])
    last = np.array([each.temperature[-1] if each.temperature.size else -np.inf for each in runs])
    begin = [np.searchsorted(each.temperature, np.maximum(first, first[i])) for i, each in enumerate(runs)]
    end = [np.searchsorted(each.temperature, np.minimum(last, last[i]), "right") for i, each in enumerate(runs)]
    return np.array(begin, dtype=np.intp), np.array(end, dtype=np.intp)


def _beside(
    runs: list[_Run], number: int, begin: NDArray[np.intp], end: NDArray[np.intp]
) -> Iterator[tuple[int, float, float]]:
    """Compare one run with all that have fewer points than it in the common range: run, mean of ln C/C, and its u."""
    other, many = (end - begin)[:, number], (end - begin)[number]
    earlier = np.arange(len(runs)) < number
    fewer = (other < many) | ((other == many) & earlier)  # of two that have as many, the earlier counts as sparser
    partners = np.flatnonzero(fewer & (np.minimum(other, many) >= _FEWEST))
    if partners.size == 0:
        return
    pieces = [slice(begin[i, number], end[i, number]) for i in partners]
    T, C, relative = (
        np.concatenate([getattr(runs[i], name)[piece] for i, piece in zip(partners, pieces, strict=True)])
        for name in ("temperature", "heat_capacity", "relative")
    )
    compared, start = _differences(T, C, relative, runs[number]), 0
    for i in partners.tolist():
        stop = start + int(other[i])
        yield i, *_mean(compared, slice(start, stop), relative, runs[number].relative)
        start = stop


def _differences(T: FloatArray, C: FloatArray, relative: FloatArray, many: _Run) -> _Compared:
    """Compare points with a run that is taken there from a straight line through its eight nearest points.

    Both are divided by a smooth curve through all points of the run (`lattice_trend`) beforehand.
    """
    trend = lattice_trend(many.temperature, many.heat_capacity)
    members, share = _nearest(T, many)
    flat = np.log(many.heat_capacity / trend.at(many.temperature))
    difference = np.log(C / trend.at(T)) - (share * flat[members]).sum(axis=1)
    return _Compared(difference, relative**2 + (share**2 * many.relative[members] ** 2).sum(axis=1), members, share)


def _mean(compared: _Compared, part: slice, relative: FloatArray, relative_many: FloatArray) -> tuple[float, float]:
    """Return the mean difference of a part of the points, and its standard uncertainty.

    A point of the denser run that serves several temperatures counts once in the uncertainty; where the differences
    scatter by more than that, u is larger by as much (R. T. Birge, Phys. Rev. 40, 207 (1932)).
    """
    difference, variance, members = compared.difference[part], compared.variance[part], compared.members[part]
    weight = 1 / variance / np.sum(1 / variance)
    mean = float(weight @ difference)
    own = weight * relative[part]
    lowest, highest = int(members[0, 0]), int(members[-1, -1])
    share = weight[:, None] * compared.share[part]
    common = np.bincount((members - lowest).ravel(), share.ravel()) * relative_many[lowest : highest + 1]
    excess = float(np.sum((difference - mean) ** 2 / variance)) / (difference.size - 1)
    return mean, math.sqrt(float(own @ own + common @ common) * max(1.0, excess))


def _nearest(T: FloatArray, many: _Run) -> tuple[NDArray[np.intp], FloatArray]:
    """Return the points of a run nearest to temperatures, and their parts in weighted straight lines in ln T."""
    at = many.temperature
    size = min(2 * _SIDE, at.size)
    starts = np.clip(np.searchsorted(at, T) - _SIDE, 0, at.size - size)
    members = starts[:, None] + np.arange(size)
    x, weight = np.log(at)[members] - np.log(T)[:, None], many.relative[members] ** -2.0
    weight = weight / weight.sum(axis=1, keepdims=True)
    middle = (weight * x).sum(axis=1, keepdims=True)
    spread = (weight * (x - middle) ** 2).sum(axis=1, keepdims=True)
    lean = np.divide(-middle * (x - middle), spread, out=np.zeros_like(x), where=spread > 1e-18)
    return members, weight * (1 + lean)

"""What a measurement shows before any fit: gaps, repeats, scatter, outliers, overlaps, suspected features, level."""

from __future__ import annotations

from dataclasses import dataclass
from math import floor, log10
from typing import Final

import numpy as np
from numpy.typing import NDArray

from ..errors import InputError
from ..exclusion import reasons_kept_out
from ..preparing.addenda import with_addenda
from ..preparing.features import suspected_features
from ..preparing.outliers import outliers_of_runs
from ..preparing.prepare import points_to_fit, prepare
from ..preparing.scatter import pooled_scatter, repeat_sets
from ..records import Feature, FloatArray, LevelFinding, Measurement, PreparedData, RunOverlap
from .lack_of_fit import unsettled_first_points
from .level import examine_prepared_level, level_not_judged

__all__ = ["Decade", "Examination", "examine"]

_GAP: Final = 1.25  # neighbours further apart than this factor in T, and
_WIDE: Final = 3.0  # this many times further than is usual, leave a gap
_MOST_GAPS: Final = 3


@dataclass(frozen=True)
class Decade:
    """Points of one decade of temperature (K) and its gaps, as pairs of temperatures, K."""

    low: float
    high: float
    points: int
    gaps: tuple[tuple[float, float], ...]


@dataclass(frozen=True)
class Examination:
    """What stands out in a measurement.

    Attributes
    ----------
    decades : tuple of Decade
    repeated_sets, repeated_points : int
        Sets of repeats and the points in them.
    scatter : float or None
        Relative standard deviation of a point from its neighbours; None where it cannot be told.
    outliers : tuple of (position, size)
        Positions in the measurement, sizes in scatters, with sign.
    features : tuple of Feature
    level : LevelFinding
    left_out : tuple of str
        Reasons for which points that could be read will not be fitted, one a point.
    averaged, means : int
        How many of the others are averaged, and into how many points.
    to_fit : int
        Points that will be fitted, means included.
    overlaps : tuple of RunOverlap
        As in PreparedData; empty where the measurement cannot be prepared.
    overlaps_compared : int
    sigma : ndarray, shape (n,), or None
        Stated standard uncertainty of each point, that of the addenda in it; unit of the measurement.
    unsettled : float or None
        By how much the first point of each set of repeats lies above the others, relative, where that is no chance.
    """

    decades: tuple[Decade, ...]
    repeated_sets: int
    repeated_points: int
    scatter: float | None
    outliers: tuple[tuple[int, float], ...]
    features: tuple[Feature, ...]
    level: LevelFinding
    left_out: tuple[str, ...]
    averaged: int
    means: int
    to_fit: int
    overlaps: tuple[RunOverlap, ...]
    overlaps_compared: int
    sigma: FloatArray | None
    unsettled: float | None


def examine(measurement: Measurement) -> Examination:
    """Look at the points of a measurement, on whatever basis they are.

    Parameters
    ----------
    measurement : Measurement
        Points that are set aside, or outside the windows of their runs, count for decades and gaps only.
    """
    prepared, why = _prepared(measurement)
    single, averaged, means = _reasons(measurement)
    # of points that are averaged, the points themselves are looked at
    reasons = reasons_kept_out(measurement) if averaged else single
    used = np.array([i for i, reason in enumerate(reasons) if reason is None], dtype=np.intp)
    index = used[np.argsort(measurement.temperature[used], kind="stable")]
    sets, points = _repeats(measurement, index)
    scatter = None
    if index.size:
        T, C = measurement.temperature[index], measurement.heat_capacity[index]
        scatter = pooled_scatter(T, C, measurement.run[index]).scatter
    return Examination(
        decades=_decades(measurement.temperature),
        repeated_sets=sets,
        repeated_points=points,
        scatter=scatter,
        outliers=_outliers(measurement, prepared, index),
        features=_features(measurement, index, scatter),
        level=level_not_judged(why) if prepared is None else examine_prepared_level(prepared),
        left_out=tuple(reason for reason in (*single, *averaged) if reason is not None),
        averaged=averaged.count(None),
        means=means,
        to_fit=single.count(None) + means,
        overlaps=() if prepared is None else prepared.overlaps,
        overlaps_compared=0 if prepared is None else prepared.overlaps_compared,
        sigma=_sigma(measurement),
        unsettled=None if prepared is None else unsettled_first_points(prepared),
    )


def _sigma(measurement: Measurement) -> FloatArray | None:
    if measurement.sigma is None:
        return None
    every = np.arange(measurement.run.size)
    return with_addenda(measurement, every, np.array(measurement.sigma), "")[0]


def _prepared(measurement: Measurement) -> tuple[PreparedData | None, str]:
    """The points that would be fitted; None and the reason where there are none, or not per mole."""
    try:
        return prepare(measurement), ""
    except InputError as error:
        return None, str(error)


def _reasons(measurement: Measurement) -> tuple[tuple[str | None, ...], tuple[str | None, ...], int]:
    """Say why points are left out: those that stand for themselves, those in means; and how many means are fitted."""
    try:
        repeated, reasons = points_to_fit(measurement)
    except InputError:  # no repeats where they were asked for
        return reasons_kept_out(measurement), (), 0
    rows = repeated.measurement.excluded[len(measurement.excluded) :]
    into = [row.averaged_into for row in rows if row.averaged_into is not None]
    single = tuple(reason for i, reason in enumerate(reasons) if i not in set(into))
    return single, tuple(reasons[i] for i in into), sum(reasons[i] is None for i in set(into))


def _outliers(
    measurement: Measurement, prepared: PreparedData | None, index: NDArray[np.intp]
) -> tuple[tuple[int, float], ...]:
    sizes = None if prepared is None else prepared.outlier_sizes
    if sizes is None or sizes.size != measurement.run.size:
        sigma = None if measurement.sigma is None else measurement.sigma[index]
        sizes = outliers_of_runs(measurement, index, sigma)
    return tuple((i, float(sizes[i])) for i in np.flatnonzero(sizes).tolist())


def _by_run(measurement: Measurement, index: NDArray[np.intp]) -> list[NDArray[np.intp]]:
    return [index[measurement.run[index] == run] for run in np.unique(measurement.run[index])]


def _repeats(measurement: Measurement, index: NDArray[np.intp]) -> tuple[int, int]:
    sets = points = 0
    for place in _by_run(measurement, index):
        numbers = repeat_sets(measurement.temperature[place], asked=True) if place.size > 1 else None
        if numbers is not None:
            sizes = np.bincount(numbers)
            sets += int((sizes > 1).sum())
            points += int(sizes[sizes > 1].sum())
    return sets, points


def _features(measurement: Measurement, index: NDArray[np.intp], scatter: float | None) -> tuple[Feature, ...]:
    found: list[Feature] = []
    for place in _by_run(measurement, index):
        own: float | FloatArray | None = scatter
        if measurement.sigma is not None:
            own = measurement.sigma[place] / measurement.heat_capacity[place]
        if own is not None:
            found += suspected_features(measurement.temperature[place], measurement.heat_capacity[place], own)
    return tuple(found)


def _decades(temperature: FloatArray) -> tuple[Decade, ...]:
    T = np.sort(temperature)
    steps = T[1:] / T[:-1]
    usual = float(np.median(np.log(steps[steps > 1]))) if (steps > 1).any() else 0.0
    wide = np.flatnonzero((steps > _GAP) & (np.log(steps) > _WIDE * usual))
    gaps = [(float(T[i]), float(T[i + 1])) for i in wide[np.argsort(-steps[wide])][:_MOST_GAPS]]
    found = []
    for power in range(floor(log10(T[0])), floor(log10(T[-1])) + 1):
        low, high = 10.0**power, 10.0 ** (power + 1)
        inside = int(((low <= T) & (high > T)).sum())
        found.append(Decade(low, high, inside, tuple(gap for gap in sorted(gaps) if low <= gap[0] < high)))
    return tuple(found)

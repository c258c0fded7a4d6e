"""What a measurement shows before any fit: gaps, repeats, scatter, outliers, overlaps, suspected features, level."""

from __future__ import annotations

from dataclasses import dataclass
from math import floor, log10
from typing import Final

import numpy as np
from numpy.typing import NDArray

from ..errors import InputError
from ..preparing.features import suspected_features
from ..preparing.outliers import outliers
from ..preparing.prepare import prepare
from ..preparing.scatter import pooled_scatter, repeat_sets
from ..records import Feature, FloatArray, LevelFinding, Measurement, RunOverlap
from .level import examine_level

__all__ = ["Decade", "Examination", "examine", "overlaps_of"]

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
    """

    decades: tuple[Decade, ...]
    repeated_sets: int
    repeated_points: int
    scatter: float | None
    outliers: tuple[tuple[int, float], ...]
    features: tuple[Feature, ...]
    level: LevelFinding
    left_out: tuple[str, ...]


def examine(measurement: Measurement) -> Examination:
    """Look at the points of a measurement, on whatever basis they are.

    Parameters
    ----------
    measurement : Measurement
        Points that are set aside, or outside the windows of their runs, count for decades and gaps only.
    """
    left_out = _left_out(measurement)
    used = np.array([i for i, reason in enumerate(left_out) if reason is None], dtype=np.intp)
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
        outliers=_outliers(measurement, index),
        features=_features(measurement, index, scatter),
        level=examine_level(measurement),
        left_out=tuple(reason for reason in left_out if reason is not None),
    )


def overlaps_of(measurement: Measurement) -> tuple[RunOverlap, ...]:
    """Compare the runs of a measurement where they overlap; empty where it cannot be prepared."""
    try:
        return prepare(measurement).overlaps
    except InputError:
        return ()


def _left_out(measurement: Measurement) -> tuple[str | None, ...]:
    try:
        reasons = prepare(measurement).reasons
    except InputError:  # not per mole, or nothing left: what is set aside is known all the same
        reasons = ()
    if len(reasons) == measurement.run.size:
        return reasons
    return measurement.set_aside or (None,) * measurement.run.size


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


def _outliers(measurement: Measurement, index: NDArray[np.intp]) -> tuple[tuple[int, float], ...]:
    found: list[tuple[int, float]] = []
    for place in _by_run(measurement, index):
        sigma = None if measurement.sigma is None else measurement.sigma[place]
        sizes = outliers(measurement.temperature[place], measurement.heat_capacity[place], sigma)
        found += [(int(place[i]), float(sizes[i])) for i in np.flatnonzero(sizes)]
    return tuple(sorted(found))


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

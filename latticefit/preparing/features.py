"""Features that no lattice makes: peaks, steps, and C/T that rises on cooling."""

from __future__ import annotations

from dataclasses import replace
from typing import Final

import numpy as np

from ..records import Feature, FloatArray
from .scatter import repeat_sets
from .templates import FEWEST, NEAR, SIGNIFICANT, Points, peaks_and_steps

__all__ = ["suspected_features"]

_MOST: Final = 1000  # more points are averaged in blocks
_LEAST_SCATTER: Final = 1e-3  # relative: no measurement follows a lattice more closely over a wide range
_LEAST_FALL: Final = 0.03  # of the heat capacity, by which it falls on warming from a hump
_MEDIAN_PAIR: Final = 0.76  # standard deviation of the difference of two medians of five
_COLD: Final = 4.0  # K below which an upturn is looked for
_LOWEST: Final = (4, 6, 9)  # numbers of lowest points whose slope of C/T is looked at
_FALLS: Final = 3.0  # standard uncertainties of that slope


def suspected_features(
    temperature: FloatArray, heat_capacity: FloatArray, scatter: float | FloatArray
) -> tuple[Feature, ...]:
    """Look for what a lattice cannot make in the heat capacity of one run.

    Parameters
    ----------
    temperature, heat_capacity : ndarray, shape (n,)
        Temperature in K; heat capacity in any unit, above 0.
    scatter : float or ndarray, shape (n,)
        Relative standard deviation of a point.

    Returns
    -------
    tuple of Feature
        By temperature. A peak is at least three adjacent points (or sets of repeats) above a smooth curve, a step a
        jump between two smooth branches, both of at least 1.5 % and 4.7 standard uncertainties; an upturn is C/T that
        falls with T over the lowest points, below 4 K. Below 20 points only an upturn is looked for.

    Notes
    -----
    The smooth curve is the best sum of Einstein functions with weights that are not negative, and of T and T^2: any
    lattice with conduction electrons can be written so, and no sum of this kind has a peak or a step. Templates of
    both are tried beside its functions at every place; the one that stands out most is taken into the fit, and so on.
    Where residuals are larger than the scatter, or go together over many points, significance is less by as much.

    Measured on 300 random solids for each of six grids of 100 to 300 points (scripts/noticing.py): 0 to 0.3 % of clean
    files with 0.3 to 1 % noise are suspected of anything. Peaks of 10 %, two to eight points wide: 96 to 100 % found at
    0.3 % noise, 24 % (two points) to 100 % at 1 %. Steps of 3 %: 94 to 100 % at 0.3 % noise, 38 to 98 % at 0.5 %, 1 to
    47 % at 1 %. T^-2 tails twice as large as the lattice at the lowest point: all, where four points lie below 4 K. Of
    clean files whose noise goes together from point to point (correlation 0.5) up to 6 % are suspected at 1 % noise.
    """
    order = np.argsort(temperature, kind="stable")
    relative = np.maximum(np.broadcast_to(scatter, temperature.shape)[order], _LEAST_SCATTER)
    points = _averaged(temperature[order], heat_capacity[order], relative)
    upturn = _upturn(points)
    features = _with_fall(peaks_and_steps(points, upturn is not None), _fall(points))
    features.sort(key=lambda each: each.temperature_low)
    return tuple(features) if upturn is None else _with_upturn(upturn, features, points.temperature)


def _with_upturn(upturn: Feature, features: list[Feature], temperature: FloatArray) -> tuple[Feature, ...]:
    """Let an upturn reach as far as the excess that begins in it, and put it first."""
    rest = []
    for each in features:
        beside = temperature[: np.searchsorted(temperature, each.temperature_low)] > upturn.temperature_high
        if beside.sum() < NEAR:
            upturn = replace(upturn, temperature_high=max(upturn.temperature_high, each.temperature_high))
        else:
            rest.append(each)
    return upturn, *rest


def _averaged(temperature: FloatArray, heat_capacity: FloatArray, relative: FloatArray) -> Points:
    numbers = repeat_sets(temperature) if temperature.size > 1 else None
    if numbers is None:
        numbers = np.arange(temperature.size) // max(1, -(-temperature.size // _MOST))
    count = np.bincount(numbers)
    return Points(
        np.exp(np.bincount(numbers, weights=np.log(temperature)) / count),
        np.exp(np.bincount(numbers, weights=np.log(heat_capacity)) / count),
        np.sqrt(np.bincount(numbers, weights=relative**2)) / count,
    )


# --------------------------------------------------------------------------------------------- falls and upturns


def _with_fall(features: list[Feature], fall: Feature | None) -> list[Feature]:
    """Make one peak of a hump and of what stands out in it; a step alone stays a step."""
    if fall is None:
        return features

    def inside(each: Feature) -> bool:
        return each.temperature_low <= fall.temperature_high and each.temperature_high >= fall.temperature_low

    within = [each for each in features if inside(each)]
    if within and all(each.kind == "step" for each in within):
        return features
    whole = replace(
        fall,
        temperature_low=min(each.temperature_low for each in (fall, *within)),
        temperature_high=max(each.temperature_high for each in (fall, *within)),
        size=max(each.size for each in (fall, *within)),
    )
    return [whole, *(each for each in features if not inside(each))]


def _fall(points: Points) -> Feature | None:
    """Return the hump from which the heat capacity falls on warming by most, None where it does not fall.

    No lattice does that. A broad hump spoils the whole curve through it, so that no part of it stands out.
    """
    T, log_c = points.temperature, np.log(points.heat_capacity)
    if T.size < FEWEST:
        return None
    around = np.clip(np.arange(T.size) - 2, 0, T.size - 5)[:, None] + np.arange(5)
    smooth = np.median(log_c[around], axis=1)
    drop = np.maximum.accumulate(smooth) - smooth
    last = int(np.argmax(drop))
    size, u = float(drop[last]), _MEDIAN_PAIR * float(points.scatter[last])
    if size <= max(_LEAST_FALL, SIGNIFICANT * u):
        return None
    top = int(np.argmax(smooth[: last + 1]))
    first = int(np.argmax(smooth >= smooth[last]))
    return Feature("peak", float(T[first]), float(T[last]), float(T[top]), float(np.expm1(size)), size / u)


def _upturn(points: Points) -> Feature | None:
    """Return the rise of C/T on cooling over the lowest points, None where there is none."""
    best: Feature | None = None
    for number in _LOWEST:
        T, C = points.temperature[:number], points.heat_capacity[:number]
        if T.size < number or T[-1] > _COLD:
            break
        ratio = C / T / np.mean(C / T)
        weight = (points.scatter[:number] * ratio) ** -2.0
        middle = float((weight * T).sum() / weight.sum())
        lever = float((weight * (T - middle) ** 2).sum())
        if lever <= 0:
            continue
        slope = float((weight * (T - middle) * ratio).sum()) / lever
        significance = -slope * lever**0.5
        if significance > max(_FALLS, best.significance if best else 0.0):
            size = -slope * float(T[-1] - T[0]) / float((weight * ratio).sum() / weight.sum())
            best = Feature("upturn", float(T[0]), float(T[-1]), float(T[0]), size, significance)
    return best

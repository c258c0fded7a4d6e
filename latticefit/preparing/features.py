"""Features that no lattice makes: peaks, steps, and C/T that rises on cooling."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Final

import numpy as np
from numpy.typing import NDArray

from ..records import Feature, FloatArray
from .lattice_trend import lattice_functions, lattice_trend, non_negative
from .scatter import repeat_sets

__all__ = ["SIGNIFICANT", "suspected_features"]

SIGNIFICANT: Final = 4.7
"""Standard uncertainties from which a peak or a step is suspected."""

_FEWEST: Final = 20  # points or sets below which a smooth curve can follow a feature
_MOST: Final = 1000  # more points are averaged in blocks
_LEAST_SIZE: Final = 0.015  # of the heat capacity: what smoothing, joins and calibration do to real tables
_LEAST_SCATTER: Final = 1e-3  # relative: no measurement follows a lattice more closely over a wide range
_PEAK: Final = 3  # adjacent points that make a peak; fewer are glitches
_WIDEST: Final = 0.35  # of ln T that a template of a peak spans; a wider peak is found piece by piece
_BESIDE: Final = 5  # points on each side of a step
_GAP: Final = 4.0  # a gap this many times wider than those around it hides whether there is a step
_ROUNDS: Final = 12
_NEAR: Final = 3  # points between two pieces that belong together
_NEAR_IN_T: Final = 1.2  # factor in T between two pieces that belong together
_COLD: Final = 4.0  # K below which an upturn is looked for
_LOWEST: Final = (4, 6, 9)  # numbers of lowest points whose slope of C/T is looked at
_FALLS: Final = 3.0  # standard uncertainties of that slope
_NORMAL_MEDIAN: Final = 1.4826


@dataclass(frozen=True)
class _Points:
    """Points of one run, sets of repeats and blocks averaged, with their relative scatter."""

    temperature: FloatArray
    heat_capacity: FloatArray
    scatter: FloatArray


@dataclass(frozen=True)
class _Found:
    """A template that stands out: `width` points from `first` to `last`, or a step between; size relative to C."""

    kind: str
    first: int
    last: int
    width: int
    size: float
    significance: float


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

    Measured on random solids (scripts/noticing.py): {MEASURED}
    """
    order = np.argsort(temperature, kind="stable")
    relative = np.maximum(np.broadcast_to(scatter, temperature.shape)[order], _LEAST_SCATTER)
    points = _averaged(temperature[order], heat_capacity[order], relative)
    features: list[Feature] = []
    upturn = _upturn(points)
    if points.temperature.size >= _FEWEST:
        found, excess = _templates(points, upturn is not None)
        features = sorted(_joined(found, excess, points.temperature), key=lambda each: each.temperature_low)
    return tuple(features) if upturn is None else _with_upturn(upturn, features, points.temperature)


def _with_upturn(upturn: Feature, features: list[Feature], temperature: FloatArray) -> tuple[Feature, ...]:
    """Let an upturn reach as far as the excess that begins in it, and put it first."""
    rest = []
    for each in features:
        beside = temperature[: np.searchsorted(temperature, each.temperature_low)] > upturn.temperature_high
        if beside.sum() < _NEAR:
            upturn = replace(upturn, temperature_high=max(upturn.temperature_high, each.temperature_high))
        else:
            rest.append(each)
    return upturn, *rest


def _averaged(temperature: FloatArray, heat_capacity: FloatArray, relative: FloatArray) -> _Points:
    numbers = repeat_sets(temperature) if temperature.size > 1 else None
    if numbers is None:
        numbers = np.arange(temperature.size) // max(1, -(-temperature.size // _MOST))
    count = np.bincount(numbers)
    return _Points(
        np.exp(np.bincount(numbers, weights=np.log(temperature)) / count),
        np.exp(np.bincount(numbers, weights=np.log(heat_capacity)) / count),
        np.sqrt(np.bincount(numbers, weights=relative**2)) / count,
    )


# ------------------------------------------------------------------------------------------------- peaks and steps


@dataclass(frozen=True)
class _Explained:
    """A fit of lattice functions and of the steps found: residual over scatter, the functions in use, the curve.

    Everything is relative to a first smooth curve and never to the measured values: a template that held their noise
    would explain it.
    """

    residual: FloatArray
    basis: FloatArray
    level: FloatArray


def _templates(points: _Points, tail: bool) -> tuple[list[_Found], FloatArray]:
    """Return what stands out, strongest first, and the excess of each point over the smooth curve, relative to it.

    With a `tail`, T^-2 belongs to the smooth curve: what levels far below the data add.
    """
    T = points.temperature
    first = lattice_trend(T, points.heat_capacity).at(T)
    functions = np.column_stack([lattice_functions(T)[1], (T[0] / T) ** 2] if tail else [lattice_functions(T)[1]])
    values, functions = points.heat_capacity / first, functions / first[:, None]
    kept = np.ones(values.size, dtype=bool)
    found: list[_Found] = []
    explained = _explained(functions, values, points.scatter, kept)
    for _ in range(_ROUNDS):
        best = _strongest(explained, points, kept)
        if best is None or kept.sum() < _FEWEST:
            break
        found.append(best)
        if best.kind == "step":
            above = (np.arange(kept.size) > best.first).astype(float)
            functions = np.column_stack([functions, above, -above])
        else:
            kept[best.first : best.last + 1] = False
        explained = _explained(functions, values, points.scatter, kept)
    return _believed(found, explained, points, kept), values / explained.level - 1


def _explained(functions: FloatArray, values: FloatArray, scatter: FloatArray, kept: NDArray[np.bool_]) -> _Explained:
    weight = kept / scatter
    design, wanted = functions * weight[:, None], values * weight
    amount = non_negative(design, wanted)
    basis = np.linalg.qr(design[:, amount > 0])[0]
    return _Explained(wanted - basis @ (basis.T @ wanted), basis, np.maximum(functions @ amount, 1e-3))


class _Pulls:
    """How much of each template the residuals hold, in standard uncertainties and relative to C."""

    def __init__(self, explained: _Explained, points: _Points, kept: NDArray[np.bool_]) -> None:
        self.place = np.flatnonzero(kept)
        self.temperature = points.temperature[kept]
        residual, basis = explained.residual[kept], explained.basis[kept]
        used = 1 / points.scatter[kept]
        terms = np.column_stack([used**2, residual * used, basis * used[:, None]])
        self._sums = np.vstack([np.zeros(terms.shape[1]), np.cumsum(terms, axis=0)])
        freedom = max(self.place.size - basis.shape[1], 1) / self.place.size
        self._common = max(1.0, _NORMAL_MEDIAN * float(np.median(np.abs(residual))) / np.sqrt(freedom))

    def peaks(self, width: int) -> tuple[FloatArray, FloatArray]:
        """Return pull and amount of `width` adjacent points, by the first of them."""
        return self._amounts(self._sums[width:] - self._sums[:-width])

    def steps(self) -> tuple[FloatArray, FloatArray]:
        """Return pull and amount of a step, by the point before it."""
        return self._amounts(self._sums[-1] - self._sums[1:-1])

    def _amounts(self, sums: FloatArray) -> tuple[FloatArray, FloatArray]:
        alone = sums[:, 0] - (sums[:, 2:] ** 2).sum(axis=1)  # what of a template the functions in use cannot follow
        own = alone > 1e-3 * sums[:, 0]
        alone = np.where(own, alone, 1.0)
        return np.where(own, sums[:, 1] / np.sqrt(alone), 0.0) / self._common, sums[:, 1] / alone


def _strongest(explained: _Explained, points: _Points, kept: NDArray[np.bool_]) -> _Found | None:
    """Return the template whose amount stands out most from 0, None where none is significant."""
    pulls = _Pulls(explained, points, kept)
    place, T = pulls.place, pulls.temperature
    tried = []
    for width in _widths(place.size):
        pull, amount = pulls.peaks(width)
        if width >= _PEAK:
            pull[(np.log(T[width - 1 :] / T[: T.size - width + 1]) > _WIDEST) | (np.abs(amount) < _LEAST_SIZE)] = 0.0
        k = int(np.argmax(np.abs(pull)))
        kind = "peak" if width >= _PEAK and amount[k] > 0 else "glitch"
        tried.append(
            _Found(kind, int(place[k]), int(place[k + width - 1]), width, float(amount[k]), abs(float(pull[k])))
        )
    pull, amount = pulls.steps()
    pull[~_may_step(T) | (np.abs(amount) < _LEAST_SIZE)] = 0.0
    k = int(np.argmax(np.abs(pull)))
    tried.append(_Found("step", int(place[k]), int(place[k + 1]), 2, float(amount[k]), abs(float(pull[k]))))
    best = max(tried, key=lambda each: each.significance)
    return best if best.significance > SIGNIFICANT else None


def _believed(found: list[_Found], explained: _Explained, points: _Points, kept: NDArray[np.bool_]) -> list[_Found]:
    """Weigh what was found against the same template elsewhere: waves in the residuals make many of them stand out."""
    pulls, believed = _Pulls(explained, points, kept), []
    for each in found:
        elsewhere = pulls.steps()[0] if each.kind == "step" else pulls.peaks(each.width)[0]
        common = max(1.0, _NORMAL_MEDIAN * float(np.median(np.abs(elsewhere))))
        weighed = replace(each, significance=each.significance / common)
        if weighed.significance > SIGNIFICANT:
            believed.append(weighed)
    return believed


def _widths(points: int) -> list[int]:
    """Numbers of points of the templates: 1 and 2 for glitches, then each about 1.4 times the one before."""
    widths, width = [1, 2], float(_PEAK)
    while width <= points // 4:
        widths.append(int(width))
        width = max(width * 1.4, width + 1)
    return widths


def _may_step(temperature: FloatArray) -> NDArray[np.bool_]:
    """Say for each gap between points whether a step in it would be seen: not at the ends, not in a wide gap."""
    gaps = np.diff(np.log(temperature))
    place = np.arange(gaps.size)
    around = np.clip(place - _BESIDE, 0, max(gaps.size - 2 * _BESIDE - 1, 0))[:, None] + np.arange(
        min(2 * _BESIDE + 1, gaps.size)
    )
    narrow = gaps <= _GAP * np.median(gaps[around], axis=1)
    return np.asarray(narrow & (place + 1 >= _BESIDE) & (temperature.size - place - 1 >= _BESIDE))


def _joined(found: list[_Found], excess: FloatArray, temperature: FloatArray) -> list[Feature]:
    """Make features of templates: neighbouring pieces of a peak are one, a step beside a peak belongs to it."""

    def beside(before: int, after: int) -> bool:
        return after - before <= _NEAR or bool(temperature[after] <= _NEAR_IN_T * temperature[before])

    groups: list[list[_Found]] = []
    for each in sorted((each for each in found if each.kind != "step" and each.size > 0), key=lambda each: each.first):
        adjacent = bool(groups) and each.first - _end(groups[-1]) <= 1
        both = bool(groups) and each.kind == groups[-1][-1].kind == "peak"
        if adjacent or (both and beside(_end(groups[-1]), each.first)):
            groups[-1].append(each)
        else:
            groups.append([each])
    peaks = [group for group in groups if _end(group) - group[0].first + 1 >= _PEAK]
    features = [_peak(group, excess, temperature) for group in peaks]
    taken = [(group[0].first, _end(group)) for group in peaks]
    for each in (each for each in found if each.kind == "step"):
        if any(beside(last, each.first) and beside(each.last, first) for first, last in taken):
            continue
        taken.append((each.first, each.last))
        low, high = float(temperature[each.first]), float(temperature[each.last])
        features.append(Feature("step", low, high, (low * high) ** 0.5, each.size, each.significance))
    return features


def _end(group: list[_Found]) -> int:
    return max(each.last for each in group)


def _peak(pieces: list[_Found], excess: FloatArray, temperature: FloatArray) -> Feature:
    first, last = pieces[0].first, _end(pieces)
    own, T = excess[first : last + 1], temperature[first : last + 1]
    smooth = np.convolve(own, np.full(_PEAK, 1 / _PEAK), mode="valid")
    top = int(np.argmax(smooth))
    return Feature(
        "peak",
        float(T[0]),
        float(T[-1]),
        float(T[top + int(np.argmax(own[top : top + _PEAK]))]),
        float(smooth[top]),
        max(each.significance for each in pieces),
    )


# --------------------------------------------------------------------------------------------------------- upturn


def _upturn(points: _Points) -> Feature | None:
    """Return the rise of C/T on cooling over the lowest points, None where there is none."""
    best: Feature | None = None
    for number in _LOWEST:
        T, C = points.temperature[:number], points.heat_capacity[:number]
        if T.size < number or T[-1] > _COLD:
            break
        ratio = C / T
        u = points.scatter[:number] * ratio
        weight = u**-2.0
        middle = float((weight * T).sum() / weight.sum())
        lever = float((weight * (T - middle) ** 2).sum())
        slope = float((weight * (T - middle) * ratio).sum()) / lever
        significance = -slope * lever**0.5
        if significance > max(_FALLS, best.significance if best else 0.0):
            size = -slope * float(T[-1] - T[0]) / float((weight * ratio).sum() / weight.sum())
            best = Feature("upturn", float(T[0]), float(T[-1]), float(T[0]), size, significance)
    return best

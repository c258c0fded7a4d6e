"""Templates of peaks and steps beside the functions of a lattice: what stands out in the heat capacity of a run."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Final

import numpy as np
from numpy.typing import NDArray

from ..constants import NORMAL_MEDIAN
from ..records import Feature, FloatArray
from .lattice_trend import lattice_functions, lattice_trend, non_negative

__all__ = ["FEWEST", "NEAR", "SIGNIFICANT", "Points", "peaks_and_steps"]

SIGNIFICANT: Final = 4.7
"""Standard uncertainties from which a peak or a step is suspected."""

FEWEST: Final = 20
"""Points or sets below which a smooth curve can follow a feature."""

NEAR: Final = 3
"""Points between two pieces that belong together."""

_LEAST_SIZE: Final = 0.015  # of the heat capacity: what smoothing, joins and calibration do to real tables
_PEAK: Final = 3  # adjacent points that make a peak; fewer are glitches
_WIDEST: Final = 0.35  # of ln T that a template of a peak spans; a wider peak is found piece by piece
_BESIDE: Final = 5  # points on each side of a step
_GAP: Final = 4.0  # a gap this many times wider than those around it hides whether there is a step
_ROUNDS: Final = 12
_AROUND: Final = 6  # points on each side in which a feature must be seen
_PLAIN: Final = 0.1  # excess of a peak that no smooth error makes, so that it need not be seen there
_LOCAL: Final = 2.5  # standard uncertainties of what is seen there
_RAISED: Final = 2.0  # scatters by which a point beside a peak belongs to it
_NEAR_IN_T: Final = 1.2  # factor in T between two pieces that belong together


@dataclass(frozen=True)
class Points:
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


def peaks_and_steps(points: Points, tail: bool) -> list[Feature]:
    """Return the peaks and steps of a run; with a `tail`, T^-2 belongs to the smooth curve.

    Nothing is found below 20 points, where a smooth curve can follow a feature.
    """
    return _joined(*_templates(points, tail), points) if points.temperature.size >= FEWEST else []


@dataclass(frozen=True)
class _Explained:
    """A fit of lattice functions and of the steps found: residual over scatter, the functions in use, the curve.

    Everything is relative to a first smooth curve and never to the measured values: a template that held their noise
    would explain it. `smooth` is the curve without the steps.
    """

    residual: FloatArray
    basis: FloatArray
    level: FloatArray
    smooth: FloatArray


def _templates(points: Points, tail: bool) -> tuple[list[_Found], FloatArray, FloatArray]:
    """Return what stands out, strongest first, and how far each point lies above the curve, steps in it and not.

    With a `tail`, T^-2 belongs to the smooth curve: what levels far below the data add.
    """
    T = points.temperature
    first = lattice_trend(T, points.heat_capacity).at(T)
    functions = np.column_stack([lattice_functions(T)[1], (T[0] / T) ** 2] if tail else [lattice_functions(T)[1]])
    values, functions = points.heat_capacity / first, functions / first[:, None]
    kept = np.ones(values.size, dtype=bool)
    found: list[_Found] = []
    explained = _explained(functions, [], values, points.scatter, kept)
    for _ in range(_ROUNDS):
        best = _strongest(explained, points, kept)
        if best is None or kept.sum() < FEWEST:
            break
        found.append(best)
        if best.kind != "step":
            kept[best.first : best.last + 1] = False
        steps = [each.first for each in found if each.kind == "step"]
        explained = _explained(functions, steps, values, points.scatter, kept)
    believed = _believed(found, explained, points, kept)
    return believed, values / explained.level - 1, values / explained.smooth - 1


def _explained(
    lattice: FloatArray, steps: list[int], values: FloatArray, scatter: FloatArray, kept: NDArray[np.bool_]
) -> _Explained:
    above = [sign * (np.arange(kept.size) > step) for step in steps for sign in (1.0, -1.0)]
    functions = np.column_stack([lattice, *above])
    weight = kept / scatter
    design, wanted = functions * weight[:, None], values * weight
    amount = non_negative(design, wanted)
    basis = np.linalg.qr(design[:, amount > 0])[0]
    level, smooth = functions @ amount, lattice @ amount[: lattice.shape[1]]
    return _Explained(wanted - basis @ (basis.T @ wanted), basis, np.maximum(level, 1e-3), np.maximum(smooth, 1e-3))


class _Pulls:
    """How much of each template the residuals hold, in standard uncertainties and relative to C."""

    def __init__(self, explained: _Explained, points: Points, kept: NDArray[np.bool_]) -> None:
        self.place = np.flatnonzero(kept)
        self.temperature = points.temperature[kept]
        residual, basis = explained.residual[kept], explained.basis[kept]
        used = 1 / points.scatter[kept]
        terms = np.column_stack([used**2, residual * used, basis * used[:, None]])
        self._sums = np.vstack([np.zeros(terms.shape[1]), np.cumsum(terms, axis=0)])
        freedom = max(self.place.size - basis.shape[1], 1) / self.place.size
        self._common = max(1.0, NORMAL_MEDIAN * float(np.median(np.abs(residual))) / np.sqrt(freedom))

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


def _strongest(explained: _Explained, points: Points, kept: NDArray[np.bool_]) -> _Found | None:
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


def _believed(found: list[_Found], explained: _Explained, points: Points, kept: NDArray[np.bool_]) -> list[_Found]:
    """Weigh what was found against the same template elsewhere: waves in the residuals make many of them stand out."""
    pulls, believed = _Pulls(explained, points, kept), []
    for each in found:
        elsewhere = pulls.steps()[0] if each.kind == "step" else pulls.peaks(each.width)[0]
        common = max(1.0, NORMAL_MEDIAN * float(np.median(np.abs(elsewhere))))
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


def _joined(found: list[_Found], excess: FloatArray, with_steps: FloatArray, points: Points) -> list[Feature]:
    """Make features of templates: neighbouring pieces of a peak are one, a step beside a peak belongs to it.

    What is not seen in the points around, too, is no feature: a smooth curve that is not that of a lattice.
    """
    temperature = points.temperature

    def beside(before: int, after: int) -> bool:
        return after - before <= NEAR or bool(temperature[after] <= _NEAR_IN_T * temperature[before])

    groups: list[list[_Found]] = []
    for each in sorted((each for each in found if each.kind != "step" and each.size > 0), key=lambda each: each.first):
        adjacent = bool(groups) and each.first - _end(groups[-1]) <= 1
        both = bool(groups) and each.kind == groups[-1][-1].kind == "peak"
        if adjacent or (both and beside(_end(groups[-1]), each.first)):
            groups[-1].append(each)
        else:
            groups.append([each])
    groups = [_with_flanks(group, excess, points.scatter) for group in groups]
    peaks = [group for group in groups if _rises(group[0].first, _end(group), excess)]
    features = [peak for group in peaks if (peak := _peak(group, excess, temperature)).size >= _LEAST_SIZE]
    taken = [(group[0].first, _end(group)) for group in peaks]
    for each in (each for each in found if each.kind == "step"):
        inside = any(beside(last, each.first) and beside(each.last, first) for first, last in taken)
        if inside or not _jumps(each, with_steps, points):
            continue
        taken.append((each.first, each.last))
        low, high = float(temperature[each.first]), float(temperature[each.last])
        features.append(Feature("step", low, high, (low * high) ** 0.5, each.size, each.significance))
    return features


def _with_flanks(group: list[_Found], excess: FloatArray, scatter: FloatArray) -> list[_Found]:
    """Take the points beside a group into it that are raised too: two high points with flanks are a narrow peak."""
    first, last = group[0].first, _end(group)
    while first > 0 and excess[first - 1] > _RAISED * scatter[first - 1]:
        first -= 1
    while last < excess.size - 1 and excess[last + 1] > _RAISED * scatter[last + 1]:
        last += 1
    if last - first + 1 < _PEAK or _end(group) - group[0].first + 1 >= _PEAK:
        return group
    return (
        [replace(group[0], first=first), *group[1:-1], replace(group[-1], last=last)]
        if len(group) > 1
        else [replace(group[0], first=first, last=last)]
    )


def _rises(first: int, last: int, excess: FloatArray) -> bool:
    """Whether points lie above those beside them, and not only above the curve."""
    around = np.concatenate([excess[max(first - _AROUND, 0) : first], excess[last + 1 : last + 1 + _AROUND]])
    own = float(excess[first : last + 1].mean())
    seen = own > _PLAIN or around.size == 0 or own - float(around.mean()) > own / 2
    return last - first + 1 >= _PEAK and seen


def _jumps(step: _Found, with_steps: FloatArray, points: Points) -> bool:
    """Whether straight lines through the points on both sides of a step miss each other by as much."""
    log_t, ends = np.log(points.temperature), []
    at = (log_t[step.first] + log_t[step.last]) / 2
    for side in (slice(max(step.last - _AROUND, 0), step.last), slice(step.last, step.last + _AROUND)):
        ends.append(float(np.polyfit(log_t[side] - at, with_steps[side], 1)[1]))
    jump = (ends[1] - ends[0]) * np.sign(step.size)
    u = float(points.scatter[step.first]) * (8 / _AROUND) ** 0.5
    return bool(jump > max(abs(step.size) / 2, _LOCAL * u))


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

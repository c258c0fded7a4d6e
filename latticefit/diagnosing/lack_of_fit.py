"""Where points stand in sets of repeats: what their spread says of sigma, and what is left speaks against the model."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray
from scipy.stats import f as f_distribution

from ..preparing.scatter import repeat_sets, spread_of_sets
from ..records import FitRecord, FloatArray, LackOfFit, PreparedData

__all__ = [
    "FIRST_OFF",
    "FirstOfSets",
    "first_of_averaged_sets",
    "first_of_sets",
    "lack_of_fit",
    "unsettled_first_points",
]

_FEWEST_FREEDOM: Final = 3
FIRST_OFF = 4.0
"""Standard errors from which the first points of sets are off by no chance."""

_FEWEST_SETS: Final = 5


@dataclass(frozen=True)
class FirstOfSets:
    """How much the first point of a set, in file order, lies above the others: mean over the sets, and its u."""

    mean: float
    u: float


def first_of_sets(prepared: PreparedData) -> FirstOfSets | None:
    """Compare the first point of each set of repeats with the mean of the others; None below five sets."""
    sets, _ = _numbered(prepared)
    C, differences = np.asarray(prepared.heat_capacity), []
    for number in np.flatnonzero(np.bincount(sets) > 1):
        members = np.flatnonzero(sets == number)
        first = members[np.argmin(prepared.index[members])]
        others = C[members[members != first]]
        differences.append(float(C[first] / others.mean() - 1))
    return _summed(differences)


def first_of_averaged_sets(prepared: PreparedData) -> FirstOfSets | None:
    """Do the same for the sets that were averaged; None below five of them."""
    sets: dict[int, list[float]] = {}
    for row in prepared.measurement.excluded:
        if row.averaged_into is not None:
            sets.setdefault(row.averaged_into, []).append(row.heat_capacity)
    return _summed([values[0] / float(np.mean(values[1:])) - 1 for values in sets.values() if len(values) > 1])


def unsettled_first_points(prepared: PreparedData) -> float | None:
    """By how much the first point of each set lies above the others, relative; None where that may be chance."""
    for first in (first_of_sets(prepared), first_of_averaged_sets(prepared)):
        if first is not None and abs(first.mean) > FIRST_OFF * first.u:
            return first.mean
    return None


def _summed(differences: list[float]) -> FirstOfSets | None:
    if len(differences) < _FEWEST_SETS:
        return None
    return FirstOfSets(float(np.mean(differences)), float(np.std(differences, ddof=1) / len(differences) ** 0.5))


def lack_of_fit(prepared: PreparedData, fit: FitRecord, residual: FloatArray) -> LackOfFit | None:
    """Divide chi-square into the part within sets of repeats and the part between them.

    Parameters
    ----------
    prepared : PreparedData
    fit : FitRecord
    residual : ndarray, shape (n,)
        Measured - model at the fitted points, J/(mol K).

    Returns
    -------
    LackOfFit or None
        None where the repeats give fewer than three degrees of freedom, or none is left for the model.

    Notes
    -----
    The sum of squares of the residuals about the mean of their set, divided by sigma squared, does not depend on the
    model; the model's slope takes out that the temperatures of a set differ a little. What is left of chi-square is
    lack of fit; the two, per degree of freedom, are compared by the F distribution. N. R. Draper and H. Smith, Applied
    Regression Analysis, 3rd ed., Wiley, New York (1998) (from memory, sure).
    """
    sets, asked = _numbered(prepared)
    count = np.bincount(sets)
    freedom = int(sets.size - count.size)
    rest = fit.degrees_of_freedom - freedom
    if freedom < _FEWEST_FREEDOM or rest < 1:
        return None
    weight = prepared.sigma**-2.0
    mean = np.bincount(sets, weights=weight * residual) / np.bincount(sets, weights=weight)
    within = residual - mean[sets]
    squares = float(weight @ within**2)
    left = max(fit.chi_square - squares, 0.0)
    if squares <= 0:
        return None
    ratio = (left / rest) / (squares / freedom)
    spread = spread_of_sets(prepared.temperature, prepared.heat_capacity, prepared.run, asked)
    return LackOfFit(
        pure_error=squares,
        pure_error_degrees_of_freedom=freedom,
        pure_error_percent=100 * float(np.sqrt(np.sum((within / prepared.heat_capacity) ** 2) / freedom)),
        lack_of_fit=left,
        degrees_of_freedom=rest,
        f=ratio,
        p=float(f_distribution.sf(ratio, rest, freedom)),
        shared_error=None if spread is None else spread.shared,
    )


def _numbered(prepared: PreparedData) -> tuple[NDArray[np.intp], bool]:
    """Number the sets of all runs, a point outside the sets as one of its own; and say whether anybody asked for them.

    Somebody did who chose what is done with repeats, or took sigma from them.
    """
    settings = [reading.settings for reading in prepared.measurement.readings]
    asked = any(each.replicates is not None or each.sigma == "replicates" for each in settings)
    numbers, taken = np.zeros(prepared.run.size, dtype=np.intp), 0
    for run in np.unique(prepared.run):
        own = prepared.run == run
        T = prepared.temperature[own]
        found = repeat_sets(T, asked) if T.size > 1 else None
        numbers[own] = taken + (np.arange(T.size) if found is None else found)
        taken = int(numbers[own].max()) + 1
    return numbers, asked

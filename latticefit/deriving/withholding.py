"""When an uncertainty is withheld, why, and what is allowed for the part below the data."""

from __future__ import annotations

import numpy as np

from ..diagnosing.reach import REACH_STOP, REACH_WARN, low_temperature_reach
from ..models import Model, cp_cv_coefficient, energy, entropy, harmonic_heat_capacity
from ..records import FitRecord, FloatArray
from .support import lost_in_spectrum, stuck

__all__ = ["HEAVY_BELOW", "HEAVY_REASON", "MISFIT_REASON", "allowance_below", "row_reasons", "value_reasons"]

_BELOW_ALLOWANCE = ((REACH_STOP, 0.10), (REACH_WARN, 0.02))
"""Relative allowance for what the model may get wrong of H and S below the lowest point, by theta/Tmin: a T^3 law from
there is 10 % off in S(Tmin) at theta/20 and 1 % at theta/50 for plain sine dispersion (computed)."""

_ABOVE = 1.25  # beyond this times the highest fitted point u is withheld: nothing tests Cp - Cv there

HEAVY_BELOW = 0.1  # share of S below the data above which u of S and H is withheld, unless the data reach low

BELOW_REASON = "below the lowest fitted point: the covariance of one model is no measure of what it does not see"
ABOVE_REASON = "more than a quarter above the highest fitted point: the covariance of one model is no measure there"

MISFIT_REASON = "the model does not describe the data: the covariance is no measure of how wrong it is"
HEAVY_REASON = "more than a tenth of S lies below the lowest fitted point: no u of S and H"


def allowance_below(fit: FitRecord, model: Model, values: FloatArray, T: FloatArray, lowest: float) -> FloatArray:
    """What the part below the lowest point adds to u of the four functions, shape (4, m); 0 where the data reach low.

    A model without a T^3 law (Einstein terms alone) has no reach to judge by and gets the larger allowance.
    """
    reach = low_temperature_reach(model, fit, lowest)
    ratio = 0.0 if reach is None else reach.ratio
    share = next((each for limit, each in _BELOW_ALLOWANCE if ratio < limit), 0.0)
    H, S = (float(each(model, np.array([lowest]), values)[0]) for each in (energy, entropy))
    return share * np.stack([np.zeros_like(T), np.full_like(T, H), np.full_like(T, S), np.abs(S - H / T)])


def row_reasons(
    model: Model, fit: FitRecord, T: FloatArray, lowest: float, highest: float, describes: bool
) -> list[str | None]:
    """Why u of a whole row is withheld; None where it is given."""
    held = stuck(model, fit)
    everywhere = None
    if not describes:
        everywhere = MISFIT_REASON
    elif held:
        everywhere = f"{held[0]} is at a bound: the covariance does not know what it would do without"
    return [BELOW_REASON if t < lowest else ABOVE_REASON if t > _ABOVE * highest else everywhere for t in T.tolist()]


def value_reasons(model: Model, fit: FitRecord, T: FloatArray, highest: float) -> list[str | None]:
    """Why not even a value is given at a temperature (K); None where it is.

    Above the data nothing is given that rests on an undetermined parameter, and nowhere where Cp - Cv has no solution.
    """
    values = np.asarray(fit.values)
    lost = lost_in_spectrum(model, fit)
    solvable = np.ones(T.size, dtype=bool)
    if model.cp_cv.solvable is not None:
        lattice = harmonic_heat_capacity(model, T, values)
        solvable = model.cp_cv.solvable(T, lattice, cp_cv_coefficient(model, values))
    reasons: list[str | None] = []
    for t, possible in zip(T.tolist(), solvable.tolist(), strict=True):
        if not possible:
            reasons.append("Cp - Cv has no solution at this temperature")
        else:
            reasons.append(f"{lost[0]} is not determined" if lost and t > highest else None)
    return reasons

"""How far the data reach: low enough for the T^3 law, high enough for the moments of the spectrum."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np

from ..models import Model, calorimetric_theta, low_temperature_theta, theta_debye_moment
from ..records import FitRecord

__all__ = [
    "REACH_STOP",
    "REACH_WARN",
    "TOP_STOP",
    "Reach",
    "high_temperature_ratio",
    "low_temperature_reach",
    "theta_debye_two",
]

REACH_STOP = 30.0
"""theta_D(T->0) is withheld when theta/Tmin is below this: a good fit can then be 2 to 13 % wrong."""

REACH_WARN = 50.0
"""theta_D(T->0) carries a warning when theta/Tmin is below this."""

TOP_STOP = 4.0
"""Moments are withheld when theta_D[m=2]/Tmax is above this: the modes that carry them are not excited."""

_IN_LAW = 0.05  # the model's own theta_D(Tmin) must be this close to its theta_D(T->0)


@dataclass(frozen=True)
class Reach:
    """How low the data reach: theta over Tmin, what follows, and the words for it.

    `theta` (K) is the lower one of theta_D(T->0) as fitted and of the model's theta_D at the lowest point: a model
    whose T^3 part hides under other terms must not pass for one that was measured in its T^3 range.
    """

    theta: float
    ratio: float
    status: Literal["reached", "doubtful", "withheld"]
    reason: str


def low_temperature_reach(model: Model, fit: FitRecord, lowest: float) -> Reach | None:
    """Judge how low the data reach; None for a model without a T^3 law.

    Parameters
    ----------
    model : Model
    fit : FitRecord
    lowest : float
        Lowest fitted temperature, K.
    """
    values = np.asarray(fit.values)
    limit = low_temperature_theta(model, values, fit.atoms)
    if limit is None:
        return None
    there = float(calorimetric_theta(model, values, fit.atoms, np.array([lowest]))[0])
    theta = limit if np.isnan(there) else min(limit, there)
    ratio = theta / lowest
    if ratio < REACH_STOP or np.isnan(there):
        return Reach(theta, ratio, "withheld", f"the lowest fitted point, {lowest:.3g} K, is theta/{ratio:.2g}")
    if abs(there / limit - 1) > _IN_LAW:
        words = (
            f"at the lowest fitted point, {lowest:.3g} K, the model is not in its T^3 range "
            f"(theta_D is {there:.4g} K there and {limit:.4g} K as T -> 0)"
        )
        return Reach(theta, ratio, "withheld", words)
    status: Literal["reached", "doubtful"] = "doubtful" if ratio < REACH_WARN else "reached"
    return Reach(theta, ratio, status, f"the lowest fitted point, {lowest:.3g} K, is theta/{ratio:.0f}")


def theta_debye_two(model: Model, fit: FitRecord) -> float:
    """theta_D[m=2] of a fit, K: the measure for high temperatures."""
    found = theta_debye_moment(2, model, np.asarray(fit.values), fit.atoms)
    return float("nan") if found is None else found


def high_temperature_ratio(model: Model, fit: FitRecord, highest: float) -> float | None:
    """theta_D[m=2] over the highest fitted temperature (K)."""
    return theta_debye_two(model, fit) / highest

"""Moments of a model's spectrum, and its calorimetric Debye temperature at one temperature."""

from __future__ import annotations

from math import exp

import numpy as np

from ..constants import GAS_CONSTANT
from ..functions import invert_debye
from ..records import FloatArray
from .model import Model, harmonic_heat_capacity, total_modes

__all__ = ["calorimetric_theta", "mean_theta", "theta_debye_moment"]


def mean_theta(model: Model, values: FloatArray, m: int) -> float:
    """Mean of theta^m over all modes, K^m; for m = 0 the mean of ln(theta/K)."""
    total = total_modes(model, values)
    mean = 0.0
    for each in model.placed:
        if each.term.theta_mean is not None:
            own = values[each.slice]
            share = sum(values[i] for i in model.modes if each.slice.start <= i < each.slice.stop) / total
            if share != 0:
                mean += share * each.term.theta_mean(m, *own)
    return mean


def theta_debye_moment(m: int, model: Model, values: FloatArray, atoms: float | None = None) -> float | None:
    """theta_D[m] = ((m+3)/3 <theta^m>)^(1/m), K; for m = 0, exp(1/3 + <ln theta>).

    The Debye temperature that has the m-th moment of the model's spectrum (Domb and Salter 1952; Barron, Berg and
    Morrison 1957).
    """
    mean = mean_theta(model, values, m)
    if m == 0:
        return exp(1 / 3 + mean)
    power = (m + 3) / 3 * mean
    return float(power ** (1 / m)) if power > 0 else None


def calorimetric_theta(model: Model, values: FloatArray, atoms: float | None, T: FloatArray) -> FloatArray:
    """Debye temperature that has the model's harmonic heat capacity at each T, K; NaN where it is not defined.

    Per atom with the declared atoms, or modes/3 where none are known; shape of T (K).
    """
    modes = 3 * atoms if atoms is not None else total_modes(model, values)
    return np.asarray(invert_debye(harmonic_heat_capacity(model, T, values) / (modes * GAS_CONSTANT)) * T)

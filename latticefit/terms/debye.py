"""Debye term: acoustic-like modes with a density proportional to the square of the frequency up to a cut-off."""

from __future__ import annotations

from math import log, pi

import numpy as np

from ..functions import debye_energy, debye_entropy, debye_heat_capacity, einstein_heat_capacity
from ..records import FloatArray
from .oscillators import Oscillators

__all__ = ["TERM"]


def slope(x: FloatArray, c: FloatArray) -> FloatArray:
    """x dc/dx = 3 (c_Einstein - c), good to 1e-15 of the plateau, at half the price of a table of its own."""
    return np.asarray(3 * (einstein_heat_capacity(x) - c))


def theta_mean(m: int, theta: float) -> float:
    """Mean of theta^m over the Debye density, 3/(m+3) theta^m for m > -3; for m = 0, ln(theta) - 1/3."""
    return log(theta) - 1 / 3 if m == 0 else 3 / (m + 3) * theta**m


TERM = Oscillators(
    heat_capacity=debye_heat_capacity,
    energy=debye_energy,
    entropy=debye_entropy,
    slope=slope,
    theta_mean=theta_mean,
    cubic=0.8 * pi**4,
    half=4.0,
).term(
    name="debye",
    meaning="Debye temperature of this term (its cut-off)",
    example=300.0,
    low_limit="(4 pi^4/5) modes R (T/theta)^3",
    source="P. Debye, Ann. Phys. 39, 789 (1912)",
)

"""Einstein term: modes that all have one frequency."""

from __future__ import annotations

from math import log

import numpy as np

from ..functions import einstein_energy, einstein_entropy, einstein_heat_capacity
from ..records import FloatArray
from .oscillators import Oscillators

__all__ = ["TERM"]


def slope(x: FloatArray, c: FloatArray) -> FloatArray:
    """x dc/dx = c (2 - x coth(x/2)), good to 1e-15 of the plateau."""
    return np.asarray(c * (2 - x / np.tanh(x / 2)))


def theta_mean(m: int, theta: float) -> float:
    """theta^m; for m = 0, ln(theta)."""
    return log(theta) if m == 0 else theta**m


TERM = Oscillators(
    heat_capacity=einstein_heat_capacity,
    energy=einstein_energy,
    entropy=einstein_entropy,
    slope=slope,
    theta_mean=theta_mean,
    cubic=0.0,
    half=3.0,
).term(
    name="einstein",
    meaning="Einstein temperature of this term",
    example=200.0,
    low_limit="modes R (theta/T)^2 exp(-theta/T)",
    source="A. Einstein, Ann. Phys. 22, 180 (1907)",
)

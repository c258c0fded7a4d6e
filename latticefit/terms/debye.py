"""Debye term: acoustic-like modes with a density proportional to the square of the frequency up to a cut-off."""

from __future__ import annotations

from math import inf, log, pi

import numpy as np

from ..constants import GAS_CONSTANT
from ..functions import debye_energy, debye_entropy, debye_heat_capacity, einstein_heat_capacity
from ..records import FloatArray
from .term import ParameterSpec, Term

__all__ = ["TERM"]


def heat_capacity(T: FloatArray, theta: float, modes: float) -> FloatArray:
    """Heat capacity, J/(mol K), of `modes` modes per formula unit (Debye 1912); T and `theta` in K."""
    return np.asarray(modes * GAS_CONSTANT * debye_heat_capacity(theta / T))


def partials(T: FloatArray, theta: float, modes: float) -> FloatArray:
    """Derivatives of the heat capacity with respect to theta, J/(mol K^2), and modes, J/(mol K); shape (2, ...)."""
    x = theta / T
    c = np.asarray(debye_heat_capacity(x))
    # x dc/dx = 3 (c_Einstein - c), good to 1e-15 of the plateau, at half the price of a table of its own
    return np.stack([3 * GAS_CONSTANT * modes / theta * (einstein_heat_capacity(x) - c), GAS_CONSTANT * c])


def energy(T: FloatArray, theta: float, modes: float) -> FloatArray:
    """U(T) - U(0), J/mol."""
    return np.asarray(modes * GAS_CONSTANT * T * debye_energy(theta / T))


def entropy(T: FloatArray, theta: float, modes: float) -> FloatArray:
    """Entropy, J/(mol K)."""
    return np.asarray(modes * GAS_CONSTANT * debye_entropy(theta / T))


def zero_point_energy(theta: float, modes: float) -> float:
    """(3/8) R theta per mode: 9/8 R theta for the three modes of an atom; J/mol."""
    return 0.375 * GAS_CONSTANT * theta * modes


def cubic_coefficient(theta: float, modes: float) -> float:
    """(4 pi^4/5) R modes/theta^3, J/(mol K^4): the T^3 law."""
    return 0.8 * pi**4 * GAS_CONSTANT * modes / theta**3


def theta_mean(m: int, theta: float, modes: float) -> float:
    """Mean of theta^m over the Debye density, 3/(m+3) theta^m for m > -3; for m = 0, ln(theta) - 1/3."""
    return log(theta) - 1 / 3 if m == 0 else 3 / (m + 3) * theta**m


TERM = Term(
    name="debye",
    parameters=(
        ParameterSpec("theta", "K", 1.0, 2.0e4, "scale", "Debye temperature of this term (its cut-off)"),
        ParameterSpec("modes", "1", 0.0, inf, "amplitude", "vibrational modes per formula unit, 3 per atom"),
    ),
    lattice=True,
    heat_capacity=heat_capacity,
    partials=partials,
    energy=energy,
    entropy=entropy,
    zero_point_energy=zero_point_energy,
    cubic_coefficient=cubic_coefficient,
    theta_mean=theta_mean,
    low_limit="(4 pi^4/5) modes R (T/theta)^3",
    high_limit="modes R",
    source="P. Debye, Ann. Phys. 39, 789 (1912)",
)

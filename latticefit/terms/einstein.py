"""Einstein term: modes that all have one frequency."""

from __future__ import annotations

from math import inf, log

import numpy as np

from ..constants import GAS_CONSTANT
from ..functions import einstein_energy, einstein_entropy, einstein_heat_capacity
from ..records import FloatArray
from .term import ParameterSpec, Term

__all__ = ["TERM"]


def heat_capacity(T: FloatArray, theta: float, modes: float) -> FloatArray:
    """Heat capacity, J/(mol K), of `modes` modes per formula unit (Einstein 1907); T and `theta` in K."""
    return np.asarray(modes * GAS_CONSTANT * einstein_heat_capacity(theta / T))


def partials(T: FloatArray, theta: float, modes: float) -> FloatArray:
    """Derivatives of the heat capacity with respect to theta, J/(mol K^2), and modes, J/(mol K); shape (2, ...)."""
    x = theta / T
    c = np.asarray(einstein_heat_capacity(x))
    # x dc/dx = c (2 - x coth(x/2)), good to 1e-15 of the plateau
    return np.stack([GAS_CONSTANT * modes / theta * c * (2 - x / np.tanh(x / 2)), GAS_CONSTANT * c])


def energy(T: FloatArray, theta: float, modes: float) -> FloatArray:
    """U(T) - U(0), J/mol."""
    return np.asarray(modes * GAS_CONSTANT * T * einstein_energy(theta / T))


def entropy(T: FloatArray, theta: float, modes: float) -> FloatArray:
    """Entropy, J/(mol K)."""
    return np.asarray(modes * GAS_CONSTANT * einstein_entropy(theta / T))


def zero_point_energy(theta: float, modes: float) -> float:
    """Half a quantum, R theta/2, per mode; J/mol."""
    return 0.5 * GAS_CONSTANT * theta * modes


def cubic_coefficient(theta: float, modes: float) -> float:
    """Zero: an Einstein term vanishes exponentially as T -> 0."""
    return 0.0


def theta_mean(m: int, theta: float, modes: float) -> float:
    """theta^m; for m = 0, ln(theta)."""
    return log(theta) if m == 0 else theta**m


TERM = Term(
    name="einstein",
    parameters=(
        ParameterSpec("theta", "K", 1.0, 2.0e4, "scale", "Einstein temperature of this term"),
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
    low_limit="modes R (theta/T)^2 exp(-theta/T)",
    high_limit="modes R",
    source="A. Einstein, Ann. Phys. 22, 180 (1907)",
)

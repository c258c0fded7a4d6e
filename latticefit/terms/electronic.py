"""Electronic term of a normal metal: linear in T."""

from __future__ import annotations

from math import inf

import numpy as np

from ..records import FloatArray
from .term import ParameterSpec, Term

__all__ = ["TERM"]


def heat_capacity(T: FloatArray, gamma: float) -> FloatArray:
    """Heat capacity gamma T, J/(mol K) (Sommerfeld 1928); `gamma` in J/(mol K^2)."""
    return np.asarray(gamma * T)


def partials(T: FloatArray, gamma: float) -> FloatArray:
    """Derivative with respect to gamma, K; shape (1, ...)."""
    return np.stack([np.asarray(T, dtype=float)])


def energy(T: FloatArray, gamma: float) -> FloatArray:
    """U(T) - U(0), J/mol."""
    return np.asarray(0.5 * gamma * T * T)


def entropy(T: FloatArray, gamma: float) -> FloatArray:
    """Entropy, J/(mol K)."""
    return np.asarray(gamma * T)


def no_zero_point_energy(gamma: float) -> float:
    """Zero: only vibrations carry a zero-point energy here."""
    return 0.0


def no_cubic_coefficient(gamma: float) -> float:
    """Zero: the term is linear in T."""
    return 0.0


def guess(T: FloatArray, measured: FloatArray) -> tuple[float]:
    """C/T at the lowest point, where a lattice beside it counts least."""
    lowest = int(np.argmin(T))
    return (float(measured[lowest] / T[lowest]),)


TERM = Term(
    name="electronic",
    parameters=(
        ParameterSpec("gamma", "J/(mol K^2)", 0.0, inf, "amplitude", "electronic (Sommerfeld) coefficient gamma", 1e-3),
    ),
    lattice=False,
    heat_capacity=heat_capacity,
    partials=partials,
    energy=energy,
    entropy=entropy,
    zero_point_energy=no_zero_point_energy,
    cubic_coefficient=no_cubic_coefficient,
    theta_mean=None,
    low_limit="gamma T",
    high_limit="gamma T (a straight line at every temperature)",
    source="A. Sommerfeld, Z. Phys. 47, 1 (1928)",
    guess=guess,
)

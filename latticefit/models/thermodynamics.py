"""Energy, entropy and zero-point energy of a whole model: closed forms, quadrature only where Cp - Cv has none."""

from __future__ import annotations

import numpy as np

from ..records import FloatArray
from .model import Model, cp_cv_coefficient, harmonic_heat_capacity

__all__ = ["energy", "entropy", "zero_point_energy"]

_EDGES = np.array(
    [0.0, 1 / 64, 1 / 16, 1 / 4, 1.0]
)  # panels as fractions of T: Cp - Cv vanishes at least as T^4 as T -> 0
_NODES = 24


def _fractions() -> tuple[FloatArray, FloatArray]:
    x, w = np.polynomial.legendre.leggauss(_NODES)
    low, high = _EDGES[:-1, None], _EDGES[1:, None]
    return ((low + high) / 2 + (high - low) / 2 * x).ravel(), ((high - low) / 2 * w).ravel()


def _excess_integral(model: Model, T: FloatArray, values: FloatArray, over_temperature: bool) -> FloatArray:
    """Integral of Cp - Cv (divided by T where `over_temperature`) from 0 to each T."""
    s, w = _fractions()
    t = T[..., None] * s
    lattice = harmonic_heat_capacity(model, t, values)
    excess = model.cp_cv.apply(t, lattice, cp_cv_coefficient(model, values)) - lattice
    return np.asarray((excess / s) @ w if over_temperature else T * (excess @ w))


def energy(model: Model, T: FloatArray, values: FloatArray) -> FloatArray:
    """H(T) - H(0) for a model of Cp, U(T) - U(0) for one of Cv, J/mol; shape of T (K)."""
    T = np.asarray(T, dtype=float)
    total = np.zeros_like(T)
    for each in model.placed:
        total = total + each.term.energy(T, *values[each.slice])
    return total if model.cp_cv.parameter is None else total + _excess_integral(model, T, values, False)


def entropy(model: Model, T: FloatArray, values: FloatArray) -> FloatArray:
    """Entropy, J/(mol K); shape of T (K)."""
    T = np.asarray(T, dtype=float)
    total, lattice_energy = np.zeros_like(T), np.zeros_like(T)
    closed = model.cp_cv.excess_entropy
    for each in model.placed:
        total = total + each.term.entropy(T, *values[each.slice])
        if closed is not None and each.term.lattice:
            lattice_energy = lattice_energy + each.term.energy(T, *values[each.slice])
    if closed is not None:
        return total + closed(T, lattice_energy, cp_cv_coefficient(model, values))
    return total if model.cp_cv.parameter is None else total + _excess_integral(model, T, values, True)


def zero_point_energy(model: Model, values: FloatArray) -> float:
    """Zero-point energy of the harmonic lattice, J/mol."""
    return float(sum(each.term.zero_point_energy(*values[each.slice]) for each in model.placed))

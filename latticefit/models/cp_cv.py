"""From the harmonic lattice heat capacity to the measured one: the difference Cp - Cv, or anharmonicity.

Each form maps the harmonic lattice heat capacity C (J/(mol K), per mole of formula unit) at T (K) to the measured
one with at most one coefficient. It acts on the lattice part alone.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from math import inf
from types import MappingProxyType

import numpy as np

from ..errors import InputError, nearest
from ..records import FloatArray
from ..terms import ParameterSpec

__all__ = ["CP_CV_FORMS", "CpCvForm", "cp_cv_form"]


@dataclass(frozen=True)
class CpCvForm:
    """One form of Cp - Cv.

    Attributes
    ----------
    parameter : ParameterSpec or None
        The coefficient; its full name is the form's name with underscores + quantity.
    apply : callable ``(T, C, a) -> ndarray``
        Measured heat capacity from the harmonic one.
    slopes : callable ``(T, C, a) -> (ndarray, ndarray)``
        Derivatives of the measured heat capacity with respect to C and to a.
    invert : callable ``(T, measured, a) -> ndarray``
        Harmonic heat capacity from the measured one.
    start_basis : callable ``(T, measured) -> ndarray``
        The difference to first order in a, per unit of a: what a linear start search uses.
    """

    name: str
    parameter: ParameterSpec | None
    apply: Callable[[FloatArray, FloatArray, float], FloatArray]
    slopes: Callable[[FloatArray, FloatArray, float], tuple[FloatArray, FloatArray]]
    invert: Callable[[FloatArray, FloatArray, float], FloatArray]
    start_basis: Callable[[FloatArray, FloatArray], FloatArray]
    meaning: str
    source: str


def _identity(T: FloatArray, C: FloatArray, a: float) -> FloatArray:
    return C


def _identity_slopes(T: FloatArray, C: FloatArray, a: float) -> tuple[FloatArray, FloatArray]:
    return np.ones_like(C), np.zeros_like(C)


def _no_basis(T: FloatArray, measured: FloatArray) -> FloatArray:
    return np.zeros_like(measured)


_SMALLEST_RADICAND = 1e-6  # keeps a trial step outside the domain finite; a fit that ends there is at a bound


def _root(T: FloatArray, C: FloatArray, a: float) -> FloatArray:
    return np.sqrt(np.maximum(1 - 4 * a * T * C, _SMALLEST_RADICAND))


def nernst_lindemann(T: FloatArray, C: FloatArray, a: float) -> FloatArray:
    """Solve Cp - C = a Cp^2 T for Cp, J/(mol K); `a` in mol/J per mole of formula unit, 4 a T C < 1.

    Written as 2 C/(1 + sqrt(1 - 4 a T C)), which keeps its digits as a -> 0.
    W. Nernst and F. A. Lindemann, Z. Elektrochem. 17, 817 (1911).
    """
    return np.asarray(2 * C / (1 + _root(T, C, a)))


def _nernst_lindemann_slopes(T: FloatArray, C: FloatArray, a: float) -> tuple[FloatArray, FloatArray]:
    root = _root(T, C, a)
    measured = 2 * C / (1 + root)
    return 1 / root, measured * measured * T / root


def _nernst_lindemann_invert(T: FloatArray, measured: FloatArray, a: float) -> FloatArray:
    return np.asarray(measured - a * measured * measured * T)


def _nernst_lindemann_basis(T: FloatArray, measured: FloatArray) -> FloatArray:
    return np.asarray(measured * measured * T)


def anharmonic(T: FloatArray, C: FloatArray, a: float) -> FloatArray:
    """C (1 + a T): the leading anharmonic correction, J/(mol K); `a` in 1/K, of either sign.

    D. C. Wallace, Thermodynamics of Crystals, Wiley (1972); T. H. K. Barron, J. G. Collins and G. K. White,
    Adv. Phys. 29, 609 (1980).
    """
    return np.asarray(C * (1 + a * T))


def _anharmonic_slopes(T: FloatArray, C: FloatArray, a: float) -> tuple[FloatArray, FloatArray]:
    return np.asarray(1 + a * T) * np.ones_like(C), np.asarray(C * T)


def _anharmonic_invert(T: FloatArray, measured: FloatArray, a: float) -> FloatArray:
    return np.asarray(measured / (1 + a * T))


def _anharmonic_basis(T: FloatArray, measured: FloatArray) -> FloatArray:
    return np.asarray(measured * T)


CP_CV_FORMS = MappingProxyType(
    {
        each.name: each
        for each in (
            CpCvForm(
                "none",
                None,
                _identity,
                _identity_slopes,
                _identity,
                _no_basis,
                "the lattice model is compared with the data as it is",
                "",
            ),
            CpCvForm(
                "nernst-lindemann",
                ParameterSpec("coefficient", "mol/J", 0.0, inf, "amplitude", "A in Cp - Cv = A Cp^2 T (lattice part)"),
                nernst_lindemann,
                _nernst_lindemann_slopes,
                _nernst_lindemann_invert,
                _nernst_lindemann_basis,
                "Cp - Cv = A Cp^2 T of the lattice part",
                "W. Nernst and F. A. Lindemann, Z. Elektrochem. 17, 817 (1911)",
            ),
            CpCvForm(
                "anharmonic",
                ParameterSpec("coefficient", "1/K", -1e-2, 1e-2, "amplitude", "a in C = C_harmonic (1 + a T)"),
                anharmonic,
                _anharmonic_slopes,
                _anharmonic_invert,
                _anharmonic_basis,
                "C = C_harmonic (1 + a T) of the lattice part",
                "D. C. Wallace, Thermodynamics of Crystals, Wiley (1972)",
            ),
        )
    }
)
"""Every form that `cp_cv` can name."""


def cp_cv_form(name: str) -> CpCvForm:
    """Return the form of that name.

    Raises
    ------
    InputError
        When there is none; the nearest name is offered.
    """
    try:
        return CP_CV_FORMS[name]
    except KeyError:
        raise InputError(f"{name!r} is not a form of Cp-Cv; {nearest(name, CP_CV_FORMS)}") from None

"""From the harmonic lattice heat capacity to the measured one: the difference Cp - Cv, or anharmonicity.

Each form maps the harmonic lattice heat capacity C (J/(mol K), per mole of formula unit) at T (K) to the measured
one with at most one coefficient. It acts on the lattice part alone. A new form is its functions, one record and its
place in `_FORMS`.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from math import inf
from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

from ..constants import NERNST_LINDEMANN_A0
from ..errors import InputError, nearest
from ..records import FloatArray
from ..terms import ParameterSpec

__all__ = ["CP_CV_FORMS", "CpCvForm", "cp_cv_form"]


@dataclass(frozen=True)
class CpCvForm:
    """One form of Cp - Cv: everything that the rest of the program asks of it.

    Attributes
    ----------
    name : str
        What `cp_cv` is set to; words joined by hyphens.
    meaning, source : str
        One line for reports, and where it was published.
    apply : callable ``(T, C, a) -> ndarray``
        Measured heat capacity from the harmonic one.
    slopes : callable ``(T, C, a) -> (ndarray, ndarray)``
        Derivatives of the measured heat capacity with respect to C and to a.
    invert : callable ``(T, measured, a) -> ndarray``
        Harmonic heat capacity from the measured one.
    start_basis : callable ``(T, measured) -> ndarray``
        The difference to first order in a, per unit of a: what a linear start search uses.
    parameter : ParameterSpec or None
        The coefficient; its full name is the form's name with underscores + quantity. None for a form without one.
    largest_coefficient : callable ``(T, C) -> float``, or None
        Largest coefficient that serves up to the temperature T where the heat capacity is at most C; None where the
        range of the parameter is all there is to say.
    solvable : callable ``(T, C, a) -> ndarray of bool``, or None
        Where the measured heat capacity exists; None where it always does.
    from_melting_point : callable ``(atoms per formula unit, melting point) -> float``, or None
        The coefficient by a rule that needs no fit; None where there is no such rule.
    excess_entropy : callable ``(T, U, a) -> ndarray``, or None
        Entropy above the harmonic one, J/(mol K), from the harmonic U(T) - U(0), J/mol; None where it has no such
        closed form and is integrated.
    """

    name: str
    meaning: str
    source: str
    apply: Callable[[FloatArray, FloatArray, float], FloatArray]
    slopes: Callable[[FloatArray, FloatArray, float], tuple[FloatArray, FloatArray]]
    invert: Callable[[FloatArray, FloatArray, float], FloatArray]
    start_basis: Callable[[FloatArray, FloatArray], FloatArray]
    parameter: ParameterSpec | None = None
    largest_coefficient: Callable[[float, float], float] | None = None
    solvable: Callable[[FloatArray, FloatArray, float], NDArray[np.bool_]] | None = None
    from_melting_point: Callable[[float, float], float] | None = None
    excess_entropy: Callable[[FloatArray, FloatArray, float], FloatArray] | None = None


def _identity(T: FloatArray, C: FloatArray, a: float) -> FloatArray:
    return C


def _identity_slopes(T: FloatArray, C: FloatArray, a: float) -> tuple[FloatArray, FloatArray]:
    return np.ones_like(C), np.zeros_like(C)


def _no_basis(T: FloatArray, measured: FloatArray) -> FloatArray:
    return np.zeros_like(measured)


_LARGEST_DILATION = 0.24  # 4 A T C stays below 0.96 up to the highest point, so that Cp - Cv has a solution
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


def _nernst_lindemann_largest(T: float, C: float) -> float:
    return _LARGEST_DILATION / (T * C)


def _nernst_lindemann_solvable(T: FloatArray, C: FloatArray, a: float) -> NDArray[np.bool_]:
    return np.asarray(4 * a * T * C < 1)


def _nernst_lindemann_from_melting_point(atoms: float, melting_point: float) -> float:
    """A = A0/(n Tm), mol/J per mole of formula unit: A0 is one number for all solids, to tens of percent."""
    return NERNST_LINDEMANN_A0 / (atoms * melting_point)


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


def _anharmonic_entropy(T: FloatArray, U: FloatArray, a: float) -> FloatArray:
    return np.asarray(a * U)  # the integral of a C dT


NONE = CpCvForm(
    name="none",
    meaning="the lattice model is compared with the data as it is",
    source="",
    apply=_identity,
    slopes=_identity_slopes,
    invert=_identity,
    start_basis=_no_basis,
)

NERNST_LINDEMANN = CpCvForm(
    name="nernst-lindemann",
    meaning="Cp - Cv = A Cp^2 T of the lattice part",
    source="W. Nernst and F. A. Lindemann, Z. Elektrochem. 17, 817 (1911)",
    apply=nernst_lindemann,
    slopes=_nernst_lindemann_slopes,
    invert=_nernst_lindemann_invert,
    start_basis=_nernst_lindemann_basis,
    parameter=ParameterSpec(
        "coefficient", "mol/J", 0.0, inf, "amplitude", "A in Cp - Cv = A Cp^2 T (lattice part)", 2e-6
    ),
    largest_coefficient=_nernst_lindemann_largest,
    solvable=_nernst_lindemann_solvable,
    from_melting_point=_nernst_lindemann_from_melting_point,
)

ANHARMONIC = CpCvForm(
    name="anharmonic",
    meaning="C = C_harmonic (1 + a T) of the lattice part",
    source="D. C. Wallace, Thermodynamics of Crystals, Wiley (1972)",
    apply=anharmonic,
    slopes=_anharmonic_slopes,
    invert=_anharmonic_invert,
    start_basis=_anharmonic_basis,
    parameter=ParameterSpec("coefficient", "1/K", -1e-2, 1e-2, "amplitude", "a in C = C_harmonic (1 + a T)", -3e-5),
    excess_entropy=_anharmonic_entropy,
)

_FORMS: dict[str, CpCvForm] = {each.name: each for each in (NONE, NERNST_LINDEMANN, ANHARMONIC)}

CP_CV_FORMS: Mapping[str, CpCvForm] = MappingProxyType(_FORMS)
"""Every form that `cp_cv` can name: a view, so that whoever imports it sees what is registered."""


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

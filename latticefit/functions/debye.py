"""Debye functions, x = theta/T.

Per 3 N k_B for heat capacity and entropy, per 3 N k_B T for energy and Helmholtz energy, without the zero point.
Sources: P. Debye, Ann. Phys. (4th ser.) 39, 789-839 (1912); for D_n M. Abramowitz and I. A. Stegun (eds.), Handbook of
Mathematical Functions, NBS Appl. Math. Ser. 55 (1964), sec. 27.1.

Each function is a table of cubics (see `tables`), built on first use from Gauss-Legendre averages of the Einstein
functions over the band: integrands of one sign, so that no digit is lost at any x.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import cache
from math import log

import numpy as np
from numpy.polynomial import legendre
from numpy.typing import ArrayLike

from latticefit.errors import InputError
from latticefit.functions import einstein
from latticefit.functions.arrays import evaluate
from latticefit.functions.tables import CubicTable, build_table, interpolate
from latticefit.records import FloatArray

__all__ = [
    "debye_energy",
    "debye_energy_derivative",
    "debye_entropy",
    "debye_function",
    "debye_function_derivative",
    "debye_heat_capacity",
    "debye_heat_capacity_derivative",
    "debye_helmholtz",
]

_CUT = 50  # from here on C, S, F and D_1..D_3 are their power law to 1e-16
_LONG_CUT = 80  # the same for D_4..D_10 and for dC/dx, whose exponential part is larger
_HIGHEST_ORDER = 10
_QUADRATURE_NODES = 64
_LOGARITHM_END = 4  # below, S and F are a table minus ln(x/4): a table cannot follow their logarithm at x = 0


def debye_heat_capacity(x: ArrayLike) -> FloatArray:
    """Heat capacity of a Debye term, C/(3 N k_B) = (3/x^3) int_0^x t^4 e^t/(e^t - 1)^2 dt.

    Parameters
    ----------
    x : array_like
        theta_D/T, dimensionless, 0 to infinity, any shape.

    Returns
    -------
    ndarray, shape of `x`, or float where `x` is a scalar
        Dimensionless; 1 at x = 0, (4 pi^4/5)/x^3 towards infinity, NaN where `x` is NaN. Relative error below 1e-14.

    Raises
    ------
    InputError
        Where `x` is negative or not a real number.

    Notes
    -----
    P. Debye, Ann. Phys. (4th ser.) 39, 789-839 (1912).
    """
    table = _heat_capacity_table()
    return evaluate(lambda part: interpolate(table, part), x)


def debye_energy(x: ArrayLike) -> FloatArray:
    """Energy of a Debye term above its zero point, U/(3 N k_B T) = D_3(x).

    Parameters
    ----------
    x : array_like
        theta_D/T, dimensionless, 0 to infinity, any shape.

    Returns
    -------
    ndarray, shape of `x`, or float where `x` is a scalar
        Dimensionless; 1 at x = 0, (pi^4/5)/x^3 towards infinity, NaN where `x` is NaN. Relative error below 1e-14.

    Raises
    ------
    InputError
        Where `x` is negative or not a real number.

    Notes
    -----
    P. Debye, Ann. Phys. (4th ser.) 39, 789-839 (1912).
    """
    return debye_function(3, x)


def debye_entropy(x: ArrayLike) -> FloatArray:
    """Entropy of a Debye term, S/(3 N k_B) = (4/3) D_3(x) - ln(1 - e^-x).

    Parameters
    ----------
    x : array_like
        theta_D/T, dimensionless, 0 to infinity, any shape.

    Returns
    -------
    ndarray, shape of `x`, or float where `x` is a scalar
        Dimensionless; infinite at x = 0, (4 pi^4/15)/x^3 towards infinity, NaN where `x` is NaN. Relative error below
        1e-14. Its derivative is dS/dx = -C/x.

    Raises
    ------
    InputError
        Where `x` is negative or not a real number.

    Notes
    -----
    From the spectrum of P. Debye, Ann. Phys. (4th ser.) 39, 789-839 (1912), by S = (U - F)/T.
    """
    table = _entropy_table()
    return evaluate(lambda part: interpolate(table, part) - _logarithm(part), x)


def debye_helmholtz(x: ArrayLike) -> FloatArray:
    """Helmholtz energy of a Debye term above its zero point, F/(3 N k_B T) = ln(1 - e^-x) - D_3(x)/3.

    Parameters
    ----------
    x : array_like
        theta_D/T, dimensionless, 0 to infinity, any shape.

    Returns
    -------
    ndarray, shape of `x`, or float where `x` is a scalar
        Dimensionless; minus infinity at x = 0, -(pi^4/15)/x^3 towards infinity, NaN where `x` is NaN. Relative error
        below 1e-14. Its derivative is dF/dx = U/x.

    Raises
    ------
    InputError
        Where `x` is negative or not a real number.

    Notes
    -----
    From the spectrum of P. Debye, Ann. Phys. (4th ser.) 39, 789-839 (1912), by F = -k_B T ln Z.
    """
    table = _helmholtz_table()
    return evaluate(lambda part: _logarithm(part) + interpolate(table, part), x)


def debye_heat_capacity_derivative(x: ArrayLike) -> FloatArray:
    """x-derivative of `debye_heat_capacity`, dC/dx = (3/x) (C_Einstein(x) - C(x)).

    Parameters
    ----------
    x : array_like
        theta_D/T, dimensionless, 0 to infinity, any shape.

    Returns
    -------
    ndarray, shape of `x`, or float where `x` is a scalar
        Dimensionless; -x/10 towards x = 0, 0 at infinity, NaN where `x` is NaN. Relative error below 1e-14.

    Raises
    ------
    InputError
        Where `x` is negative or not a real number.

    Notes
    -----
    Derivative of the formula of P. Debye, Ann. Phys. (4th ser.) 39, 789-839 (1912). The difference above loses digits
    at small x; (dC/dx)/x has a table of its own.
    """
    table = _heat_capacity_slope_table()
    return evaluate(lambda part: np.minimum(part, table.cut) * interpolate(table, part), x)


def debye_energy_derivative(x: ArrayLike) -> FloatArray:
    """x-derivative of `debye_energy`, dD_3/dx = (3/x) (x/(e^x - 1) - D_3(x)).

    Parameters
    ----------
    x : array_like
        theta_D/T, dimensionless, 0 to infinity, any shape.

    Returns
    -------
    ndarray, shape of `x`, or float where `x` is a scalar
        Dimensionless; -3/8 at x = 0, 0 at infinity, NaN where `x` is NaN. Relative error below 1e-14.

    Raises
    ------
    InputError
        Where `x` is negative or not a real number.

    Notes
    -----
    Derivative of the formula of P. Debye, Ann. Phys. (4th ser.) 39, 789-839 (1912).
    """
    return debye_function_derivative(3, x)


def debye_function(n: int, x: ArrayLike) -> FloatArray:
    """Debye function D_n(x) = (n/x^n) int_0^x t^n/(e^t - 1) dt.

    Parameters
    ----------
    n : int
        Order, 1 to 10; 3 for a three-dimensional band.
    x : array_like
        Dimensionless, 0 to infinity, any shape.

    Returns
    -------
    ndarray, shape of `x`, or float where `x` is a scalar
        Dimensionless; 1 at x = 0, n n! zeta(n + 1)/x^n towards infinity, NaN where `x` is NaN. Relative error below
        1e-14.

    Raises
    ------
    InputError
        Where `n` is not a whole number from 1 to 10, or `x` is negative or not a real number.

    Notes
    -----
    M. Abramowitz and I. A. Stegun (eds.), Handbook of Mathematical Functions, NBS Appl. Math. Ser. 55 (1964),
    sec. 27.1.
    """
    table = _order_table(_order(n))
    return evaluate(lambda part: interpolate(table, part), x)


def debye_function_derivative(n: int, x: ArrayLike) -> FloatArray:
    """x-derivative of `debye_function`, dD_n/dx = (n/x) (x/(e^x - 1) - D_n(x)).

    Parameters
    ----------
    n : int
        Order, 1 to 10.
    x : array_like
        Dimensionless, 0 to infinity, any shape.

    Returns
    -------
    ndarray, shape of `x`, or float where `x` is a scalar
        Dimensionless; -n/(2 (n + 1)) at x = 0, 0 at infinity, NaN where `x` is NaN. Relative error below 1e-14.

    Raises
    ------
    InputError
        Where `n` is not a whole number from 1 to 10, or `x` is negative or not a real number.

    Notes
    -----
    Derivative of the definition in M. Abramowitz and I. A. Stegun (eds.), Handbook of Mathematical Functions, NBS
    Appl. Math. Ser. 55 (1964), sec. 27.1.
    """
    table = _order_derivative_table(_order(n))
    return evaluate(lambda part: interpolate(table, part), x)


def _order(n: object) -> int:
    """Return the order, or refuse it."""
    if isinstance(n, int | np.integer) and not isinstance(n, bool) and 1 <= n <= _HIGHEST_ORDER:
        return int(n)
    raise InputError(f"the order n of a Debye function must be a whole number from 1 to {_HIGHEST_ORDER}, found {n!r}")


def _logarithm(x: FloatArray) -> FloatArray:
    """Return ln(x/4) below x = 4 and 0 from there on."""
    return np.log(np.minimum(x / _LOGARITHM_END, 1.0))


def _band_average(kernel: Callable[[FloatArray], FloatArray], power: int, x: FloatArray) -> FloatArray:
    """Return int_0^1 s^power kernel(x s) ds for every x, shape (m,)."""
    node, weight = _quadrature()
    y = np.outer(x, node)
    values = kernel(y.ravel()).reshape(y.shape)
    average: FloatArray = values @ (weight * node**power)
    return average


@cache
def _quadrature() -> tuple[FloatArray, FloatArray]:
    """Return Gauss-Legendre nodes and weights on [0, 1]; 64 reach rounding up to x = 80.

    The weights are 1/sum of (k + 1/2) P_k^2, a sum of positive terms: those of the library are good to 1e-12 only.
    """
    node, _ = legendre.leggauss(_QUADRATURE_NODES)
    order = np.arange(_QUADRATURE_NODES)
    weight = 1 / np.sum((order + 0.5) * legendre.legvander(node, _QUADRATURE_NODES - 1) ** 2, axis=1)
    return (node + 1) / 2, weight / 2


def _third_order(x: FloatArray) -> FloatArray:
    return 3 * _band_average(einstein.energy_kernel, 2, x)


def _einstein_helmholtz_without_logarithm(x: FloatArray) -> FloatArray:
    """Return ln(1 - e^-x) minus `_logarithm`, for x > 0."""
    below = np.log(-np.expm1(-x) * (_LOGARITHM_END / x))
    return np.where(x < _LOGARITHM_END, below, einstein.helmholtz_kernel(x))


@cache
def _heat_capacity_table() -> CubicTable:
    return build_table(lambda x: 3 * _band_average(einstein.heat_capacity_kernel, 2, x), 1.0, _CUT, 3)


@cache
def _heat_capacity_slope_table() -> CubicTable:
    """Return the table of (dC/dx)/x."""
    return build_table(
        lambda x: 3 * _band_average(einstein.heat_capacity_derivative_kernel, 3, x) / x, -1 / 10, _LONG_CUT, 4
    )


@cache
def _entropy_table() -> CubicTable:
    """Return the table of S + `_logarithm`."""
    return build_table(
        lambda x: 4 / 3 * _third_order(x) - _einstein_helmholtz_without_logarithm(x),
        4 / 3 - log(_LOGARITHM_END),
        _CUT,
        3,
    )


@cache
def _helmholtz_table() -> CubicTable:
    """Return the table of F - `_logarithm`."""
    return build_table(
        lambda x: _einstein_helmholtz_without_logarithm(x) - _third_order(x) / 3,
        log(_LOGARITHM_END) - 1 / 3,
        _CUT,
        3,
    )


@cache
def _order_table(n: int) -> CubicTable:
    cut = _CUT if n <= 3 else _LONG_CUT
    return build_table(lambda x: n * _band_average(einstein.energy_kernel, n - 1, x), 1.0, cut, n)


@cache
def _order_derivative_table(n: int) -> CubicTable:
    cut = _CUT if n <= 3 else _LONG_CUT
    at_zero = -n / (2 * (n + 1))
    return build_table(lambda x: n * _band_average(einstein.energy_derivative_kernel, n, x), at_zero, cut, n + 1)

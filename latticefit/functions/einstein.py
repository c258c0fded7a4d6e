"""Functions of one Einstein oscillator, x = theta/T.

Per 3 N k_B for heat capacity and entropy, per 3 N k_B T for energy and Helmholtz energy, without the zero point.
Source: A. Einstein, Ann. Phys. (4th ser.) 22, 180-190 (1907).

The functions whose names end in `_kernel` are the bare formulas, for 1-d arrays of doubles >= 0; the Debye functions
are averages of them over the band. Written with v = x/2 and sinh v they neither cancel nor overflow.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from latticefit.functions.arrays import evaluate
from latticefit.records import FloatArray

__all__ = [
    "einstein_energy",
    "einstein_energy_derivative",
    "einstein_entropy",
    "einstein_heat_capacity",
    "einstein_heat_capacity_derivative",
    "einstein_helmholtz",
    "energy_derivative_kernel",
    "energy_kernel",
    "heat_capacity_derivative_kernel",
    "heat_capacity_kernel",
    "helmholtz_kernel",
]

_TINY, _HUGE = 1e-300, 500.0  # v = x/2 is kept within: below, v/sinh v is 1; above, every function has underflowed

_LANGEVIN = (
    # coth v - 1/v = sum of 2^(2k) B_2k/(2k)! v^(2k-1), B the Bernoulli numbers; ten terms reach rounding at v = 1/2.
    1 / 3,
    -1 / 45,
    2 / 945,
    -1 / 4725,
    2 / 93555,
    -1382 / 638512875,
    4 / 18243225,
    -3617 / 162820783125,
    87734 / 38979295480125,
    -349222 / 1531329465290625,
)


def einstein_heat_capacity(x: ArrayLike) -> FloatArray:
    """Heat capacity of an Einstein term, C/(3 N k_B) = x^2 e^x/(e^x - 1)^2.

    Parameters
    ----------
    x : array_like
        theta_E/T, dimensionless, 0 to infinity, any shape.

    Returns
    -------
    ndarray, shape of `x`, or float where `x` is a scalar
        Dimensionless; 1 at x = 0, 0 at infinity, NaN where `x` is NaN. Relative error below 1e-14.

    Raises
    ------
    InputError
        Where `x` is negative or not a real number.

    Notes
    -----
    A. Einstein, Ann. Phys. (4th ser.) 22, 180-190 (1907).
    """
    return evaluate(heat_capacity_kernel, x)


def einstein_energy(x: ArrayLike) -> FloatArray:
    """Energy of an Einstein term above its zero point, U/(3 N k_B T) = x/(e^x - 1).

    Parameters
    ----------
    x : array_like
        theta_E/T, dimensionless, 0 to infinity, any shape.

    Returns
    -------
    ndarray, shape of `x`, or float where `x` is a scalar
        Dimensionless; 1 at x = 0, 0 at infinity, NaN where `x` is NaN. Relative error below 1e-14.

    Raises
    ------
    InputError
        Where `x` is negative or not a real number.

    Notes
    -----
    A. Einstein, Ann. Phys. (4th ser.) 22, 180-190 (1907).
    """
    return evaluate(energy_kernel, x)


def einstein_entropy(x: ArrayLike) -> FloatArray:
    """Entropy of an Einstein term, S/(3 N k_B) = x/(e^x - 1) - ln(1 - e^-x).

    Parameters
    ----------
    x : array_like
        theta_E/T, dimensionless, 0 to infinity, any shape.

    Returns
    -------
    ndarray, shape of `x`, or float where `x` is a scalar
        Dimensionless; infinite at x = 0, 0 at infinity, NaN where `x` is NaN. Relative error below 1e-14. Its
        derivative is dS/dx = -C/x.

    Raises
    ------
    InputError
        Where `x` is negative or not a real number.

    Notes
    -----
    From the oscillator of A. Einstein, Ann. Phys. (4th ser.) 22, 180-190 (1907), by S = (U - F)/T.
    """
    return evaluate(lambda part: energy_kernel(part) - helmholtz_kernel(part), x)


def einstein_helmholtz(x: ArrayLike) -> FloatArray:
    """Helmholtz energy of an Einstein term above its zero point, F/(3 N k_B T) = ln(1 - e^-x).

    Parameters
    ----------
    x : array_like
        theta_E/T, dimensionless, 0 to infinity, any shape.

    Returns
    -------
    ndarray, shape of `x`, or float where `x` is a scalar
        Dimensionless; minus infinity at x = 0, 0 at infinity, NaN where `x` is NaN. Relative error below 1e-14. Its
        derivative is dF/dx = U/x.

    Raises
    ------
    InputError
        Where `x` is negative or not a real number.

    Notes
    -----
    From the oscillator of A. Einstein, Ann. Phys. (4th ser.) 22, 180-190 (1907), by F = -k_B T ln Z.
    """
    return evaluate(helmholtz_kernel, x)


def einstein_heat_capacity_derivative(x: ArrayLike) -> FloatArray:
    """x-derivative of `einstein_heat_capacity`, dC/dx = -C (coth(x/2) - 2/x).

    Parameters
    ----------
    x : array_like
        theta_E/T, dimensionless, 0 to infinity, any shape.

    Returns
    -------
    ndarray, shape of `x`, or float where `x` is a scalar
        Dimensionless; 0 at x = 0 and at infinity, NaN where `x` is NaN. Relative error below 1e-14.

    Raises
    ------
    InputError
        Where `x` is negative or not a real number.

    Notes
    -----
    Derivative of the formula of A. Einstein, Ann. Phys. (4th ser.) 22, 180-190 (1907).
    """
    return evaluate(heat_capacity_derivative_kernel, x)


def einstein_energy_derivative(x: ArrayLike) -> FloatArray:
    """x-derivative of `einstein_energy`, d(U/T)/dx = -U (1 + coth(x/2) - 2/x)/2.

    Parameters
    ----------
    x : array_like
        theta_E/T, dimensionless, 0 to infinity, any shape.

    Returns
    -------
    ndarray, shape of `x`, or float where `x` is a scalar
        Dimensionless; -1/2 at x = 0, 0 at infinity, NaN where `x` is NaN. Relative error below 1e-14.

    Raises
    ------
    InputError
        Where `x` is negative or not a real number.

    Notes
    -----
    Derivative of the formula of A. Einstein, Ann. Phys. (4th ser.) 22, 180-190 (1907).
    """
    return evaluate(energy_derivative_kernel, x)


def heat_capacity_kernel(x: FloatArray) -> FloatArray:
    """Return C/(3 N k_B) = (v/sinh v)^2."""
    return _heat_capacity_at(_half(x))


def energy_kernel(x: FloatArray) -> FloatArray:
    """Return U/(3 N k_B T) = e^-v v/sinh v."""
    return _energy_at(_half(x))


def helmholtz_kernel(x: FloatArray) -> FloatArray:
    """Return F/(3 N k_B T) = ln(1 - e^-x), each part of the range in the form that keeps its digits."""
    return np.where(x < 1, np.log(-np.expm1(-x)), np.log1p(-np.exp(-x)))


def heat_capacity_derivative_kernel(x: FloatArray) -> FloatArray:
    """Return dC/dx."""
    v = _half(x)
    result = _heat_capacity_at(v)
    result *= _langevin(x, v)
    return np.negative(result, out=result)


def energy_derivative_kernel(x: FloatArray) -> FloatArray:
    """Return the derivative of U/T."""
    v = _half(x)
    result = _energy_at(v)
    result *= _langevin(x, v) + 1
    result *= -0.5
    return result


def _half(x: FloatArray) -> FloatArray:
    """Return v = x/2, kept where v/sinh v is neither 0/0 nor infinity/infinity."""
    v = x * 0.5
    np.maximum(v, _TINY, out=v)
    return np.minimum(v, _HUGE, out=v)


def _heat_capacity_at(v: FloatArray) -> FloatArray:
    root = v / np.sinh(v)
    return np.multiply(root, root, out=root)


def _energy_at(v: FloatArray) -> FloatArray:
    result = v / np.sinh(v)
    result *= np.exp(-v)
    return result


def _langevin(x: FloatArray, v: FloatArray) -> FloatArray:
    """Return coth(x/2) - 2/x, by its series below x = 1, where the difference would lose digits."""
    small = np.minimum(x, 1.0)
    small *= 0.5
    square = small * small
    series = square * _LANGEVIN[-1]
    for coefficient in _LANGEVIN[-2:0:-1]:
        series += coefficient
        series *= square
    series += _LANGEVIN[0]
    series *= small
    return np.where(x < 1, series, 1 / np.tanh(v) - 1 / v)

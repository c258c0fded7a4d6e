"""The frame around every special function: what is accepted as x, and how long arrays are walked through."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import ArrayLike

from latticefit.errors import InputError
from latticefit.records import FloatArray

__all__ = ["evaluate"]

_CHUNK = 8192  # 64 kB of doubles: the temporaries of one chunk stay in the cache, worth 4x at 1e6 values


def evaluate(kernel: Callable[[FloatArray], FloatArray], x: ArrayLike) -> FloatArray:
    """Apply a function of x = theta/T to anything array-like.

    Parameters
    ----------
    kernel : callable
        Takes a 1-d array of doubles >= 0 (or NaN) and returns a new array of its length.
    x : array_like of real numbers
        theta/T, dimensionless, 0 to infinity, any shape; integers and single precision are computed in double.

    Returns
    -------
    ndarray of float64, shape of `x`
        A float (`numpy.float64`) where `x` is a scalar.

    Raises
    ------
    InputError
        Where `x` holds something that is not a real number, or a negative one.
    """
    values = _doubles(x)
    flat = values.ravel()
    # fmin passes over NaN, so that a NaN beside it cannot hide a negative value.
    if np.fmin.reduce(flat, initial=0.0) < 0:
        raise InputError(_negative(values))
    # Inside, the limits are reached on purpose: log(0) at x = 0, underflow at large x, NaN as a table index.
    with np.errstate(all="ignore"):
        if flat.size <= _CHUNK:
            result = kernel(flat)
        else:
            result = np.empty_like(flat)
            for begin in range(0, flat.size, _CHUNK):
                part = slice(begin, begin + _CHUNK)
                result[part] = kernel(flat[part])
    shaped: FloatArray = result.reshape(values.shape) if values.ndim else result[0]
    return shaped


def _doubles(x: ArrayLike) -> FloatArray:
    """Return x as an array of doubles, or refuse it."""
    try:
        values = np.asarray(x)
    except ValueError as error:
        raise InputError("x = theta/T must be numbers in a regular array; the rows given differ in length") from error
    if values.dtype.kind not in "iuf":
        shown = repr(x) if values.ndim == 0 else f"an array of {values.dtype}"
        raise InputError(f"x = theta/T must be a real number or an array of real numbers, found {shown}")
    return values.astype(np.float64, copy=False)


def _negative(values: FloatArray) -> str:
    """Return the sentence that names the first negative value and where it stands."""
    first = int(np.flatnonzero(values < 0)[0])
    place = np.unravel_index(first, values.shape)
    where = f" at index {', '.join(str(int(i)) for i in place)}" if place else ""
    return f"x = theta/T must not be negative, found {values.flat[first]:g}{where}: check the sign of theta and of T"

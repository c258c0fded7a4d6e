"""The inverse of the Debye heat capacity."""

from __future__ import annotations

import numpy as np

from latticefit.functions.debye import debye_heat_capacity
from latticefit.records import FloatArray

__all__ = ["invert_debye"]

_LOW, _HIGH, _STEPS = np.log(1e-6), np.log(1e6), 64


def invert_debye(ratio: FloatArray) -> FloatArray:
    """Return x = theta/T at which the Debye function C/(3 N k_B) equals `ratio`; NaN outside 0 < ratio < 1.

    By bisection in ln x: the function falls from 1 to 0 without a turn (P. Debye, Ann. Phys. 39, 789 (1912)).
    """
    ratio = np.asarray(ratio, dtype=float)
    inside = (ratio > 0) & (ratio < 1)
    low, high = np.full(ratio.shape, _LOW), np.full(ratio.shape, _HIGH)
    for _ in range(_STEPS):
        middle = (low + high) / 2
        above = np.asarray(debye_heat_capacity(np.exp(middle))) > ratio
        low, high = np.where(above, middle, low), np.where(above, high, middle)
    return np.where(inside, np.exp((low + high) / 2), np.nan)

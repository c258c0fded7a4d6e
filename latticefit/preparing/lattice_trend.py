"""A smooth curve through measured heat capacities that any lattice can have, and nothing that no lattice makes."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from ..constants import NORMAL_MEDIAN
from ..functions import einstein_heat_capacity
from ..records import FloatArray

__all__ = ["LatticeTrend", "lattice_functions", "lattice_trend", "non_negative"]

_STEP: Final = 0.1  # of ln theta: Einstein functions this close add up to a Debye function without a ripple
_HIGHEST: Final = 20.0  # times the highest T: modes above are not excited
_MOST_POINTS: Final = 500  # more are averaged in blocks before the weights are sought
_ROUNDS: Final = 6
_TUNING: Final = 2.0  # scatters beyond which a point loses weight


@dataclass(frozen=True)
class LatticeTrend:
    """Weights of Einstein functions at `theta` (K), and of T/`top` and its square; all that are not 0."""

    theta: FloatArray
    weight: FloatArray
    top: float

    @property
    def functions(self) -> int:
        """How many functions carry the curve."""
        return int((self.weight > 0).sum())

    def at(self, temperature: FloatArray) -> FloatArray:
        """Return the heat capacity at temperatures in K, unit of the data."""
        return np.asarray(_columns(temperature, self.theta, self.top) @ self.weight)


def _columns(temperature: FloatArray, theta: FloatArray, top: float) -> FloatArray:
    ratio = (temperature / top)[:, None]
    return np.hstack([np.asarray(einstein_heat_capacity(theta / temperature[:, None])), ratio, ratio**2])


def lattice_functions(temperature: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return temperatures theta in K, and the functions at `temperature` (ascending, K) as columns.

    The last two columns are T and T^2: conduction electrons, and the rise of Cp above Cv.
    """
    theta = np.exp(np.arange(np.log(temperature[0]), np.log(_HIGHEST * temperature[-1]), _STEP))
    return theta, _columns(temperature, theta, float(temperature[-1]))


def non_negative(columns: FloatArray, values: FloatArray) -> FloatArray:
    """Least squares with weights that are not negative; columns that vanish get none.

    C. L. Lawson and R. J. Hanson, Solving Least Squares Problems, Prentice-Hall (1974), ch. 23.
    """
    from scipy.optimize import nnls

    size = np.abs(columns).max(axis=0)
    kept = size > 1e-150 * size.max()
    weight = np.zeros(columns.shape[1])
    weight[kept] = nnls(columns[:, kept] / size[kept], values, maxiter=100 * columns.shape[1])[0] / size[kept]
    return weight


def lattice_trend(temperature: FloatArray, heat_capacity: FloatArray) -> LatticeTrend:
    """Draw a smooth curve through the points of one run that few outliers do not move.

    Parameters
    ----------
    temperature, heat_capacity : ndarray, shape (n,)
        Ascending temperature in K; heat capacity in any unit, above 0.

    Returns
    -------
    LatticeTrend

    Notes
    -----
    The heat capacity of any harmonic lattice is a sum of Einstein functions with weights that are not negative, and
    such a sum is smooth on a scale that the physics sets: it follows the steep rise at low T and the level at high T
    alike, without a number of neighbours to be chosen, and it cannot follow a glitch, a transition or a step. Relative
    deviations are squared up to twice their robust scatter and count linearly beyond (P. J. Huber, Ann. Math. Stat. 35,
    73 (1964); from memory, sure).
    """
    T, C = _in_blocks(temperature, heat_capacity)
    theta, columns = lattice_functions(T)
    trust, level, weight = np.ones(T.size), C, np.zeros(columns.shape[1])
    for _ in range(_ROUNDS):
        weight = non_negative(columns * (trust / level)[:, None], C * trust / level)
        level = np.maximum(columns @ weight, 1e-3 * C)
        off = np.abs(np.log(C / level))
        scatter = max(NORMAL_MEDIAN * float(np.median(off)), 1e-9)
        trust = np.sqrt(np.minimum(1.0, _TUNING * scatter / np.maximum(off, 1e-300)))
    kept = weight[: theta.size] > 0
    return LatticeTrend(theta[kept], np.concatenate([weight[: theta.size][kept], weight[theta.size :]]), float(T[-1]))


def _in_blocks(temperature: FloatArray, heat_capacity: FloatArray) -> tuple[FloatArray, FloatArray]:
    size = -(-temperature.size // _MOST_POINTS)
    if size == 1:
        return temperature, heat_capacity
    starts = np.arange(0, temperature.size, size)
    count = np.diff(np.append(starts, temperature.size))
    return (
        np.exp(np.add.reduceat(np.log(temperature), starts) / count),
        np.exp(np.add.reduceat(np.log(heat_capacity), starts) / count),
    )

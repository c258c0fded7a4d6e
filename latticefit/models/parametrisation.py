"""Which parameters of a model are free, held or tied by the mode sum: plain arrays that every minimiser can use."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from ..records import FloatArray, Frozen
from .model import Model, heat_capacity, heat_capacity_and_partials

__all__ = ["Parametrisation", "jacobian", "residual", "residual_and_jacobian"]


@dataclass(frozen=True)
class Parametrisation(Frozen):
    """Free parameters x (k,) and how all parameters (p,) follow from them.

    The mode sum is held by re-parametrisation: the tied mode count is `modes_total` minus the others.

    Attributes
    ----------
    base : ndarray, shape (p,)
        Values of the held parameters (the other entries are not used).
    free : ndarray of int, shape (k,)
    tied : int or None
        The mode count that follows from the sum.
    modes_total : float
        3 per atom; not used when `tied` is None.
    low, high : ndarray, shape (p,)
        Bounds of every parameter.
    """

    model: Model
    base: FloatArray
    free: NDArray[np.intp]
    tied: int | None
    modes_total: float
    low: FloatArray
    high: FloatArray

    @property
    def others(self) -> list[int]:
        """Mode counts other than the tied one."""
        return [i for i in self.model.modes if i != self.tied]

    def expand(self, x: FloatArray) -> FloatArray:
        """All parameters, shape (p,), from the free ones, shape (k,)."""
        values = self.base.copy()
        values[self.free] = x
        if self.tied is not None:
            values[self.tied] = self.modes_total - values[self.others].sum()
        return values

    def matrix(self) -> FloatArray:
        """Derivatives of all parameters with respect to the free ones, shape (p, k)."""
        matrix = np.zeros((self.base.size, self.free.size))
        matrix[self.free, np.arange(self.free.size)] = 1.0
        if self.tied is not None:
            matrix[self.tied] = -matrix[self.others].sum(axis=0)
        return matrix

    def hold(self, held: NDArray[np.intp], values: FloatArray) -> Parametrisation:
        """The same with the parameters at positions `held` no longer free but at their entries of `values`."""
        base = self.base.copy()
        base[held] = values[held]
        return replace(self, base=base, free=np.setdiff1d(self.free, held))

    def retie(self, position: int) -> Parametrisation:
        """The same constraint with another, free, mode count as the tied one."""
        if self.tied is None or position == self.tied:
            return self
        free = np.sort(np.append(self.free[self.free != position], self.tied))
        return replace(self, free=free, tied=position)


def residual(
    parametrisation: Parametrisation, x: FloatArray, T: FloatArray, measured: FloatArray, sigma: FloatArray
) -> FloatArray:
    """(measured - model)/sigma, shape (n,)."""
    return np.asarray((measured - heat_capacity(parametrisation.model, T, parametrisation.expand(x))) / sigma)


def residual_and_jacobian(
    parametrisation: Parametrisation, x: FloatArray, T: FloatArray, measured: FloatArray, sigma: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """`residual` and `jacobian`, both from one evaluation of the model."""
    modelled, columns = heat_capacity_and_partials(parametrisation.model, T, parametrisation.expand(x))
    return (measured - modelled) / sigma, np.asarray(-(columns / sigma).T @ parametrisation.matrix())


def jacobian(
    parametrisation: Parametrisation, x: FloatArray, T: FloatArray, measured: FloatArray, sigma: FloatArray
) -> FloatArray:
    """Derivatives of `residual` with respect to x, shape (n, k): minus the partials of the model over sigma."""
    return residual_and_jacobian(parametrisation, x, T, measured, sigma)[1]

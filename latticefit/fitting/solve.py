"""Weighted least squares on plain arrays: the only place that calls a minimiser.

`minimise` goes straight through scipy for the many fits of a start search, a profile or a bootstrap;
`minimise_with_lmfit` makes the one fit that a person sees. Both use the same residual and analytic Jacobian.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from scipy.optimize import least_squares

from ..models import Parametrisation, jacobian, residual
from ..records import FloatArray, Frozen

if TYPE_CHECKING:
    import lmfit

__all__ = ["Solution", "minimise", "minimise_with_lmfit"]

_WORDS = {
    0: "the number of evaluations ran out",
    1: "the gradient vanished",
    2: "chi-square no longer changed",
    3: "the parameters no longer changed",
    4: "neither chi-square nor the parameters changed any more",
}
"""How a minimiser stopped, by its status."""

_INSIDE = 1e-6  # how far inside its bounds, as a fraction of the range or of the value, a start is kept


@dataclass(frozen=True)
class Solution(Frozen):
    """A minimum: all parameters (p,), their parametrisation, and how it was reached."""

    parametrisation: Parametrisation
    values: FloatArray
    chi_square: float
    converged: bool
    message: str
    evaluations: int


def _inside(x: FloatArray, low: FloatArray, high: FloatArray) -> FloatArray:
    """Move x strictly inside its bounds: started on a bound, some minimisers never leave it."""
    span = np.where(np.isfinite(high - low), high - low, np.maximum(np.abs(x), 1.0))
    return np.clip(x, low + _INSIDE * span, np.where(np.isfinite(high), high - _INSIDE * span, np.inf))


def _scipy(
    par: Parametrisation, x: FloatArray, data: tuple[FloatArray, FloatArray, FloatArray], tolerance: float, most: int
) -> tuple[FloatArray, float, bool, str, int]:

    def difference(z: FloatArray) -> FloatArray:
        return residual(par, z, *data)

    def slopes(z: FloatArray) -> FloatArray:
        return jacobian(par, z, *data)

    found = least_squares(
        difference,
        x,
        jac=slopes,
        bounds=(par.low[par.free], par.high[par.free]),
        x_scale="jac",
        ftol=tolerance,
        xtol=tolerance,
        gtol=None,
        max_nfev=most,
    )
    return found.x, 2 * float(found.cost), bool(found.status > 0), _WORDS[int(found.status)], int(found.nfev)


def _lmfit_parameters(par: Parametrisation, x: FloatArray) -> lmfit.Parameters:
    from lmfit import Parameters

    parameters = Parameters()
    for position, value in zip(par.free, x, strict=True):
        parameters.add(
            par.model.names[position], value=value, min=float(par.low[position]), max=float(par.high[position])
        )
    return parameters


def _lmfit(
    par: Parametrisation, x: FloatArray, data: tuple[FloatArray, FloatArray, FloatArray], tolerance: float, most: int
) -> tuple[FloatArray, float, bool, str, int]:
    import lmfit

    def vector(parameters: lmfit.Parameters) -> FloatArray:
        return np.array([each.value for each in parameters.values()])

    found = lmfit.minimize(
        lambda parameters: residual(par, vector(parameters), *data),
        _lmfit_parameters(par, x),
        method="least_squares",
        nan_policy="raise",
        scale_covar=False,
        max_nfev=most,
        Dfun=lambda parameters: jacobian(par, vector(parameters), *data),
        x_scale="jac",
        ftol=tolerance,
        xtol=tolerance,
        gtol=None,
    )
    words = _WORDS.get(int(getattr(found, "status", -1)), str(found.message))
    return vector(found.params), float(found.chisqr), bool(found.success), words, int(found.nfev)


def _violated(par: Parametrisation, values: FloatArray) -> bool:
    return par.tied is not None and not (par.low[par.tied] <= values[par.tied] <= par.high[par.tied])


def _roomiest(par: Parametrisation, values: FloatArray, barred: set[int]) -> int | None:
    """The free mode count that lies deepest inside its bounds: the best one to follow from the sum instead."""
    depth = {
        i: min(values[i] - par.low[i], par.high[i] - values[i]) for i in par.others if i in par.free and i not in barred
    }
    return max(depth, key=lambda i: depth[i]) if depth else None


def _run(
    par: Parametrisation,
    start: FloatArray,
    data: tuple[FloatArray, FloatArray, FloatArray],
    tolerance: float,
    most: int,
    lmfit_too: bool,
) -> Solution:
    solver = _lmfit if lmfit_too else _scipy
    values, spent, barred = start, 0, set[int]()
    while True:
        if par.free.size == 0:
            r = residual(par, np.empty(0), *data)
            return Solution(par, par.expand(np.empty(0)), float(r @ r), True, "nothing was free", 1)
        x = _inside(values[par.free], par.low[par.free], par.high[par.free])
        x, chi_square, converged, message, evaluations = solver(par, x, data, tolerance, most)
        values, spent = par.expand(x), spent + evaluations
        other = _roomiest(par, values, barred) if _violated(par, values) else None
        if other is None or par.tied is None:
            return Solution(par, values, chi_square, converged and not _violated(par, values), message, spent)
        # the tied mode count left its bounds: let it be free, so that they hold it, and tie another instead
        barred.add(par.tied)
        values = values.copy()
        values[par.tied] = np.clip(values[par.tied], par.low[par.tied], par.high[par.tied])
        par = par.retie(other)


def minimise(
    parametrisation: Parametrisation,
    start: FloatArray,
    T: FloatArray,
    measured: FloatArray,
    sigma: FloatArray,
    tolerance: float = 1e-10,
    most: int = 200,
) -> Solution:
    """Minimise chi-square from `start`, bounded, with the analytic Jacobian.

    Parameters
    ----------
    parametrisation : Parametrisation
    start : ndarray, shape (p,)
        All parameters of the model; the free ones are moved strictly inside their bounds.
    T, measured, sigma : ndarray, shape (n,)
        K, J/(mol K), J/(mol K).
    tolerance : float
        Relative change of chi-square and of the parameters at which to stop.
    most : int
        Most evaluations.

    Returns
    -------
    Solution
        With the tied mode count inside its bounds where that is possible: otherwise another one is tied instead.
    """
    return _run(parametrisation, start, (T, measured, sigma), tolerance, most, lmfit_too=False)


def minimise_with_lmfit(
    parametrisation: Parametrisation,
    start: FloatArray,
    T: FloatArray,
    measured: FloatArray,
    sigma: FloatArray,
    tolerance: float = 1e-13,
    most: int = 2000,
) -> Solution:
    """The same through `lmfit.minimize` (method ``least_squares``): the fit that is reported."""
    return _run(parametrisation, start, (T, measured, sigma), tolerance, most, lmfit_too=True)

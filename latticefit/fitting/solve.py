"""Weighted least squares on plain arrays: the only place that calls a minimiser.

`minimise` goes straight through scipy for the many fits of a start search, a profile or a bootstrap;
`minimise_with_lmfit` makes the one fit that a person sees. Both use the same residual and analytic Jacobian, and both
try MINPACK's Levenberg-Marquardt first: it knows no bounds but needs a third of the time. A fit that leaves the bounds
on its way starts again with the bounded trust-region method.
"""

from __future__ import annotations

import warnings
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from scipy.optimize import least_squares, leastsq

from ..models import Parametrisation, residual, residual_and_jacobian
from ..records import FloatArray, Frozen

if TYPE_CHECKING:
    import lmfit

__all__ = ["Solution", "minimise", "minimise_with_lmfit"]

_Data = tuple[FloatArray, FloatArray, FloatArray]  # T, measured, sigma
_Found = tuple[FloatArray, float, bool, str]  # free parameters, chi-square, converged, message

_WORDS = {
    0: "the number of evaluations ran out",
    1: "the gradient vanished",
    2: "chi-square no longer changed",
    3: "the parameters no longer changed",
    4: "neither chi-square nor the parameters changed any more",
}
"""How least_squares stopped, by its status."""

_MINPACK_WORDS = {1: _WORDS[2], 2: _WORDS[3], 3: _WORDS[4], 4: _WORDS[1]}
"""The same for the status of leastsq; any other status means that no minimum was found."""

_INSIDE = 1e-6  # how far inside its bounds, as a fraction of the range or of the value, a start is kept


@dataclass(frozen=True, eq=False)
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


class _OutsideError(Exception):
    """A trial step has left the bounds."""


class _Problem:
    """Residual and Jacobian of one fit as minimisers ask for them: one after the other at the same x.

    Both are evaluated together and kept for the last x. They are handed out as copies, because MINPACK and lmfit work
    in the arrays that they are given.
    """

    def __init__(self, par: Parametrisation, data: _Data) -> None:
        self.par, self.data = par, data
        self.low, self.high = par.low[par.free], par.high[par.free]
        self.evaluations = 0
        self._x = np.full(par.free.size, np.nan)

    def _evaluate(self, x: FloatArray) -> None:
        if (x == self._x).all():
            return
        if (x < self.low).any() or (x > self.high).any():
            raise _OutsideError
        self._residual, self._jacobian = residual_and_jacobian(self.par, x, *self.data)
        self._x = x.copy()
        self.evaluations += 1

    def residual(self, x: FloatArray) -> FloatArray:
        self._evaluate(x)
        return self._residual.copy()

    def jacobian(self, x: FloatArray) -> FloatArray:
        self._evaluate(x)
        return self._jacobian.copy()


def _scipy(problem: _Problem, x: FloatArray, tolerance: float, most: int) -> _Found:
    try:
        y, _, details, _, status = leastsq(
            problem.residual,
            x,
            Dfun=problem.jacobian,
            full_output=True,
            ftol=tolerance,
            xtol=tolerance,
            gtol=0.0,
            maxfev=most,
        )
        if status in _MINPACK_WORDS:
            return y, float(details["fvec"] @ details["fvec"]), True, _MINPACK_WORDS[status]
    except _OutsideError:
        pass
    found = least_squares(
        problem.residual,
        x,
        jac=problem.jacobian,
        bounds=(problem.low, problem.high),
        x_scale="jac",
        ftol=tolerance,
        xtol=tolerance,
        gtol=None,
        max_nfev=most,
    )
    return found.x, 2 * float(found.cost), bool(found.status > 0), _WORDS[int(found.status)]


def _lmfit(problem: _Problem, x: FloatArray, tolerance: float, most: int) -> _Found:
    import lmfit

    def vector(parameters: lmfit.Parameters) -> FloatArray:
        return np.array([each.value for each in parameters.values()])

    def fit(bounded: bool, **method: Any) -> lmfit.minimizer.MinimizerResult:
        parameters = lmfit.Parameters()
        for i, value, low, high in zip(problem.par.free, x, problem.low, problem.high, strict=True):
            limits = {"min": float(low), "max": float(high)} if bounded else {}
            parameters.add(problem.par.model.names[i], value=value, **limits)
        return lmfit.minimize(
            lambda parameters: problem.residual(vector(parameters)),
            parameters,
            nan_policy="raise",
            scale_covar=False,
            max_nfev=most,
            Dfun=lambda parameters: problem.jacobian(vector(parameters)),
            ftol=tolerance,
            xtol=tolerance,
            **method,
        )

    try:
        found = fit(bounded=False, method="leastsq", gtol=0.0)
        if found.success and found.ier in _MINPACK_WORDS:
            return vector(found.params), float(found.chisqr), True, _MINPACK_WORDS[found.ier]
    except _OutsideError:
        pass
    found = fit(bounded=True, method="least_squares", x_scale="jac", gtol=None)
    words = _WORDS[0] if found.aborted else _WORDS.get(int(getattr(found, "status", -1)), str(found.message))
    return vector(found.params), float(found.chisqr), bool(found.success), words


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
    data: _Data,
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
        problem = _Problem(par, data)
        with warnings.catch_warnings():
            # both libraries warn about covariances that are not used here
            warnings.simplefilter("ignore", RuntimeWarning)
            try:
                x, chi_square, converged, message = solver(problem, x, tolerance, most)
            except (ValueError, TypeError, ArithmeticError, np.linalg.LinAlgError) as error:
                # the data say nothing at this point (a column of zeros, an overflow): no minimum from here
                return Solution(par, values, np.inf, False, f"the minimiser gave up ({error})", spent)
        values, spent = par.expand(x), spent + problem.evaluations
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
    """The same through `lmfit.minimize`: the fit that is reported."""
    return _run(parametrisation, start, (T, measured, sigma), tolerance, most, lmfit_too=True)

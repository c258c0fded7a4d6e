"""Propagation of the parameters' covariance to anything computed from them."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from ..records import FitRecord, FloatArray

__all__ = ["stated_covariance", "uncertainties"]

_STEP = 1e-4  # relative step of the central differences: rounding and curvature errors both stay below 1e-7
_SIGMAS = 1e-2  # step in standard uncertainties for a parameter that is zero


def _gradient(function: Callable[[FloatArray], FloatArray], values: FloatArray, deviations: FloatArray) -> FloatArray:
    columns = []
    for i, u in enumerate(deviations):
        if u == 0:
            columns.append(np.zeros_like(np.asarray(function(values), dtype=float)))
            continue
        step = _STEP * abs(values[i]) or _SIGMAS * u
        up, down = values.copy(), values.copy()
        up[i] += step
        down[i] -= step
        if values[i] >= 0 > down[i]:  # the functions of a negative theta or mode count are not those of the model
            down[i] = values[i]
        columns.append((np.asarray(function(up)) - np.asarray(function(down))) / (up[i] - down[i]))
    return np.array(columns, dtype=float)


def stated_covariance(fit: FitRecord) -> FloatArray:
    """Return the covariance behind u, shape (p, p).

    That of the fit, its part from the data enlarged by the reduced chi-square where stated sigmas fall short; what held
    parameters bring along is not enlarged.
    """
    total = np.array(fit.covariance)
    if fit.covariance_kind == "scaled":
        return total
    carried = np.zeros_like(total) if fit.carried is None else np.array(fit.carried)
    return (total - carried) * max(1.0, fit.scale_factor) + carried


def uncertainties(function: Callable[[FloatArray], FloatArray], fit: FitRecord) -> tuple[FloatArray, FloatArray]:
    """Return u_fit and u of every element of ``function(values)``.

    Law of propagation of uncertainty, JCGM 100:2008, section 5.2, with central differences.

    Parameters
    ----------
    function : callable
        Parameters (p,) -> array of any one shape.
    fit : FitRecord

    Returns
    -------
    u_fit, u : ndarray
        From the covariance of the fit alone, and as latticefit states it; shape of the function's result.
    """
    values, covariance = np.array(fit.values), np.array(fit.covariance)
    gradient = _gradient(function, values, np.sqrt(np.diag(covariance)))
    return _deviation(gradient, covariance), _deviation(gradient, stated_covariance(fit))


def _deviation(gradient: FloatArray, covariance: FloatArray) -> FloatArray:
    variance = np.einsum("i...,ij,j...->...", gradient, covariance, gradient)
    return np.asarray(np.sqrt(np.maximum(variance, 0.0)))

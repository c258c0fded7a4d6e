"""Covariance of the free parameters from the analytic Jacobian, and what the data do not determine."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ..models import Parametrisation, jacobian, partials
from ..records import FloatArray, Frozen, HeldParameters

__all__ = ["Covariance", "at_bounds", "carried_covariance", "covariance"]

_NULL = 1e-8  # singular values of the unit-column Jacobian below this, relative to the largest, are not determined
_NULL_SHARE = 0.1  # a parameter with at least this share of such a direction is undetermined
_AT_BOUND = 0.05  # closer to a bound than this many standard uncertainties is at the bound
_AT_BOUND_SHARE = 1e-3  # but never further than this share of the range, or of the value
_AT_BOUND_RANGE = 1e-6  # or closer than this fraction of a finite range


@dataclass(frozen=True)
class Covariance(Frozen):
    """Absolute covariance of all parameters (p, p), condition of its correlation matrix, undetermined positions."""

    matrix: FloatArray
    condition: float
    undetermined: NDArray[np.intp]


def covariance(
    par: Parametrisation, values: FloatArray, T: FloatArray, measured: FloatArray, sigma: FloatArray
) -> Covariance:
    """Invert the normal matrix of the weighted residuals at `values`.

    Parameters
    ----------
    par : Parametrisation
    values : ndarray, shape (p,)
    T, measured, sigma : ndarray, shape (n,)
        K, J/(mol K), J/(mol K).

    Returns
    -------
    Covariance
        Rows of held parameters are zero; the tied mode count has its row. Directions without weight in the data are
        left out and the parameters that share in them are named as undetermined.
    """
    p = len(par.model.names)
    if par.free.size == 0:
        return Covariance(np.zeros((p, p)), 1.0, np.empty(0, dtype=np.intp))
    J = jacobian(par, values[par.free], T, measured, sigma)
    norms = np.linalg.norm(J, axis=0)
    scale = np.where(norms > 0, norms, 1.0)
    _, s, vt = np.linalg.svd(J / scale, full_matrices=False)
    kept = s > _NULL * s[0]
    inverse = (vt[kept].T / s[kept] ** 2) @ vt[kept] / np.outer(scale, scale)
    lost = np.abs(vt[~kept]).max(axis=0) > _NULL_SHARE if (~kept).any() else np.zeros(par.free.size, dtype=bool)
    correlation = np.where(np.isfinite(inverse), inverse, 0.0)
    deviation = np.sqrt(np.diag(correlation))
    usable = deviation > 0
    correlation = correlation[np.ix_(usable, usable)] / np.outer(deviation[usable], deviation[usable])
    condition = float(np.linalg.cond(correlation)) if kept.all() else float("inf")
    matrix = par.matrix()
    return Covariance(matrix @ inverse @ matrix.T, condition, par.free[lost])


def carried_covariance(
    par: Parametrisation,
    values: FloatArray,
    T: FloatArray,
    measured: FloatArray,
    sigma: FloatArray,
    held: HeldParameters,
) -> FloatArray:
    """What the uncertainty of held parameters adds to the covariance of all parameters, shape (p, p).

    A held parameter that was a little off would have moved the free ones by dx = -(J'J)^-1 J' J_held d(held) (implicit
    differentiation of the normal equations; law of propagation of uncertainty, JCGM 100:2008, section 5.2).

    Parameters
    ----------
    par : Parametrisation
    values : ndarray, shape (p,)
    T, measured, sigma : ndarray, shape (n,)
        K, J/(mol K), J/(mol K).
    held : HeldParameters
        Those of its names that `par` holds are taken.
    """
    names = par.model.names
    kept = [k for k, name in enumerate(held.names) if name in names and names.index(name) not in par.free]
    positions = [names.index(held.names[k]) for k in kept]
    own = np.zeros((len(names), len(positions)))
    own[positions, np.arange(len(positions))] = 1.0
    if par.tied is not None:
        own[par.tied] = [-1.0 if i in par.others else 0.0 for i in positions]
    sensitivity = own
    if par.free.size:
        J = jacobian(par, values[par.free], T, measured, sigma)
        moved = -(partials(par.model, T, values) / sigma).T @ own
        scale = np.where((norms := np.linalg.norm(J, axis=0)) > 0, norms, 1.0)
        shift = -np.linalg.lstsq(J / scale, moved, rcond=_NULL)[0] / scale[:, None]
        sensitivity = own + par.matrix() @ shift
    return np.asarray(sensitivity @ held.covariance[np.ix_(kept, kept)] @ sensitivity.T)


def at_bounds(
    par: Parametrisation, values: FloatArray, T: FloatArray, measured: FloatArray, sigma: FloatArray
) -> NDArray[np.intp]:
    """Positions of free parameters that ended at a bound."""
    found = covariance(par, values, T, measured, sigma)
    u = np.sqrt(np.diag(found.matrix))
    u[found.undetermined] = 0.0
    span = par.high - par.low
    scale = np.where(np.isfinite(span), span, np.abs(values))
    reach = np.where(np.isfinite(span), _AT_BOUND_RANGE * span, 0.0)
    # gamma or a mode count that ended at zero is its own scale of nothing: there u alone decides
    near_zero = (par.low == 0) & (values < u)
    reach = np.maximum(reach, np.where(near_zero, _AT_BOUND * u, np.minimum(_AT_BOUND * u, _AT_BOUND_SHARE * scale)))
    near = (values - par.low <= reach) | (par.high - values <= reach)
    return np.array([i for i in par.free if near[i]], dtype=np.intp)

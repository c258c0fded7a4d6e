"""The smooth curve of a known heat capacity, ln C against ln T, and the standard uncertainty of the curve.

A smoothing spline with a penalty on the third derivative, in its statistical reading: the prior of ln C is a parabola
on which nothing is known, plus a twice integrated Wiener process, and what is expected given the points is the
smoothing spline (G. Kimeldorf and G. Wahba, Ann. Math. Statist. 41, 495-502 (1970); from memory). Its posterior
variance covers the curve in the mean over the points (G. Wahba, J. Roy. Statist. Soc. B 45, 133-150 (1983); from
memory). The splines of libraries penalise the second derivative and give no uncertainty: ln C bends from a slope of 3
to one of 0, and of two dozen points they take much of the scatter for shape. Here curve and u come from one eigenvalue
problem.

How rough the curve may be is not chosen but weighed: all strengths of smoothing count by their restricted likelihood
given the points, so that u holds what the points leave open about it, between them as well as at them. One roughness
holds for the whole curve: a narrow feature in a long one, such as that of a grease, is smoothed over in part, which u
does not hold.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline
from scipy.special import logsumexp

from ..constants import REPEAT_FACTOR
from ..errors import InputError
from ..records import FloatArray

__all__ = ["FEWEST", "MARGIN", "AddendaCurve", "smooth_curve"]

FEWEST: Final = 4
"""Fewest temperatures that make a curve: three for the parabola, and one to see how far points lie from it."""

MARGIN: Final = 0.005
"""How far beyond its points a curve is continued, as a part of T: repeats of one set point differ by as much (common
practice, no source)."""

_REPEAT: Final = math.log(REPEAT_FACTOR)  # points closer than this in ln T are averaged
_MOST: Final = 250  # averages: the eigenvalue problem grows with their cube
_STRENGTHS: Final = 80
_BETWEEN: Final = 4  # places between two points at which u is worked out


@dataclass(frozen=True)
class AddendaCurve:
    """A smooth curve with its u.

    Attributes
    ----------
    low, high : float
        The range of the points, K.
    points : int
        Points it rests on, repeats averaged.
    excess : float or None
        How many times more the points scatter about it than they state, where u was enlarged for it.
    spline, places, u : CubicSpline, ndarray, ndarray
        ln C as a function of ln T, and places in ln T with the standard uncertainty of ln C there.
    """

    low: float
    high: float
    points: int
    excess: float | None
    spline: CubicSpline
    places: FloatArray
    u: FloatArray

    def covers(self, temperature: FloatArray) -> NDArray[np.bool_]:
        """Say for each temperature (K) whether it lies in the range of the points, to `MARGIN`."""
        return (temperature >= self.low * (1 - MARGIN)) & (temperature <= self.high * (1 + MARGIN))

    def evaluate(self, temperature: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return the heat capacity and its standard uncertainty at temperatures (K) that it covers, shape (n,) each."""
        x = np.log(temperature)
        value = np.exp(np.asarray(self.spline(x)))
        return value, value * np.interp(x, self.places, self.u)


def smooth_curve(temperature: FloatArray, heat_capacity: FloatArray, sigma: FloatArray | None) -> AddendaCurve:
    """Draw a smooth curve through measured points.

    Parameters
    ----------
    temperature, heat_capacity : ndarray, shape (n,)
        K, in any order; any unit, above 0.
    sigma : ndarray, shape (n,), or None
        Standard uncertainty of each point, independent from point to point; where None, u follows from the scatter
        about the curve, and where the points scatter clearly more than stated as well.

    Raises
    ------
    InputError
        If there are fewer than `FEWEST` temperatures.
    """
    x, y, w = _averaged(temperature, heat_capacity, sigma)
    if x.size < FEWEST:
        raise InputError(f"holds {x.size} different temperatures; a smooth curve needs {FEWEST} or more")
    low, high = float(temperature.min()), float(temperature.max())
    places = _places(x, math.log(low * (1 - MARGIN)), math.log(high * (1 + MARGIN)))
    problem = _spectral(x, y, w, places)
    excess = None if sigma is None else _excess(problem)
    mean, variance = _weighed(problem, known=sigma is not None and excess is None)
    return AddendaCurve(low, high, int(x.size), excess, CubicSpline(places, mean), places, np.sqrt(variance))


def _places(x: FloatArray, first: float, last: float) -> FloatArray:
    """Return the points themselves, some places between each two, and the ends of what is covered; ascending."""
    share = np.arange(_BETWEEN + 1) / (_BETWEEN + 1)
    inner = x[:-1, None] + np.diff(x)[:, None] * share
    return np.concatenate([[first], inner.ravel(), [x[-1], last]])


def _averaged(
    temperature: FloatArray, heat_capacity: FloatArray, sigma: FloatArray | None
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return ln T, ln C and the weight of repeats averaged: 1/variance of ln C, or their number without sigma."""
    order = np.argsort(temperature, kind="stable")
    x, y = np.log(temperature[order]), np.log(heat_capacity[order])
    w = np.ones(x.size) if sigma is None else np.square(heat_capacity[order] / sigma[order])
    width = _REPEAT
    while (starts := _starts(x, width)).size > _MOST:
        width *= 1.5
    total = np.add.reduceat(w, starts)
    return np.add.reduceat(w * x, starts) / total, np.add.reduceat(w * y, starts) / total, total


def _starts(x: FloatArray, width: float) -> NDArray[np.intp]:
    """Return where each group begins: it holds all points within `width` of its first one; x ascends."""
    starts, position = [], 0
    while position < x.size:
        starts.append(position)
        position = int(np.searchsorted(x, x[position] + width, side="right"))
    return np.array(starts, dtype=np.intp)


# ------------------------------------------------------------------------------------------------------ the algebra


@dataclass(frozen=True)
class _Spectral:
    """The problem in the coordinates that smoothing acts on one by one.

    `level` is the parabola at the places and `spread` its variance per unit variance of the points; `z` are the
    contrasts of the points that are free of the parabola, with variances s^2 (1 + rho d), where rho is the strength of
    the process over s^2; `gain` takes them to the places; `prior` is the variance there per unit strength.
    """

    level: FloatArray
    spread: FloatArray
    z: FloatArray
    d: FloatArray
    gain: FloatArray
    prior: FloatArray


def _kernel(a: FloatArray, b: FloatArray) -> FloatArray:
    """Covariance of a twice integrated Wiener process that starts at 0, unit strength."""
    low, high = np.minimum(a[:, None], b[None, :]), np.maximum(a[:, None], b[None, :])
    gap = high - low
    return np.asarray(low**3 * (low * low / 20 + gap * low / 8 + gap * gap / 12))


def _parabola(x: FloatArray) -> FloatArray:
    return np.stack([np.ones_like(x), x - 0.5, (x - 0.5) ** 2], axis=1)


def _spectral(x: FloatArray, y: FloatArray, w: FloatArray, places: FloatArray) -> _Spectral:
    first, span = places[0], places[-1] - places[0]
    own, there = (x - first) / span, (places - first) / span
    root = np.sqrt(w)
    shape = root[:, None] * _parabola(own)
    q, _ = np.linalg.qr(shape, mode="complete")
    free = q[:, 3:]
    kernel = root[:, None] * _kernel(own, own) * root[None, :]
    d, turn = np.linalg.eigh(free.T @ kernel @ free)
    contrasts = free @ turn
    back = _parabola(there) @ np.linalg.pinv(shape)
    across, onto = _kernel(there, own) * root[None, :], back @ kernel
    prior = there**5 / 20 + np.einsum("ij,ij->i", onto - 2 * across, back)
    return _Spectral(
        level=back @ (root * y),
        spread=np.einsum("ij,ij->i", back, back),
        z=contrasts.T @ (root * y),
        d=np.maximum(d, 0.0),
        gain=(across - onto) @ contrasts,
        prior=np.maximum(prior, 0.0),
    )


def _strengths(problem: _Spectral) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return strengths rho from none to all of the shape, and for each the log determinant and sum of squares."""
    d = problem.d
    rho = np.geomspace(1e-3 / d.max(), 1e3 / max(float(np.median(d)), 1e-9 * d.max()), _STRENGTHS)
    loss = 1 + rho[:, None] * d
    return rho, np.log(loss).sum(axis=1), (problem.z**2 / loss).sum(axis=1)


def _excess(problem: _Spectral) -> float | None:
    """Return how many times the stated scatter the points have, where that is clear; None where it is not.

    Clear is a likelihood, all strengths weighed, that rises by more than 2 (95 % for one more parameter).
    """
    _, log_loss, squares = _strengths(problem)
    s2 = np.geomspace(1, 1e4, 81)
    evidence = logsumexp(-0.5 * (log_loss + squares / s2[:, None]), axis=1) - 0.5 * problem.z.size * np.log(s2)
    best = int(evidence.argmax())
    return math.sqrt(s2[best]) if evidence[best] > evidence[0] + 2 else None


def _weighed(problem: _Spectral, known: bool) -> tuple[FloatArray, FloatArray]:
    """Return mean and variance of ln C at the places, all strengths weighed by their restricted likelihood.

    With `known` the variance of unit weight is 1, as the weights say; else it is estimated, and u is the standard
    deviation of the t-distribution that follows (JCGM 101:2008, 6.4.9; number of the clause from memory), with three
    degrees of freedom where there are fewer.
    """
    rho, log_loss, squares = _strengths(problem)
    freedom = problem.z.size
    s2 = np.ones(rho.size) if known else np.maximum(squares / freedom, 1e-20)
    log_weight = -0.5 * log_loss - (0.5 * squares if known else 0.5 * freedom * np.log(s2))
    weight = np.exp(log_weight - logsumexp(log_weight))
    shrunk = rho[:, None] / (1 + rho[:, None] * problem.d)
    means = (shrunk * problem.z) @ problem.gain.T
    mean = weight @ means
    inner = rho[:, None] * problem.prior - (rho[:, None] * shrunk) @ np.square(problem.gain).T + problem.spread
    variance = weight @ (s2[:, None] * np.maximum(inner, 0.0) + np.square(means - mean))
    if not known:
        variance = variance * (max(freedom, 3) / (max(freedom, 3) - 2))
    return problem.level + mean, variance

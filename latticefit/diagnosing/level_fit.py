"""How many modes the data show by their shape alone: one small robust fit that knows nothing of formula and masses."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from ..constants import GAS_CONSTANT, NORMAL_MEDIAN
from ..fitting import Solution, covariance, minimise
from ..functions import debye_heat_capacity, einstein_heat_capacity
from ..models import Model, Parametrisation, build_model, heat_capacity, theta_debye_moment, total_modes
from ..records import FloatArray, PreparedData

__all__ = ["ModeCount", "count_modes", "shape_uncertainty"]

_MODEL = ("debye + einstein", "anharmonic")
_FEWEST, _NARROWEST = 6, 2.0  # points, and the factor in T that they must span
_CUT = 0.15  # of Tmax: points below it tell of dispersion, not of the number of modes
_WARM, _PLATEAU = 350.0, 0.8  # K, of C(Tmax): points above both tell of Cp - Cv only
_LOW, _HIGH = 0.05, 2.5  # times Tmax, of a theta: modes above are hardly seen, and would take up any amount
_FLOOR = 0.005  # relative; two bands follow the spectrum of a solid no better than this
_MOST_POINTS = 60
_GRID = 12
_STARTS = 2
_ROBUST = 2.5  # standard deviations beyond which a point (of a peak) loses its weight

# a theta_D[m=2], where a T is what Cp - Cv adds to C: near 0.03 for copper, 0.05 for aluminium and alkali halides,
# 0.1 for alkali metals (orders of magnitude, from memory)
_DILATION, _U_DILATION = 0.03, 0.03
_U_GAMMA = 0.04  # beside it: gamma T of a metal whose data do not reach low enough to show gamma
_COLD = 0.03  # of Tmax: gamma is seen below
_LARGEST_GAMMA = 0.15  # of C(Tmax): a larger C/T at low T is not that at high T (heavy electrons, a Schottky tail)
_NODES = (0.0, -1.0, 1.0, -2.0, 2.0)  # standard deviations of the dilation

_U_SHAPE = 0.012  # relative, at Tmax = theta and above; measured on invented solids, scripts/level_cases.py


@dataclass(frozen=True)
class ModeCount:
    """Modes per formula unit as the data show them, and their standard uncertainty.

    `theta` is theta_D[m=2] of the shape, `top` the highest temperature of the points that were used, K.
    """

    modes: float
    u: float
    theta: float
    top: float


@dataclass(frozen=True)
class _Points:
    T: FloatArray
    C: FloatArray
    sigma: FloatArray


def shape_uncertainty(theta: float, top: float) -> float:
    """Relative u of a count of modes by a few Debye and Einstein terms, for real spectra are none of these.

    Parameters
    ----------
    theta, top : float
        theta_D[m=2] and the highest temperature, K.
    """
    return _U_SHAPE * max(1.0, theta / top) ** 2


def count_modes(prepared: PreparedData) -> ModeCount | None:
    """Count the modes that the data show, by a fit of debye + einstein with both mode counts free.

    Only points above 0.15 Tmax are used: those below show the dispersion, not the number of modes. An electronic part
    is taken off first where low temperatures show it. What Cp - Cv adds is held at several sizes, (3 ± 3) % at theta,
    and the fits are averaged with the weights that these and the data give them; a point far off (a peak) loses its
    weight. The u holds noise, that average, and 1.2 % (more where the data end below theta) for the shape of real
    spectra.

    Returns
    -------
    ModeCount or None
        None for fewer than 6 points, where they span less than a factor of 2 in T, or where no fit succeeds.
    """
    sample, quantity = prepared.measurement.sample, prepared.measurement.quantity
    T, C = np.asarray(prepared.temperature), np.asarray(prepared.heat_capacity)
    gamma = 0.0 if sample.insulator else _gamma(T, C)
    points = _chosen(T, C - (gamma or 0.0) * T, np.asarray(prepared.sigma))
    if points.T.size < _FEWEST or points.T[-1] < _NARROWEST * points.T[0]:
        return None
    dilation = (_DILATION, _U_DILATION) if quantity == "Cp" else (0.0, 0.0)
    spread = float(np.hypot(dilation[1], _U_GAMMA if gamma is None else 0.0))
    model = build_model(*_MODEL)
    first = _first(model, points)
    theta = _theta(model, first)
    if not (np.isfinite(theta) and np.isfinite(first.chi_square)):
        return None
    held = _held(first, dilation[0] / theta)
    points = _robust(model, held, points)
    fits = [
        _fit(_held(held, (dilation[0] + z * spread) / theta), points) for z in _NODES[: len(_NODES) if spread else 1]
    ]
    return _average(model, fits, points)


def _gamma(T: FloatArray, C: FloatArray) -> float | None:
    """C/T as T -> 0, J/(mol K^2), from a straight line in T^2 and never above the least C/T; None where not seen."""
    if (T <= _COLD * T[-1]).sum() < 3:
        return None
    low = T <= max(2 * T[0], T[3])
    line = np.column_stack([np.ones(low.sum()), (T[low] / T[0]) ** 2])
    intercept = np.linalg.lstsq(line, C[low] / T[low], rcond=None)[0][0]
    gamma = max(0.0, min(float(intercept), float((C / T).min())))
    return gamma if gamma * T[-1] <= _LARGEST_GAMMA * C[-1] else None


def _chosen(T: FloatArray, C: FloatArray, sigma: FloatArray) -> _Points:
    """The points above the cut, thinned from the top, sigma lowered accordingly and with its floor."""
    top = max(_WARM, float(T[C >= _PLATEAU * C[-1]].min(initial=np.inf)))
    top = min(top, float(T[-1]))
    chosen = np.flatnonzero((T >= _CUT * top) & (top >= T) & (C > 0))
    step = max(1, chosen.size // _MOST_POINTS)
    kept = chosen[::-1][::step][::-1]
    return _Points(T[kept], C[kept], np.hypot(sigma[kept], _FLOOR * C[kept]) / np.sqrt(step))


def _parametrisation(model: Model, points: _Points) -> Parametrisation:
    top, free = float(points.T[-1]), np.arange(len(model.names) - 1)
    scale = np.array([spec.role == "scale" for spec in model.specs])
    low = np.where(scale, _LOW * top, 0.0)
    high = np.where(scale, _HIGH * top, 100 * float(points.C.max()) / GAS_CONSTANT)
    low[-1], high[-1] = -np.inf, np.inf
    base = np.full(len(model.names), np.nan)
    base[-1] = 0.0
    return Parametrisation(model, base, free, None, 0.0, low, high)


def _first(model: Model, points: _Points) -> Solution:
    """The best fit without Cp - Cv, from the best pairs of temperatures on a coarse grid."""
    par = _parametrisation(model, points)
    ln_grid = np.linspace(np.log(2 * _LOW), np.log(_HIGH), _GRID)
    debye, einstein = (points.T[-1] * np.exp(ln_grid + offset) for offset in (0.0, -0.1))
    columns = GAS_CONSTANT * np.concatenate(
        [
            np.asarray(debye_heat_capacity(debye[:, None] / points.T)),
            np.asarray(einstein_heat_capacity(einstein[:, None] / points.T)),
        ]
    )
    columns = columns / points.sigma
    target = points.C / points.sigma
    gram, seen = columns @ columns.T, columns @ target
    i, j = (each.ravel() for each in np.meshgrid(np.arange(_GRID), np.arange(_GRID, 2 * _GRID), indexing="ij"))
    modes, misfit = _pairs(gram[i, i], gram[j, j], gram[i, j], seen[i], seen[j])
    starts = np.column_stack([debye[i], modes[0], einstein[j - _GRID], modes[1], np.zeros(i.size)])
    best = np.argsort(misfit)[:_STARTS]
    found = [minimise(par, starts[k], *_data(points), tolerance=1e-6) for k in best]
    return min(found, key=lambda each: each.chi_square)


def _pairs(
    first: FloatArray, second: FloatArray, mixed: FloatArray, seen: FloatArray, also: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Solve many normal equations of two amplitudes that may not be negative: amplitudes (2, n), chi-square but a term.

    Where one comes out negative, the better of the two alone is the solution.
    """
    determinant = np.maximum(first * second - mixed**2, 1e-12 * first * second)
    both = np.array([second * seen - mixed * also, first * also - mixed * seen]) / determinant
    alone = np.where(seen**2 / first > also**2 / second, [seen / first, 0 * also], [0 * seen, also / second])
    modes = np.where((both >= 0).all(axis=0), both, alone)
    gained = modes[0] * seen + modes[1] * also
    return modes, modes[0] ** 2 * first + modes[1] ** 2 * second + 2 * modes[0] * modes[1] * mixed - 2 * gained


def _data(points: _Points) -> tuple[FloatArray, FloatArray, FloatArray]:
    return points.T, points.C, points.sigma


def _theta(model: Model, solution: Solution) -> float:
    values = np.asarray(solution.values)
    found = theta_debye_moment(2, model, values) if total_modes(model, values) > 0 else None
    return float("nan") if found is None else found


def _held(solution: Solution, dilation: float) -> Solution:
    """The same start with the coefficient of Cp - Cv held at a value, 1/K."""
    values, base = np.array(solution.values), np.array(solution.parametrisation.base)
    values[-1] = base[-1] = dilation
    return replace(solution, values=values, parametrisation=replace(solution.parametrisation, base=base))


def _fit(start: Solution, points: _Points) -> Solution:
    return minimise(start.parametrisation, start.values, *_data(points), tolerance=1e-7)


def _robust(model: Model, start: Solution, points: _Points) -> _Points:
    """The points with the sigma of those far off enlarged, so that they pull with a bounded force."""
    solution = _fit(start, points)
    off = np.abs(points.C - heat_capacity(model, points.T, np.asarray(solution.values))) / points.sigma
    scale = max(1.0, NORMAL_MEDIAN * float(np.median(off)))
    return replace(points, sigma=points.sigma * scale * np.maximum(1.0, off / (_ROBUST * scale)))


def _average(model: Model, fits: list[Solution], points: _Points) -> ModeCount:
    """Average over the fits, each weighted by its misfit and by how usual its Cp - Cv is."""
    picked = np.array([float(i in model.modes) for i in range(len(model.names))])
    modes = np.array([total_modes(model, np.asarray(each.values)) for each in fits])
    thetas = np.array([_theta(model, each) for each in fits])
    misfit = np.array([each.chi_square for each in fits])
    per_freedom = max(1.0, float(misfit.min()) / max(points.T.size - 4, 1))
    noise = [picked @ covariance(each.parametrisation, each.values, *_data(points)).matrix @ picked for each in fits]
    log_weight = -0.5 * ((misfit - misfit.min()) / per_freedom + np.square(_NODES[: len(fits)]))
    weight = np.exp(log_weight) / np.exp(log_weight).sum()
    mean, theta = float(weight @ modes), float(weight @ thetas)
    variance = float(weight @ (np.array(noise) * per_freedom + (modes - mean) ** 2))
    top = float(points.T[-1])
    shape = mean * shape_uncertainty(theta, top)
    return ModeCount(mean, float(np.hypot(np.sqrt(variance), shape)), theta, top)

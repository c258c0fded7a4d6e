"""The fit that a user gets, and many warm-started ones, against scipy's curve_fit over a quadrature-based model."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import curve_fit

from benchmarks.functions import quadrature_heat_capacity
from benchmarks.measuring import Row, best_time, cost_row, in_turn, ratio_row
from latticefit.constants import GAS_CONSTANT
from latticefit.fitting import minimise, minimise_with_lmfit, parametrise
from latticefit.models import Parametrisation, build_model, heat_capacity
from latticefit.records import ModelSettings, Sample

__all__ = ["fits_section"]

FloatArray = NDArray[np.float64]

_SEED = 3
_POINTS, _NOISE = 300, 0.005
_TRUTH = np.array([240.0, 3.2, 480.0, 2.4, 1.5e-3])  # Debye theta and modes, Einstein theta and modes, gamma
_START = 1.2 * _TRUTH
_REFITS = 1000
_SAME = 1e-3  # two minima are the same when no parameter differs by more standard uncertainties than this


@dataclass(frozen=True)
class _Problem:
    """Debye + Einstein + gamma T, five free parameters, with 300 noisy points from 2 to 300 K."""

    parametrisation: Parametrisation
    T: FloatArray
    measured: FloatArray
    sigma: FloatArray

    @property
    def data(self) -> tuple[FloatArray, FloatArray, FloatArray]:
        return self.T, self.measured, self.sigma


def _problem(random: np.random.Generator) -> _Problem:
    terms = "debye + einstein + electronic"
    model = build_model(terms)
    T = np.geomspace(2, 300, _POINTS)
    exact = heat_capacity(model, T, _TRUTH)
    sigma = _NOISE * exact
    measured = exact + sigma * random.standard_normal(_POINTS)
    parametrisation = parametrise(model, ModelSettings(terms, "free"), Sample("benchmark"), T, measured)
    return _Problem(parametrisation, T, measured, sigma)


def naive_model(
    T: FloatArray, theta_debye: float, modes_debye: float, theta_einstein: float, modes_einstein: float, gamma: float
) -> FloatArray:
    """Return the same model as it is usually written, J/(mol K)."""
    debye = np.array([quadrature_heat_capacity(theta_debye / each) for each in T])
    x = theta_einstein / T
    einstein = x**2 * np.exp(x) / (np.exp(x) - 1) ** 2
    return np.asarray(GAS_CONSTANT * (modes_debye * debye + modes_einstein * einstein) + gamma * T)


def fits_section() -> list[Row]:
    """Time one fit from the same start both ways, and a thousand refits of fresh noise from the minimum."""
    random = np.random.default_rng(_SEED)
    problem = _problem(random)
    par, T, sigma = problem.parametrisation, problem.T, problem.sigma

    def naive_fit() -> tuple[FloatArray, FloatArray]:
        values, covariance = curve_fit(naive_model, T, problem.measured, p0=_START, sigma=sigma, absolute_sigma=True)
        return values, np.sqrt(np.diag(covariance))

    own = minimise_with_lmfit(par, _START, *problem.data)
    fresh = heat_capacity(par.model, T, own.values) + sigma * random.standard_normal((_REFITS, _POINTS))
    times = in_turn(
        "fits",
        {
            "curve_fit": lambda: best_time(naive_fit),
            "lmfit": lambda: best_time(lambda: minimise_with_lmfit(par, _START, *problem.data)),
            "refits": lambda: best_time(lambda: [minimise(par, own.values, T, each, sigma) for each in fresh]),
        },
    )
    naive_values, u = naive_fit()
    shift = float(np.max(np.abs(own.values - naive_values) / u))
    failed = sum(not minimise(par, own.values, T, each, sigma).converged for each in fresh)
    naive, lmfit, refits = (times[name] for name in ("curve_fit", "lmfit", "refits"))
    return [
        Row(
            "lmfit and the naive fit: largest difference of a parameter / its u",
            f"<= {_SAME:g}",
            f"{shift:.1e}  (chi-square {own.chi_square:.2f}, {_POINTS} points, seed {_SEED})",
            shift <= _SAME and own.converged,
        ),
        ratio_row(
            "one lmfit fit against curve_fit over a quad model, same start",
            100,
            naive,
            lmfit,
            f"  ({naive * 1e3:.0f} / {lmfit * 1e3:.2f} ms)",
        ),
        cost_row(
            f"{_REFITS} warm-started refits (what a bootstrap will cost) against that naive fit",
            1,
            refits,
            naive,
            f"  ({refits:.3f} / {naive:.3f} s, {failed} not converged)",
        ),
    ]

"""Statistics of the residuals of a fit."""

from __future__ import annotations

from math import floor, log, log10, nan

import numpy as np
from numpy.typing import NDArray
from scipy.stats import chi2, norm

from ..preparing.scatter import repeat_sets
from ..records import FitRecord, FloatArray, PreparedData, ResidualBand, ResidualStatistics
from .lack_of_fit import lack_of_fit

__all__ = ["akaike", "bayes", "durbin_watson", "lag1_correlation", "residual_statistics", "runs_test"]


def akaike(chi_square: float, parameters: int, points: int, known_sigma: bool = True) -> float | None:
    """AICc: chi2 + 2k + 2k(k+1)/(n-k-1) where sigma is known; None where there are too few points for it.

    Where only the relative sizes of sigma are known, chi2 is replaced by n ln(chi2/n) and the scale counts as one more
    parameter. C. M. Hurvich and C.-L. Tsai, Biometrika 76, 297 (1989).
    """
    k = parameters if known_sigma else parameters + 1
    room = points - k - 1
    if room <= 0 or (not known_sigma and chi_square <= 0):
        return None
    misfit = chi_square if known_sigma else points * log(chi_square / points)
    return misfit + 2 * k + 2 * k * (k + 1) / room


def bayes(chi_square: float, parameters: int, points: int, known_sigma: bool = True) -> float | None:
    """BIC: chi2 + k ln n where sigma is known; as `akaike` where it is not. G. Schwarz, Ann. Stat. 6, 461 (1978)."""
    if known_sigma:
        return chi_square + parameters * log(points)
    return None if chi_square <= 0 else points * log(chi_square / points) + (parameters + 1) * log(points)


def _average_ties(T: FloatArray, normalised: FloatArray) -> FloatArray:
    """Residuals with repeats averaged: they are neighbours by design, not by correlation."""
    sets = repeat_sets(T) if T.size > 1 else None
    if sets is None:
        sets = np.unique(T, return_inverse=True)[1].ravel()
    return np.asarray(np.bincount(sets, weights=normalised) / np.sqrt(np.bincount(sets)))


def _by_run(T: FloatArray, normalised: FloatArray, run: NDArray[np.intp]) -> list[FloatArray]:
    return [_average_ties(T[run == each], normalised[run == each]) for each in np.unique(run)]


def durbin_watson(T: FloatArray, normalised: FloatArray, run: NDArray[np.intp]) -> float | None:
    """Sum of squared steps over sum of squares of the normalised residuals, by temperature within each run.

    Near 2 for independent residuals, below 1.2 for correlated ones; None for fewer than three temperatures in
    every run. J. Durbin and G. S. Watson, Biometrika 37, 409 (1950).
    """
    sequences = [each for each in _by_run(T, normalised, run) if each.size >= 3]
    total = sum(float(each @ each) for each in sequences)
    return sum(float((np.diff(each) ** 2).sum()) for each in sequences) / total if total > 0 else None


def lag1_correlation(T: FloatArray, normalised: FloatArray, run: NDArray[np.intp]) -> float | None:
    """Correlation of neighbouring residuals, by temperature within each run; None where it is not defined."""
    sequences = [each for each in _by_run(T, normalised, run) if each.size >= 3]
    total = sum(float(each @ each) for each in sequences)
    return sum(float(each[:-1] @ each[1:]) for each in sequences) / total if total > 0 else None


def runs_test(T: FloatArray, normalised: FloatArray, run: NDArray[np.intp]) -> tuple[float | None, int]:
    """Two-sided p-value of the number of runs of one sign, and the longest run.

    None with fewer than 10 temperatures or fewer than 3 of one sign, where the normal approximation does not hold.
    A. Wald and J. Wolfowitz, Ann. Math. Stat. 11, 147 (1940).
    """
    found = expected = variance = 0.0
    longest = 0
    usable = False
    for each in _by_run(T, normalised, run):
        signs = each[each != 0] > 0
        if signs.size == 0:
            continue
        breaks = np.flatnonzero(np.diff(signs.astype(int)))
        longest = max(longest, int(np.diff(np.concatenate([[-1], breaks, [signs.size - 1]])).max()))
        up, down = float(signs.sum()), float(signs.size - signs.sum())
        if signs.size < 10 or min(up, down) < 3:
            continue
        n = up + down
        usable = True
        found += breaks.size + 1
        expected += 2 * up * down / n + 1
        variance += 2 * up * down * (2 * up * down - n) / (n * n * (n - 1))
    if not usable or variance <= 0:
        return None, longest
    return float(2 * norm.sf(abs(found - expected) / np.sqrt(variance))), longest


def _bands(T: FloatArray, percent: FloatArray) -> tuple[ResidualBand, ...]:
    bands = []
    for power in range(floor(log10(T.min())), floor(log10(T.max())) + 1):
        low, high = 10.0**power, 10.0 ** (power + 1)
        inside = (low <= T) & (high > T)
        if inside.any():
            own = percent[inside]
            bands.append(
                ResidualBand(low, high, int(inside.sum()), float(np.sqrt(np.mean(own**2))), float(np.abs(own).max()))
            )
    return tuple(bands)


def residual_statistics(
    prepared: PreparedData, fit: FitRecord, residual: FloatArray, percent: FloatArray, normalised: FloatArray
) -> ResidualStatistics:
    """Everything the report says in numbers about the residuals.

    Parameters
    ----------
    prepared : PreparedData
    fit : FitRecord
    residual, percent, normalised : ndarray, shape (n,)
        Residuals of the fitted points in J/(mol K), in percent of the model, and divided by sigma.
    """
    T, run = prepared.temperature, prepared.run
    n, k, dof = T.size, fit.free_parameters, fit.degrees_of_freedom
    p_runs, longest = runs_test(T, normalised, run)
    worst = int(np.argmax(np.abs(percent)))
    return ResidualStatistics(
        reduced_chi_square=fit.chi_square / dof if dof > 0 else None,
        chi_square_p=float(chi2.sf(fit.chi_square, dof)) if dof > 0 else None,
        aicc=akaike(fit.chi_square, k, n, not prepared.sigma_assumed),
        bic=bayes(fit.chi_square, k, n, not prepared.sigma_assumed),
        rms_percent=float(np.sqrt(np.mean(percent**2))),
        max_abs_percent=float(np.abs(percent[worst])),
        max_abs_percent_temperature=float(T[worst]),
        durbin_watson=durbin_watson(T, normalised, run),
        lag1_correlation=lag1_correlation(T, normalised, run),
        runs_test_p=p_runs,
        longest_run=longest,
        bands=_bands(T, percent),
        entropy_miss=float(np.trapezoid(residual / T, T)),
        energy_miss=float(np.trapezoid(residual, T)),
        run_means_percent=tuple(
            float(percent[run == k].mean()) if (run == k).any() else nan
            for k in range(len(prepared.measurement.readings))
        ),
        lack_of_fit=lack_of_fit(prepared, fit, residual),
    )

"""The named warnings on a fit: one function each, and one registry.

A new warning is one function here (or in a file beside this one) and one line in `RULES`.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from ..models import Model, low_temperature_theta, total_modes
from ..records import FitRecord, NamedWarning, PreparedData, ResidualStatistics
from .verdict import MISFIT

__all__ = ["REACH_STOP", "REACH_WARN", "RULES", "Case", "find_warnings"]

REACH_STOP = 30.0
"""theta_D(T->0) is withheld when theta/Tmin is below this: a good fit can then be 2 to 13 % wrong."""

REACH_WARN = 50.0
"""theta_D(T->0) carries a warning when theta/Tmin is below this."""

_CORRELATION = 0.95
_POINTS_PER_PARAMETER = 5
_SIGMA_OVERSTATED = 0.5
_MODE_SUM = 0.02
_DURBIN_WATSON = 1.2
_RUNS_P = 0.01


@dataclass(frozen=True)
class Case:
    """What a rule looks at."""

    prepared: PreparedData
    model: Model
    fit: FitRecord
    statistics: ResidualStatistics

    @property
    def theta(self) -> float | None:
        """theta_D(T->0) as fitted, K; None where the model has none."""
        return low_temperature_theta(self.model, self.fit.values, self.fit.atoms)


def _low_temperature_reach(case: Case) -> NamedWarning | None:
    if case.theta is None:
        return None
    lowest = float(case.prepared.temperature[0])
    ratio = case.theta / lowest
    if ratio >= REACH_WARN:
        return None
    stop = ratio < REACH_STOP
    withheld = "it is withheld" if stop else "quote it only with that remark"
    return NamedWarning(
        code="low-temperature-reach",
        level="stop" if stop else "warn",
        concerns="theta_debye_low_temperature",
        message=(
            f"the lowest fitted point, {lowest:.3g} K, is theta/{ratio:.0f}; theta_D(T->0) follows from the choice of "
            f"model there, not from the data: {withheld}"
        ),
        found=ratio,
        threshold=REACH_STOP if stop else REACH_WARN,
        advice=f"measure a few points between {case.theta / 100:.2g} and {case.theta / REACH_WARN:.2g} K",
    )


def _model_misfit(case: Case) -> NamedWarning | None:
    reduced, p = case.statistics.reduced_chi_square, case.statistics.chi_square_p
    if reduced is None or p is None or reduced <= MISFIT or p >= 1e-3:
        return None
    return NamedWarning(
        code="model-misfit",
        level="warn",
        concerns="fit",
        message="the model does not describe the data; its parameters are those of the best wrong model",
        found=reduced,
        threshold=MISFIT,
        advice="add a term, mask an anomaly, allow for Cp-Cv, or check the stated uncertainties",
    )


def _sigma_overstated(case: Case) -> NamedWarning | None:
    reduced = case.statistics.reduced_chi_square
    if case.prepared.sigma_kind != "stated" or reduced is None or reduced >= _SIGMA_OVERSTATED:
        return None
    return NamedWarning(
        code="sigma-overstated",
        level="note",
        concerns="uncertainty",
        message="the residuals are smaller than the stated uncertainties: those are cautious, or the table is smoothed",
        found=reduced,
        threshold=_SIGMA_OVERSTATED,
        advice="u follows the stated uncertainties and is cautious too; chi-square is blunt as a test here",
    )


def _sigma_assumed(case: Case) -> NamedWarning | None:
    if "assumed" not in case.prepared.sigma_text:
        return None
    return NamedWarning(
        code="sigma-assumed",
        level="note",
        concerns="uncertainty",
        message=f"no uncertainty was stated and none could be estimated: {case.prepared.sigma_text}",
        found=None,
        threshold=None,
        advice="state one, e.g. --sigma '0.5%'",
    )


def _correlated_residuals(case: Case) -> NamedWarning | None:
    dw, p = case.statistics.durbin_watson, case.statistics.runs_test_p
    low = dw is not None and not _DURBIN_WATSON <= dw <= 4 - _DURBIN_WATSON
    if not low and (p is None or p >= _RUNS_P):
        return None
    rho = min(max(case.statistics.lag1_correlation or 0.0, 0.0), 0.99)
    return NamedWarning(
        code="correlated-residuals",
        level="warn",
        concerns="uncertainty",
        message=(
            f"neighbouring residuals go together (correlation {rho:.2f}): uncertainties from the scatter alone are "
            f"too small by about {((1 + rho) / (1 - rho)) ** 0.5:.1f}"
        ),
        found=dw if low else p,
        threshold=_DURBIN_WATSON if low else _RUNS_P,
        advice="look at the residuals: a wave means a missing term, a step a join of runs, smoothness a smoothed table",
    )


def _parameter_at_bound(case: Case) -> NamedWarning | None:
    names = [each.name for each in case.fit.parameters if each.status == "at_bound"]
    if not names:
        return None
    return NamedWarning(
        code="parameter-at-bound",
        level="warn",
        concerns=", ".join(names),
        message=f"{', '.join(names)} ended at a bound; no symmetric uncertainty can be given there",
        found=", ".join(names),
        threshold=None,
        advice="leave the term out, or widen the bound if it is yours",
    )


def _undetermined_parameters(case: Case) -> NamedWarning | None:
    names = [each.name for each in case.fit.parameters if each.status == "undetermined"]
    if not names:
        return None
    return NamedWarning(
        code="undetermined-parameters",
        level="stop",
        concerns=", ".join(names),
        message=f"the data do not determine {', '.join(names)}; their uncertainty is withheld",
        found=", ".join(names),
        threshold=None,
        advice="use fewer terms, or fix one of them from other knowledge",
    )


def _strong_correlation(case: Case) -> NamedWarning | None:
    free = [k for k, each in enumerate(case.fit.parameters) if each.status == "fitted"]
    u = np.sqrt(np.diag(case.fit.covariance)[free])
    if len(free) < 2 or not np.all(u > 0):
        return None
    correlation = np.abs(case.fit.covariance[np.ix_(free, free)] / np.outer(u, u) - np.eye(len(free)))
    i, j = np.unravel_index(int(correlation.argmax()), correlation.shape)
    found = float(correlation[i, j])
    if found <= _CORRELATION:
        return None
    pair = f"{case.fit.names[free[int(i)]]} and {case.fit.names[free[int(j)]]}"
    return NamedWarning(
        code="strong-correlation",
        level="warn",
        concerns=pair,
        message=f"{pair} are measured only in combination (correlation {found:.3f})",
        found=found,
        threshold=_CORRELATION,
        advice="quote sums and derived values (S, H, moments) rather than the single parameters",
    )


def _not_unique(case: Case) -> NamedWarning | None:
    if case.fit.distinct_minima <= 1:
        return None
    return NamedWarning(
        code="not-unique",
        level="warn",
        concerns="parameters",
        message=f"{case.fit.distinct_minima} different sets of parameters describe the data equally well",
        found=float(case.fit.distinct_minima),
        threshold=1.0,
        advice="use fewer terms",
    )


def _few_points(case: Case) -> NamedWarning | None:
    k = case.fit.free_parameters
    ratio = case.prepared.temperature.size / k if k else float("inf")
    if ratio >= _POINTS_PER_PARAMETER:
        return None
    return NamedWarning(
        code="few-points",
        level="note",
        concerns="fit",
        message=f"{case.prepared.temperature.size} points for {k} free parameters",
        found=ratio,
        threshold=float(_POINTS_PER_PARAMETER),
        advice="use fewer terms, or measure more points",
    )


def _cp_cv_missing(case: Case) -> NamedWarning | None:
    theta = case.theta
    if theta is None or case.prepared.measurement.quantity != "Cp" or case.model.cp_cv.parameter is not None:
        return None
    ratio = float(case.prepared.temperature[-1]) / theta
    if ratio <= 0.5:
        return None
    return NamedWarning(
        code="cp-cv-missing",
        level="warn",
        concerns="theta_debye_moment, modes",
        message="the data are Cp up to above theta/2, where Cp-Cv is 1 % or more, and the model has no form for it",
        found=ratio,
        threshold=0.5,
        advice="use --cp-cv nernst-lindemann; characteristic temperatures are biased without it, S and H hardly",
    )


def _mode_sum(case: Case) -> NamedWarning | None:
    if case.fit.mode_sum != "free" or case.fit.atoms is None:
        return None
    ratio = total_modes(case.model, case.fit.values) / (3 * case.fit.atoms)
    if abs(ratio - 1) <= _MODE_SUM:
        return None
    return NamedWarning(
        code="mode-sum",
        level="warn",
        concerns="modes",
        message=f"the fitted modes add up to {ratio:.3f} times the three per atom of the formula",
        found=ratio - 1,
        threshold=_MODE_SUM,
        advice="check mass, molar mass, formula, addenda and Cp-Cv; or the data end too low to show the sum",
    )


RULES: tuple[Callable[[Case], NamedWarning | None], ...] = (
    _low_temperature_reach,
    _model_misfit,
    _undetermined_parameters,
    _parameter_at_bound,
    _not_unique,
    _strong_correlation,
    _correlated_residuals,
    _cp_cv_missing,
    _mode_sum,
    _sigma_overstated,
    _sigma_assumed,
    _few_points,
)
"""Every warning on a fit."""


def find_warnings(case: Case) -> tuple[NamedWarning, ...]:
    """Return the warnings that apply."""
    return tuple(found for rule in RULES if (found := rule(case)) is not None)

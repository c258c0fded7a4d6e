"""The registry of named warnings. A new one is one function in a file of rules and one line here."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from types import MappingProxyType

from ..records import NamedWarning
from . import correction_rules, data_rules, fit_rules, level_rules, point_rules, range_rules
from .case import Case

__all__ = ["RULES", "find_warnings"]

_RULES: dict[str, Callable[[Case], NamedWarning | None]] = {
    "implausible-level": level_rules.implausible_level,
    "addenda-share": correction_rules.addenda_share,
    "low-temperature-reach": range_rules.reach_down,
    "high-temperature-reach": range_rules.reach_up,
    "above-classical-limit": level_rules.above_classical_limit,
    "sigma-understated": data_rules.sigma_understated,
    "cp-cv-from-melting-point": range_rules.cp_cv_from_melting_point,
    "repeats-fitted-singly": data_rules.repeats,
    "first-points-averaged": data_rules.first_points_averaged,
    "replicate-spread": point_rules.replicate_spread,
    "suspected-feature": point_rules.suspected_feature,
    "run-overlap": point_rules.run_overlap,
    "runs-differ": data_rules.runs_differ,
    "model-misfit": fit_rules.model_misfit,
    "lack-of-fit": point_rules.lack_of_fit,
    "undetermined-parameters": fit_rules.undetermined_parameters,
    "parameter-at-bound": fit_rules.parameter_at_bound,
    "not-unique": fit_rules.not_unique,
    "strong-correlation": fit_rules.strong_correlation,
    "correlated-residuals": data_rules.correlated_residuals,
    "outliers": point_rules.outliers,
    "gamma-reach": range_rules.gamma_reach,
    "cp-cv-missing": range_rules.cp_cv_missing,
    "mode-sum": level_rules.mode_sum,
    "sigma-overstated": data_rules.sigma_overstated,
    "sigma-assumed": data_rules.sigma_assumed,
    "few-points": data_rules.few_points,
    "addenda-uncertainty": correction_rules.addenda_uncertainty,
    "mass-uncertainty": correction_rules.mass_uncertainty,
}

RULES: Mapping[str, Callable[[Case], NamedWarning | None]] = MappingProxyType(_RULES)
"""Every warning on a fit, by its code: a view, so that whoever imports it sees what is registered."""


def find_warnings(case: Case) -> tuple[NamedWarning, ...]:
    """Return the warnings that apply."""
    return tuple(found for rule in RULES.values() if (found := rule(case)) is not None)

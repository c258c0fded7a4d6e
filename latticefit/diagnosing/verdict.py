"""Whether the model describes the data, in words."""

from __future__ import annotations

from typing import Literal

from ..records import FitRecord, PreparedData, ResidualBand, ResidualStatistics, ValidityFact
from ..rounding import percent_text

__all__ = [
    "DURBIN_WATSON",
    "MISFIT",
    "RUNS_P",
    "blame",
    "correlated",
    "misfit",
    "name_of",
    "only_scatter",
    "plain",
    "validity_facts",
    "verdict",
]

MISFIT = 2.0
"""Reduced chi-square above which a model is said not to describe the data (common practice, no source)."""

_UNLIKELY = 1e-3  # upper-tail probability of chi-square below which chance is ruled out
DURBIN_WATSON = 1.2
"""Durbin-Watson below this, or above 4 minus this, means correlated residuals."""

RUNS_P = 0.01
"""Probability of the runs test below which residuals are called correlated."""

_ENOUGH = 15  # degrees of freedom below which the tests for a pattern have no power
_MISSED = 10.0  # rms residual in percent within a decade above which a model has missed it
_CONDITION = 1e8


def _worst(bands: tuple[ResidualBand, ...]) -> ResidualBand:
    return max(bands, key=lambda each: each.rms_percent)


def correlated(statistics: ResidualStatistics) -> bool:
    """Whether neighbouring residuals go together, by the Durbin-Watson or the runs test."""
    dw, p = statistics.durbin_watson, statistics.runs_test_p
    return (dw is not None and not DURBIN_WATSON <= dw <= 4 - DURBIN_WATSON) or (p is not None and p < RUNS_P)


def only_scatter(fit: FitRecord, statistics: ResidualStatistics) -> bool:
    """Whether too large a chi-square comes from scatter without a pattern, which speaks against sigma."""
    tested = statistics.runs_test_p is not None and fit.degrees_of_freedom >= _ENOUGH
    return tested and not correlated(statistics) and _worst(statistics.bands).rms_percent < _MISSED


def misfit(fit: FitRecord, statistics: ResidualStatistics) -> bool:
    """Whether chi-square is too large and chance is ruled out."""
    reduced, p = statistics.reduced_chi_square, statistics.chi_square_p
    return reduced is not None and p is not None and reduced > MISFIT and p < _UNLIKELY


def blame(prepared: PreparedData, fit: FitRecord, statistics: ResidualStatistics) -> Literal["model", "sigma"] | None:
    """What a misfit speaks against: the model, or only the uncertainties; None where there is none to speak of."""
    if prepared.sigma_assumed:
        return "model" if correlated(statistics) or _worst(statistics.bands).rms_percent > _MISSED else None
    if not misfit(fit, statistics):
        return None
    return "sigma" if only_scatter(fit, statistics) else "model"


def verdict(prepared: PreparedData, fit: FitRecord, statistics: ResidualStatistics) -> tuple[bool, str]:
    """Whether the model describes the data, and the sentence that says so.

    A model describes the data unless its reduced chi-square exceeds 2 and chance is ruled out (p < 0.001); scatter
    without any pattern then speaks against sigma and not against the model. Where no degree of freedom is left nothing
    can be said.
    """
    reduced, p = statistics.reduced_chi_square, statistics.chi_square_p
    stated = "the stated uncertainties" if prepared.sigma_kind == "stated" else "the scatter of the points"
    if not fit.converged:
        return False, f"The fit did not converge ({fit.message}); its numbers are not to be used."
    if reduced is None or p is None:
        return False, "As many parameters as points: the model passes through them and nothing tests it."
    if prepared.sigma_assumed:
        return _with_assumed_sigma(prepared, fit, statistics)
    if blame(prepared, fit, statistics) == "sigma":
        return True, (
            f"The model {name_of(fit)!r} follows the data without a pattern in the residuals, but they are "
            f"{plain(reduced**0.5)} times larger than {stated} (reduced chi-square {plain(reduced)}): those are too "
            f"small, or the scatter is real (rms residual {percent_text(statistics.rms_percent)})."
        )
    if blame(prepared, fit, statistics) == "model":
        return False, (
            f"The model {name_of(fit)!r} does not describe the data: the residuals are {plain(reduced**0.5)} times "
            f"larger than {stated} (reduced chi-square {plain(reduced)}); {_where(statistics)}."
        )
    return True, _described(fit, statistics, stated, reduced, p)


def _with_assumed_sigma(prepared: PreparedData, fit: FitRecord, statistics: ResidualStatistics) -> tuple[bool, str]:
    """Without any known sigma only a pattern in the residuals, or a gross miss, speaks against a model."""
    rms = percent_text(statistics.rms_percent)
    if blame(prepared, fit, statistics) == "model":
        return False, (
            f"The model {name_of(fit)!r} does not describe the data: its residuals (rms {rms}) are no mere scatter; "
            f"{_where(statistics)}."
        )
    return True, (
        f"The model {name_of(fit)!r} follows the data with an rms residual of {rms}; whether that is the scatter of "
        "the measurement cannot be told, because no uncertainty was stated and none could be estimated."
    )


def name_of(fit: FitRecord) -> str:
    """Terms of a fit, with its form of Cp-Cv where it has one."""
    return fit.terms if fit.cp_cv == "none" else f"{fit.terms} with {fit.cp_cv}"


def _where(statistics: ResidualStatistics) -> str:
    worst = _worst(statistics.bands)
    return (
        f"between {worst.temperature_low:g} and {worst.temperature_high:g} K the residuals reach "
        f"{percent_text(worst.max_abs_percent)} (rms {percent_text(worst.rms_percent)})"
    )


def _described(fit: FitRecord, statistics: ResidualStatistics, stated: str, reduced: float, p: float) -> str:
    if reduced > 1 and p < _UNLIKELY:
        text = (
            f"The model {name_of(fit)!r} comes close to the data but misses them by more than chance allows "
            f"(reduced chi-square {plain(reduced)}, p = {p:.1g}; {_where(statistics)})"
        )
    elif _worst(statistics.bands).rms_percent > _MISSED:
        text = (
            f"The model {name_of(fit)!r} stays within {stated} (reduced chi-square {plain(reduced)}), but those are "
            f"wide: {_where(statistics)}, so the fit hardly judges the model there"
        )
    else:
        text = (
            f"The model {name_of(fit)!r} describes the data within {stated} (reduced chi-square {plain(reduced)}, "
            f"rms residual {percent_text(statistics.rms_percent)})"
        )
    if correlated(statistics):
        text += "; neighbouring residuals go together, so something systematic remains in them"
    return text + "."


def plain(value: float) -> str:
    """A number to two figures, never as a power of ten."""
    return percent_text(value).removesuffix(" %") if abs(value) <= 1000 else f"{value:.0f}"


def validity_facts(prepared: PreparedData, fit: FitRecord, statistics: ResidualStatistics) -> tuple[ValidityFact, ...]:
    """The yes-or-no facts without which no fit is shown."""
    at_bound = [each.name for each in fit.parameters if each.status == "at_bound"]
    lost = [each.name for each in fit.parameters if each.status == "undetermined"]
    reduced, p = statistics.reduced_chi_square, statistics.chi_square_p
    dw = statistics.durbin_watson
    facts = [
        ValidityFact("converged", fit.converged, f"{fit.evaluations} evaluations; {fit.message}"),
        ValidityFact("no parameter at a bound", not at_bound, ", ".join(at_bound) or "none"),
        ValidityFact("every parameter determined", not lost, ", ".join(lost) or "none is undetermined"),
        ValidityFact(
            "parameters can be told apart",
            fit.condition < _CONDITION,
            f"condition of the scaled covariance {fit.condition:.2g} (limit {_CONDITION:.0e})",
        ),
        ValidityFact(
            "one minimum only",
            fit.distinct_minima <= 1,
            f"{fit.distinct_minima} within a chi-square of 4, {fit.starts_tried} starts",
        ),
    ]
    if reduced is not None and p is not None and not prepared.sigma_assumed:
        facts.append(
            ValidityFact(
                "chi-square within reach of chance",
                not (reduced > 1 and p < _UNLIKELY),
                f"{plain(reduced)} per degree of freedom ({fit.degrees_of_freedom}), upper tail p = {p:.2g}",
            )
        )
    facts.append(
        ValidityFact(
            "residuals independent",
            not correlated(statistics),
            f"Durbin-Watson {'undefined' if dw is None else format(dw, '.2f')}, runs test p = "
            f"{'undefined' if statistics.runs_test_p is None else format(statistics.runs_test_p, '.2g')}, "
            f"longest run {statistics.longest_run}",
        )
    )
    return tuple(facts)

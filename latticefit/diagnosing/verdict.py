"""Whether the model describes the data, in words."""

from __future__ import annotations

from ..records import FitRecord, PreparedData, ResidualBand, ResidualStatistics, ValidityFact

__all__ = ["MISFIT", "validity_facts", "verdict"]

MISFIT = 2.0
"""Reduced chi-square above which a model is said not to describe the data (common practice, no source)."""

_UNLIKELY = 1e-3  # upper-tail probability of chi-square below which chance is ruled out
_CORRELATED = (1.2, 2.8)  # Durbin-Watson outside this range
_RUNS_P = 0.01
_CONDITION = 1e8


def _worst(bands: tuple[ResidualBand, ...]) -> ResidualBand:
    return max(bands, key=lambda each: each.rms_percent)


def _correlated(statistics: ResidualStatistics) -> bool:
    dw, p = statistics.durbin_watson, statistics.runs_test_p
    return (dw is not None and not _CORRELATED[0] <= dw <= _CORRELATED[1]) or (p is not None and p < _RUNS_P)


def verdict(prepared: PreparedData, fit: FitRecord, statistics: ResidualStatistics) -> tuple[bool, str]:
    """Whether the model describes the data, and the sentence that says so.

    A model describes the data unless its reduced chi-square exceeds 2 and chance is ruled out (p < 0.001). Where no
    degree of freedom is left nothing can be said.
    """
    reduced, p = statistics.reduced_chi_square, statistics.chi_square_p
    stated = "the stated uncertainties" if prepared.sigma_kind == "stated" else "the scatter of the points"
    worst = _worst(statistics.bands)
    where = (
        f"between {worst.temperature_low:g} and {worst.temperature_high:g} K the residuals reach "
        f"{worst.max_abs_percent:.2g} % (rms {worst.rms_percent:.2g} %)"
    )
    if not fit.converged:
        return False, f"The fit did not converge ({fit.message}); its numbers are not to be used."
    if reduced is None or p is None:
        return False, "As many parameters as points: the model passes through them and nothing tests it."
    if reduced > MISFIT and p < _UNLIKELY:
        return False, (
            f"The model {fit.terms!r} does not describe the data: the residuals are {reduced**0.5:.2g} times larger "
            f"than {stated} (reduced chi-square {reduced:.3g}); {where}."
        )
    text = (
        f"The model {fit.terms!r} describes the data within {stated} "
        f"(reduced chi-square {reduced:.2g}, rms residual {statistics.rms_percent:.2g} %)"
    )
    if reduced > 1 and p < _UNLIKELY:
        text = (
            f"The model {fit.terms!r} comes close to the data but misses them by more than chance allows "
            f"(reduced chi-square {reduced:.2g}, p = {p:.1g}; {where})"
        )
    if _correlated(statistics):
        text += "; neighbouring residuals go together, so something systematic remains in them"
    return True, text + "."


def validity_facts(fit: FitRecord, statistics: ResidualStatistics) -> tuple[ValidityFact, ...]:
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
    if reduced is not None and p is not None:
        facts.append(
            ValidityFact(
                "chi-square within reach of chance",
                not (reduced > 1 and p < _UNLIKELY),
                f"{reduced:.3g} per degree of freedom ({fit.degrees_of_freedom}), upper tail p = {p:.2g}",
            )
        )
    facts.append(
        ValidityFact(
            "residuals independent",
            not _correlated(statistics),
            f"Durbin-Watson {'undefined' if dw is None else format(dw, '.2f')}, runs test p = "
            f"{'undefined' if statistics.runs_test_p is None else format(statistics.runs_test_p, '.2g')}, "
            f"longest run {statistics.longest_run}",
        )
    )
    return tuple(facts)

"""Named warnings: uncertainties, repeats, runs and number of points."""

from __future__ import annotations

import numpy as np

from ..preparing.scatter import repeat_sets
from ..records import NamedWarning
from ..rounding import percent_text
from .case import Case
from .lack_of_fit import FIRST_OFF, first_of_averaged_sets, first_of_sets
from .verdict import DURBIN_WATSON, MISFIT, RUNS_P, blame, correlated

__all__ = [
    "correlated_residuals",
    "few_points",
    "first_points_averaged",
    "repeats",
    "runs_differ",
    "sigma_assumed",
    "sigma_overstated",
    "sigma_understated",
]

_POINTS_PER_PARAMETER = 5
_SIGMA_OVERSTATED = 0.5
_RUN_PULL = 4.0  # mean normalised residual of a run, in its own standard errors


def sigma_understated(case: Case) -> NamedWarning | None:
    """The points scatter more than their uncertainties say."""
    if blame(case.prepared, case.fit, case.statistics) != "sigma":
        return None
    return NamedWarning(
        code="sigma-understated",
        level="warn",
        concerns="uncertainty",
        message="the points scatter about the model more than their uncertainties say, without any pattern",
        found=case.statistics.reduced_chi_square,
        threshold=MISFIT,
        advice="state larger uncertainties or none; u has been enlarged by the square root of the reduced chi-square",
    )


def sigma_overstated(case: Case) -> NamedWarning | None:
    """The points scatter less than their stated uncertainties say."""
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


def sigma_assumed(case: Case) -> NamedWarning | None:
    """No uncertainty was stated and none could be estimated."""
    if not case.prepared.sigma_assumed:
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


def correlated_residuals(case: Case) -> NamedWarning | None:
    """Neighbouring residuals go together."""
    dw, p = case.statistics.durbin_watson, case.statistics.runs_test_p
    low = dw is not None and not DURBIN_WATSON <= dw <= 4 - DURBIN_WATSON
    if not correlated(case.statistics):
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
        threshold=DURBIN_WATSON if low else RUNS_P,
        advice="look at the residuals: a wave means a missing term, a step a join of runs, smoothness a smoothed table",
    )


def repeats(case: Case) -> NamedWarning | None:
    """Points come in sets of repeats that are fitted one by one."""
    sizes = []
    for run in np.unique(case.prepared.run):
        T = case.prepared.temperature[case.prepared.run == run]
        sets = repeat_sets(T) if T.size > 1 else None
        if sets is not None:
            sizes.append(T.size / (sets[-1] + 1))
    if not sizes:
        return None
    first = first_of_sets(case.prepared)
    off = first is not None and abs(first.mean) > FIRST_OFF * first.u
    settling = (
        f"; the first of each lies {percent_text(100 * abs(first.mean))} {'above' if first.mean > 0 else 'below'} the "
        "others"
        if first is not None and off
        else ""
    )
    return NamedWarning(
        code="repeats-fitted-singly",
        level="warn",
        concerns="uncertainty",
        message=(
            f"points come in sets of {max(sizes):.1f} repeats and are fitted one by one; where a set shares its error, "
            f"u is too small by up to {max(sizes) ** 0.5:.1f}{settling}"
        ),
        found=float(max(sizes)),
        threshold=1.0,
        advice=(
            "the first had not settled: --replicates drop-first leaves it out of each set"
            if off
            else "average each set into one point before the fit: --replicates average"
        ),
    )


def first_points_averaged(case: Case) -> NamedWarning | None:
    """The first point of each set had not settled and was averaged in."""
    first = first_of_averaged_sets(case.prepared)
    if first is None or abs(first.mean) <= FIRST_OFF * first.u:
        return None
    side = "above" if first.mean > 0 else "below"
    return NamedWarning(
        code="first-points-averaged",
        level="warn",
        concerns="data",
        message=f"the first point of each averaged set lies {percent_text(100 * abs(first.mean))} {side} the others",
        found=abs(first.mean) / first.u,
        threshold=FIRST_OFF,
        advice="it had not settled: --replicates drop-first leaves it out of each set",
    )


def runs_differ(case: Case) -> NamedWarning | None:
    """Runs differ by more than their scatter."""
    labels = [each.label for each in case.prepared.measurement.readings]
    if len(labels) < 2:
        return None
    normal = (case.prepared.heat_capacity - case.expected) / case.prepared.sigma
    pulls = [
        float(normal[case.prepared.run == k].sum() / max((case.prepared.run == k).sum(), 1) ** 0.5)
        for k in range(len(labels))
    ]
    worst = max(range(len(labels)), key=lambda k: abs(pulls[k]))
    if abs(pulls[worst]) <= _RUN_PULL:
        return None
    means = ", ".join(
        f"{label} {mean:+.2g} %"
        for label, mean in zip(labels, case.statistics.run_means_percent, strict=True)
        if np.isfinite(mean)
    )
    return NamedWarning(
        code="runs-differ",
        level="warn",
        concerns=labels[worst],
        message=f"the runs do not agree with one model: mean residuals are {means}",
        found=abs(pulls[worst]),
        threshold=_RUN_PULL,
        advice="look for a scale error (mass, addenda, calibration) between the runs where they overlap",
    )


def few_points(case: Case) -> NamedWarning | None:
    """There are few points for the number of parameters."""
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

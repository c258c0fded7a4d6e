"""Named warnings: whether the model describes the data, and which parameters they determine."""

from __future__ import annotations

import numpy as np

from ..records import NamedWarning
from .case import Case
from .verdict import MISFIT, blame

__all__ = [
    "model_misfit",
    "not_unique",
    "parameter_at_bound",
    "strong_correlation",
    "undetermined_parameters",
]

_CORRELATION = 0.95
_INSEPARABLE = 0.999
_LOOSE = 0.1  # relative u from which a strongly correlated parameter is not a measured one


def model_misfit(case: Case) -> NamedWarning | None:
    """The model does not describe the data."""
    if blame(case.prepared, case.fit, case.statistics) != "model":
        return None
    return NamedWarning(
        code="model-misfit",
        level="warn",
        concerns="fit",
        message=(
            "the model does not describe the data; its parameters are those of the best wrong model, and u of "
            "every derived value is withheld: over the fitted points the residuals add up to "
            f"{case.statistics.entropy_miss:+.3g} J/(mol K) in S and {case.statistics.energy_miss:+.3g} J/mol in the "
            "energy, which the model lacks"
        ),
        found=case.statistics.reduced_chi_square,
        threshold=MISFIT,
        advice="add a term, mask an anomaly, allow for Cp-Cv, or check mass, molar mass, formula and uncertainties",
    )


def undetermined_parameters(case: Case) -> NamedWarning | None:
    """The data do not determine a parameter."""
    names = [each.name for each in case.fit.parameters if each.status == "undetermined"]
    if not names:
        return None
    return NamedWarning(
        code="undetermined-parameters",
        level="stop",
        concerns=", ".join(names),
        message=f"the data do not determine {', '.join(names)}; no uncertainty is given",
        found=", ".join(names),
        threshold=None,
        advice="use fewer terms, or fix one of them from other knowledge",
    )


def parameter_at_bound(case: Case) -> NamedWarning | None:
    """A parameter ended at a bound."""
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


def not_unique(case: Case) -> NamedWarning | None:
    """Several sets of parameters are equally good."""
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


def strong_correlation(case: Case) -> NamedWarning | None:
    """The errors of two parameters go together."""
    free = [k for k, each in enumerate(case.fit.parameters) if each.status == "fitted"]
    u = np.sqrt(np.diag(case.fit.covariance)[free])
    if len(free) < 2 or not np.all(u > 0):
        return None
    correlation = np.abs(case.fit.covariance[np.ix_(free, free)] / np.outer(u, u) - np.eye(len(free)))
    i, j = (int(k) for k in np.unravel_index(int(correlation.argmax()), correlation.shape))
    found = float(correlation[i, j])
    if found <= _CORRELATION:
        return None
    pair = f"{case.fit.names[free[i]]} and {case.fit.names[free[j]]}"
    loose = found > _INSEPARABLE or max(u[[i, j]] / np.abs(case.fit.values[[free[i], free[j]]])) > _LOOSE
    return NamedWarning(
        code="strong-correlation",
        level="warn" if loose else "note",
        concerns=pair,
        message=(
            f"{pair} are measured only in combination (correlation {found:.3f})"
            if loose
            else f"the errors of {pair} go together (correlation {found:.3f})"
        ),
        found=found,
        threshold=_CORRELATION,
        advice="quote sums and derived values (S, H, moments), or give the covariance with the parameters",
    )

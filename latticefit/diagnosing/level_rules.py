"""Named warnings: whether the level of the data fits the formula, and what slip would explain it where it does not."""

from __future__ import annotations

from dataclasses import dataclass, replace
from math import hypot, inf

import numpy as np

from ..constants import GAS_CONSTANT
from ..fitting import covariance, minimise
from ..models import Model, Parametrisation, total_modes
from ..records import FitRecord, FloatArray, Level, NamedWarning
from .case import Case
from .level import LEVEL_IMPOSSIBLE, explain_mode_sum
from .level_fit import shape_uncertainty
from .level_words import explained, mode_sum_text
from .reach import theta_debye_two
from .stiff import stiff_share
from .verdict import MISFIT, blame

__all__ = ["above_classical_limit", "implausible_level", "mode_sum"]

_CLASSICAL = 1.02  # times 3nR that a harmonic lattice does not pass
_NOTED, _WARNED = 0.01, 0.02  # of the mode sum
_SURE = 2.0  # standard uncertainties that it must be off beside: of the fit for a note, in all for a warning
_HALF = 2.0  # theta over Tmax above which freed modes mean nothing
_DILATION = 0.06  # excess that a missing Cp - Cv can make


def implausible_level(case: Case) -> NamedWarning | None:
    """The data were accepted in spite of a level that looks impossible."""
    if case.level.verdict != "impossible":
        return None
    return NamedWarning(
        code="implausible-level",
        level="warn",
        concerns="data",
        message=case.level.sentence,
        found=case.level.ratio_to_classical,
        threshold=LEVEL_IMPOSSIBLE,
        advice="the level was accepted as asked; no result is better than unit, mass, molar mass and formula are",
    )


def above_classical_limit(case: Case) -> NamedWarning | None:
    """The lattice passes 3nR where it cannot (mass, formula, an extra contribution)."""
    if case.fit.atoms is None or case.level.verdict == "impossible":
        return None
    limit = 3 * case.fit.atoms * GAS_CONSTANT
    theta = theta_debye_two(case.model, case.fit)
    cold = case.prepared.temperature < theta
    harmonic = case.prepared.heat_capacity - case.outside_lattice
    ratio = float(harmonic[cold].max() / limit) if cold.any() else 0.0
    if ratio <= _CLASSICAL:
        return None
    advice = "check mass, molar mass, formula and addenda; an extra contribution or Cp-Cv is the other explanation"
    if case.level.explanations:
        slips = explained(case.level.explanations, case.level.mode_sum_ratio, case.level.mode_sum_u)
        advice = f"{slips}; otherwise {advice}"
    return NamedWarning(
        code="above-classical-limit",
        level="warn",
        concerns="data",
        message=f"the lattice heat capacity reaches {ratio:.3g} times 3nR below theta_D[m=2] = {theta:.4g} K",
        found=ratio,
        threshold=_CLASSICAL,
        advice=advice,
    )


def mode_sum(case: Case) -> NamedWarning | None:
    """The modes, freed where they are held, are not three per atom."""
    if case.fit.atoms is None or case.level.verdict == "impossible":
        return None
    counted = _counted(case)
    if counted is not None:
        return _against_three(case, counted)
    if case.level.verdict != "suspicious" or case.level.mode_sum_ratio is None:
        return None
    return _warning("warn", case.level.sentence, case.level.mode_sum_ratio)


def _against_three(case: Case, counted: _Counted) -> NamedWarning | None:
    off = abs(counted.ratio - 1)
    level: Level = "warn" if off > max(_WARNED, _SURE * counted.u) else "note"
    if off <= max(_NOTED, _SURE * counted.u_fit):
        return None
    text = mode_sum_text(counted.ratio, counted.u)
    message = f"the fitted modes add up to {text} of the three per atom of the formula"
    if case.fit.mode_sum == "fixed":
        message = f"with its modes freed the model wants {text} of the three per atom at which they are held"
    sample, top = case.prepared.measurement.sample, float(case.prepared.temperature[-1])
    stiff = stiff_share(sample, top)
    dilated = case.prepared.measurement.quantity == "Cp" and case.model.cp_cv.parameter is None
    if dilated and 1 < counted.ratio < 1 + _DILATION:
        message += "; so much can be the Cp-Cv that the model does not have"
    elif 0 < 1 - counted.ratio <= stiff + _SURE * counted.u and stiff > 0:
        level, message = "note", f"{message}; so many modes of light atoms may not be excited yet"
    elif level == "note":
        message += "; so much a few terms can miss of a real spectrum"
    elif explanations := explain_mode_sum(case.prepared, counted.ratio, counted.u):
        message += f"; {explained(explanations, counted.ratio, counted.u)}"
    return _warning(level, message, counted.ratio)


def _warning(level: Level, message: str, ratio: float) -> NamedWarning:
    return NamedWarning(
        code="mode-sum",
        level=level,
        concerns="modes",
        message=message,
        found=ratio - 1,
        threshold=_WARNED if level == "warn" else _NOTED,
        advice="check mass, molar mass, formula, addenda and Cp-Cv; the sum of the modes is no property of the solid",
    )


@dataclass(frozen=True)
class _Counted:
    """Modes of a model over 3n; `u_fit` is from the covariance, `u` allows for a real spectrum beside it."""

    ratio: float
    u_fit: float
    u: float


def _counted(case: Case) -> _Counted | None:
    """Modes of the model over 3n, freed by one more fit where they are held; None where they are not seen.

    The fit starts from the one that is reported. Not seen: the data end below theta/2, a mode count is not determined,
    or the model describes the data neither way.
    """
    top = float(case.prepared.temperature[-1])
    if case.fit.mode_sum == "free":
        return _over_three(case.model, case.fit, top, np.asarray(case.fit.values), np.asarray(case.fit.covariance))
    if theta_debye_two(case.model, case.fit) > _HALF * top:
        return None
    par = _freed(case.model, case.fit)
    if not set(case.model.modes) & set(par.free.tolist()):
        return None
    data = (
        np.asarray(case.prepared.temperature),
        np.asarray(case.prepared.heat_capacity),
        np.asarray(case.prepared.sigma),
    )
    solution = minimise(par, np.asarray(case.fit.values), *data)
    freedom = data[0].size - par.free.size
    if freedom <= 0 or not solution.converged:
        return None
    reduced = solution.chi_square / freedom
    if reduced > MISFIT and blame(case.prepared, case.fit, case.statistics) == "model":
        return None
    found = covariance(solution.parametrisation, solution.values, *data)
    if set(found.undetermined.tolist()) & set(case.model.modes):
        return None
    scale = reduced if case.fit.covariance_kind == "scaled" else 1.0
    fit = replace(case.fit, scale_factor=reduced)
    return _over_three(case.model, fit, top, np.asarray(solution.values), scale * found.matrix)


def _over_three(model: Model, fit: FitRecord, top: float, values: FloatArray, matrix: FloatArray) -> _Counted:
    modes = 3 * (fit.atoms or 1.0)
    picked = np.array([float(i in model.modes) for i in range(values.size)])
    inflation = max(1.0, fit.scale_factor) if fit.covariance_kind == "absolute" else 1.0
    ratio = total_modes(model, values) / modes
    u_fit = float(np.sqrt(max(picked @ matrix @ picked * inflation, 0.0))) / modes
    return _Counted(ratio, u_fit, hypot(u_fit, ratio * shape_uncertainty(theta_debye_two(model, fit), top)))


def _freed(model: Model, fit: FitRecord) -> Parametrisation:
    """The parametrisation of a fit with its mode sum no longer held; what the user holds stays held."""
    free = np.array([i for i, each in enumerate(fit.parameters) if each.status != "fixed"], dtype=np.intp)
    total = 3 * (fit.atoms or 0.0)
    low = np.array([each.low for each in fit.parameters])
    # a mode count that could have all modes is bounded by their sum alone
    high = np.array([each.high for each in fit.parameters])
    high[[i for i in model.modes if high[i] >= total]] = inf
    return Parametrisation(model, np.array(fit.values), free, None, 0.0, low, high)

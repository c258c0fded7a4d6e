"""What derived values rest on: parameters that the data do not determine, by the weight they carry."""

from __future__ import annotations

import numpy as np

from ..models import Model, total_modes
from ..records import FitRecord, ParameterValue

__all__ = ["lost_in_law", "lost_in_spectrum", "stuck"]

_NEGLIGIBLE = 1e-4  # share of the modes, or of the T^3 coefficient, below which a term moves nothing


def _lost(parameters: tuple[ParameterValue, ...]) -> list[str]:
    return [
        each.name
        for each in parameters
        if each.status in ("at_bound", "undetermined") or (each.status == "tied" and each.u is None)
    ]


def lost_in_spectrum(model: Model, fit: FitRecord) -> list[str]:
    """Parameters without a determined value on which the moments of the spectrum rest."""
    total = total_modes(model, np.asarray(fit.values))
    found: list[str] = []
    for placed in model.placed:
        modes = sum(fit.values[i] for i in model.modes if placed.slice.start <= i < placed.slice.stop)
        if placed.term.lattice and abs(modes) > _NEGLIGIBLE * total:
            found += _lost(fit.parameters[placed.slice])
    return found


def lost_in_law(model: Model, fit: FitRecord) -> list[str]:
    """Parameters without a determined value on which the T^3 coefficient rests."""
    betas = {each.name: each.term.cubic_coefficient(*fit.values[each.slice]) for each in model.placed}
    total = sum(betas.values())
    heavy = [each for each in model.placed if total > 0 and betas[each.name] > _NEGLIGIBLE * total]
    return [name for each in heavy for name in _lost(fit.parameters[each.slice])]


def stuck(model: Model, fit: FitRecord) -> list[str]:
    """Parameters at a bound that still carry weight: u of everything would miss what they could do.

    An amplitude that ended at zero carries none, nor does the temperature of a term without modes.
    """
    free_of_weight = {
        name
        for placed in model.placed
        if placed.term.lattice and not _weighs(model, fit, placed.slice)
        for name in model.names[placed.slice]
    }
    found = []
    for each, spec in zip(fit.parameters, model.specs, strict=True):
        at_zero = spec.role == "amplitude" and each.low == 0 and abs(each.value) < abs(each.high - each.value)
        if each.status == "at_bound" and not at_zero and each.name not in free_of_weight:
            found.append(each.name)
    return found


def _weighs(model: Model, fit: FitRecord, where: slice) -> bool:
    modes = sum(fit.values[i] for i in model.modes if where.start <= i < where.stop)
    return bool(abs(modes) > _NEGLIGIBLE * total_modes(model, np.asarray(fit.values)))

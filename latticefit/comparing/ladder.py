"""The ladder of candidates that is compared when the user names no model.

debye; einstein; debye + einstein; debye + 2 einstein; 2 debye; each without the electronic term and with it, each
without Cp - Cv and with the Nernst-Lindemann form, as far as the data can see either.
"""

from __future__ import annotations

from dataclasses import replace

from ..errors import InputError, nearest
from ..fitting import fit_model, refuse_cp_cv_of_cv
from ..models import build_model
from ..records import ModelSettings, PreparedData

__all__ = ["LADDER", "candidates"]

LADDER = ("debye", "einstein", "debye + einstein", "debye + 2 einstein", "2 debye")
"""Lattice parts of the candidates, from the simplest up."""

_COLD, _COLD_THETA = 3.0, 60.0  # without a point below max(3 K, theta/60) gamma cannot be seen beside dispersion
_HOT_THETA = 2.0  # below theta/2, Cp - Cv is less than about 1 %


def candidates(prepared: PreparedData, settings: ModelSettings, seed: int = 0) -> tuple[ModelSettings, ...]:
    """Return the settings of every candidate.

    Parameters
    ----------
    prepared : PreparedData
    settings : ModelSettings
        Its mode sum, start, fix and bounds hold for every candidate; a form of Cp - Cv that it names, also.
    seed : int

    Raises
    ------
    InputError
        When start, fix or bounds name a parameter that no candidate has.
    """
    refuse_cp_cv_of_cv(prepared, settings)
    theta = _single_debye_theta(prepared, settings, seed)
    forms = [settings.cp_cv] if settings.cp_cv is not None else ["none"]
    quantity, hottest = prepared.measurement.quantity, float(prepared.temperature[-1])
    if settings.cp_cv is None and quantity == "Cp" and hottest > theta / _HOT_THETA:
        forms.append("nernst-lindemann")
    coldest = float(prepared.temperature[0])
    sees_gamma = coldest < max(_COLD, theta / _COLD_THETA) and not prepared.measurement.sample.insulator
    endings = ["", " + electronic"] if sees_gamma or "electronic_gamma" in settings.fix else [""]
    every = [
        replace(settings, terms=terms + ending, cp_cv=form) for terms in LADDER for ending in endings for form in forms
    ]
    return _with_named_parameters(every, settings)


def _single_debye_theta(prepared: PreparedData, settings: ModelSettings, seed: int) -> float:
    """theta of the single-Debye candidate, K: the measure of how low and how high the data reach."""
    plain = ModelSettings("debye", settings.mode_sum, "none")
    return float(fit_model(prepared, plain, seed).values[0])


def _with_named_parameters(every: list[ModelSettings], settings: ModelSettings) -> tuple[ModelSettings, ...]:
    named = {*settings.start, *settings.fix, *settings.bounds}
    having = [each for each in every if named <= set(_names(each))]
    if named and not having:
        known = {name for each in every for name in _names(each)}
        stranger = next((name for name in sorted(named) if name not in known), None)
        if stranger is not None:
            raise InputError(f"no candidate model has a parameter {stranger!r}; {nearest(stranger, known)}")
        raise InputError(f"no candidate model has all of {', '.join(sorted(named))}; name the model with --terms")
    return tuple(having or every)


def _names(settings: ModelSettings) -> tuple[str, ...]:
    return build_model(settings.terms or "", settings.cp_cv or "none").names

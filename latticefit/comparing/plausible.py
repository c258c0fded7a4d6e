"""Whether a fitted candidate makes physical sense, apart from how well it fits."""

from __future__ import annotations

from itertools import combinations

import numpy as np

from ..constants import STANDARD_TEMPERATURE
from ..models import Model, build_model, entropy, low_temperature_theta, total_modes
from ..records import FitRecord

__all__ = ["SAME_THETA", "objections"]

SAME_THETA = 1.1
"""Two lattice terms whose temperatures are closer than this factor are one band (common practice, no source)."""

_NEGLIGIBLE = 1e-3  # share of the modes below which a term has vanished
_LOOSE = 0.25  # relative u above which the theta of the T^3 law is not pinned down (common practice, no source)
_SAME_CORRELATION = 0.999
_UNSEEN = 0.02  # share of S(298.15 K) below the data above which a lattice without acoustic modes is not tested


def objections(fit: FitRecord, lowest: float) -> tuple[str, ...]:
    """Return why a candidate is not plausible, in words; empty when it is.

    Parameters
    ----------
    fit : FitRecord
    lowest : float
        Lowest fitted temperature, K.

    Returns
    -------
    tuple of str
        Not converged; a parameter at a bound or undetermined; an amplitude that vanishes (not above its own standard
        uncertainty); terms that cannot be told apart; no acoustic modes although much of S lies below the data.
    """
    model = build_model(fit.terms, fit.cp_cv)
    found = [] if fit.converged else ["the fit did not converge"]
    for each in fit.parameters:
        if each.status == "at_bound":
            found.append(f"{each.name} is at a bound")
        elif each.status == "undetermined":
            found.append(f"{each.name} is not determined")
    return (
        *found,
        *_loose_law(fit, model),
        *_vanishing(fit, model),
        *_indistinct(fit, model),
        *_without_acoustic_modes(fit, model, lowest),
    )


def _without_acoustic_modes(fit: FitRecord, model: Model, lowest: float) -> list[str]:
    """Einstein terms alone vanish exponentially: what lies below the data would be missed, and nothing shows it."""
    values = np.asarray(fit.values)
    if low_temperature_theta(model, values, fit.atoms) is not None:
        return []
    below, total = entropy(model, np.array([lowest, STANDARD_TEMPERATURE]), values)
    if below <= _UNSEEN * total:
        return []
    return ["it has no acoustic modes, and the data start too high to show what that does to S"]


def _loose_law(fit: FitRecord, model: Model) -> list[str]:
    """A term that carries the T^3 law must have a temperature that the data pin down: it is what people quote."""
    betas = [each.term.cubic_coefficient(*fit.values[each.slice]) for each in model.placed]
    found = []
    for placed, beta in zip(model.placed, betas, strict=True):
        for each, spec in zip(fit.parameters[placed.slice], placed.term.parameters, strict=True):
            loose = spec.role == "scale" and each.u is not None and each.u > _LOOSE * each.value
            if loose and 2 * beta > sum(betas):
                found.append(f"{each.name} is hardly determined ({each.value:.3g} K with u = {each.u:.2g} K)")
    return found


def _vanishing(fit: FitRecord, model: Model) -> list[str]:
    total = total_modes(model, np.asarray(fit.values))
    found = []
    for i, (each, spec) in enumerate(zip(fit.parameters, model.specs, strict=True)):
        if spec.role != "amplitude" or each.status not in ("fitted", "tied"):
            continue
        least = _NEGLIGIBLE * total if i in model.modes else 0.0
        if abs(each.value) <= max(each.u or 0.0, least):
            found.append(f"{each.name} vanishes within its uncertainty")
    return found


def _indistinct(fit: FitRecord, model: Model) -> list[str]:
    scales = [
        (placed.name, placed.slice.start + k)
        for placed in model.placed
        for k, spec in enumerate(placed.term.parameters)
        if spec.role == "scale"
    ]
    found = []
    for (one, i), (other, j) in combinations(scales, 2):
        low, high = sorted((fit.values[i], fit.values[j]))
        if high < SAME_THETA * low:
            found.append(f"{one} and {other} have nearly one temperature and cannot be told apart")
    u = np.sqrt(np.diag(fit.covariance))
    for i, j in combinations(model.modes, 2):
        free = fit.parameters[i].status == fit.parameters[j].status == "fitted"
        if free and abs(fit.covariance[i, j]) > _SAME_CORRELATION * u[i] * u[j]:
            found.append(f"{fit.names[i]} and {fit.names[j]} are measured only as a sum")
    return found

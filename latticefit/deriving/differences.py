"""Differences of energy and entropy between two temperatures: what lies below both of them drops out."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ..constants import STANDARD_TEMPERATURE
from ..models import Model, build_model, energy, entropy
from ..records import EnergyDifference, FitRecord, FloatArray, SavedResult
from .propagation import propagate, standard_uncertainty
from .withholding import row_reasons

__all__ = ["energy_differences", "energy_from_standard"]


def _u(fit: FitRecord, u_fit: FloatArray) -> FloatArray:
    return standard_uncertainty(u_fit, fit.scale_factor, fit.covariance_kind)


def energy_from_standard(
    fit: FitRecord, model: Model, T: FloatArray, reasons: Sequence[str | None], standard_reason: str | None
) -> tuple[FloatArray, FloatArray]:
    """H(T)-H(298.15 K) on a grid with its u, J/mol; U with Cv. Shapes of T (K).

    Parameters
    ----------
    reasons : sequence of (str or None), one for each T
        Why u of a row is withheld; `standard_reason` the same for 298.15 K.
    """
    at = np.array([STANDARD_TEMPERATURE])

    def difference(values: FloatArray) -> FloatArray:
        return energy(model, T, values) - energy(model, at, values)

    u = _u(fit, propagate(difference, np.array(fit.values), np.array(fit.covariance)))
    given = [reason is None and standard_reason is None for reason in reasons]
    return difference(np.array(fit.values)), np.where(given, u, np.nan)


def energy_differences(saved: SavedResult, pairs: Sequence[tuple[float, float]]) -> tuple[EnergyDifference, ...]:
    """Energy and entropy between pairs of temperatures, per mole of formula unit.

    Parameters
    ----------
    saved : SavedResult
    pairs : sequence of (low, high)
        K.

    Returns
    -------
    tuple of EnergyDifference
        u from the covariance of the difference itself, in which common errors and the part below both temperatures
        drop out; None where either end has none.
    """
    fit = saved.fit
    model = build_model(fit.terms, fit.cp_cv)
    return tuple(_difference(saved, fit, model, low, high) for low, high in pairs)


def _difference(saved: SavedResult, fit: FitRecord, model: Model, low: float, high: float) -> EnergyDifference:
    ends = np.array([low, high])

    def steps(values: FloatArray) -> FloatArray:
        H, S = energy(model, ends, values), entropy(model, ends, values)
        return np.array([H[1] - H[0], S[1] - S[0]])

    found = steps(np.array(fit.values))
    u = _u(fit, propagate(steps, np.array(fit.values), np.array(fit.covariance)))
    reasons = row_reasons(model, fit, ends, saved.lowest, saved.highest, saved.describes)
    reason = next((each for each in reasons if each is not None), None)
    return EnergyDifference(
        low=low,
        high=high,
        energy=float(found[0]),
        energy_u=None if reason else float(u[0]),
        entropy=float(found[1]),
        entropy_u=None if reason else float(u[1]),
        reason=reason,
        quantity=saved.quantity,
        per="mol",
    )

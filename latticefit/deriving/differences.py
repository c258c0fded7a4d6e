"""Differences of energy and entropy between two temperatures: what lies below both of them drops out."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ..constants import STANDARD_TEMPERATURE
from ..models import Model, build_model, energy, entropy
from ..records import EnergyDifference, FitRecord, FloatArray, SavedResult
from .propagation import uncertainties
from .withholding import row_reasons, value_reasons

__all__ = ["energy_differences", "energy_from_standard"]


def _reasons(
    fit: FitRecord, model: Model, T: FloatArray, lowest: float, highest: float, describes: bool
) -> tuple[list[str | None], list[str | None]]:
    """Why no value, and why no u, is given at each T."""
    missing = value_reasons(model, fit, T, highest)
    return missing, row_reasons(model, fit, T, lowest, highest, describes)


def energy_from_standard(
    fit: FitRecord, model: Model, T: FloatArray, lowest: float, highest: float, describes: bool
) -> tuple[FloatArray, FloatArray]:
    """H(T)-H(298.15 K) on a grid with its u, J/mol; U with Cv. NaN where either end has no value, or no u.

    Shapes of T (K); `lowest` and `highest` bound the fitted points, K.
    """
    at = np.array([STANDARD_TEMPERATURE])

    def difference(values: FloatArray) -> FloatArray:
        return energy(model, T, values) - energy(model, at, values)

    _, u = uncertainties(difference, fit)
    missing, withheld = _reasons(fit, model, np.append(T, at), lowest, highest, describes)
    valued = np.array([each is None and missing[-1] is None for each in missing[:-1]])
    given = valued & np.array([each is None and withheld[-1] is None for each in withheld[:-1]])
    return np.where(valued, difference(np.array(fit.values)), np.nan), np.where(given, u, np.nan)


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
    _, u = uncertainties(steps, fit)
    missing, withheld = _reasons(fit, model, ends, saved.lowest, saved.highest, saved.describes)
    gone = next((each for each in missing if each is not None), None)
    reason = gone or next((each for each in withheld if each is not None), None)
    return EnergyDifference(
        low=low,
        high=high,
        energy=None if gone else float(found[0]),
        energy_u=None if reason else float(u[0]),
        entropy=None if gone else float(found[1]),
        entropy_u=None if reason else float(u[1]),
        reason=reason,
        quantity=saved.quantity,
        per="mol",
    )

"""Thermodynamic functions of a fitted model on any grid, with uncertainties and origin."""

from __future__ import annotations

from typing import Literal

import numpy as np

from ..models import (
    Model,
    build_model,
    components,
    energy,
    entropy,
    heat_capacity,
)
from ..records import FitRecord, FloatArray, Quantity, ThermodynamicTable
from .differences import energy_from_standard
from .propagation import uncertainties
from .withholding import HEAVY_BELOW, HEAVY_REASON, allowance_below, row_reasons, value_reasons

__all__ = ["default_grid", "functions_table"]

Origin = Literal["measured", "extrapolated_below", "extrapolated_above"]


def default_grid(lowest: float, highest: float) -> FloatArray:
    """Round temperatures from a fifth of the lowest point to the highest, K.

    Steps grow with temperature the way printed tables do; 298.15 K is added by `functions_table`'s callers.
    """
    steps = (
        (0.1, 1.0, 0.1),
        (1.0, 5.0, 0.5),
        (5.0, 20.0, 1.0),
        (20.0, 50.0, 5.0),
        (50.0, 300.0, 10.0),
        (300.0, 5000.0, 50.0),
    )
    grid = np.concatenate([np.round(np.arange(low, high, step), 6) for low, high, step in steps])
    kept = grid[(grid >= lowest / 5) & (grid <= highest)]
    return np.asarray(kept if kept.size else np.array([lowest]))


def _stack(model: Model, T: FloatArray, values: FloatArray) -> FloatArray:
    """Heat capacity, energy, entropy and free-energy function, shape (4, m)."""
    H, S = energy(model, T, values), entropy(model, T, values)
    return np.stack([heat_capacity(model, T, values), H, S, S - H / T])


def functions_table(
    fit: FitRecord,
    temperature: FloatArray,
    lowest: float,
    highest: float,
    quantity: Quantity,
    describes: bool = True,
) -> ThermodynamicTable:
    """Evaluate a fit on a grid.

    Parameters
    ----------
    fit : FitRecord
    temperature : ndarray, shape (m,)
        K, positive.
    lowest, highest : float
        Range of the fitted points, K: rows outside are marked as extrapolated.
    quantity : {"Cp", "Cv"}
    describes : bool
        Whether the model describes the data; no u is given where it does not.

    Returns
    -------
    ThermodynamicTable
        Closed forms of the terms; quadrature only for Cp - Cv. u is NaN, with the reason, below the lowest point, far
        above the highest, and wherever something else makes the covariance no measure. Rows above the data that rest
        on an undetermined parameter are NaN altogether.
    """
    T = np.asarray(temperature, dtype=float)
    model = build_model(fit.terms, fit.cp_cv)
    values = np.array(fit.values)
    missing = value_reasons(model, fit, T, highest)
    rows = _stack(model, T, values) * np.where([each is None for each in missing], 1.0, np.nan)
    u_fit, u = uncertainties(lambda v: _stack(model, T, v), fit)
    base = row_reasons(model, fit, T, lowest, highest, describes)
    from_standard, from_standard_u = energy_from_standard(fit, model, T, lowest, highest, describes)
    u, reasons = _withheld(model, fit, T, rows, u, lowest, base, missing)
    return ThermodynamicTable(
        quantity=quantity,
        temperature=T,
        heat_capacity=rows[0],
        heat_capacity_u=u[0],
        heat_capacity_u_fit=u_fit[0],
        energy=rows[1],
        energy_u=u[1],
        energy_u_fit=u_fit[1],
        entropy=rows[2],
        entropy_u=u[2],
        entropy_u_fit=u_fit[2],
        energy_from_standard=from_standard,
        energy_from_standard_u=from_standard_u,
        free_energy_function=rows[3],
        free_energy_function_u=u[3],
        free_energy_function_u_fit=u_fit[3],
        entropy_fraction_below_data=_share_below(model, values, T, rows[2], lowest),
        origin=tuple(_origin(t, lowest, highest) for t in T.tolist()),
        u_reasons=tuple(reasons),
        components=dict(components(model, T, values)),
    )


def _origin(t: float, lowest: float, highest: float) -> Origin:
    return "extrapolated_below" if t < lowest else "extrapolated_above" if t > highest else "measured"


def _share_below(model: Model, values: FloatArray, T: FloatArray, S: FloatArray, lowest: float) -> FloatArray:
    """Share of S that lies below the lowest point; all of it for the rows below."""
    below = float(entropy(model, np.array([lowest]), values)[0])
    return np.where(lowest >= T, 1.0, below / np.maximum(S, 1e-300))


def _withheld(
    model: Model,
    fit: FitRecord,
    T: FloatArray,
    rows: FloatArray,
    u: FloatArray,
    lowest: float,
    base: list[str | None],
    missing: list[str | None],
) -> tuple[FloatArray, list[str | None]]:
    """u of the four functions, shape (4, m), NaN where withheld, and the reason for each row."""
    values, reasons = np.asarray(fit.values), list(base)
    u = u * np.where([reason is None for reason in reasons], 1.0, np.nan)
    allowance = allowance_below(fit, model, values, T, lowest)
    u = np.hypot(u, allowance)
    heavy = (allowance[2] > 0) & (_share_below(model, values, T, rows[2], lowest) > HEAVY_BELOW)
    u[1:, heavy] = np.nan
    for k, why in enumerate(missing):
        if heavy[k]:
            reasons[k] = reasons[k] or HEAVY_REASON
        if why is not None:
            u[:, k], reasons[k] = np.nan, why
    return u, reasons

"""Thermodynamic functions of a fitted model on any grid, with uncertainties and origin."""

from __future__ import annotations

from typing import Literal

import numpy as np

from ..diagnosing.reach import low_temperature_reach
from ..models import (
    Model,
    build_model,
    components,
    cp_cv_coefficient,
    energy,
    entropy,
    harmonic_heat_capacity,
    heat_capacity,
)
from ..records import FitRecord, FloatArray, Quantity, ThermodynamicTable
from .propagation import propagate, standard_uncertainty
from .support import lost_in_spectrum, stuck

__all__ = ["default_grid", "functions_table"]

Origin = Literal["measured", "extrapolated_below", "extrapolated_above"]

_BELOW_ALLOWANCE = ((30.0, 0.10), (50.0, 0.02))
"""Relative allowance for what the model may get wrong of H and S below the lowest point, by theta/Tmin: a T^3 law from
there is 10 % off in S(Tmin) at theta/20 and 1 % at theta/50 for plain sine dispersion (computed)."""

_ABOVE = 1.25  # beyond this times the highest fitted point u is withheld: nothing tests Cp - Cv there

_HEAVY_BELOW = 0.1  # share of S below the data above which u of S and H is withheld, unless the data reach low

BELOW_REASON = "below the lowest fitted point: the covariance of one model is no measure of what it does not see"
ABOVE_REASON = "more than a quarter above the highest fitted point: the covariance of one model is no measure there"

MISFIT_REASON = "the model does not describe the data: the covariance is no measure of how wrong it is"
HEAVY_REASON = "more than a tenth of S lies below the lowest fitted point: no u of S and H"


def default_grid(lowest: float, highest: float) -> FloatArray:
    """Round temperatures from a fifth of the lowest point to the highest, K.

    Steps grow with temperature the way printed tables do; 298.15 K is added by `functions_table`'s callers.
    """
    steps = ((0.1, 1.0, 0.1), (1.0, 5.0, 0.5), (5.0, 20.0, 1.0), (20.0, 50.0, 5.0), (50.0, 3000.0, 10.0))
    grid = np.concatenate([np.round(np.arange(low, high, step), 6) for low, high, step in steps])
    kept = grid[(grid >= lowest / 5) & (grid <= highest)]
    return np.asarray(kept if kept.size else np.array([lowest]))


def _stack(model: Model, T: FloatArray, values: FloatArray) -> FloatArray:
    """Heat capacity, energy, entropy and free-energy function, shape (4, m)."""
    H, S = energy(model, T, values), entropy(model, T, values)
    return np.stack([heat_capacity(model, T, values), H, S, S - H / T])


def _solvable(model: Model, T: FloatArray, values: FloatArray) -> FloatArray:
    """1 where Cp - Cv has a solution, NaN where the temperature is too high for its form."""
    if model.cp_cv.solvable is None:
        return np.ones_like(T)
    lattice = harmonic_heat_capacity(model, T, values)
    return np.where(model.cp_cv.solvable(T, lattice, cp_cv_coefficient(model, values)), 1.0, np.nan)


def _allowance_below(fit: FitRecord, model: Model, values: FloatArray, T: FloatArray, lowest: float) -> FloatArray:
    """What the part below the lowest point adds to u of the four functions, shape (4, m); 0 where the data reach low.

    A model without a T^3 law (Einstein terms alone) has no reach to judge by and gets the larger allowance.
    """
    reach = low_temperature_reach(model, fit, lowest)
    ratio = 0.0 if reach is None else reach.ratio
    share = next((each for limit, each in _BELOW_ALLOWANCE if ratio < limit), 0.0)
    H, S = (float(each(model, np.array([lowest]), values)[0]) for each in (energy, entropy))
    return share * np.stack([np.zeros_like(T), np.full_like(T, H), np.full_like(T, S), np.abs(S - H / T)])


def _reasons(
    model: Model, fit: FitRecord, T: FloatArray, lowest: float, highest: float, describes: bool
) -> list[str | None]:
    """Why u of a whole row is withheld; None where it is given."""
    held = stuck(model, fit)
    everywhere = None
    if not describes:
        everywhere = MISFIT_REASON
    elif held:
        everywhere = f"{held[0]} is at a bound: the covariance does not know what it would do without"
    return [BELOW_REASON if t < lowest else ABOVE_REASON if t > _ABOVE * highest else everywhere for t in T.tolist()]


def _origins(T: FloatArray, lowest: float, highest: float) -> tuple[Origin, ...]:
    return tuple("extrapolated_below" if t < lowest else "extrapolated_above" if t > highest else "measured" for t in T)


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
    values, covariance = np.array(fit.values), np.array(fit.covariance)
    rows = _stack(model, T, values) * _solvable(model, T, values)
    lost = lost_in_spectrum(model, fit)
    if lost:
        rows = np.where(highest < T, np.nan, rows)
    u_fit = propagate(lambda v: _stack(model, T, v), values, covariance)
    reasons = _reasons(model, fit, T, lowest, highest, describes)
    u = standard_uncertainty(u_fit, fit.scale_factor, fit.covariance_kind)
    u = u * np.where([reason is None for reason in reasons], 1.0, np.nan)
    allowance = _allowance_below(fit, model, values, T, lowest)
    below = float(entropy(model, np.array([lowest]), values)[0])
    u = np.hypot(u, allowance)
    heavy = (allowance[2] > 0) & (below > _HEAVY_BELOW * rows[2])
    u[1:, heavy] = np.nan
    for k in np.flatnonzero(heavy):
        reasons[k] = reasons[k] or HEAVY_REASON
    for k in np.flatnonzero(np.isnan(rows[2]) & (T > highest)):
        reasons[k] = f"{lost[0]} is not determined" if lost else "Cp - Cv has no solution at this temperature"
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
        free_energy_function=rows[3],
        free_energy_function_u=u[3],
        free_energy_function_u_fit=u_fit[3],
        entropy_fraction_below_data=np.where(lowest >= T, 1.0, below / np.maximum(rows[2], 1e-300)),
        origin=_origins(T, lowest, highest),
        u_reasons=tuple(reasons),
        components=dict(components(model, T, values)),
    )

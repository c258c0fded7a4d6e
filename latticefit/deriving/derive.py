"""From a fit to everything derived from it."""

from __future__ import annotations

from typing import Literal

import numpy as np

from ..constants import STANDARD_TEMPERATURE
from ..diagnosing import REACH_STOP, REACH_WARN
from ..models import Model, build_model, low_temperature_theta, zero_point_energy
from ..records import (
    Derived,
    DerivedValue,
    FitRecord,
    FloatArray,
    NamedWarning,
    PreparedData,
    ThermodynamicTable,
)
from .characteristic import QUANTITIES, CharacteristicTemperature
from .functions_table import default_grid, functions_table
from .pointwise import model_theta, pointwise_theta
from .propagation import propagate, standard_uncertainty

__all__ = ["derive"]

Status = Literal["determined", "interval", "undetermined", "undefined"]

_SHARE_BELOW = 0.005
_CURVE_POINTS = 400


def derive(prepared: PreparedData, fit: FitRecord, grid: tuple[float, ...] | None = None) -> Derived:
    """Compute characteristic temperatures, zero-point energy, thermodynamic functions and pointwise theta_D(T).

    Parameters
    ----------
    prepared : PreparedData
    fit : FitRecord
    grid : tuple of float, or None
        Temperatures of the table, K; None for round temperatures over the measured range and below it. 298.15 K is
        always a row.
    """
    model = build_model(fit.terms, fit.cp_cv)
    lowest, highest = float(prepared.temperature[0]), float(prepared.temperature[-1])
    quantity = prepared.measurement.quantity
    wanted = default_grid(lowest, highest) if grid is None else np.array(grid, dtype=float)
    table = functions_table(fit, np.union1d(wanted, [STANDARD_TEMPERATURE]), lowest, highest, quantity)
    dense = np.geomspace(lowest / 5, max(highest * 1.05, lowest * 2), _CURVE_POINTS)
    return Derived(
        characteristic_temperatures=tuple(_characteristic(each, fit, model, lowest) for each in QUANTITIES),
        zero_point_energy=_zero_point(fit, model),
        table=table,
        curve=functions_table(fit, dense, lowest, highest, quantity),
        pointwise_theta=pointwise_theta(prepared, fit, model),
        model_theta=model_theta(fit, model, dense),
        warnings=_entropy_below_data(table),
    )


def _u(fit: FitRecord, u_fit: float) -> float:
    return float(standard_uncertainty(np.array(u_fit), fit.scale_factor, fit.covariance_kind))


def _reach(fit: FitRecord, model: Model, lowest: float) -> tuple[Status, str | None]:
    """Whether the data reach low enough for theta_D(T->0), and the remark that goes with it."""
    theta = low_temperature_theta(model, np.asarray(fit.values), fit.atoms)
    if theta is None:
        return "undefined", "the model has no Debye term, so its heat capacity does not go as T^3"
    if theta / lowest < REACH_STOP:
        return "undetermined", (
            f"too little data: the lowest fitted point, {lowest:.3g} K, is above theta/{REACH_STOP:.0f}; "
            "theta_D(T->0) would come from the choice of model alone"
        )
    remark = "a mixed model's theta_D(T->0) can be 1-2 % off beyond its u: that is the model, not the scatter"
    if theta / lowest < REACH_WARN:
        remark = f"the lowest fitted point, {lowest:.3g} K, is above theta/{REACH_WARN:.0f}; {remark}"
    return "determined", remark


def _characteristic(each: CharacteristicTemperature, fit: FitRecord, model: Model, lowest: float) -> DerivedValue:
    status: Status = "determined"
    reason: str | None = None
    if each.key == "theta_debye_low_temperature":
        status, reason = _reach(fit, model, lowest)
    values = np.array(fit.values)
    value = each.function(model, values, fit.atoms)
    if value is None and status == "determined":
        status, reason = "undefined", "not defined for this model"
    u_fit = None
    if value is not None:

        def of(v: FloatArray) -> FloatArray:
            found = each.function(model, v, fit.atoms)
            return np.array(np.nan if found is None else found)

        u_fit = float(propagate(of, values, np.array(fit.covariance)))
        u_fit = u_fit if np.isfinite(u_fit) else None
    shown = status == "determined" and value is not None
    u = _u(fit, u_fit) if shown and u_fit is not None else None
    return DerivedValue(
        key=each.key,
        symbol=each.symbol,
        value=value if shown else None,
        u=u,
        u_fit=u_fit if shown else None,
        low=None if value is None or u is None else value - 2 * u,
        high=None if value is None or u is None else value + 2 * u,
        unit="K",
        definition=each.definition,
        source=each.source,
        status=status,
        reason=reason,
    )


def _zero_point(fit: FitRecord, model: Model) -> DerivedValue:
    values = np.array(fit.values)
    value = zero_point_energy(model, values)
    u_fit = float(propagate(lambda v: np.array(zero_point_energy(model, v)), values, np.array(fit.covariance)))
    u = _u(fit, u_fit)
    return DerivedValue(
        key="zero_point_energy",
        symbol="U(0)",
        value=value,
        u=u,
        u_fit=u_fit,
        low=value - 2 * u,
        high=value + 2 * u,
        unit="J/mol",
        definition="half a quantum for every mode of the harmonic lattice: (9/8) n R theta_D[1]",
        source="C. Domb and L. Salter, Phil. Mag. 43, 1083 (1952)",
        status="determined",
        reason=None,
    )


def _entropy_below_data(table: ThermodynamicTable) -> tuple[NamedWarning, ...]:
    row = int(np.argmin(np.abs(table.temperature - STANDARD_TEMPERATURE)))
    share = float(table.entropy_fraction_below_data[row])
    if not share > _SHARE_BELOW:
        return ()
    return (
        NamedWarning(
            code="entropy-below-data",
            level="warn" if share > 10 * _SHARE_BELOW else "note",
            concerns="entropy",
            message=f"{100 * share:.2g} % of S(298.15 K) comes from below the lowest point, from the model alone",
            found=share,
            threshold=_SHARE_BELOW,
            advice="u of S has a rough allowance for what the model may get wrong there; measure lower",
        ),
    )

"""From a fit to everything derived from it."""

from __future__ import annotations

from typing import Literal

import numpy as np

from ..constants import STANDARD_TEMPERATURE
from ..diagnosing import REACH_STOP, REACH_WARN
from ..models import Model, build_model, low_temperature_theta, total_modes, zero_point_energy
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
_NEGLIGIBLE = 1e-4  # a term with less than this share of the modes moves no moment


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


def _spectrum(fit: FitRecord, model: Model) -> tuple[Status, str | None]:
    """Whether the temperatures of all terms that carry modes are determined: moments rest on every one of them."""
    total = total_modes(model, np.asarray(fit.values))
    for i in model.modes:
        own = next(each for each in model.placed if each.slice.start <= i < each.slice.stop)
        parameters = fit.parameters[own.slice]
        lost = [p.name for p in parameters if p.name != fit.names[i] and p.status in ("at_bound", "undetermined")]
        if lost and fit.values[i] > _NEGLIGIBLE * total:
            return "undetermined", f"{lost[0]} is not determined by the data, and every moment rests on it"
    return "determined", None


def _characteristic(each: CharacteristicTemperature, fit: FitRecord, model: Model, lowest: float) -> DerivedValue:
    low_temperature = each.key == "theta_debye_low_temperature"
    status, reason = _reach(fit, model, lowest) if low_temperature else _spectrum(fit, model)
    values = np.array(fit.values)
    value = each.function(model, values, fit.atoms)
    if value is None and status == "determined":
        status, reason = "undefined", "not defined for this model"
    if status != "determined":
        return _derived_value(each, None, None, None, status, reason)

    def of(v: FloatArray) -> FloatArray:
        found = each.function(model, v, fit.atoms)
        return np.array(np.nan if found is None else found)

    u_fit = float(propagate(of, values, np.array(fit.covariance)))
    if not np.isfinite(u_fit):
        return _derived_value(each, value, None, None, status, reason)
    return _derived_value(each, value, _u(fit, u_fit), u_fit, status, reason)


def _derived_value(
    each: CharacteristicTemperature,
    value: float | None,
    u: float | None,
    u_fit: float | None,
    status: Status,
    reason: str | None,
) -> DerivedValue:
    low, high = (None, None) if value is None or u is None else (value - 2 * u, value + 2 * u)
    return DerivedValue(
        key=each.key,
        symbol=each.symbol,
        value=value,
        u=u,
        u_fit=u_fit,
        low=low,
        high=high,
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

"""From a fit to everything derived from it."""

from __future__ import annotations

from dataclasses import replace
from typing import Literal

import numpy as np

from ..constants import STANDARD_TEMPERATURE
from ..diagnosing import TOP_STOP, high_temperature_ratio, low_temperature_reach
from ..models import Model, build_model, zero_point_energy
from ..records import (
    Derived,
    DerivedValue,
    FitRecord,
    FloatArray,
    NamedWarning,
    PreparedData,
    ThermodynamicTable,
)
from .characteristic import LOW_TEMPERATURE, QUANTITIES, CharacteristicTemperature
from .pointwise import model_theta, pointwise_theta
from .propagation import uncertainties
from .support import lost_in_law, lost_in_spectrum
from .thermodynamic_table import default_grid, functions_table
from .withholding import MISFIT_REASON

__all__ = ["derive"]

Status = Literal["determined", "interval", "undetermined", "undefined"]

_SHARE_BELOW = 0.005
_CURVE_POINTS = 400


def derive(
    prepared: PreparedData, fit: FitRecord, describes: bool = True, grid: tuple[float, ...] | None = None
) -> Derived:
    """Compute characteristic temperatures, zero-point energy, thermodynamic functions and pointwise theta_D(T).

    Parameters
    ----------
    prepared : PreparedData
    fit : FitRecord
    describes : bool
        Whether the model describes the data, as the diagnosis says.
    grid : tuple of float, or None
        Temperatures of the table, K; None for round temperatures over the measured range and below it. 298.15 K is
        always a row.
    """
    model = build_model(fit.terms, fit.cp_cv)
    lowest, highest = float(prepared.temperature[0]), float(prepared.temperature[-1])
    quantity = prepared.measurement.quantity
    wanted = default_grid(lowest, highest) if grid is None else np.array(grid, dtype=float)
    table = functions_table(fit, np.union1d(wanted, [STANDARD_TEMPERATURE]), lowest, highest, quantity, describes)
    dense = np.geomspace(lowest / 5, max(highest * 1.05, lowest * 2), _CURVE_POINTS)
    law, spectrum = _reach(fit, model, lowest), _spectrum(fit, model, highest)
    temperatures = [
        _characteristic(each, fit, model, law if each.key == LOW_TEMPERATURE else spectrum) for each in QUANTITIES
    ]
    zero_point = _zero_point(fit, model, spectrum)
    return Derived(
        characteristic_temperatures=tuple(each if describes else _of_wrong_model(each) for each in temperatures),
        zero_point_energy=zero_point if describes else _of_wrong_model(zero_point),
        table=table,
        curve=functions_table(fit, dense, lowest, highest, quantity, describes),
        pointwise_theta=pointwise_theta(prepared, fit, model),
        model_theta=model_theta(fit, model, dense),
        warnings=_entropy_below_data(table),
    )


def _of_wrong_model(each: DerivedValue) -> DerivedValue:
    """The value without u: where a model misses the data, its covariance says nothing about how far off it is."""
    if each.value is None:
        return each
    remark = f"u withheld, {MISFIT_REASON}; this is the value of the best wrong model"
    return replace(each, u=None, low=None, high=None, reason=f"{remark}; {each.reason}" if each.reason else remark)


def _reach(fit: FitRecord, model: Model, lowest: float) -> tuple[Status, str | None]:
    """Whether theta_D(T->0) is determined, and the remark that goes with it."""
    reach = low_temperature_reach(model, fit, lowest)
    if reach is None:
        return "undefined", "the model has no Debye term, so its heat capacity does not go as T^3"
    if reach.status == "withheld":
        return "undetermined", f"too little data: {reach.reason}, and the value would come from the choice of model"
    lost = lost_in_law(model, fit)
    if lost:
        return "undetermined", f"too little data: {lost[0]} is not determined, and the T^3 law rests on it"
    remark = "the model's theta_D(T->0) can be 1-2 % off beyond its u: that is the model, not the scatter"
    if reach.status == "doubtful":
        remark = f"{reach.reason}, where a good fit can still be wrong by percents; {remark}"
    return "determined", remark


def _spectrum(fit: FitRecord, model: Model, highest: float) -> tuple[Status, str | None]:
    """Whether the moments of the spectrum are determined: they rest on every term, and on modes that are excited."""
    lost = lost_in_spectrum(model, fit)
    if lost:
        return "undetermined", f"{lost[0]} is not determined by the data, and every moment rests on it"
    ratio = high_temperature_ratio(model, fit, highest)
    if ratio is not None and ratio > TOP_STOP:
        return "undetermined", f"the data end at theta_D[m=2]/{ratio:.2g}: the modes that carry it are not excited"
    return "determined", None


def _characteristic(
    each: CharacteristicTemperature, fit: FitRecord, model: Model, judged: tuple[Status, str | None]
) -> DerivedValue:
    status, reason = judged
    values = np.array(fit.values)
    value = each.function(model, values, fit.atoms)
    if value is None and status == "determined":
        status, reason = "undefined", "not defined for this model"
    if status != "determined":
        return _derived_value(each, None, None, None, status, reason)

    def of(v: FloatArray) -> FloatArray:
        found = each.function(model, v, fit.atoms)
        return np.array(np.nan if found is None else found)

    u_fit, u = (float(each_u) for each_u in uncertainties(of, fit))
    if not np.isfinite(u_fit):
        return _derived_value(each, value, None, None, status, reason)
    return _derived_value(each, value, u, u_fit, status, reason)


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


def _zero_point(fit: FitRecord, model: Model, judged: tuple[Status, str | None]) -> DerivedValue:
    values = np.array(fit.values)
    status, reason = judged
    value = u_fit = u = None
    if status == "determined":
        value = zero_point_energy(model, values)
        found = uncertainties(lambda v: np.array(zero_point_energy(model, v)), fit)
        u_fit, u = (float(each) for each in found)
    low, high = (None, None) if value is None or u is None else (value - 2 * u, value + 2 * u)
    return DerivedValue(
        key="zero_point_energy",
        symbol="U(0)",
        value=value,
        u=u,
        u_fit=u_fit,
        low=low,
        high=high,
        unit="J/mol",
        definition="half a quantum for every mode of the harmonic lattice: (9/8) n R theta_D[1]",
        source="C. Domb and L. Salter, Phil. Mag. 43, 1083 (1952)",
        status=status,
        reason=reason,
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

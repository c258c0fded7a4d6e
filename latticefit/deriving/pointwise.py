"""Calorimetric Debye temperature of single heat capacities."""

from __future__ import annotations

import numpy as np

from ..constants import GAS_CONSTANT
from ..functions import debye_heat_capacity_derivative, invert_debye
from ..models import Model, calorimetric_theta, cp_cv_coefficient, harmonic_heat_capacity, heat_capacity, total_modes
from ..preparing.addenda import sigma_of_all
from ..records import FitRecord, FloatArray, PointwiseTheta, PreparedData

__all__ = ["model_theta", "pointwise_theta"]


def _harmonic(model: Model, values: FloatArray, T: FloatArray, measured: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Harmonic lattice part of measured heat capacities and its derivative with respect to them."""
    lattice = harmonic_heat_capacity(model, T, values)
    other = heat_capacity(model, T, values) - model.cp_cv.apply(T, lattice, cp_cv_coefficient(model, values))
    seen = measured - other
    harmonic = model.cp_cv.invert(T, seen, cp_cv_coefficient(model, values))
    slope, _ = model.cp_cv.slopes(T, lattice, cp_cv_coefficient(model, values))
    return harmonic, 1 / slope


def _limit(model: Model, fit: FitRecord) -> float:
    """3 n R, J/(mol K), with the declared atoms; of the fitted modes where none are known."""
    modes = 3 * fit.atoms if fit.atoms is not None else total_modes(model, fit.values)
    return modes * GAS_CONSTANT


def pointwise_theta(prepared: PreparedData, fit: FitRecord, model: Model) -> PointwiseTheta:
    """theta_D(T) of every measured point: the Debye temperature whose heat capacity it has, K.

    Electronic part and Cp - Cv of the fit are removed first; u(theta) = u(C)/|dC/dtheta|. Blank, with the reason,
    where the lattice part is at or above 3nR or not positive.
    """
    measurement = prepared.measurement
    T, measured = np.asarray(measurement.temperature), np.asarray(measurement.heat_capacity)
    harmonic, slope = _harmonic(model, np.asarray(fit.values), T, measured)
    limit = _limit(model, fit)
    x = invert_debye(harmonic / limit)
    steepness = np.abs(np.asarray(debye_heat_capacity_derivative(np.where(np.isnan(x), 1.0, x)))) * limit / T
    reasons = tuple(_blank_reason(float(value), limit) for value in harmonic)
    u = np.where(np.isnan(x), np.nan, sigma_of_all(prepared) * slope / steepness)
    return PointwiseTheta(theta=x * T, u=u, reasons=reasons)


def _blank_reason(value: float, limit: float) -> str | None:
    if value >= limit:
        return "lattice part at or above 3nR"
    return None if value > 0 else "lattice part not positive"


def model_theta(fit: FitRecord, model: Model, T: FloatArray) -> FloatArray:
    """theta_D(T) of the fitted harmonic lattice, K; NaN where it is not defined."""
    return calorimetric_theta(model, np.asarray(fit.values), fit.atoms, T)

"""Every measured point beside the model: the fitted ones as diagnosed, the masked ones in the same columns."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ..preparing.addenda import with_addenda
from ..preparing.outliers import outlier_words
from ..records import Analysis, FloatArray, Frozen

__all__ = ["MeasuredPoints", "measured_points"]


@dataclass(frozen=True)
class MeasuredPoints(Frozen):
    """All points of a measurement in file order, shape (m,) each; NaN where a value is not known.

    Attributes
    ----------
    temperature : ndarray
        K.
    heat_capacity, sigma, model, residual : ndarray
        J/(mol K); residual is measured - model.
    residual_percent, residual_normalised : ndarray
        Percent of the model, and the residual divided by sigma.
    run, line : ndarray of int
        Index into the readings, and 1-based line in the file.
    used : ndarray of bool
        Whether the point is fitted.
    reasons : tuple of (str or None)
        Why a point is not fitted.
    flags : tuple of (str or None)
        How far a point lies from its neighbours, where that is too far for scatter.
    """

    temperature: FloatArray
    heat_capacity: FloatArray
    sigma: FloatArray
    model: FloatArray
    residual: FloatArray
    residual_percent: FloatArray
    residual_normalised: FloatArray
    run: NDArray[np.intp]
    line: NDArray[np.intp]
    used: NDArray[np.bool_]
    reasons: tuple[str | None, ...]
    flags: tuple[str | None, ...]


def measured_points(analysis: Analysis) -> MeasuredPoints:
    """Return all measured points with their residuals.

    Residuals of fitted points are those of the diagnosis. A masked point has the same difference from the model; its
    sigma, and with it the normalised residual, is known only where sigma was stated.
    """
    measurement, prepared, diagnosis = analysis.measurement, analysis.prepared, analysis.diagnosis
    model = diagnosis.model_all
    residual = measurement.heat_capacity - model
    percent = 100 * np.divide(residual, model, out=np.full_like(residual, np.nan), where=model != 0)
    stated = np.full_like(residual, np.nan) if measurement.sigma is None else np.array(measurement.sigma)
    sigma, _ = with_addenda(measurement, np.arange(residual.size), stated, "")
    normalised = residual / sigma
    for column, fitted in (
        (residual, diagnosis.residual),
        (percent, diagnosis.residual_percent),
        (sigma, prepared.sigma),
        (normalised, diagnosis.residual_normalised),
    ):
        column[prepared.index] = fitted
    used = np.zeros(residual.size, dtype=bool)
    used[prepared.index] = True
    return MeasuredPoints(
        temperature=measurement.temperature,
        heat_capacity=measurement.heat_capacity,
        sigma=sigma,
        model=model,
        residual=residual,
        residual_percent=percent,
        residual_normalised=normalised,
        run=measurement.run,
        line=measurement.line,
        used=used,
        reasons=prepared.reasons,
        flags=_flags(prepared.outlier_sizes, residual.size),
    )


def _flags(sizes: FloatArray | None, points: int) -> tuple[str | None, ...]:
    if sizes is None:
        return (None,) * points
    return tuple(outlier_words(size) if size else None for size in sizes.tolist())

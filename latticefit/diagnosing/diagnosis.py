"""From a fit to its diagnosis: residuals, statistics, validity, verdict, warnings."""

from __future__ import annotations

import numpy as np

from ..models import build_model, heat_capacity
from ..records import Diagnosis, FitRecord, LevelFinding, PreparedData
from .case import Case
from .level import examine_prepared_level
from .rules import find_warnings
from .statistics import residual_statistics
from .verdict import validity_facts, verdict

__all__ = ["diagnose"]


def diagnose(prepared: PreparedData, fit: FitRecord, level: LevelFinding | None = None) -> Diagnosis:
    """Compare a fit with the data it was made on.

    Parameters
    ----------
    prepared : PreparedData
    fit : FitRecord
    level : LevelFinding, optional
        What was found of the level of the points before the fit; examined here where it is not given.

    Returns
    -------
    Diagnosis
        Residual = measured - model, percent of the model value, normalised by sigma.
    """
    model = build_model(fit.terms, fit.cp_cv)
    expected = heat_capacity(model, prepared.temperature, fit.values)
    difference = prepared.heat_capacity - expected
    percent = 100 * difference / expected
    normalised = difference / prepared.sigma
    statistics = residual_statistics(prepared, fit, difference, percent, normalised)
    describes, sentence = verdict(prepared, fit, statistics)
    return Diagnosis(
        model=expected,
        residual=difference,
        residual_percent=percent,
        residual_normalised=normalised,
        model_all=heat_capacity(model, np.asarray(prepared.measurement.temperature), fit.values),
        statistics=statistics,
        validity=validity_facts(prepared, fit, statistics),
        describes=describes,
        verdict=sentence,
        warnings=find_warnings(Case(prepared, model, fit, statistics, level or examine_prepared_level(prepared))),
    )

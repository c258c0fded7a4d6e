"""Lattice models: expressions, sums of terms, Cp-Cv, parametrisation; and the same terms as lmfit Models."""

from __future__ import annotations

from typing import Any

from ..terms import TERMS
from .cp_cv import CP_CV_FORMS, CpCvForm, cp_cv_form
from .expression import format_expression, parse_expression
from .model import (
    Model,
    PlacedTerm,
    build_model,
    components,
    cp_cv_coefficient,
    harmonic_heat_capacity,
    heat_capacity,
    heat_capacity_and_partials,
    low_temperature_theta,
    partials,
    total_modes,
)
from .parametrisation import Parametrisation, jacobian, residual, residual_and_jacobian
from .spectrum import calorimetric_theta, mean_theta, theta_debye_moment
from .thermodynamics import energy, entropy, zero_point_energy

__all__ = [
    "CP_CV_FORMS",
    "CpCvForm",
    "Model",
    "Parametrisation",
    "PlacedTerm",
    "build_model",
    "calorimetric_theta",
    "components",
    "cp_cv_coefficient",
    "cp_cv_form",
    "energy",
    "entropy",
    "format_expression",
    "harmonic_heat_capacity",
    "heat_capacity",
    "heat_capacity_and_partials",
    "jacobian",
    "low_temperature_theta",
    "mean_theta",
    "parse_expression",
    "partials",
    "residual",
    "residual_and_jacobian",
    "theta_debye_moment",
    "total_modes",
    "zero_point_energy",
]


def _lmfit_names() -> set[str]:
    return {"TermModel", "weighted_jacobian", *(each.model_class_name for each in TERMS.values())}


def __getattr__(name: str) -> Any:
    """Give the lmfit Model classes (DebyeModel, EinsteinModel ...) on first use: lmfit takes a second to import."""
    if name in _lmfit_names():
        from . import lmfit_models

        return getattr(lmfit_models, name)
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")


def __dir__() -> list[str]:
    """List the lmfit Model classes too, without importing lmfit."""
    return sorted({*globals(), *_lmfit_names()})

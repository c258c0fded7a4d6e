"""Characteristic temperatures, thermodynamic functions on any grid, pointwise Debye temperatures."""

from __future__ import annotations

from typing import TYPE_CHECKING

from ..lazy import on_first_use

if TYPE_CHECKING:
    from .characteristic import QUANTITIES, CharacteristicTemperature
    from .derivation import derive
    from .pointwise import model_theta, pointwise_theta
    from .propagation import stated_covariance, uncertainties
    from .thermodynamic_table import default_grid, functions_table

__all__ = [
    "QUANTITIES",
    "CharacteristicTemperature",
    "default_grid",
    "derive",
    "functions_table",
    "model_theta",
    "pointwise_theta",
    "stated_covariance",
    "uncertainties",
]

__getattr__ = on_first_use(
    __name__,
    {
        "characteristic": (
            "QUANTITIES",
            "CharacteristicTemperature",
        ),
        "derivation": ("derive",),
        "thermodynamic_table": (
            "default_grid",
            "functions_table",
        ),
        "pointwise": (
            "model_theta",
            "pointwise_theta",
        ),
        "propagation": (
            "stated_covariance",
            "uncertainties",
        ),
    },
)

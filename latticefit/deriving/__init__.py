"""Characteristic temperatures, thermodynamic functions on any grid, pointwise Debye temperatures."""

from .characteristic import QUANTITIES, CharacteristicTemperature
from .derive import derive
from .functions_table import default_grid, functions_table
from .pointwise import model_theta, pointwise_theta
from .propagation import propagate, standard_uncertainty

__all__ = [
    "QUANTITIES",
    "CharacteristicTemperature",
    "default_grid",
    "derive",
    "functions_table",
    "model_theta",
    "pointwise_theta",
    "propagate",
    "standard_uncertainty",
]

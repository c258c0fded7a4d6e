"""Special functions of lattice heat capacity: plain numpy, x = theta/T of any shape, accurate to rounding.

Heat capacity and entropy are per 3 N k_B, energy and Helmholtz energy per 3 N k_B T and without the zero point.
"""

from latticefit.functions.check import PublishedCheck, published_check
from latticefit.functions.debye import (
    debye_energy,
    debye_energy_derivative,
    debye_entropy,
    debye_function,
    debye_function_derivative,
    debye_heat_capacity,
    debye_heat_capacity_derivative,
    debye_helmholtz,
)
from latticefit.functions.einstein import (
    einstein_energy,
    einstein_energy_derivative,
    einstein_entropy,
    einstein_heat_capacity,
    einstein_heat_capacity_derivative,
    einstein_helmholtz,
)
from latticefit.functions.inversion import invert_debye

__all__ = [
    "PublishedCheck",
    "debye_energy",
    "debye_energy_derivative",
    "debye_entropy",
    "debye_function",
    "debye_function_derivative",
    "debye_heat_capacity",
    "debye_heat_capacity_derivative",
    "debye_helmholtz",
    "einstein_energy",
    "einstein_energy_derivative",
    "einstein_entropy",
    "einstein_heat_capacity",
    "einstein_heat_capacity_derivative",
    "einstein_helmholtz",
    "invert_debye",
    "published_check",
]

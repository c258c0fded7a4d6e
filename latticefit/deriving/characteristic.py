"""Characteristic temperatures of a model: one function each, and one registry.

A new quantity is one function and one line in `QUANTITIES`.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import partial
from math import exp

import numpy as np

from ..models import Model, low_temperature_theta, mean_theta, theta_debye_moment
from ..records import FloatArray

__all__ = ["LOW_TEMPERATURE", "QUANTITIES", "CharacteristicTemperature"]

LOW_TEMPERATURE = "theta_debye_low_temperature"
"""Key of theta_D(T->0)."""

_MOMENTS = "C. Domb and L. Salter, Phil. Mag. 43, 1083 (1952); T. H. K. Barron, W. T. Berg and J. A. Morrison, " + (
    "Proc. R. Soc. Lond. A 242, 478 (1957)"
)
_DEBYE = "P. Debye, Ann. Phys. 39, 789 (1912)"


def _low_temperature(model: Model, values: FloatArray, atoms: float | None) -> float | None:
    return low_temperature_theta(model, values, atoms)


def _einstein_entropy(model: Model, values: FloatArray, atoms: float | None) -> float | None:
    return exp(mean_theta(model, values, 0))


def _einstein_high_temperature(model: Model, values: FloatArray, atoms: float | None) -> float | None:
    return float(np.sqrt(mean_theta(model, values, 2)))


def _einstein_zero_point(model: Model, values: FloatArray, atoms: float | None) -> float | None:
    return mean_theta(model, values, 1)


@dataclass(frozen=True)
class CharacteristicTemperature:
    """A characteristic temperature: its key in result.json, symbol, definition, source and function."""

    key: str
    symbol: str
    definition: str
    source: str
    function: Callable[[Model, FloatArray, float | None], float | None]


def _moment(m: int, key: str, meaning: str) -> CharacteristicTemperature:
    if m == 0:
        formula = "exp(1/3 + <ln theta>)"
    else:
        formula = f"((m+3)/3 <theta^m>)^(1/m), m = {m}"
    return CharacteristicTemperature(
        f"theta_debye_moment_{key}",
        f"theta_D[m={m}]",
        f"{formula} over all modes; {meaning}",
        _MOMENTS,
        partial(theta_debye_moment, m),
    )


QUANTITIES: tuple[CharacteristicTemperature, ...] = (
    CharacteristicTemperature(
        LOW_TEMPERATURE,
        "theta_D(T->0)",
        "(12 pi^4 n R/(5 beta))^(1/3), beta the T^3 coefficient of the lattice, n atoms per formula unit",
        _DEBYE,
        _low_temperature,
    ),
    _moment(-2, "minus_2", "for mean square displacements at high T"),
    _moment(-1, "minus_1", "for zero-point mean square displacements"),
    _moment(0, "0", "logarithmic, for the entropy at high T"),
    _moment(1, "1", "for the zero-point energy"),
    _moment(2, "2", "for the heat capacity at high T"),
    CharacteristicTemperature(
        "theta_einstein_entropy",
        "theta_E(entropy)",
        "exp<ln theta> = exp(-1/3) theta_D[0]: one Einstein frequency with the entropy of the model at high T",
        _MOMENTS,
        _einstein_entropy,
    ),
    CharacteristicTemperature(
        "theta_einstein_high_temperature",
        "theta_E(high T)",
        "<theta^2>^(1/2) = sqrt(3/5) theta_D[2]: one Einstein frequency with the heat capacity of the model at high T",
        _MOMENTS,
        _einstein_high_temperature,
    ),
    CharacteristicTemperature(
        "theta_einstein_zero_point",
        "theta_E(zero point)",
        "<theta> = (3/4) theta_D[1]: one Einstein frequency with the zero-point energy of the model",
        _MOMENTS,
        _einstein_zero_point,
    ),
)
"""Every characteristic temperature, in the order of the report."""

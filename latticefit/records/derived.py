"""What was derived, and the whole analysis that reports are rendered from."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

from .base import FloatArray, Frozen, Quantity
from .data import Measurement, PreparedData
from .findings import Diagnosis, FitRecord, NamedWarning
from .request import Sheet

__all__ = ["Analysis", "Derived", "DerivedValue", "PointwiseTheta", "Provenance", "ThermodynamicTable"]


@dataclass(frozen=True)
class DerivedValue:
    """A derived quantity: value, uncertainty, definition and source; `reason` says why a value or u is missing.

    `low` and `high` bound an interval (k = 2) where one is given. `status`: determined, interval, undetermined (too
    little data) or undefined (not defined for this model).
    """

    key: str
    symbol: str
    value: float | None
    u: float | None
    u_fit: float | None
    low: float | None
    high: float | None
    unit: str
    definition: str
    source: str
    status: Literal["determined", "interval", "undetermined", "undefined"]
    reason: str | None


@dataclass(frozen=True, eq=False)
class ThermodynamicTable(Frozen):
    """Thermodynamic functions on a grid, per mole of formula unit, shape (m,) each; NaN where not given.

    `energy` is H(T)-H(0) with quantity Cp and U(T)-U(0) with Cv, J/mol; `free_energy_function` is -(G(T)-H(0))/T,
    respectively -(F(T)-U(0))/T, J/(mol K). `..._u` are standard uncertainties that latticefit stands behind (NaN
    where withheld, with `u_reasons`), `..._u_fit` those of the covariance. `components` holds the heat capacity of
    each term and of Cp-Cv, J/(mol K).
    """

    quantity: Quantity
    temperature: FloatArray
    heat_capacity: FloatArray
    heat_capacity_u: FloatArray
    heat_capacity_u_fit: FloatArray
    energy: FloatArray
    energy_u: FloatArray
    energy_u_fit: FloatArray
    entropy: FloatArray
    entropy_u: FloatArray
    entropy_u_fit: FloatArray
    free_energy_function: FloatArray
    free_energy_function_u: FloatArray
    free_energy_function_u_fit: FloatArray
    entropy_fraction_below_data: FloatArray
    origin: tuple[Literal["measured", "extrapolated_below", "extrapolated_above"], ...]
    u_reasons: tuple[str | None, ...]
    components: Mapping[str, FloatArray]


@dataclass(frozen=True, eq=False)
class PointwiseTheta(Frozen):
    """Calorimetric theta_D(T) of every measured point (order of the measurement), K; NaN with a reason where blank."""

    theta: FloatArray
    u: FloatArray
    reasons: tuple[str | None, ...]


@dataclass(frozen=True, eq=False)
class Derived(Frozen):
    """Everything derived from a fit.

    `characteristic_temperatures` is keyed as in result.json; `table` is the user's or the standard grid (298.15 K is
    always in it); `curve` is a dense grid for figures, from below the data to above them.
    """

    characteristic_temperatures: tuple[DerivedValue, ...]
    zero_point_energy: DerivedValue
    table: ThermodynamicTable
    curve: ThermodynamicTable
    pointwise_theta: PointwiseTheta
    model_theta: FloatArray
    warnings: tuple[NamedWarning, ...]


@dataclass(frozen=True)
class Provenance(Frozen):
    """Which version made a result, when, with which packages, seed and command."""

    version: str
    created: str
    random_seed: int
    packages: Mapping[str, str]
    command: str


@dataclass(frozen=True, eq=False)
class Analysis:
    """All records of one run, from the request to the derived quantities: what reports are rendered from.

    `warnings` are those of the diagnosis and of the derived quantities together, gravest first.
    """

    sheet: Sheet
    measurement: Measurement
    prepared: PreparedData
    fit: FitRecord
    diagnosis: Diagnosis
    derived: Derived
    warnings: tuple[NamedWarning, ...]
    chosen_because: str
    provenance: Provenance

"""What was derived, and the whole analysis that reports are rendered from."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

from .base import FloatArray, Frozen, Quantity
from .data import Measurement, PreparedData, Sample
from .findings import Comparison, Diagnosis, FitRecord, LevelFinding, NamedWarning
from .request import Sheet

__all__ = [
    "Analysis",
    "Derived",
    "DerivedValue",
    "EnergyDifference",
    "PointwiseTheta",
    "Provenance",
    "SavedResult",
    "ThermodynamicTable",
]


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
    """Thermodynamic functions on a grid, shape (m,) each; NaN where not given.

    Per mole of formula unit, or per gram or kilogram where `per` says so.


    `energy` is H(T)-H(0) with quantity Cp and U(T)-U(0) with Cv, J/mol; `energy_from_standard` is the same from
    298.15 K on, H(T)-H(298.15 K); `free_energy_function` is -(G(T)-H(0))/T,
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
    energy_from_standard: FloatArray
    energy_from_standard_u: FloatArray
    free_energy_function: FloatArray
    free_energy_function_u: FloatArray
    free_energy_function_u_fit: FloatArray
    entropy_fraction_below_data: FloatArray
    origin: tuple[Literal["measured", "extrapolated_below", "extrapolated_above"], ...]
    u_reasons: tuple[str | None, ...]
    components: Mapping[str, FloatArray]
    per: Literal["mol", "g", "kg"] = "mol"


@dataclass(frozen=True)
class EnergyDifference:
    """H(high)-H(low) between two temperatures (U with quantity Cv) and S(high)-S(low), with u; None where withheld.

    Per mole of formula unit, gram or kilogram as `per` says; J or J/K per that amount.
    """

    low: float
    high: float
    energy: float | None
    energy_u: float | None
    entropy: float | None
    entropy_u: float | None
    reason: str | None
    quantity: Quantity
    per: Literal["mol", "g", "kg"]


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

    `warnings` are those of the diagnosis and of the derived quantities together, gravest first; `level` is what was
    found of the level of the data before the fit.
    """

    sheet: Sheet
    measurement: Measurement
    prepared: PreparedData
    fit: FitRecord
    diagnosis: Diagnosis
    derived: Derived
    warnings: tuple[NamedWarning, ...]
    comparison: Comparison
    provenance: Provenance
    level: LevelFinding | None = None


@dataclass(frozen=True)
class SavedResult:
    """A result read back from its file: the fit, its sample, the range of the points (K), and the verdict."""

    sample: Sample
    quantity: Quantity
    lowest: float
    highest: float
    fit: FitRecord
    describes: bool

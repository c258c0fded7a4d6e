"""Frozen records handed from stage to stage: what was asked, read, prepared, fitted, found and derived.

A record holds facts and no logic. Temperatures are in K; heat capacity and entropy in J/(mol K), energy in
J/mol, per mole of formula unit; everything else in SI. Arrays inside a record are read-only.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, fields
from types import MappingProxyType
from typing import Literal

import numpy as np
from numpy.typing import NDArray

__all__ = [
    "Analysis",
    "Basis",
    "Derived",
    "DerivedValue",
    "Diagnosis",
    "ExcludedRow",
    "FitRecord",
    "FloatArray",
    "Frozen",
    "Measurement",
    "ModelSettings",
    "NamedWarning",
    "ParameterValue",
    "PointwiseTheta",
    "PreparedData",
    "Provenance",
    "Reading",
    "Repair",
    "ReportSettings",
    "Quantity",
    "ResidualBand",
    "ResidualStatistics",
    "RunSettings",
    "Sample",
    "SampleSettings",
    "Sheet",
    "ThermodynamicTable",
    "ValidityFact",
]

FloatArray = NDArray[np.float64]
Basis = Literal["mol", "gram", "sample"]
Quantity = Literal["Cp", "Cv"]
SigmaKind = Literal["stated", "estimated"]
Level = Literal["note", "warn", "stop"]


class Frozen:
    """Make every array of a frozen dataclass read-only and every mapping a read-only view."""

    def __post_init__(self) -> None:
        for entry in fields(self):  # type: ignore[arg-type]
            value = getattr(self, entry.name)
            if isinstance(value, np.ndarray):
                held = value.copy()
                held.flags.writeable = False
                object.__setattr__(self, entry.name, held)
            elif isinstance(value, dict):
                object.__setattr__(self, entry.name, MappingProxyType(dict(value)))


def _empty() -> Mapping[str, float]:
    return MappingProxyType({})


# ------------------------------------------------------------------------------------------------ what was asked


@dataclass(frozen=True)
class SampleSettings:
    """The `[sample]` table of a run sheet, as written (quantities are strings with unit)."""

    name: str | None = None
    formula: str | None = None
    atoms: float | None = None
    molar_mass: str | None = None
    mass: str | None = None
    melting_point: str | None = None


@dataclass(frozen=True)
class RunSettings:
    """One `[[run]]` of a run sheet: a file and how it is to be read.

    `temperature` and `heat_capacity` are a header or a 1-based column number, None to recognise them; `sigma` is
    a header, a column number or a sigma text. `window` and `mask` are closed intervals in K.
    """

    file: str
    label: str | None = None
    quantity: Quantity | None = None
    temperature: str | int | None = None
    heat_capacity: str | int | None = None
    sigma: str | int | None = None
    coverage_factor: float | None = None
    temperature_unit: str | None = None
    heat_capacity_unit: str | None = None
    window: tuple[tuple[float, float], ...] = ()
    mask: tuple[tuple[float, float], ...] = ()


@dataclass(frozen=True)
class ModelSettings(Frozen):
    """The `[model]` table: which terms, how the modes are summed, Cp-Cv, and what the user holds by name."""

    terms: str | None = None
    mode_sum: Literal["fixed", "free"] | None = None
    cp_cv: str = "none"
    start: Mapping[str, float] = field(default_factory=_empty)
    fix: Mapping[str, float] = field(default_factory=_empty)
    bounds: Mapping[str, tuple[float, float]] = field(default_factory=dict)


@dataclass(frozen=True)
class ReportSettings:
    """The `[report]` table: grid text, figures, folder and seed."""

    grid: str | None = None
    figures: Literal["none", "svg", "png", "all"] = "svg"
    out: str | None = None
    random_seed: int = 0


@dataclass(frozen=True)
class Sheet:
    """A whole request: everything that is needed to repeat a run."""

    sample: SampleSettings
    runs: tuple[RunSettings, ...]
    model: ModelSettings = field(default_factory=ModelSettings)
    report: ReportSettings = field(default_factory=ReportSettings)


# -------------------------------------------------------------------------------------------------- what was read


@dataclass(frozen=True)
class Sample:
    """The sample: atoms per formula unit, molar mass in kg/mol, mass in kg, melting point in K; None where unknown."""

    name: str
    formula: str | None = None
    atoms: float | None = None
    molar_mass: float | None = None
    mass: float | None = None
    melting_point: float | None = None


@dataclass(frozen=True)
class Repair:
    """Something that the reader mended or left out, and where. `line` is None when it concerns the whole file."""

    file: str
    line: int | None
    message: str


@dataclass(frozen=True)
class ExcludedRow:
    """A row that the reader could not use; values are NaN where unreadable. `run` is the index of its source."""

    run: int
    line: int
    temperature: float
    heat_capacity: float
    sigma: float
    reason: str


@dataclass(frozen=True)
class Reading:
    """How one file was read: path, sha256 of its bytes, and the choices that were made."""

    path: str
    file: str
    sha256: str
    label: str
    encoding: str
    delimiter: str
    decimal: str
    temperature_column: str
    heat_capacity_column: str
    sigma_column: str | None
    temperature_unit: str
    heat_capacity_unit: str
    rows: int
    settings: RunSettings


@dataclass(frozen=True)
class Measurement(Frozen):
    """Measured heat capacity of one sample, in file order, unusable rows omitted.

    Attributes
    ----------
    temperature : ndarray, shape (n,)
        K.
    heat_capacity : ndarray, shape (n,)
        J/(mol K) when `basis` is "mol", J/(g K) when "gram", J/K when "sample".
    sigma : ndarray, shape (n,), or None
        Standard uncertainty (k = 1) as stated by the file or the user, unit as `heat_capacity`.
    run : ndarray of int, shape (n,)
        Index into `readings`.
    line : ndarray of int, shape (n,)
        1-based line in the file.
    """

    sample: Sample
    temperature: FloatArray
    heat_capacity: FloatArray
    sigma: FloatArray | None
    run: NDArray[np.intp]
    line: NDArray[np.intp]
    quantity: Quantity
    basis: Basis
    sigma_text: str
    readings: tuple[Reading, ...]
    repairs: tuple[Repair, ...]
    excluded: tuple[ExcludedRow, ...]
    sample_settings: SampleSettings


# ---------------------------------------------------------------------------------------------- what was prepared


@dataclass(frozen=True)
class PreparedData(Frozen):
    """The points that are fitted, by ascending temperature, each with its standard uncertainty.

    Attributes
    ----------
    temperature, heat_capacity, sigma : ndarray, shape (n,)
        K, J/(mol K), J/(mol K); ascending temperature.
    run : ndarray of int, shape (n,)
        Index into ``measurement.readings``.
    index : ndarray of int, shape (n,)
        Position of each point in the arrays of `measurement`.
    reasons : tuple of (str or None), length of the measurement
        Why a measured point is not fitted; None for the fitted ones.
    sigma_text : str
        The sigma model in force, in words.
    """

    measurement: Measurement
    temperature: FloatArray
    heat_capacity: FloatArray
    sigma: FloatArray
    run: NDArray[np.intp]
    index: NDArray[np.intp]
    reasons: tuple[str | None, ...]
    sigma_kind: SigmaKind
    sigma_text: str


# ------------------------------------------------------------------------------------------------ what was fitted


@dataclass(frozen=True)
class ParameterValue:
    """One parameter of the model with its uncertainty (k = 1), unit and status.

    `u` is the standard uncertainty that latticefit stands behind, `u_fit` the one from the covariance alone; both
    None where undetermined, 0 where fixed.
    """

    name: str
    value: float
    u: float | None
    u_fit: float | None
    unit: str
    status: Literal["fitted", "fixed", "tied", "at_bound", "undetermined"]
    low: float
    high: float
    start: float
    meaning: str


@dataclass(frozen=True)
class FitRecord(Frozen):
    """Result of one fit: enough to evaluate the model again without the data.

    Attributes
    ----------
    terms : str
        The model expression in its standard spelling, e.g. ``"debye + 2 einstein"``.
    mode_sum : {"fixed", "free"}
        Whether the modes are held at 3 per atom.
    atoms : float or None
        Atoms per formula unit.
    names : tuple of str, length p
        Every parameter of the model, free or not.
    values : ndarray, shape (p,)
        Their values in SI (K; modes; J/(mol K^2); mol/J; 1/K).
    covariance : ndarray, shape (p, p)
        Of all parameters, of kind `covariance_kind`; rows of fixed parameters are zero, tied ones are filled in.
        Directions that the data do not determine are left out of it; the parameters concerned have the status
        "undetermined".
    scale_factor : float
        Reduced chi-square; what an absolute covariance would be multiplied by (already done when "scaled").
    condition : float
        Condition number of the covariance of the free parameters scaled to unit diagonal.
    starts_tried, distinct_minima : int
        Local fits made to find the minimum, and distinct minima found within a chi-square of 4 of the best.
    """

    terms: str
    mode_sum: Literal["fixed", "free"]
    cp_cv: str
    atoms: float | None
    names: tuple[str, ...]
    values: FloatArray
    covariance: FloatArray
    parameters: tuple[ParameterValue, ...]
    covariance_kind: Literal["absolute", "scaled"]
    scale_factor: float
    condition: float
    converged: bool
    message: str
    chi_square: float
    degrees_of_freedom: int
    free_parameters: int
    evaluations: int
    starts_tried: int
    distinct_minima: int


# ------------------------------------------------------------------------------------------------- what was found


@dataclass(frozen=True)
class ResidualBand:
    """Residuals of one temperature decade: how many points, rms and largest in percent of the model."""

    temperature_low: float
    temperature_high: float
    points: int
    rms_percent: float
    max_abs_percent: float


@dataclass(frozen=True)
class ResidualStatistics:
    """Numbers on the residuals of the fitted points; None where they are not defined."""

    reduced_chi_square: float | None
    chi_square_p: float | None
    aicc: float | None
    bic: float | None
    rms_percent: float
    max_abs_percent: float
    max_abs_percent_temperature: float
    durbin_watson: float | None
    lag1_correlation: float | None
    runs_test_p: float | None
    longest_run: int
    bands: tuple[ResidualBand, ...]


@dataclass(frozen=True)
class ValidityFact:
    """One yes-or-no fact on the fit: what was asked, whether it holds, and the number behind it in words."""

    name: str
    holds: bool
    detail: str


@dataclass(frozen=True)
class NamedWarning:
    """A named finding: code in kebab-case, level, what it concerns, and what to do next."""

    code: str
    level: Level
    concerns: str
    message: str
    found: float | str | None
    threshold: float | str | None
    advice: str


@dataclass(frozen=True)
class Diagnosis(Frozen):
    """Residuals of the fitted points and what they say.

    Attributes
    ----------
    model, residual, residual_percent, residual_normalised : ndarray, shape (n,)
        For the fitted points in the order of `PreparedData`: model in J/(mol K), measured - model in J/(mol K), the
        same in percent of the model, and divided by sigma.
    model_all : ndarray, shape (m,)
        The model at every point of the measurement, fitted or not, in its order.
    describes : bool
        Whether the model describes the data.
    verdict : str
        The same in one or two sentences.
    """

    model: FloatArray
    residual: FloatArray
    residual_percent: FloatArray
    residual_normalised: FloatArray
    model_all: FloatArray
    statistics: ResidualStatistics
    validity: tuple[ValidityFact, ...]
    describes: bool
    verdict: str
    warnings: tuple[NamedWarning, ...]


# ----------------------------------------------------------------------------------------------- what was derived


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


@dataclass(frozen=True)
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


@dataclass(frozen=True)
class PointwiseTheta(Frozen):
    """Calorimetric theta_D(T) of every measured point (order of the measurement), K; NaN with a reason where blank."""

    theta: FloatArray
    u: FloatArray
    reasons: tuple[str | None, ...]


@dataclass(frozen=True)
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


@dataclass(frozen=True)
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

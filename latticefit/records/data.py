"""What was read and prepared: the sample, the measured points, and those that are fitted."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from html import escape

import numpy as np
from numpy.typing import NDArray

from .base import Basis, FloatArray, Frozen, Quantity, SigmaKind
from .noticed import RunOverlap
from .request import AddendaSettings, RunSettings, SampleSettings

__all__ = ["AddendaShare", "ExcludedRow", "Measurement", "PreparedData", "Reading", "Repair", "Sample"]


_UNITS: Mapping[Basis, str] = {"mol": "J/(mol K)", "gram": "J/(g K)", "sample": "J/K"}


@dataclass(frozen=True)
class Sample:
    """The sample: atoms per formula unit, molar mass in kg/mol, mass in kg, melting point in K; None where unknown.

    `insulator` is True where the user declared that there are no conduction electrons; `mass_u` is the standard
    uncertainty of the mass, kg, None where none is stated.
    """

    name: str
    formula: str | None = None
    atoms: float | None = None
    molar_mass: float | None = None
    mass: float | None = None
    melting_point: float | None = None
    insulator: bool = False
    mass_u: float | None = None


@dataclass(frozen=True)
class Repair:
    """Something that the reader mended or left out, and where. `line` is None when it concerns the whole file."""

    file: str
    line: int | None
    message: str


@dataclass(frozen=True)
class ExcludedRow:
    """A row that the reader could not use; values are NaN where unreadable. `run` is the index of its source.

    Points that were averaged stand here too; `averaged_into` is then the position of their mean in the measurement.
    """

    run: int
    line: int
    temperature: float
    heat_capacity: float
    sigma: float
    reason: str
    averaged_into: int | None = None


@dataclass(frozen=True)
class Reading:
    """How one run was read: path and sha256 of its file, and the choices that were made.

    Runs that come from one file, divided by a column, share its path and its settings. `unused_columns` are the headers
    of the columns that nothing was taken from.
    """

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
    unused_columns: tuple[str, ...] = ()


@dataclass(frozen=True)
class AddendaShare:
    """What one known heat capacity makes of a measurement, over the `points` that it was taken off.

    Its share of the measured total, lowest and highest, and its standard uncertainty (k = 1) as a part of what is left.
    """

    points: int
    lowest: float
    highest: float
    u_lowest: float
    u_highest: float


@dataclass(frozen=True, eq=False, repr=False)
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
    set_aside : tuple of (str or None), length n or 0
        Why a point is not to be fitted although it could be read (a line that is masked, a condition that is not met);
        None for the others. Empty where no point is set aside.
    addenda, addenda_u : ndarray, shape (n,), or None
        The known heat capacity that was taken off at each point, and its standard uncertainty (k = 1), which is not in
        `sigma`; unit as `heat_capacity`, and with it the measured total. None where nothing was taken off.
    addenda_readings, addenda_shares : tuple of Reading, tuple of AddendaShare
        How the files of known heat capacities were read, and what each makes up, one for each of `addenda_settings`.
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
    set_aside: tuple[str | None, ...] = ()
    addenda: FloatArray | None = None
    addenda_u: FloatArray | None = None
    addenda_settings: tuple[AddendaSettings, ...] = ()
    addenda_readings: tuple[Reading, ...] = ()
    addenda_shares: tuple[AddendaShare, ...] = ()

    def _facts(self) -> dict[str, str]:
        """What a notebook shows of it; names stand in quotes, with whatever does not print escaped."""
        sample = self.sample
        T = self.temperature
        formula = "" if sample.formula is None else f" ({sample.formula!r})"
        return {
            "sample": f"{sample.name!r}{'' if sample.formula == sample.name else formula}",
            "files": ", ".join(repr(each.file) for each in self.readings),
            "points": str(T.size),
            "range": f"{T.min():.4g} to {T.max():.4g} K" if T.size else "none",
            "quantity": f"{self.quantity} in {_UNITS[self.basis]}",
            "sigma": repr(self.sigma_text) if self.sigma_text else "none stated",
            **(
                {"addenda": ", ".join(repr(each.file) for each in self.addenda_readings)}
                if self.addenda_readings
                else {}
            ),
        }

    def __repr__(self) -> str:
        facts = self._facts()
        return f"<Measurement {facts['sample']}: {facts['points']} points, {facts['range']}, {facts['quantity']}>"

    def _repr_html_(self) -> str:
        rows = "".join(f"<tr><th>{name}</th><td>{escape(text)}</td></tr>" for name, text in self._facts().items())
        return f"<table>{rows}</table>"


@dataclass(frozen=True, eq=False)
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
    sigma_assumed : bool
        True where nothing was stated and nothing could be estimated: only the relative sizes of sigma mean anything.
    outlier_sizes : ndarray, shape of the measurement, or None
        How far a fitted point lies from its neighbours, in scatters, where that is too far for scatter; 0 for the
        others. None where it was not looked at.
    overlaps : tuple of RunOverlap
        Pairs of runs with a common range: all in the order of the runs, of many those that differ most, worst first.
    overlaps_compared : int
        How many pairs have a common range.
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
    sigma_assumed: bool = False
    outlier_sizes: FloatArray | None = None
    overlaps: tuple[RunOverlap, ...] = ()
    overlaps_compared: int = 0

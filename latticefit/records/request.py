"""What was asked: the tables of a run sheet."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Literal

from .base import Frozen, Quantity, ReadOnly, Replicates, TemperatureScale, empty

__all__ = ["AddendaSettings", "ModelSettings", "ReportSettings", "RunSettings", "SampleSettings", "Sheet"]


@dataclass(frozen=True)
class SampleSettings:
    """The `[sample]` table of a run sheet, as written (quantities are strings with unit).

    `mass` may hold its standard uncertainty, as in ``"12.3(2) mg"``. `accept_level` takes a heat capacity whose level
    looks impossible as it stands.
    """

    name: str | None = None
    formula: str | None = None
    atoms: float | None = None
    molar_mass: str | None = None
    mass: str | None = None
    melting_point: str | None = None
    insulator: bool = False
    accept_level: bool = False


@dataclass(frozen=True)
class RunSettings:
    """One `[[run]]` of a run sheet: a file and how it is to be read.

    `temperature` and `heat_capacity` are a header or a 1-based column number, None to recognise them; `sigma` is
    a header, a column number, a sigma text or the word "scatter" or "replicates", which estimates it from the data.
    `window` and `mask` are closed intervals in K, `mask_lines` closed intervals of 1-based lines of the file, `require`
    conditions on a column, such as ``"quality >= 0.9"``; `split_by` is a column whose values divide the file into runs.
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
    worksheet: str | None = None
    temperature_scale: TemperatureScale | None = None
    require: tuple[str, ...] = ()
    mask_lines: tuple[tuple[int, int], ...] = ()
    replicates: Replicates | None = None
    split_by: str | int | None = None


@dataclass(frozen=True)
class AddendaSettings:
    """One `[[addenda]]` of a run sheet: a known heat capacity that is in the data and is taken off.

    Columns, units and sigma as in `RunSettings`. A file in J/K is taken off as it stands; one per gram needs `mass`
    (grease, exchange gas) or `fraction`, the part of the sample's mass that is another substance, each also with its
    uncertainty. `runs` holds the labels of the runs that it concerns, all of them when empty.
    """

    file: str
    temperature: str | int | None = None
    heat_capacity: str | int | None = None
    sigma: str | int | None = None
    coverage_factor: float | None = None
    temperature_unit: str | None = None
    heat_capacity_unit: str | None = None
    worksheet: str | None = None
    temperature_scale: TemperatureScale | None = None
    mass: str | None = None
    fraction: str | None = None
    runs: tuple[str, ...] = ()


@dataclass(frozen=True)
class ModelSettings(Frozen):
    """The `[model]` table: which terms, how the modes are summed, Cp-Cv, and what the user holds by name.

    `terms` None compares the ladder of candidates; `cp_cv` None leaves the form to it (no form with named terms).
    `fix_u` holds standard uncertainties of fixed parameters, `fix_from` the path of a saved result whose lattice is
    held.
    """

    terms: str | None = None
    mode_sum: Literal["fixed", "free"] | None = None
    cp_cv: str | None = None
    start: Mapping[str, float] = field(default_factory=empty)
    fix: Mapping[str, float] = field(default_factory=empty)
    bounds: Mapping[str, tuple[float, float]] = field(default_factory=lambda: ReadOnly({}))
    fix_u: Mapping[str, float] = field(default_factory=empty)
    fix_from: str | None = None


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
    addenda: tuple[AddendaSettings, ...] = ()

"""What was asked: the tables of a run sheet."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Literal

from .base import Frozen, Quantity, ReadOnly, empty

__all__ = ["ModelSettings", "ReportSettings", "RunSettings", "SampleSettings", "Sheet"]


@dataclass(frozen=True)
class SampleSettings:
    """The `[sample]` table of a run sheet, as written (quantities are strings with unit)."""

    name: str | None = None
    formula: str | None = None
    atoms: float | None = None
    molar_mass: str | None = None
    mass: str | None = None
    melting_point: str | None = None
    insulator: bool = False


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

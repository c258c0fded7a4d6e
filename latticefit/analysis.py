"""The order of the stages, in one readable function, and what a notebook holds."""

from __future__ import annotations

import platform
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from datetime import UTC, datetime
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal

import numpy as np

from ._version import __version__
from .deriving import derive, functions_table
from .diagnosing import diagnose
from .errors import InputError
from .fitting import fit_model
from .preparing import prepare
from .reading import parse_grid, read_measurement
from .reading.settings import MODEL, REPORT, RUN, SAMPLE, checked, temperatures, wrong
from .records import (
    Analysis,
    FloatArray,
    Measurement,
    ModelSettings,
    NamedWarning,
    Provenance,
    Quantity,
    ReportSettings,
    RunSettings,
    SampleSettings,
    Sheet,
)

if TYPE_CHECKING:
    import pandas as pd
    from matplotlib.figure import Figure

__all__ = ["Fit", "analyse", "fit", "read"]

_PACKAGES = ("numpy", "scipy", "lmfit", "matplotlib", "pandas", "pint", "periodictable")
_GRAVITY = {"stop": 0, "warn": 1, "note": 2}
_DEFAULTS = ModelSettings()
_LONGEST_ARGUMENT = 60

Interval = str | tuple[float, float]


def analyse(
    sheet: Sheet, measurement: Measurement, command: str = "", progress: Callable[[str], None] | None = None
) -> Analysis:
    """Prepare, fit, diagnose and derive: everything between reading and the report.

    Parameters
    ----------
    sheet : Sheet
        The whole request; its runs have been read into `measurement`.
    measurement : Measurement
    command : str
        What was typed, for the provenance.
    progress : callable, optional
        Called with a few words as each stage begins.
    """
    tell = progress or (lambda words: None)
    prepared = prepare(measurement)
    tell(f"fitting {sheet.model.terms or ''} to {prepared.temperature.size} points")
    record = fit_model(prepared, sheet.model, sheet.report.random_seed)
    diagnosis = diagnose(prepared, record)
    tell("deriving thermodynamic functions")
    derived = derive(
        prepared, record, diagnosis.describes, parse_grid(sheet.report.grid) if sheet.report.grid else None
    )
    return Analysis(
        sheet=sheet,
        measurement=measurement,
        prepared=prepared,
        fit=record,
        diagnosis=diagnosis,
        derived=derived,
        warnings=_gravest_first((*diagnosis.warnings, *derived.warnings)),
        chosen_because="the terms were named by the user",
        provenance=_provenance(sheet.report.random_seed, command),
    )


def _gravest_first(warnings: Iterable[NamedWarning]) -> tuple[NamedWarning, ...]:
    return tuple(sorted(warnings, key=lambda each: _GRAVITY[each.level]))


def _provenance(seed: int, command: str) -> Provenance:
    packages = {"python": platform.python_version()}
    for name in _PACKAGES:
        try:
            packages[name] = version(name)
        except PackageNotFoundError:
            packages[name] = "unknown"
    created = datetime.now(UTC).replace(microsecond=0).isoformat()
    return Provenance(version=__version__, created=created, random_seed=seed, packages=packages, command=command)


def read(
    files: str | Path | Iterable[str | Path],
    *,
    formula: str | None = None,
    name: str | None = None,
    atoms: float | None = None,
    molar_mass: str | None = None,
    mass: str | None = None,
    melting_point: str | None = None,
    temperature: str | int | None = None,
    heat_capacity: str | int | None = None,
    sigma: str | int | None = None,
    coverage_factor: float | None = None,
    temperature_unit: str | None = None,
    heat_capacity_unit: str | None = None,
    quantity: Quantity | None = None,
) -> Measurement:
    """Read one file, or several files of one sample.

    Parameters
    ----------
    files : path or several
    formula, name, atoms, molar_mass, mass, melting_point
        The sample; quantities with unit are text, e.g. ``"12.3 mg"``, ``"101.96 g/mol"``, ``"1358 K"``.
    temperature, heat_capacity : str or int
        Column: a header, or a number counted from 1; recognised when left out.
    sigma : str or int
        A column, or a text such as ``"1% below 100 K, 0.3% above"``.
    coverage_factor : float
        k of the stated uncertainties; 1 when left out.
    temperature_unit, heat_capacity_unit : str
        Where the header does not say.
    quantity : {"Cp", "Cv"}

    Returns
    -------
    Measurement

    Raises
    ------
    InputError
        One sentence: what is wrong, where, and how to mend it.
    """
    sample = {
        "name": name,
        "formula": formula,
        "atoms": atoms,
        "molar_mass": molar_mass,
        "mass": mass,
        "melting_point": melting_point,
    }
    how = {
        "quantity": quantity,
        "temperature": temperature,
        "heat_capacity": heat_capacity,
        "sigma": sigma,
        "coverage_factor": coverage_factor,
        "temperature_unit": temperature_unit,
        "heat_capacity_unit": heat_capacity_unit,
    }
    runs = tuple(RunSettings(file=path, **checked(how, RUN)) for path in _paths(files))
    return read_measurement(SampleSettings(**checked(sample, SAMPLE)), runs)


def _paths(files: Any) -> list[str]:
    several = [files] if isinstance(files, (str, Path)) else files
    if not isinstance(several, Iterable) or isinstance(several, (bytes, Mapping)):
        raise wrong("files", "a path or several", files)
    paths = []
    for each in several:
        if not isinstance(each, (str, Path)) or not str(each).strip():
            raise wrong("files", "a path or several", each)
        paths.append(str(each))
    if not paths:
        raise InputError("files names no file; give at least one")
    return paths


def fit(
    measurement: Measurement,
    terms: str | None = None,
    *,
    cp_cv: str = "none",
    mode_sum: Literal["fixed", "free"] | None = None,
    start: Mapping[str, float] | None = None,
    fix: Mapping[str, float] | None = None,
    bounds: Mapping[str, tuple[float, float] | str] | None = None,
    window: Interval | Sequence[Interval] = (),
    mask: Interval | Sequence[Interval] = (),
    grid: str | float | Iterable[float] | None = None,
    random_seed: int = 0,
) -> Fit:
    """Fit a lattice model to a measurement.

    Parameters
    ----------
    measurement : Measurement
        From `read`.
    terms : str
        Model expression, e.g. ``"debye + einstein + electronic"``.
    cp_cv : {"none", "nernst-lindemann", "anharmonic"}
    mode_sum : {"fixed", "free"}
        Whether the modes are held at 3 per atom; fixed when the atoms are known.
    start, fix, bounds : mapping by parameter name
        SI units: K, J/(mol K^2), mol/J, 1/K; bounds are (low, high), a side -inf or inf where it is open.
    window, mask : str or (low, high), or several
        Closed intervals in K, e.g. ``"2:300"`` or ``(2, 300)``.
    grid : str or numbers
        Temperatures of the table in K, e.g. ``"0.5:5:0.5, 10:300:10"``.
    random_seed : int

    Returns
    -------
    Fit

    Raises
    ------
    InputError
        One sentence: what is wrong and how to mend it.
    """
    if not isinstance(measurement, Measurement):
        raise wrong("measurement", "a Measurement from latticefit.read", measurement)
    model = {"terms": terms, "mode_sum": mode_sum, "cp_cv": cp_cv, "start": start, "fix": fix, "bounds": bounds}
    report = {"grid": None if grid is None else _grid(grid), "random_seed": random_seed}
    points = checked({"window": _several(window), "mask": _several(mask)}, RUN)
    settings = ModelSettings(**checked(model, MODEL))
    readings = tuple(replace(each, settings=_narrowed(each.settings, points)) for each in measurement.readings)
    sheet = Sheet(
        measurement.sample_settings,
        tuple(each.settings for each in readings),
        settings,
        ReportSettings(**checked(report, REPORT)),
    )
    return Fit(analyse(sheet, replace(measurement, readings=readings), _call(settings, points, sheet.report)))


def _several(given: Any) -> Any:
    """None for no interval at all, which is the default."""
    return None if isinstance(given, (list, tuple)) and not given else given


def _grid(given: Any) -> Any:
    return given if isinstance(given, str) else temperatures(given, "grid")


def _narrowed(run: RunSettings, points: Mapping[str, tuple[tuple[float, float], ...]]) -> RunSettings:
    return replace(run, window=run.window + points.get("window", ()), mask=run.mask + points.get("mask", ()))


def _call(model: ModelSettings, points: Mapping[str, tuple[tuple[float, float], ...]], report: ReportSettings) -> str:
    """The call of `fit` in short, for the provenance: what is not at its default."""
    words = ["measurement", repr(model.terms)]
    named = {name: getattr(model, name) for name in ("mode_sum", "cp_cv", "start", "fix", "bounds")}
    named |= {**points, "grid": report.grid, "random_seed": report.random_seed}
    for name, value in named.items():
        if value and value != getattr(_DEFAULTS, name, None):
            text = repr(value)
            words.append(f"{name}={text if len(text) <= _LONGEST_ARGUMENT else text[:_LONGEST_ARGUMENT] + '...'}")
    return f"latticefit.fit({', '.join(words)})"


@dataclass(frozen=True, eq=False, repr=False)
class Fit:
    """A finished fit: DataFrames, figures and the report of one `Analysis`."""

    analysis: Analysis

    @property
    def parameters(self) -> pd.DataFrame:
        """Value, u, u_fit, unit and status of every parameter."""
        from .report import parameters_frame

        return parameters_frame(self.analysis)

    @property
    def characteristic_temperatures(self) -> pd.DataFrame:
        """theta_D(T->0), moments and equivalent Einstein temperatures, K."""
        from .report import characteristic_temperatures_frame

        return characteristic_temperatures_frame(self.analysis)

    @property
    def residuals(self) -> pd.DataFrame:
        """Every point with model, residuals, and whether it was used or why not."""
        from .report import residuals_frame

        return residuals_frame(self.analysis)

    @property
    def warnings(self) -> pd.DataFrame:
        """The named warnings, gravest first."""
        from .report import warnings_frame

        return warnings_frame(self.analysis)

    def table(self, temperature: float | Iterable[float] | FloatArray | str | None = None) -> pd.DataFrame:
        """Thermodynamic functions at temperatures in K (numbers or a grid text); the standard grid when left out."""
        from .report import functions_frame

        if temperature is None:
            return functions_frame(self.analysis.derived.table)
        wanted = temperatures(temperature, "temperature")
        fitted = self.analysis.prepared
        return functions_frame(
            functions_table(
                self.analysis.fit,
                np.array(wanted),
                float(fitted.temperature[0]),
                float(fitted.temperature[-1]),
                fitted.measurement.quantity,
                self.analysis.diagnosis.describes,
            )
        )

    def figure(self, name: str) -> Figure:
        """Draw one of the report's figures, e.g. ``"residuals"``."""
        from .report import draw_figure

        if not isinstance(name, str):
            raise wrong("name", "the name of a figure", name)
        return draw_figure(name, self.analysis)

    def save(self, out: str | Path, *, replace: bool = False, figures: str = "svg") -> Path:
        """Write the report folder and return its path."""
        from .report import write_report

        if not isinstance(out, (str, Path)) or not str(out).strip():
            raise wrong("out", "a folder to write to", out)
        checked({"figures": figures}, REPORT)
        return write_report(self.analysis, Path(out), replace, figures)

    def __repr__(self) -> str:
        from .report import summary_text

        return summary_text(self.analysis, None).rstrip()

    def __str__(self) -> str:
        from .report import text_report

        return text_report(self.analysis)

    def _repr_html_(self) -> str:
        from .report import html_summary

        return html_summary(self.analysis)

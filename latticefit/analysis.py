"""The order of the stages, in one readable function, and what a notebook holds."""

from __future__ import annotations

import platform
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import replace
from datetime import UTC, datetime
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal

from ._version import __version__
from .comparing import compare
from .deriving import derive
from .diagnosing import diagnose
from .errors import InputError
from .held import resolve_held
from .notebook import Fit, Saved
from .preparing import prepare
from .reading import parse_grid, read_measurement
from .reading.settings import MODEL, REPORT, RUN, SAMPLE, checked, temperatures, wrong
from .records import (
    Analysis,
    Comparison,
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

__all__ = ["Fit", "Saved", "analyse", "fit", "load", "rank", "ranked", "read"]

_PACKAGES = ("numpy", "scipy", "lmfit", "matplotlib", "pandas", "pint", "periodictable")
_GRAVITY = {"stop": 0, "warn": 1, "note": 2}
_DEFAULTS = ModelSettings()
_LONGEST_ARGUMENT = 60

Interval = str | tuple[float, float]


def analyse(
    sheet: Sheet,
    measurement: Measurement,
    command: str = "",
    progress: Callable[[str], None] | None = None,
    base: Path | None = None,
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
    base : Path, optional
        Folder that the path of a saved result in the sheet starts from; the current one by default.
    """
    tell = progress or (lambda words: None)
    settings, held = resolve_held(sheet.model, base or Path(), measurement.quantity)
    prepared = prepare(measurement)
    compared = compare(prepared, settings, sheet.report.random_seed, held, tell)
    diagnosis = diagnose(prepared, compared.fit)
    tell("deriving thermodynamic functions")
    grid = parse_grid(sheet.report.grid) if sheet.report.grid else None
    derived = derive(prepared, compared.fit, diagnosis.describes, grid)
    return Analysis(
        sheet=replace(sheet, model=replace(sheet.model, fix_from=settings.fix_from)),
        measurement=measurement,
        prepared=prepared,
        fit=compared.fit,
        diagnosis=diagnosis,
        derived=derived,
        warnings=_gravest_first((*diagnosis.warnings, *derived.warnings)),
        comparison=compared.comparison,
        provenance=_provenance(sheet.report.random_seed, command),
    )


def ranked(
    sheet: Sheet,
    measurement: Measurement,
    progress: Callable[[str], None] | None = None,
    base: Path | None = None,
) -> Comparison:
    """Compare the candidates of the ladder; parameters as `analyse`."""
    settings, held = resolve_held(replace(sheet.model, terms=None), base or Path(), measurement.quantity)
    return compare(prepare(measurement), settings, sheet.report.random_seed, held, progress).comparison


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
    insulator: bool = False,
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
    insulator : bool
        True where there are no conduction electrons.
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
        "insulator": insulator,
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
    cp_cv: str | None = None,
    mode_sum: Literal["fixed", "free"] | None = None,
    start: Mapping[str, float] | None = None,
    fix: Mapping[str, float] | None = None,
    fix_u: Mapping[str, float] | None = None,
    fix_from: str | Path | None = None,
    bounds: Mapping[str, tuple[float, float] | str] | None = None,
    window: Interval | Sequence[Interval] = (),
    mask: Interval | Sequence[Interval] = (),
    grid: str | float | Iterable[float] | None = None,
    random_seed: int = 0,
) -> Fit:
    """Fit a lattice model to a measurement, or choose one from the ladder of candidates.

    Parameters
    ----------
    measurement : Measurement
        From `read`.
    terms : str
        Model expression, e.g. ``"debye + einstein + electronic"``; when left out, candidates are compared and the
        reason for the choice stands in ``fit.analysis.comparison``.
    cp_cv : {"none", "nernst-lindemann", "anharmonic"}
        None leaves it to the comparison; with named terms it means "none".
    mode_sum : {"fixed", "free"}
        Whether the modes are held at 3 per atom; fixed when the atoms are known.
    start, fix, bounds : mapping by parameter name
        SI units: K, J/(mol K^2), mol/J, 1/K; bounds are (low, high), a side -inf or inf where it is open.
    fix_u : mapping by parameter name
        Standard uncertainties of fixed parameters, carried on to every u.
    fix_from : path
        A saved result whose lattice is held, with its covariance carried on.
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
    model = {
        "terms": terms,
        "mode_sum": mode_sum,
        "cp_cv": cp_cv,
        "start": start,
        "fix": fix,
        "fix_u": fix_u,
        "fix_from": str(fix_from) if isinstance(fix_from, Path) else fix_from,
        "bounds": bounds,
    }
    report = {"grid": None if grid is None else _grid(grid), "random_seed": random_seed}
    sheet, narrowed, call = _request(measurement, model, window, mask, report)
    return Fit(analyse(sheet, narrowed, call))


def rank(
    measurement: Measurement,
    *,
    cp_cv: str | None = None,
    mode_sum: Literal["fixed", "free"] | None = None,
    start: Mapping[str, float] | None = None,
    fix: Mapping[str, float] | None = None,
    fix_u: Mapping[str, float] | None = None,
    fix_from: str | Path | None = None,
    bounds: Mapping[str, tuple[float, float] | str] | None = None,
    window: Interval | Sequence[Interval] = (),
    mask: Interval | Sequence[Interval] = (),
    random_seed: int = 0,
) -> pd.DataFrame:
    """Compare candidate models on the same points with the same uncertainties.

    Parameters
    ----------
    measurement : Measurement
        From `read`.
    cp_cv, mode_sum, start, fix, fix_u, fix_from, bounds, window, mask, random_seed
        As for `fit`.

    Returns
    -------
    DataFrame
        One row for each candidate, by AICc, plausible ones first; ``chosen`` marks the one that `fit` would take, and
        ``attrs["because"]`` says why.
    """
    from .report import ranking_frame

    model = {
        "mode_sum": mode_sum,
        "cp_cv": cp_cv,
        "start": start,
        "fix": fix,
        "fix_u": fix_u,
        "fix_from": str(fix_from) if isinstance(fix_from, Path) else fix_from,
        "bounds": bounds,
    }
    sheet, narrowed, _ = _request(measurement, model, window, mask, {"random_seed": random_seed})
    return ranking_frame(ranked(sheet, narrowed))


def load(path: str | Path) -> Saved:
    """Read a saved result: a result.json, or the report folder that holds it.

    Raises
    ------
    InputError
        When it is no latticefit result.
    """
    from .report import read_result

    if not isinstance(path, (str, Path)):
        raise wrong("path", "the path of a result.json or a report folder", path)
    return Saved(read_result(Path(path)))


def _request(
    measurement: Measurement, model: Mapping[str, Any], window: Any, mask: Any, report: Mapping[str, Any]
) -> tuple[Sheet, Measurement, str]:
    """The sheet of a call from Python, the measurement with its windows, and the call in words."""
    if not isinstance(measurement, Measurement):
        raise wrong("measurement", "a Measurement from latticefit.read", measurement)
    points = checked({"window": _several(window), "mask": _several(mask)}, RUN)
    settings = ModelSettings(**checked(model, MODEL))
    readings = tuple(replace(each, settings=_narrowed(each.settings, points)) for each in measurement.readings)
    sheet = Sheet(
        measurement.sample_settings,
        tuple(each.settings for each in readings),
        settings,
        ReportSettings(**checked(report, REPORT)),
    )
    return sheet, replace(measurement, readings=readings), _call(settings, points, sheet.report)


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
    named = {
        name: getattr(model, name) for name in ("mode_sum", "cp_cv", "start", "fix", "fix_u", "fix_from", "bounds")
    }
    named |= {**points, "grid": report.grid, "random_seed": report.random_seed}
    for name, value in named.items():
        if value and value != getattr(_DEFAULTS, name, None):
            text = repr(value)
            words.append(f"{name}={text if len(text) <= _LONGEST_ARGUMENT else text[:_LONGEST_ARGUMENT] + '...'}")
    return f"latticefit.fit({', '.join(words)})"

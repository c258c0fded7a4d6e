"""What is called from Python: `read`, `fit`, `rank` and `load`, with the words of the command line as keywords."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal

from .analysis import analyse, ranked
from .errors import InputError, nearest
from .notebook import Fit, Saved
from .reading import read_measurement
from .reading.settings import ADDENDA, MODEL, REPORT, RUN, SAMPLE, checked, temperatures, wrong
from .records import (
    AddendaSettings,
    Measurement,
    ModelSettings,
    Quantity,
    Replicates,
    ReportSettings,
    RunSettings,
    SampleSettings,
    Sheet,
    TemperatureScale,
)

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["Fit", "Saved", "fit", "load", "rank", "read", "write_measurement"]

_DEFAULTS = ModelSettings()
_LONGEST_ARGUMENT = 60

Interval = str | tuple[float, float]
Lines = str | int | tuple[int, int]
Addenda = str | Path | Mapping[str, Any]


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
    accept_level: bool = False,
    temperature: str | int | None = None,
    heat_capacity: str | int | None = None,
    sigma: str | int | None = None,
    coverage_factor: float | None = None,
    temperature_unit: str | None = None,
    heat_capacity_unit: str | None = None,
    quantity: Quantity | None = None,
    temperature_scale: TemperatureScale | None = None,
    worksheet: str | None = None,
    split_by: str | int | None = None,
    require: str | Sequence[str] = (),
    mask_lines: Lines | Sequence[Lines] = (),
    addenda: Addenda | Sequence[Addenda] = (),
) -> Measurement:
    """Read one file, or several files of one sample.

    Parameters
    ----------
    files : path or several
    formula, name, atoms, molar_mass, mass, melting_point
        The sample; quantities with unit are text, e.g. ``"12.3 mg"``, ``"101.96 g/mol"``, ``"1358 K"``.
    insulator : bool
        True where there are no conduction electrons.
    accept_level : bool
        True to fit a heat capacity whose level looks impossible.
    temperature, heat_capacity : str or int
        Column: a header, or a number counted from 1; recognised when left out.
    sigma : str or int
        A column, a text such as ``"1% below 100 K, 0.3% above"``, or the word "scatter" or "replicates", which leaves
        it to be estimated from the data.
    coverage_factor : float
        k of the stated uncertainties; 1 when left out.
    temperature_unit, heat_capacity_unit : str
        Where the header does not say.
    quantity : {"Cp", "Cv"}
    temperature_scale : {"ITS-90", "IPTS-68"}
        With "IPTS-68" both T and Cp are converted to ITS-90.
    worksheet : str
        Name or number of the sheet of a spreadsheet file.
    split_by : str or int
        A column whose values divide the file into runs.
    require : str or several
        Conditions on a column for the points that are fitted, e.g. ``"quality >= 0.9"``.
    mask_lines : str, int, or several
        Lines of the file that are not fitted, e.g. ``"40:45"``.
    addenda : path or several
        Files in J/K of what was measured with the sample, to be taken off; or mappings with the keys of an
        ``[[addenda]]`` table of a run sheet.

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
        "accept_level": accept_level,
    }
    how = {
        "quantity": quantity,
        "temperature": temperature,
        "heat_capacity": heat_capacity,
        "sigma": sigma,
        "coverage_factor": coverage_factor,
        "temperature_unit": temperature_unit,
        "heat_capacity_unit": heat_capacity_unit,
        "temperature_scale": temperature_scale,
        "worksheet": worksheet,
        "split_by": split_by,
        "require": _several(require),
        "mask_lines": _several(mask_lines),
    }
    runs = tuple(RunSettings(file=path, **checked(how, RUN)) for path in _paths(files))
    return read_measurement(SampleSettings(**checked(sample, SAMPLE)), runs, addenda=_addenda(addenda))


def _addenda(given: Any) -> tuple[AddendaSettings, ...]:
    several = [given] if isinstance(given, (str, Path, Mapping)) else given
    if not isinstance(several, Iterable) or isinstance(several, bytes):
        raise wrong("addenda", "a path, a mapping with a file, or several", given)
    found = []
    for each in several:
        keys = dict(each) if isinstance(each, Mapping) else {"file": each}
        unknown = next((key for key in keys if key not in ADDENDA), None)
        if unknown is not None:
            raise InputError(f"addenda has no key {unknown!r}; {nearest(str(unknown), ADDENDA)}")
        if keys.get("file") is None:
            raise InputError("addenda has no file; give its path")
        keys["file"] = str(keys["file"]) if isinstance(keys["file"], Path) else keys["file"]
        found.append(AddendaSettings(**checked(keys, ADDENDA, lambda key: f"addenda {key}")))
    return tuple(found)


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
    replicates: Replicates | None = None,
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
    replicates : {"keep", "average", "drop-first"}
        What is done with sets of repeats; kept one by one when left out.
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
    points = {"window": _several(window), "mask": _several(mask), "replicates": replicates}
    sheet, narrowed, call = _request(measurement, model, points, report)
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
    replicates: Replicates | None = None,
    random_seed: int = 0,
) -> pd.DataFrame:
    """Compare candidate models on the same points with the same uncertainties.

    Parameters
    ----------
    measurement : Measurement
        From `read`.
    cp_cv, mode_sum, start, fix, fix_u, fix_from, bounds, window, mask, replicates, random_seed
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
    points = {"window": _several(window), "mask": _several(mask), "replicates": replicates}
    sheet, narrowed, _ = _request(measurement, model, points, {"random_seed": random_seed})
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


def write_measurement(measurement: Measurement, path: str | Path, *, replace: bool = False) -> Path:
    """Write a measurement, as converted and corrected, to a CSV file that reads back to the last bit.

    Parameters
    ----------
    measurement : Measurement
        From `read`.
    path : path
        The file to be. Read it with ``split_by="run"`` where there are several runs, and with
        ``require="used = yes"`` where points are set aside.
    replace : bool
        Whether a file that is there may be replaced; a file that was read for the measurement never is.

    Returns
    -------
    Path

    Raises
    ------
    InputError
        If the file exists already, cannot be written, or the measurement cannot be read back from a file.
    """
    from .report import write_measurement_file

    if not isinstance(measurement, Measurement):
        raise wrong("measurement", "a Measurement from latticefit.read", measurement)
    if not isinstance(path, (str, Path)) or not str(path).strip():
        raise wrong("path", "the path of the file to write", path)
    return write_measurement_file(measurement, Path(path), replace)


def _request(
    measurement: Measurement, model: Mapping[str, Any], chosen: Mapping[str, Any], report: Mapping[str, Any]
) -> tuple[Sheet, Measurement, str]:
    """The sheet of a call from Python, the measurement with its windows, and the call in words."""
    if not isinstance(measurement, Measurement):
        raise wrong("measurement", "a Measurement from latticefit.read", measurement)
    points = checked(chosen, RUN)
    settings = ModelSettings(**checked(model, MODEL))
    readings = tuple(replace(each, settings=_narrowed(each.settings, points)) for each in measurement.readings)
    sheet = Sheet(
        measurement.sample_settings,
        tuple(dict.fromkeys(each.settings for each in readings)),  # the runs of one divided file share their settings
        settings,
        ReportSettings(**checked(report, REPORT)),
        measurement.addenda_settings,
    )
    return sheet, replace(measurement, readings=readings), _call(settings, points, sheet.report)


def _several(given: Any) -> Any:
    """None for no interval at all, which is the default."""
    return None if isinstance(given, (list, tuple)) and not given else given


def _grid(given: Any) -> Any:
    return given if isinstance(given, str) else temperatures(given, "grid")


def _narrowed(run: RunSettings, points: Mapping[str, Any]) -> RunSettings:
    return replace(
        run,
        window=run.window + points.get("window", ()),
        mask=run.mask + points.get("mask", ()),
        replicates=points.get("replicates", run.replicates),
    )


def _call(model: ModelSettings, points: Mapping[str, Any], report: ReportSettings) -> str:
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

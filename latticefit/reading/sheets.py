"""Run sheets: the TOML file that holds a whole request, read strictly and written so that it reads back identical."""

from __future__ import annotations

import math
import tomllib
from collections.abc import Callable, Mapping
from dataclasses import fields
from pathlib import Path
from typing import Any, Final

from ..errors import InputError, nearest
from ..records import ModelSettings, ReportSettings, RunSettings, SampleSettings, Sheet
from .options import interval_text, parse_bounds, parse_grid, parse_interval
from .wording import quoted, shown_name

__all__ = ["read_sheet", "write_sheet"]

_MAX_BYTES: Final = 1_000_000

Converter = Callable[[Any, str], Any]


# --------------------------------------------------------------------------------------------- one value of a sheet


def _kind(value: Any) -> str:
    if isinstance(value, str):
        return quoted(value)
    names = {bool: "true or false", dict: "a table", list: "a list"}
    return names.get(type(value), str(value))


def _wrong(where: str, wanted: str, value: Any) -> InputError:
    return InputError(f"{where} must be {wanted}, not {_kind(value)}")


def _text(value: Any, where: str) -> str:
    if not isinstance(value, str) or not value.strip():
        raise _wrong(where, "a text in quotes", value)
    return value


def _number(value: Any, where: str) -> float:
    if isinstance(value, bool) or not isinstance(value, (int, float)) or not math.isfinite(value):
        raise _wrong(where, "a number without quotes", value)
    return float(value)


def _positive(value: Any, where: str) -> float:
    number = _number(value, where)
    if number <= 0:
        raise _wrong(where, "above 0", value)
    return number


def _column(value: Any, where: str) -> str | int:
    if isinstance(value, int) and not isinstance(value, bool) and value >= 1:
        return value
    if isinstance(value, str) and value.strip():
        return value
    raise _wrong(where, "a header in quotes or a column number from 1 on", value)


def _sigma(value: Any, where: str) -> str | int:
    if isinstance(value, float):
        raise _wrong(where, 'a column or a text such as "0.5%"', value)
    return _column(value, where)


def _seed(value: Any, where: str) -> int:
    if isinstance(value, bool) or not isinstance(value, int) or value < 0:
        raise _wrong(where, "a whole number from 0 on", value)
    return value


def _one_of(*choices: str) -> Converter:
    def convert(value: Any, where: str) -> str:
        if value not in choices:
            raise InputError(f"{where} cannot be {_kind(value)}: {nearest(str(value), choices)}")
        return str(value)

    return convert


def _intervals(value: Any, where: str) -> tuple[tuple[float, float], ...]:
    texts = [value] if isinstance(value, str) else value
    if not isinstance(texts, list) or not texts or not all(isinstance(text, str) for text in texts):
        raise _wrong(where, 'a text such as "2:300" or a list of them', value)
    try:
        return tuple(parse_interval(text) for text in texts)
    except InputError as error:
        raise InputError(f"{where}: {error}") from None


def _grid(value: Any, where: str) -> str:
    text = _text(value, where)
    try:
        parse_grid(text)
    except InputError as error:
        raise InputError(f"{where}: {error}") from None
    return text


def _bounds(value: Any, where: str) -> tuple[float, float]:
    if isinstance(value, str):
        try:
            return parse_bounds(f"parameter={value}")[1]
        except InputError:
            raise _wrong(where, "[low, high]", value) from None
    sides = value if isinstance(value, list) else []
    numbers = all(isinstance(side, (int, float)) and not isinstance(side, bool) for side in sides)
    if len(sides) != 2 or not numbers or any(math.isnan(side) for side in sides):
        raise _wrong(where, "[low, high], where a side may be -inf or inf", value)
    low, high = float(sides[0]), float(sides[1])
    if low >= high:
        raise InputError(f"{where}: the lower bound must be below the upper one, not [{low:g}, {high:g}]")
    return low, high


def _by_name(convert: Converter) -> Converter:
    def table(value: Any, where: str) -> dict[str, Any]:
        if not isinstance(value, dict):
            raise _wrong(where, "a table of parameter names", value)
        return {name: convert(entry, f"{where} {shown_name(name)}") for name, entry in value.items()}

    return table


# -------------------------------------------------------------------------------------------------- the whole sheet

_SAMPLE: Final[dict[str, Converter]] = {
    "name": _text,
    "formula": _text,
    "atoms": _positive,
    "molar_mass": _text,
    "mass": _text,
    "melting_point": _text,
}
_RUN: Final[dict[str, Converter]] = {
    "file": _text,
    "label": _text,
    "quantity": _one_of("Cp", "Cv"),
    "temperature": _column,
    "heat_capacity": _column,
    "sigma": _sigma,
    "coverage_factor": _positive,
    "temperature_unit": _text,
    "heat_capacity_unit": _text,
    "window": _intervals,
    "mask": _intervals,
}
_MODEL: Final[dict[str, Converter]] = {
    "terms": _text,
    "mode_sum": _one_of("fixed", "free"),
    "cp_cv": _text,
    "start": _by_name(_number),
    "fix": _by_name(_number),
    "bounds": _by_name(_bounds),
}
_REPORT: Final[dict[str, Converter]] = {
    "grid": _grid,
    "figures": _one_of("none", "svg", "png", "all"),
    "out": _text,
    "random_seed": _seed,
}
_TABLES: Final = ("sample", "run", "model", "report")
_LATER: Final = {
    "": {"addenda"},
    "sample": {"density", "insulator", "scale_uncertainty"},
    "run": {"split_by"},
    "model": set[str](),
    "report": set[str](),
}
"""Keys of the agreed sheet that this version cannot act on: refused, never ignored."""


def read_sheet(path: Path, allow_outside: bool = False) -> Sheet:
    """Read a run sheet.

    Parameters
    ----------
    path : Path
        The TOML file.
    allow_outside : bool
        Whether the files it names, and the folder it writes to, may lie outside its own folder.

    Returns
    -------
    Sheet
        File names as written, relative to the folder of the sheet.

    Raises
    ------
    InputError
        If the sheet cannot be read, or holds an unknown key or a wrong value.
    """
    shown = shown_name(str(path))
    content = _load(path, shown)
    for key in content:
        if key in _LATER[""]:
            raise InputError(f"{shown}: [{key}] is not available in this version; remove it")
        if key not in _TABLES:
            raise InputError(f"{shown}: unknown table [{shown_name(key)}]; {nearest(key, _TABLES)}")
    sheet = Sheet(
        sample=SampleSettings(**_table(content.get("sample", {}), "sample", _SAMPLE, f"{shown}: [sample]")),
        runs=_runs(content.get("run"), shown),
        model=ModelSettings(**_table(content.get("model", {}), "model", _MODEL, f"{shown}: [model]")),
        report=ReportSettings(**_table(content.get("report", {}), "report", _REPORT, f"{shown}: [report]")),
    )
    if not allow_outside:
        _refuse_outside(sheet, path.parent, shown)
    return sheet


def _load(path: Path, shown: str) -> dict[str, Any]:
    try:
        with path.open("rb") as stream:
            data = stream.read(_MAX_BYTES + 1)
    except FileNotFoundError:
        raise InputError(f"{shown}: there is no such file") from None
    except (OSError, ValueError) as error:
        reason = error.strerror if isinstance(error, OSError) and error.strerror else str(error)
        raise InputError(f"{shown}: the sheet cannot be opened ({reason})") from None
    if len(data) > _MAX_BYTES:
        raise InputError(f"{shown}: is too large to be a run sheet")
    try:
        return tomllib.loads(data.decode("utf-8-sig"))
    except UnicodeDecodeError:
        raise InputError(f"{shown}: is not UTF-8 text and so not a run sheet") from None
    except (tomllib.TOMLDecodeError, RecursionError, ValueError) as error:
        detail = "nested too deeply" if isinstance(error, RecursionError) else str(error)
        raise InputError(f"{shown}: is not valid TOML: {detail}") from None


def _table(content: Any, name: str, keys: Mapping[str, Converter], where: str) -> dict[str, Any]:
    if not isinstance(content, dict):
        raise _wrong(where, "a table", content)
    for key in content:
        if key in _LATER[name]:
            raise InputError(f"{where} {key} is not available in this version; remove it")
        if key not in keys:
            raise InputError(f"{where} has no key {quoted(key)}; {nearest(key, keys)}")
    return {key: keys[key](value, f"{where} {key}") for key, value in content.items()}


def _runs(content: Any, shown: str) -> tuple[RunSettings, ...]:
    if content is None:
        raise InputError(f"{shown}: names no data; add a table [[run]] with a file")
    if isinstance(content, dict):
        raise InputError(f"{shown}: [run] must be written [[run]], since a sheet may hold several")
    if not isinstance(content, list) or not content:
        raise _wrong(f"{shown}: run", "one or more tables [[run]]", content)
    runs = []
    for number, entry in enumerate(content, start=1):
        where = f"{shown}: [[run]]" + (f" {number}" if len(content) > 1 else "")
        settings = _table(entry, "run", _RUN, where)
        if "file" not in settings:
            raise InputError(f'{where} has no file; add file = "..."')
        runs.append(RunSettings(**settings))
    return tuple(runs)


def _refuse_outside(sheet: Sheet, folder: Path, shown: str) -> None:
    named = [run.file for run in sheet.runs] + ([sheet.report.out] if sheet.report.out else [])
    try:
        root = folder.resolve()
        outside = next((name for name in named if not (root / name).resolve().is_relative_to(root)), None)
    except (OSError, ValueError, RuntimeError) as error:  # a NUL in a name, a loop of links
        raise InputError(f"{shown}: a file name cannot be followed ({error})") from None
    if outside is not None:
        raise InputError(f"{shown}: {quoted(outside)} lies outside the folder of the sheet; give --allow-outside")


def write_sheet(sheet: Sheet) -> str:
    """Return a run sheet as TOML text; `read_sheet` gives the same sheet back. What is at its default is left out."""
    import tomli_w

    def table(name: str, settings: Any) -> list[str]:
        changed = _changed(settings)
        return [tomli_w.dumps({name: changed})] if changed else []

    # each run by itself: the library would set short ones inside one list, where people write [[run]]
    runs = ["[[run]]\n" + tomli_w.dumps(_changed(run)) for run in sheet.runs]
    return "\n".join(
        [*table("sample", sheet.sample), *runs, *table("model", sheet.model), *table("report", sheet.report)]
    )


def _changed(settings: Any) -> dict[str, Any]:
    """Return the fields of a settings record that are not at their default, as TOML values."""
    default = type(settings)("") if isinstance(settings, RunSettings) else type(settings)()
    changed = {}
    for entry in fields(settings):
        value = getattr(settings, entry.name)
        if value == getattr(default, entry.name):
            continue
        if entry.name in ("window", "mask"):
            value = [interval_text(interval) for interval in value]
        elif isinstance(value, Mapping):
            value = {name: list(part) if isinstance(part, tuple) else part for name, part in value.items()}
        changed[entry.name] = value
    return changed

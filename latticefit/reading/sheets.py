"""Run sheets: the TOML file that holds a whole request, read strictly and written so that it reads back identical."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from dataclasses import fields
from pathlib import Path
from typing import Any, Final

from ..errors import InputError, nearest
from ..later import LATER_KEYS
from ..records import AddendaSettings, ModelSettings, ReportSettings, RunSettings, SampleSettings, Sheet
from .options import interval_text, line_interval_text
from .settings import ADDENDA, MODEL, REPORT, RUN, SAMPLE, Converter, checked, wrong
from .wording import quoted, shown_name

__all__ = ["read_sheet", "write_sheet"]

_MAX_BYTES: Final = 1_000_000

_TABLES: Final = ("sample", "run", "addenda", "model", "report")


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
        if key in LATER_KEYS[""]:
            raise InputError(f"{shown}: [{key}] is not available in this version; remove it")
        if key not in _TABLES:
            raise InputError(f"{shown}: unknown table [{shown_name(key)}]; {nearest(key, _TABLES)}")
    sheet = Sheet(
        sample=SampleSettings(**_table(content.get("sample", {}), "sample", SAMPLE, f"{shown}: [sample]")),
        runs=_runs(content.get("run"), shown),
        model=ModelSettings(**_table(content.get("model", {}), "model", MODEL, f"{shown}: [model]")),
        report=ReportSettings(**_table(content.get("report", {}), "report", REPORT, f"{shown}: [report]")),
        addenda=_addenda(content.get("addenda", []), shown),
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
        raise wrong(where, "a table", content)
    for key in content:
        if key in LATER_KEYS.get(name, ()):
            raise InputError(f"{where} {key} is not available in this version; remove it")
        if key not in keys:
            raise InputError(f"{where} has no key {quoted(key)}; {nearest(key, keys)}")
    return checked(content, keys, lambda key: f"{where} {key}")


def _runs(content: Any, shown: str) -> tuple[RunSettings, ...]:
    if content is None:
        raise InputError(f"{shown}: names no data; add a table [[run]] with a file")
    if isinstance(content, dict):
        raise InputError(f"{shown}: [run] must be written [[run]], since a sheet may hold several")
    if not isinstance(content, list) or not content:
        raise wrong(f"{shown}: run", "one or more tables [[run]]", content)
    runs = []
    for number, entry in enumerate(content, start=1):
        where = f"{shown}: [[run]]" + (f" {number}" if len(content) > 1 else "")
        settings = _table(entry, "run", RUN, where)
        if "file" not in settings:
            raise InputError(f'{where} has no file; add file = "..."')
        runs.append(RunSettings(**settings))
    return tuple(runs)


def _addenda(content: Any, shown: str) -> tuple[AddendaSettings, ...]:
    """Read ``[addenda]``, or several ``[[addenda]]``."""
    entries = [content] if isinstance(content, dict) else content
    if not isinstance(entries, list):
        raise wrong(f"{shown}: addenda", "a table [addenda] or several [[addenda]]", content)
    found = []
    for number, entry in enumerate(entries, start=1):
        where = f"{shown}: [addenda]" if isinstance(content, dict) else f"{shown}: [[addenda]] {number}"
        settings = _table(entry, "addenda", ADDENDA, where)
        if "file" not in settings:
            raise InputError(f'{where} has no file; add file = "..."')
        found.append(AddendaSettings(**settings))
    return tuple(found)


def _refuse_outside(sheet: Sheet, folder: Path, shown: str) -> None:
    named = [run.file for run in sheet.runs] + [known.file for known in sheet.addenda]
    named += [name for name in (sheet.report.out, sheet.model.fix_from) if name]
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
    addenda = ["[[addenda]]\n" + tomli_w.dumps(_changed(each)) for each in sheet.addenda]
    return "\n".join(
        [*table("sample", sheet.sample), *runs, *addenda, *table("model", sheet.model), *table("report", sheet.report)]
    )


def _changed(settings: Any) -> dict[str, Any]:
    """Return the fields of a settings record that are not at their default, as TOML values."""
    named = isinstance(settings, (RunSettings, AddendaSettings))
    default = type(settings)("") if named else type(settings)()
    changed = {}
    for entry in fields(settings):
        value = getattr(settings, entry.name)
        if value == getattr(default, entry.name):
            continue
        if entry.name in ("window", "mask"):
            value = [interval_text(interval) for interval in value]
        elif entry.name == "mask_lines":
            value = [line_interval_text(lines) for lines in value]
        elif isinstance(value, tuple):
            value = list(value)
        elif isinstance(value, Mapping):
            value = {name: list(part) if isinstance(part, tuple) else part for name, part in value.items()}
        changed[entry.name] = value
    return changed

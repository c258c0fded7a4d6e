"""The report folder: written aside and put in its place in one step, or not at all."""

from __future__ import annotations

import hashlib
import json
import re
import secrets
import shutil
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from dataclasses import replace
from pathlib import Path
from typing import Literal

from ..errors import InputError, nearest
from ..records import Analysis, Sheet
from ..wording import harmless
from .figures import FIGURES, draw_figure, render
from .html import html_report
from .result import SCHEMA, json_text, result_record
from .sheet_file import sheet_bytes
from .tables import residuals_csv, table_csv
from .text import text_report

__all__ = ["check_out_folder", "write_report"]

_FIGURE_FORMATS: Mapping[str, tuple[Literal["svg", "png"], ...]] = {
    "none": (),
    "svg": ("svg",),
    "png": ("png",),
    "all": ("svg", "png"),
}
_OUR_NAMES = frozenset(
    ("result.json", "report.html", "report.txt", "table.csv", "residuals.csv", "run_sheet.toml", "inputs", "figures")
)
# Characters that some file system refuses, and all that could leave the folder; leading dots would hide the file.
_UNSAFE_IN_NAME = re.compile(r'[<>:"/\\|?*]')
# Names of devices on some systems, whatever ending follows them.
_RESERVED = re.compile(r"(?i)(?:con|prn|aux|nul|conin\$|conout\$|(?:com|lpt)[0-9\u00b9\u00b2\u00b3]) *(?:\.|$)")
_LONGEST_NAME = 120  # bytes, of which file systems take 255; a number may be added


def check_out_folder(out: Path, replace: bool) -> None:
    """Refuse a report folder that cannot be written, before anyone waits for a fit.

    Parameters
    ----------
    out : Path
        The folder to be.
    replace : bool
        Whether an earlier latticefit report there may be replaced.

    Raises
    ------
    InputError
        When the folder exists already (with `replace`: and is no latticefit report), or its parent is missing or
        cannot be written.
    """
    shown = harmless(str(out))
    if out.is_symlink():
        raise InputError(f"the report folder {shown!r} is a link; name the folder itself with --out")
    if out.exists() and not replace:
        raise InputError(f"{shown!r} exists already; choose another folder with --out, or replace it with --replace")
    if out.exists() and not _is_report(out):
        raise InputError(
            f"{shown!r} is not a latticefit report (it holds no result.json written by latticefit), so it is not "
            "replaced; choose another folder with --out"
        )
    parent = out.absolute().parent
    if not parent.is_dir():
        raise InputError(
            f"the folder {harmless(str(parent))!r} for the report does not exist; make it, or change --out"
        )
    with _written_aside(out):
        pass


def _is_report(folder: Path) -> bool:
    try:
        record = json.loads((folder / "result.json").read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return False
    schema = record.get("schema") if isinstance(record, dict) else None
    return isinstance(schema, str) and schema.startswith(SCHEMA.partition("/")[0] + "/")


@contextmanager
def _written_aside(out: Path) -> Iterator[Path]:
    """Make a folder beside `out` under a name of its own, and remove it again unless it was moved away."""
    aside = out.absolute().parent / f".{_file_name(out.name)[:40]}-{secrets.token_hex(6)}.partial"
    try:
        try:
            aside.mkdir()
            yield aside
        except OSError as error:
            reason = error.strerror or str(error)
            raise InputError(
                f"the report folder {harmless(str(out))!r} cannot be written ({reason}); choose another with --out"
            ) from error
    finally:
        shutil.rmtree(aside, ignore_errors=True)


def write_report(analysis: Analysis, out: Path, replace: bool = False, figures: str = "svg") -> Path:
    """Write the report folder of the contract and return its path.

    Everything is written into a folder beside `out` that takes its place at the end; a run that fails or is
    interrupted leaves what was there before. Files in a replaced report that are not latticefit's are kept.

    Parameters
    ----------
    analysis : Analysis
        All records of one run.
    out : Path
        The folder to be; its parent must exist.
    replace : bool
        Whether an earlier latticefit report there may be replaced.
    figures : {"none", "svg", "png", "all"}
        Which figure files are written; with "none" the HTML page has no figures either.

    Returns
    -------
    Path
        `out`.

    Raises
    ------
    InputError
        As `check_out_folder`; and when a file that was fitted is no longer what it was when it was read.
    """
    if figures not in _FIGURE_FORMATS:
        raise InputError(f"{figures!r} is no choice of figures; {nearest(figures, _FIGURE_FORMATS)}")
    check_out_folder(out, replace)
    with _written_aside(out) as aside:
        _write_files(analysis, aside, figures)
        if out.exists():
            _keep_foreign_files(out, aside)
        _take_place(aside, out)
    return out


def _write_files(analysis: Analysis, folder: Path, figures: str) -> None:
    names = _copy_inputs(analysis, folder / "inputs")
    sheet = _portable_sheet(analysis, names, _copy_held(analysis, folder / "inputs", names), figures)
    sheet_text = sheet_bytes(sheet, "the run sheet").decode("utf-8")
    pictures = _write_figures(analysis, folder / "figures", figures)
    texts = {
        "result.json": json_text(result_record(analysis)),
        "report.html": html_report(analysis, pictures, sheet_text),
        "report.txt": text_report(analysis),
        "table.csv": table_csv(analysis),
        "residuals.csv": residuals_csv(analysis),
        "run_sheet.toml": sheet_text,
    }
    for name, text in texts.items():
        (folder / name).write_text(text, encoding="utf-8", newline="\n")


def _write_figures(analysis: Analysis, folder: Path, figures: str) -> dict[str, bytes]:
    """Write the figure files and return the SVG of each for the page."""
    folder.mkdir()
    pictures = {}
    for name in FIGURES if figures != "none" else ():
        drawn = draw_figure(name, analysis)
        pictures[name] = render(drawn, "svg")
        for file_format in _FIGURE_FORMATS[figures]:
            picture = pictures[name] if file_format == "svg" else render(drawn, file_format)
            (folder / f"{name}.{file_format}").write_bytes(picture)
    return pictures


def _file_name(name: str) -> str:
    """A file name that every system accepts and that stays in its folder."""
    safe = "".join("_" if not each.isprintable() else each for each in name)
    safe = _UNSAFE_IN_NAME.sub("_", safe).encode()[-_LONGEST_NAME:].decode(errors="ignore")
    whole = safe.strip(". ") or "input"
    return f"_{whole}" if _RESERVED.match(whole) else whole


def _copy_inputs(analysis: Analysis, folder: Path) -> list[str]:
    """Copy the files that were fitted, and those of addenda, and return the name of each one's copy in the folder.

    Raises
    ------
    InputError
        When a file is gone or is not the one that was read.
    """
    folder.mkdir()
    by_path: dict[str, str] = {}
    taken: set[str] = set()
    every = (*analysis.measurement.readings, *analysis.measurement.addenda_readings)
    for reading in every:
        if reading.path in by_path:
            continue
        try:
            content = Path(reading.path).read_bytes()
        except OSError as error:
            raise InputError(
                f"{harmless(reading.file)!r} cannot be read any more ({error.strerror}), so it cannot be kept with "
                "the report; put it back and run again"
            ) from error
        if hashlib.sha256(content).hexdigest() != reading.sha256:
            raise InputError(f"{harmless(reading.file)!r} has changed since it was read; run again")
        name = _free_name(_file_name(Path(reading.file).name), taken)
        taken.add(name.casefold())
        by_path[reading.path] = name
        (folder / name).write_bytes(content)
    return [by_path[reading.path] for reading in every]


def _copy_held(analysis: Analysis, folder: Path, names: list[str]) -> str | None:
    """Copy the saved result whose lattice was held, and return its name in the folder; None where there was none."""
    source = analysis.sheet.model.fix_from
    if source is None:
        return None
    name = _free_name("held_result.json", {each.casefold() for each in names})
    try:
        shutil.copyfile(source, folder / name)
    except OSError as error:
        raise InputError(f"{harmless(source)!r} cannot be read any more ({error.strerror}); run again") from error
    return name


def _free_name(name: str, taken: set[str]) -> str:
    """The name itself, or with a number; names that differ in case only are one file on some systems."""
    path, number, free = Path(name), 1, name
    while free.casefold() in taken:
        number += 1
        free = f"{path.stem}-{number}{path.suffix}"
    return free


def _portable_sheet(analysis: Analysis, names: list[str], held: str | None, figures: str) -> Sheet:
    """The sheet that repeats the run from inside the report folder: copied inputs, no folder to write to."""
    measurement = analysis.measurement
    readings = measurement.readings
    runs = tuple(
        # The label is kept: a copy may have another name than the file had. Runs that one file was divided into have
        # labels of their own, and its label stands in the settings that they share.
        replace(
            reading.settings,
            file=f"inputs/{name}",
            label=reading.label if reading.settings.split_by is None else reading.settings.label,
        )
        for reading, name in zip(readings, names, strict=False)
    )
    copies = names[len(readings) :]
    addenda = tuple(
        replace(settings, file=f"inputs/{name}")
        for settings, name in zip(measurement.addenda_settings, copies, strict=True)
    )
    return replace(
        analysis.sheet,
        runs=tuple(dict.fromkeys(runs)),
        addenda=addenda,
        model=replace(analysis.sheet.model, fix_from=None if held is None else f"inputs/{held}"),
        report=replace(analysis.sheet.report, out=None, figures=figures),  # type: ignore[arg-type]
    )


def _keep_foreign_files(old: Path, new: Path) -> None:
    for entry in old.iterdir():
        if entry.name in _OUR_NAMES:
            continue
        if entry.is_dir() and not entry.is_symlink():
            shutil.copytree(entry, new / entry.name, symlinks=True)
        else:
            shutil.copy2(entry, new / entry.name, follow_symlinks=False)


def _take_place(aside: Path, out: Path) -> None:
    """Put the finished folder at `out`; the old one is moved away first and comes back when that fails."""
    if not out.exists():
        aside.rename(out)
        return
    old = aside.with_suffix(".old")
    out.rename(old)
    try:
        aside.rename(out)
    except BaseException:
        old.rename(out)
        raise
    shutil.rmtree(old, ignore_errors=True)

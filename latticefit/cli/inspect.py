"""``latticefit inspect``: what was read from files, before any fit; writes nothing but the sheet that is asked for."""

from __future__ import annotations

import argparse
import sys
from pathlib import Path
from typing import TYPE_CHECKING

from ..errors import InputError
from . import options
from .parsing import CommandParser
from .request import request
from .streams import print_json

if TYPE_CHECKING:
    from ..diagnosing.examination import Examination
    from ..records import Measurement, RunOverlap, Sheet

__all__ = ["parser", "run"]


def parser() -> CommandParser:
    """Return the command's parser."""
    made = CommandParser(
        "inspect",
        "Show what was read from files: columns, units, points, range, repairs, level. Writes nothing without "
        "--save-sheet.",
        "latticefit inspect run.csv --formula Al2O3 --save-sheet",
    )
    made.add_argument("files", nargs="+", metavar="FILE|SHEET", help="files of one sample, or one run sheet (.toml)")
    options.add_sample_options(made)
    options.add_column_options(made)
    options.add_point_options(made)
    made.add_argument("--allow-outside", action="store_true", help="let a sheet name files outside its own folder")
    made.add_argument(
        "--save-sheet",
        action="store_true",
        help="write NAME_sheet.toml beside the file: everything that was recognised",
    )
    made.add_argument("--json", action="store_true", help="print everything that was read as JSON")
    return made


def run(arguments: argparse.Namespace) -> int:
    """Print what was read from each file."""
    from ..diagnosing.examination import examine
    from ..report.inspection import inspection_record, inspection_text, overlap_text
    from ..report.noticed import overlap_record
    from ..report.result import json_text
    from ..report.sheet_file import recognised_sheet, save_sheet

    if arguments.save_sheet and any(options.is_sheet(file) for file in arguments.files):
        raise InputError("--save-sheet writes the sheet of data files; a run sheet was given")
    sheet, base, _ = request(arguments, parser())
    measurements = _read(sheet, base)
    if arguments.save_sheet:
        path = save_sheet(recognised_sheet(measurements))
        print(f"latticefit: wrote {str(path)!r}", file=sys.stderr)
    seen = [(each, examine(each)) for each in measurements]
    overlaps, compared, apart = _compared(sheet, base, seen)
    if arguments.json:
        files = [inspection_record(*each) for each in seen]
        record = {"files": files, "overlaps": overlap_record(overlaps), "overlaps_compared": compared}
        print_json(json_text({**record, "not_joined_because": apart}))
    else:
        parts = [inspection_text(*each) for each in seen]
        joined = overlap_text(overlaps, compared), f"not to be joined: {apart}\n" if apart else ""
        print("\n".join([*parts, *(text for text in joined if text)]), end="")
    return 0


def _compared(
    sheet: Sheet, base: Path, seen: list[tuple[Measurement, Examination]]
) -> tuple[tuple[RunOverlap, ...], int, str | None]:
    """How the runs compare where they overlap, and how many pairs do; or why they cannot be joined."""
    from ..preparing import prepare
    from ..reading import read_measurement

    if len(seen) == 1:
        return seen[0][1].overlaps, seen[0][1].overlaps_compared, None
    try:
        joined = read_measurement(sheet.sample, sheet.runs, base, sheet.addenda)
    except InputError as error:
        return (), 0, str(error)
    try:
        prepared = prepare(joined)
    except InputError:  # not per mole, or nothing left: each file has said so
        return (), 0, None
    return prepared.overlaps, prepared.overlaps_compared, None


def _read(sheet: Sheet, base: Path) -> list[Measurement]:
    """Read every file for itself, with the known heat capacities that concern it."""
    from dataclasses import replace

    from ..reading import read_measurement
    from ..reading.measurement import labelled

    runs = labelled(sheet.runs)
    known_labels = [str(run.label) for run in runs]
    for known in sheet.addenda:
        stray = next((name for name in known.runs if not any(_of(name, label) for label in known_labels)), None)
        if stray is not None:
            raise InputError(f"the addenda {known.file!r} name a run {stray!r} that there is not")
    found = []
    for run, label in zip(runs, known_labels, strict=True):
        own = [(known, tuple(name for name in known.runs if _of(name, label))) for known in sheet.addenda]
        addenda = tuple(
            # a file that is read for itself has its own runs only; where it is one run, all of it is concerned
            replace(known, runs=() if label in names else names)
            for known, names in own
            if names or not known.runs
        )
        found.append(read_measurement(sheet.sample, (run,), base, addenda))
    return found


def _of(name: str, label: str) -> bool:
    """Whether a name is that of a run of this label, or of a part of its file."""
    return name == label or name.startswith(f"{label}, ")

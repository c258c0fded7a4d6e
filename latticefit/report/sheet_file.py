"""A run sheet written beside the data that it reads: the choices that were made, so that a rerun is identical."""

from __future__ import annotations

import os
from dataclasses import replace
from pathlib import Path

from ..errors import InputError
from ..reading.sheets import write_sheet
from ..records import Measurement, Sheet
from ..wording import harmless

__all__ = ["recognised_sheet", "save_sheet", "sheet_bytes"]


def recognised_sheet(measurements: list[Measurement]) -> Sheet:
    """Return the sheet that reads the same files in the same way, with every choice written out.

    Parameters
    ----------
    measurements : list of Measurement
        One for each file, of one sample.
    """
    first = measurements[0]
    readings = [reading for each in measurements for reading in each.readings]
    runs = dict.fromkeys(reading.settings for reading in readings)  # the runs of a divided file share their settings
    return Sheet(first.sample_settings, tuple(runs), addenda=first.addenda_settings)


def save_sheet(sheet: Sheet) -> Path:
    """Write a sheet as NAME_sheet.toml beside the first file it names, NAME its stem; paths become relative to it.

    Returns
    -------
    Path
        The file.

    Raises
    ------
    InputError
        If the file exists already or cannot be written, or a data file does not lie below its folder.
    """
    data = Path(sheet.runs[0].file)
    path = data.with_name(f"{data.stem}_sheet.toml")
    folder = data.parent
    portable = replace(
        sheet,
        runs=tuple(replace(run, file=_below(folder, run.file)) for run in sheet.runs),
        addenda=tuple(replace(known, file=_below(folder, known.file)) for known in sheet.addenda),
    )
    shown = harmless(str(path))
    text = sheet_bytes(portable, shown)
    try:
        with path.open("xb") as stream:
            stream.write(text)
    except FileExistsError:
        raise InputError(f"{shown!r} exists already and is not overwritten; move it away first") from None
    except OSError as error:
        raise InputError(f"{shown!r} cannot be written ({error.strerror or error})") from None
    return path


def sheet_bytes(sheet: Sheet, shown: str) -> bytes:
    """Return a sheet as the bytes of its file, `shown` being what messages call it.

    Raises
    ------
    InputError
        If a file name in it is no valid text, which a sheet cannot hold.
    """
    try:
        return write_sheet(sheet).encode("utf-8")
    except UnicodeEncodeError:
        raise InputError(
            f"{shown!r} cannot be written: a file name in it is no valid UTF-8 text; rename the data file"
        ) from None


def _below(folder: Path, file: str) -> str:
    try:
        inside = os.path.relpath(file, folder)
    except ValueError:  # another drive
        inside = os.pardir
    if os.path.isabs(inside) or inside.split(os.sep)[0] == os.pardir:
        raise InputError(
            f"{harmless(file)!r} lies outside {harmless(str(folder))!r}, the folder of the sheet; keep the files of "
            "one sample below one folder"
        )
    return Path(inside).as_posix()

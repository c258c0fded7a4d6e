"""A measurement as a file of text that reads back to the last bit."""

from __future__ import annotations

import csv
import io
import re
import secrets
from contextlib import suppress
from pathlib import Path
from typing import Final

from .._version import __version__
from ..errors import InputError
from ..reading.division import MAX_RUNS, escaped_label
from ..reading.values import is_number
from ..records import Basis, Measurement
from ..wording import harmless

__all__ = ["measurement_csv", "write_measurement_file"]

_UNITS: Final[dict[Basis, str]] = {"mol": "J_molK", "gram": "J_gK", "sample": "J_K"}
_LONGEST_LABEL: Final = 1000
_LONGEST_NAME: Final = 200
# signs that neither end a cell nor belong to a number with its uncertainty, a power of ten or the mark of a footnote
_PLAIN_LABEL: Final = re.compile(r"[^\W\d_](?:[\w.,=:()/-]| (?! ))*(?<! )")
_MISREAD: Final = re.compile(r"\+-|[xX] ?10|[\d)] [a-e]\)")


def measurement_csv(measurement: Measurement) -> str:
    """Return a measurement as CSV, as it is after conversion and corrections.

    Columns are ``T_K``, ``Cp_J_molK`` (``Cv``, ``J_gK`` or ``J_K`` after quantity and basis), ``sigma_J_molK`` where
    sigma is stated, ``run`` with the labels where there are several runs, and ``used`` where points are set aside. Read
    with ``split_by="run"`` and ``require="used = yes"`` the same runs and points come back.

    Parameters
    ----------
    measurement : Measurement
        With at least one point.

    Raises
    ------
    InputError
        If there is no point, or runs are too many or a label too long to be read back.
    """
    labels = [each.label for each in measurement.readings]
    _refuse_unreadable(measurement, labels)
    several, aside = len(labels) > 1, bool(measurement.set_aside)
    unit = _UNITS[measurement.basis]
    out = io.StringIO()
    out.write("".join(f"# {line}\n" for line in _remarks(measurement, several, aside)))
    writer = csv.writer(out, lineterminator="\n")
    sigma = measurement.sigma
    writer.writerow(
        ["T_K", f"{measurement.quantity}_{unit}"]
        + ([] if sigma is None else [f"sigma_{unit}"])
        + (["run"] if several else [])
        + (["used"] if aside else [])
    )
    names = [_label(each) for each in labels]
    for i, run in enumerate(measurement.run.tolist()):
        row = [repr(float(measurement.temperature[i])), repr(float(measurement.heat_capacity[i]))]
        row += [] if sigma is None else [repr(float(sigma[i]))]
        row += [names[run]] if several else []
        row += ["yes" if measurement.set_aside[i] is None else "no"] if aside else []
        writer.writerow(row)
    return out.getvalue()


def _refuse_unreadable(measurement: Measurement, labels: list[str]) -> None:
    if not measurement.temperature.size:
        raise InputError("the measurement has no points to write")
    if len(labels) > MAX_RUNS:
        raise InputError(f"the measurement has {len(labels)} runs, more than the {MAX_RUNS} of a file; write fewer")
    longest = max(map(len, labels))
    if longest > _LONGEST_LABEL:
        raise InputError(f"the label of a run has {longest} characters, more than the {_LONGEST_LABEL} of a file")


def _remarks(measurement: Measurement, several: bool, aside: bool) -> list[str]:
    """Say what is in the file and how it is to be read."""
    sample = measurement.sample
    formula = "" if sample.formula is None or sample.formula == sample.name else f", {sample.formula}"
    remarks = [
        f"written by latticefit {__version__}",
        f"sample: {harmless(sample.name + formula)[:_LONGEST_NAME]}",
    ]
    if measurement.addenda is not None:
        remarks.append("known heat capacities have been taken off; their uncertainty is not in sigma")
    if several:
        remarks.append("read with --split-by run to keep the runs apart")
    if aside:
        remarks.append("read with --require 'used = yes' to leave out the points that were set aside")
    return remarks


def _label(label: str) -> str:
    """Return a text in a spelling that the reader takes for one cell and gives back as it was."""
    numbers = sum(map(is_number, re.split(r"[ ,]", label)))
    plain = _PLAIN_LABEL.fullmatch(label) and label.isprintable() and not _MISREAD.search(label) and numbers < 2
    return label if plain else escaped_label(label)


def write_measurement_file(measurement: Measurement, path: Path, replace: bool = False) -> Path:
    """Write a measurement to a file and return its path.

    Parameters
    ----------
    measurement : Measurement
        As for `measurement_csv`.
    path : Path
        The file to be; its folder must exist.
    replace : bool
        Whether a file that is there may be replaced.

    Raises
    ------
    InputError
        When the file exists already (with `replace`: and was read for this measurement, addenda included), or cannot
        be written.
    """
    shown, text = harmless(str(path)), measurement_csv(measurement)
    if path.is_dir():
        raise InputError(f"{shown!r} is a folder; name a file")
    if path.exists() and _was_read(path, measurement):
        raise InputError(f"{shown!r} is a file that was read for this measurement; it is never replaced, name another")
    if path.exists() and not replace:
        raise InputError(f"{shown!r} exists already; name another file, or give replace=True")
    aside = path.with_name(f".{path.name[:40]}-{secrets.token_hex(6)}.partial")
    try:
        try:
            aside.write_text(text, encoding="utf-8", newline="\n")
            aside.replace(path)
        finally:
            aside.unlink(missing_ok=True)
    except (OSError, ValueError) as error:  # a NUL in the name
        reason = error.strerror if isinstance(error, OSError) and error.strerror else str(error)
        raise InputError(f"{shown!r} cannot be written ({reason}); name another file") from error
    return path


def _was_read(path: Path, measurement: Measurement) -> bool:
    """Say whether a file is one of those read, addenda included, whatever the names by which both are reached."""
    for reading in (*measurement.readings, *measurement.addenda_readings):
        with suppress(OSError):  # a file that is gone since
            if path.samefile(reading.path):
                return True
    return False

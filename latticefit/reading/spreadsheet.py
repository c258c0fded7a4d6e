"""The table of a spreadsheet as lines of text: values as they were last computed, nothing evaluated."""

from __future__ import annotations

import io
import warnings
import zipfile
from collections.abc import Iterator
from typing import Any, Final

from ..errors import InputError
from .wording import listed

__all__ = ["MAX_CELLS", "MAX_SHEET_COLUMNS", "MAX_UNPACKED", "spreadsheet_lines"]

MAX_UNPACKED: Final = 100_000_000
"""Bytes of all parts of a spreadsheet together; the sizes are declared in its directory and kept by the library."""
MAX_PARTS: Final = 1000
MAX_SHEET_COLUMNS: Final = 1000
MAX_CELLS: Final = 2_000_000

_ENTITY_MARKS: Final = tuple(
    mark.encode(encoding) for mark in ("<!DOCTYPE", "<!ENTITY") for encoding in ("ascii", "utf-16-le", "utf-16-be")
)


def spreadsheet_lines(data: bytes, shown: str) -> tuple[list[str], tuple[str, ...]]:
    """Return the one worksheet that holds numbers, a line a row, cells separated by tabs, and what is to be noted.

    Raises
    ------
    InputError
        If it is no .xlsx file, is damaged or too large when unpacked, or several worksheets hold numbers.
    """
    _check_archive(data, shown)
    try:
        import openpyxl
    except ImportError:
        raise InputError(f"{shown}: is a spreadsheet; install openpyxl to read it, or save the table as CSV") from None
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # the library warns of styles and validations, which are not read
            book = openpyxl.load_workbook(io.BytesIO(data), read_only=True, data_only=True)
            sheets = {sheet.title: list(_rows(sheet, shown)) for sheet in book.worksheets}
    except InputError:
        raise
    except Exception as error:  # the library has no single exception for a damaged file
        raise InputError(
            f"{shown}: the spreadsheet is damaged ({type(error).__name__}); save it once more, or as CSV"
        ) from None
    return _only_table(sheets, shown)


def _check_archive(data: bytes, shown: str) -> None:
    """Refuse what is no .xlsx file and what would fill the memory, before anything is parsed."""
    try:
        with zipfile.ZipFile(io.BytesIO(data)) as archive:
            parts = archive.infolist()
            unpacked = sum(part.file_size for part in parts)
            if len(parts) > MAX_PARTS or unpacked > MAX_UNPACKED:
                raise InputError(
                    f"{shown}: the spreadsheet unpacks to {unpacked / 1e6:.0f} MB in {len(parts)} parts, more than the "
                    f"{MAX_UNPACKED / 1e6:.0f} MB in {MAX_PARTS} parts that are read; save the table as CSV"
                )
            names = {part.filename for part in parts}
            if "[Content_Types].xml" not in names or not any(name.startswith("xl/") for name in names):
                raise InputError(f"{shown}: is an archive but no .xlsx spreadsheet; save the table as .xlsx or CSV")
            for part in parts:
                if not part.filename.startswith("xl/media/"):
                    _refuse_entities(archive, part, shown)
    except InputError:
        raise
    except Exception as error:  # a damaged archive fails in many ways
        raise InputError(
            f"{shown}: the spreadsheet is damaged ({type(error).__name__}); save it once more, or as CSV"
        ) from None


def _refuse_entities(archive: zipfile.ZipFile, part: zipfile.ZipInfo, shown: str) -> None:
    tail = b""
    with archive.open(part) as stream:
        while chunk := stream.read(1 << 20):
            if any(mark in tail + chunk for mark in _ENTITY_MARKS):
                raise InputError(f"{shown}: the spreadsheet defines XML entities, which none needs; save it as CSV")
            tail = chunk[-24:]


def _rows(sheet: Any, shown: str) -> Iterator[list[str]]:
    sheet.reset_dimensions()  # the size that a file states need not be true
    cells, last = 0, 0
    for row in sheet.iter_rows(max_col=MAX_SHEET_COLUMNS + 1):
        number = next((cell.row for cell in row if getattr(cell, "row", None)), last + 1)
        cells += max(len(row), 1) + number - last - 1
        if len(row) > MAX_SHEET_COLUMNS and row[-1].value is not None:
            raise InputError(f"{shown}: row {number} has more than the {MAX_SHEET_COLUMNS} columns that are read")
        if cells > MAX_CELLS:
            raise InputError(f"{shown}: has more than the {MAX_CELLS} cells that are read; save the table as CSV")
        yield from ([] for _ in range(number - last - 1))
        last = number
        yield [_text(cell) for cell in row]


def _text(cell: Any) -> str:
    value = cell.value
    if value is None:
        return ""
    if isinstance(value, float | int) and not isinstance(value, bool):
        # a cell shown in percent holds the hundredth of what a person sees
        return f"{value * 100!r} %" if "%" in str(cell.number_format) else repr(value)
    return " ".join(str(value).split())


def _only_table(sheets: dict[str, list[list[str]]], shown: str) -> tuple[list[str], tuple[str, ...]]:
    with_numbers = {
        title: rows for title, rows in sheets.items() if any(_numbers(row) >= 2 for row in rows) and len(rows) > 1
    }
    if len(with_numbers) > 1:
        raise InputError(f"{shown}: sheets {listed(with_numbers)} all hold numbers; keep the one to read in the file")
    if not with_numbers:
        raise InputError(f"{shown}: no sheet holds two columns of numbers")
    title, rows = next(iter(with_numbers.items()))
    notes = (
        () if len(sheets) == 1 else (f"read from sheet {title!r}, the only one of {len(sheets)} that holds a table",)
    )
    return ["\t".join(row) for row in rows], notes


def _numbers(row: list[str]) -> int:
    return sum(cell[:1].isdigit() or cell[:2].lstrip("-−.")[:1].isdigit() for cell in row if cell)

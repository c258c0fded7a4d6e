"""The table of a spreadsheet as lines of text: values as they were last computed, nothing evaluated."""

from __future__ import annotations

import io
import itertools
import operator
import re
import warnings
import zipfile
from collections.abc import Callable, Collection, Iterator
from typing import Any, Final

from ..errors import InputError, nearest
from .opendocument import read_ods
from .sheet_size import MAX_SHEET_COLUMNS, SheetSize
from .wording import listed, quoted, shown_name

__all__ = ["MAX_UNPACKED", "spreadsheet_lines"]

MAX_UNPACKED: Final = 100_000_000
"""Bytes of all parts of a spreadsheet together; the sizes are declared in its directory and kept by the library."""
MAX_PARTS: Final = 1000

_ENTITY_MARKS: Final = tuple(
    mark.encode(encoding) for mark in ("<!DOCTYPE", "<!ENTITY") for encoding in ("ascii", "utf-16-le", "utf-16-be")
)


def spreadsheet_lines(
    data: bytes, shown: str, worksheet: str | None = None
) -> tuple[list[str], tuple[str, ...], str | None]:
    """Return one worksheet as lines of text.

    Parameters
    ----------
    data : bytes
        An .xlsx or .ods file.
    shown : str
        The file as messages name it.
    worksheet : str, optional
        Name or 1-based number of the sheet; the only one that holds numbers when left out.

    Returns
    -------
    lines : list of str
        A line a row, cells separated by tabs.
    notes : tuple of str
    title : str or None
        What names the sheet again; None in a file that has no other.

    Raises
    ------
    InputError
        If it is no such file, is damaged or too large when unpacked, there is no such sheet, or several hold numbers.
    """
    try:
        with zipfile.ZipFile(io.BytesIO(data)) as archive:
            read = _sheets_of(archive, data, shown)
            titles = list(read(lambda number, title: False)) if worksheet is not None else []
            chosen = None if worksheet is None else _chosen(titles, worksheet, shown)
            sheets = read(lambda number, title: chosen in (None, number))
            if chosen is None:
                return _only_table(sheets, shown)
            return _lines(sheets[titles[chosen]]), (), _name_again(titles[chosen], titles)
    except InputError:
        raise
    except MemoryError:
        raise InputError(f"{shown}: the spreadsheet needs more memory than there is; save the table as CSV") from None
    except Exception as error:  # neither archives nor the library have a single exception for a damaged file
        raise InputError(
            f"{shown}: the spreadsheet is damaged ({type(error).__name__}); save it once more, or as CSV"
        ) from None


_Wanted = Callable[[int, str], bool]


def _sheets_of(archive: zipfile.ZipFile, data: bytes, shown: str) -> Callable[[_Wanted], dict[str, list[list[str]]]]:
    """Return what reads the sheets, once it is known that they will not fill the memory."""
    parts = archive.infolist()
    unpacked = sum(part.file_size for part in parts)
    if len(parts) > MAX_PARTS or unpacked > MAX_UNPACKED:
        raise InputError(
            f"{shown}: the spreadsheet unpacks to {unpacked / 1e6:.0f} MB in {len(parts)} parts, more than the "
            f"{MAX_UNPACKED / 1e6:.0f} MB in {MAX_PARTS} parts that are read; save the table as CSV"
        )
    names = {part.filename for part in parts}
    if "content.xml" in names and "[Content_Types].xml" not in names:
        return _ods(archive, names, shown)
    if "[Content_Types].xml" not in names or not any(name.startswith("xl/") for name in names):
        raise InputError(f"{shown}: is an archive but no .xlsx or .ods spreadsheet; save the table as CSV")
    for part in parts:
        if not part.filename.startswith("xl/media/"):
            _refuse_entities(archive, part, shown)
    return _xlsx(data, shown)


def _ods(archive: zipfile.ZipFile, names: set[str], shown: str) -> Callable[[_Wanted], dict[str, list[list[str]]]]:
    manifest = "META-INF/manifest.xml"
    if manifest in names and b"encryption-data" in archive.read(manifest):
        raise InputError(f"{shown}: the spreadsheet is protected by a password; save it without, or as CSV")
    _refuse_entities(archive, archive.getinfo("content.xml"), shown)

    def read(wanted: _Wanted) -> dict[str, list[list[str]]]:
        with archive.open("content.xml") as content:
            sheets = read_ods(content, wanted, SheetSize(shown))
        if not sheets:
            raise InputError(f"{shown}: is an OpenDocument file but no spreadsheet; save the table as CSV")
        return sheets

    return read


def _xlsx(data: bytes, shown: str) -> Callable[[_Wanted], dict[str, list[list[str]]]]:
    try:
        import openpyxl
    except ImportError:
        raise InputError(f"{shown}: is a spreadsheet; install openpyxl to read it, or save the table as CSV") from None

    def read(wanted: _Wanted) -> dict[str, list[list[str]]]:
        size = SheetSize(shown)
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # the library warns of styles and validations, which are not read
            book = openpyxl.load_workbook(io.BytesIO(data), read_only=True, data_only=True)
            return {
                sheet.title: list(_rows(sheet, size)) if wanted(number, sheet.title) else []
                for number, sheet in enumerate(book.worksheets)
            }

    return read


def _chosen(titles: list[str], worksheet: str, shown: str) -> int:
    """Return the 0-based number of the sheet of this name, or of this 1-based number where none has the name."""
    wanted = worksheet.strip()
    if worksheet in titles:
        return titles.index(worksheet)
    named = [number for number, title in enumerate(titles) if title.strip() == wanted]
    if len(named) == 1:
        return named[0]
    if re.fullmatch(r"\d{1,6}", wanted, re.ASCII) is None:
        hint = nearest(wanted, map(shown_name, titles))
        hint = hint if hint.startswith("did you mean") else f"there are {listed(titles)}"
        raise InputError(f"{shown}: there is no worksheet {quoted(worksheet)}; {hint}")
    if not 1 <= int(wanted) <= len(titles):
        raise InputError(f"{shown}: there is no worksheet {wanted}; the file has {len(titles)}: {listed(titles)}")
    return int(wanted) - 1


def _name_again(title: str, titles: Collection[str]) -> str | None:
    """Return the name of a sheet, or its number where the name is blank; None where there is no other sheet."""
    if len(titles) == 1:
        return None
    return title if title.strip() else str(list(titles).index(title) + 1)


def _refuse_entities(archive: zipfile.ZipFile, part: zipfile.ZipInfo, shown: str) -> None:
    tail = b""
    with archive.open(part) as stream:
        while chunk := stream.read(1 << 20):
            if any(mark in tail + chunk for mark in _ENTITY_MARKS):
                raise InputError(f"{shown}: the spreadsheet defines XML entities, which none needs; save it as CSV")
            tail = chunk[-24:]


def _rows(sheet: Any, size: SheetSize) -> Iterator[list[str]]:
    """Give the rows down to the last that holds something; the library fills those up that a file leaves out."""
    sheet.reset_dimensions()  # the size that a file states need not be true
    blank, empty = None, 0
    for number, row in enumerate(sheet.iter_rows(max_col=MAX_SHEET_COLUMNS + 1), start=1):
        # the library gives one and the same row for all that are left out; there may be a million of them
        texts = [] if row is blank else _texts(row, number, size)
        if not texts:
            blank, empty = row, empty + 1
            size.add_empty(1)
            continue
        size.check_columns(number, len(texts))
        size.add_row(texts)
        yield from ([] for _ in range(empty))
        empty = 0
        yield texts


def _texts(row: tuple[Any, ...], number: int, size: SheetSize) -> list[str]:
    """Return the cells of a row without the empty ones at its end, with which the library fills it up."""
    from openpyxl.cell.read_only import EMPTY_CELL

    width = 1
    while not all(map(operator.is_, row[width:], itertools.repeat(EMPTY_CELL))):
        width *= 2
    texts = []
    for cell in row[:width]:
        if isinstance(cell.value, str):
            size.check_cell(number, len(cell.value))
        texts.append(_text(cell))
    while texts and not texts[-1]:
        texts.pop()
    return texts


def _text(cell: Any) -> str:
    value = cell.value
    if value is None:
        return ""
    if isinstance(value, float | int) and not isinstance(value, bool):
        # a cell shown in percent holds the hundredth of what a person sees
        return f"{value * 100!r} %" if "%" in str(cell.number_format) else repr(value)
    return " ".join(str(value).split())


def _only_table(sheets: dict[str, list[list[str]]], shown: str) -> tuple[list[str], tuple[str, ...], str | None]:
    with_numbers = {
        title: rows for title, rows in sheets.items() if any(_numbers(row) >= 2 for row in rows) and len(rows) > 1
    }
    if len(with_numbers) > 1:
        raise InputError(f"{shown}: worksheets {listed(with_numbers)} all hold numbers; choose one by --worksheet")
    if not with_numbers:
        raise InputError(f"{shown}: no worksheet holds two columns of numbers")
    title, rows = next(iter(with_numbers.items()))
    again = _name_again(title, sheets)
    note = f"read from worksheet {quoted(title)}, the only one of {len(sheets)} that holds a table"
    return _lines(rows), (() if again is None else (note,)), again


def _lines(rows: list[list[str]]) -> list[str]:
    return ["\t".join(row) for row in rows] or [""]


def _numbers(row: list[str]) -> int:
    return sum(cell[:1].isdigit() or cell[:2].lstrip("-−.")[:1].isdigit() for cell in row if cell)

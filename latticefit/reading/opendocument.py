"""The tables of an .ods spreadsheet (ISO/IEC 26300), read as a stream: values as they were last computed."""

from __future__ import annotations

import re
from collections.abc import Callable
from typing import IO, Final
from xml.parsers import expat

from .sheet_size import SheetSize

__all__ = ["OdsSheets", "read_ods"]

OdsSheets = dict[str, list[list[str]]]
"""Rows of cells by the name of their sheet."""

_OFFICE: Final = "urn:oasis:names:tc:opendocument:xmlns:office:1.0 "
_TABLE: Final = "urn:oasis:names:tc:opendocument:xmlns:table:1.0 "
_TEXT: Final = "urn:oasis:names:tc:opendocument:xmlns:text:1.0 "
_CELLS: Final = frozenset({f"{_TABLE}table-cell", f"{_TABLE}covered-table-cell"})
_BLANKS: Final = frozenset({f"{_TEXT}s", f"{_TEXT}tab", f"{_TEXT}line-break", f"{_TEXT}p"})
# what holds words or cells that are not those of the sheet: notes, the record of changes, drawings, shapes
_NOT_READ: Final = frozenset({f"{_OFFICE}annotation", f"{_TABLE}tracked-changes", f"{_TABLE}shapes"})
_DRAWING: Final = "urn:oasis:names:tc:opendocument:xmlns:drawing:1.0 "
_NUMBER: Final = re.compile(r"[-+]?(?:\d+\.?\d*|\.\d+)(?:[eE][-+]?\d{1,4})?", re.ASCII)


def read_ods(content: IO[bytes], wanted: Callable[[int, str], bool], size: SheetSize) -> OdsSheets:
    """Read the sheets of a spreadsheet.

    Parameters
    ----------
    content : binary stream
        The part ``content.xml``.
    wanted : callable
        Says for the 0-based number and the name of a sheet whether its rows are read; else it comes out empty.
    size : SheetSize
        Counts what all sheets hold, before a cell or a row is repeated.

    Raises
    ------
    InputError
        If it is too large.
    ValueError
        If it is damaged.
    """
    reader = _Reader(wanted, size)
    parser = expat.ParserCreate(namespace_separator=" ")
    parser.buffer_text = True
    parser.StartElementHandler = reader.start
    parser.EndElementHandler = reader.end
    parser.CharacterDataHandler = reader.characters
    try:
        parser.ParseFile(content)
    except expat.ExpatError as error:
        raise ValueError(str(error)) from None
    return reader.sheets


class _Reader:
    """What has been read so far; empty cells and rows at the end of a row or a sheet are counted, not kept."""

    def __init__(self, wanted: Callable[[int, str], bool], size: SheetSize) -> None:
        self.sheets: OdsSheets = {}
        self._wanted, self._size = wanted, size
        self._unread = 0  # how deep inside something that is not read
        self._rows: list[list[str]] = []
        self._empty_rows = self._empty_cells = 0
        self._repeat = 1
        self._row: list[str] | None = None
        self._cell: dict[str, str] | None = None
        self._words: list[str] = []

    def start(self, name: str, attributes: dict[str, str]) -> None:
        if self._unread or name in _NOT_READ or name.startswith(_DRAWING):
            self._unread += 1
        elif name == f"{_TABLE}table":
            self._begin_sheet(attributes)
        elif name == f"{_TABLE}table-row":
            self._row, self._empty_cells = [], 0
            self._repeat = _count(attributes, "number-rows-repeated")
        elif name in _CELLS:
            self._cell, self._words = attributes, []
        elif name in _BLANKS and self._words:
            self._words.append(" ")

    def end(self, name: str) -> None:
        if self._unread:
            self._unread -= 1
        elif name in _CELLS and self._cell is not None and self._row is not None:
            self._end_cell(self._row, _count(self._cell, "number-columns-repeated"), _value(self._cell, self._words))
            self._cell = None
        elif name == f"{_TABLE}table-row" and self._row is not None:
            self._end_row(self._row)
            self._row = None

    def characters(self, text: str) -> None:
        if self._cell is not None and not self._unread:
            self._words.append(text)

    def _begin_sheet(self, attributes: dict[str, str]) -> None:
        if self._cell is not None:  # a table inside a cell
            self._unread = 1
            return
        number, title = len(self.sheets), attributes.get(f"{_TABLE}name", "")
        if title in self.sheets:
            raise ValueError("two sheets of one name")
        self._rows = self.sheets[title] = []
        self._empty_rows = 0
        if not self._wanted(number, title):
            self._unread = 1

    def _end_cell(self, row: list[str], count: int, value: str) -> None:
        if not value:
            self._empty_cells += count
            return
        number = len(self._rows) + self._empty_rows + 1
        self._size.check_columns(number, len(row) + self._empty_cells + count)
        self._size.check_cell(number, len(value))
        row += [""] * self._empty_cells + [value] * count
        self._empty_cells = 0

    def _end_row(self, row: list[str]) -> None:
        if not row:
            self._empty_rows += self._repeat
            return
        self._size.add_empty(self._empty_rows)
        self._size.add_row(row, self._repeat)
        self._rows += [[] for _ in range(self._empty_rows)] + [row] * self._repeat
        self._empty_rows = 0


def _count(attributes: dict[str, str], name: str) -> int:
    text = attributes.get(_TABLE + name, "1")
    if re.fullmatch(r"\d{1,9}", text, re.ASCII) is None or int(text) == 0:
        raise ValueError(f"{name} is {text[:20]!r}")
    return int(text)


def _value(attributes: dict[str, str], words: list[str]) -> str:
    """Return the cell as a person sees it: a percentage with its sign, a number in full precision."""
    kind = attributes.get(f"{_OFFICE}value-type")
    if kind in ("float", "currency", "percentage"):
        number = attributes.get(f"{_OFFICE}value", "").strip()
        if _NUMBER.fullmatch(number) is None:
            raise ValueError(f"a number is {number[:20]!r}")
        return f"{float(number) * 100!r} %" if kind == "percentage" else number
    typed = {"date": "date-value", "time": "time-value", "boolean": "boolean-value", "string": "string-value"}
    text = attributes.get(_OFFICE + typed.get(kind or "", "string-value"))
    return " ".join(("".join(words) if text is None else text).split())

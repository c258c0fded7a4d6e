"""From lines of text to a table: which sign separates the columns, and whether a line names them."""

from __future__ import annotations

import csv
import re
from collections.abc import Iterable, Sequence
from contextlib import suppress
from dataclasses import dataclass, replace
from itertools import pairwise
from typing import Final, NamedTuple

from ..errors import InputError
from .blocks import Row, divide
from .text import TextFile
from .values import is_number
from .wording import counted, quoted, shown_name

__all__ = ["MAX_COLUMNS", "MAX_TABLE_CELLS", "Table", "find_table"]

MAX_COLUMNS: Final = 1000
MAX_TABLE_CELLS: Final = 5_000_000
"""Cells of a file; each takes some 70 bytes of memory, so that these take about half a gigabyte."""
_SAMPLED_LINES: Final = 200
_SPREADSHEET_ERROR: Final = re.compile(r"\s*#(?:N/A|DIV/0!|VALUE!|NUM!)", re.IGNORECASE)  # an empty cell, no comment
_DELIMITERS: Final[dict[str, str | None]] = {"tab": "\t", "semicolon": ";", "comma": ",", "blank": None}


@dataclass(frozen=True)
class Table:
    """The table of a file; `headers` is None where no line names the columns, else one header a column.

    `series` holds the lines that begin a series, and their words.
    """

    delimiter: str
    headers: tuple[str, ...] | None
    width: int
    rows: tuple[Row, ...]
    notes: tuple[str, ...]
    repairs: tuple[tuple[int | None, str], ...]
    series: tuple[tuple[int, str], ...] = ()

    def where(self, keep: Iterable[bool]) -> Table:
        """Return the table with some of its rows."""
        return replace(self, rows=tuple(row for row, kept in zip(self.rows, keep, strict=True) if kept))

    def cell(self, row: Row, column: int) -> str:
        """Return a cell, empty where the line ends before it."""
        return row.cells[column] if column < len(row.cells) else ""


class _Line(NamedTuple):
    line: int
    text: str


def find_table(source: TextFile, masked: Sequence[tuple[int, int]] = ()) -> Table:
    """Find the table in a file; a row in one of the `masked` intervals of lines may have any number of cells.

    Raises
    ------
    InputError
        If there is none, if it has one column, or if it is not clear where its columns are.
    """
    shown = shown_name(source.name)
    _refuse_wide(source, shown)
    lines = _without_comments(source.lines)
    if not lines:
        raise InputError(f"{shown}: holds comments only, no data")
    delimiter = source.delimiter or _find_delimiter(_sample(lines))
    rows = _rows(lines, delimiter, shown)
    if not any(is_number(cell) for row in rows for cell in row.cells):
        raise InputError(f"{shown}: no column holds numbers")
    texts = dict(lines)
    parts = divide(
        rows, lambda row, width: _header_cells(texts[row.line], row.cells, width, delimiter), delimiter, shown
    )
    headers, rows, notes = parts.headers, parts.rows, source.notes
    if headers is None:
        commented = _commented_header(source.lines, rows, delimiter)
        if commented is not None:
            headers = tuple(commented.cells)
            notes = (*notes, f"column names taken from the comment in line {commented.line}")
    unmasked = [row for row in rows if not any(first <= row.line <= last for first, last in masked)] or rows
    if headers is not None and delimiter == "comma":
        _refuse_comma_in_header(unmasked, headers, shown)
    _check_rows(unmasked, headers, delimiter, shown)
    width = max(len(row.cells) for row in unmasked) if headers is None else len(headers)
    if width < 2:
        raise InputError(f"{shown}: has one column; temperature and heat capacity are needed side by side")
    return Table(delimiter, headers, width, tuple(rows), notes, parts.repairs, parts.series)


def _rows(lines: list[_Line], delimiter: str, shown: str) -> list[Row]:
    """Split the lines, unless their cells would fill the memory."""
    rows, plain_blanks = [], any(re.search(r"\S[ \t]+\S", line.text) for line in lines)
    count = 0
    for line, text in lines:
        cells = _split(text, delimiter, plain_blanks)
        count += len(cells)
        if count > MAX_TABLE_CELLS:
            most = f"more than {MAX_TABLE_CELLS} cells down to line {line}, the most that are read"
            raise InputError(f"{shown}: has {most}; keep the columns that are needed, or fewer rows")
        if any(cells):
            rows.append(Row(line, cells))
    return rows


def _refuse_wide(source: TextFile, shown: str) -> None:
    """Refuse too many columns before a line is split into them."""
    if source.delimiter is not None:  # a spreadsheet, whose columns have been counted; a note in it may have many words
        return
    for number, line in enumerate(source.lines, start=1):
        if len(line) <= 2 * MAX_COLUMNS or line.lstrip().startswith("#"):
            continue
        columns = (
            max(line.count("\t"), line.count(";"), line.count(","), len(line.split(None, 3 * MAX_COLUMNS)) - 1) + 1
        )
        if columns > MAX_COLUMNS:
            raise InputError(f"{shown}: line {number} has {columns} columns, more than the {MAX_COLUMNS} that are read")


def _sample(lines: list[_Line]) -> list[_Line]:
    """Return lines from the beginning and the middle: a long preamble must not settle the delimiter."""
    middle = len(lines) // 2
    return (
        lines if len(lines) <= _SAMPLED_LINES else lines[: _SAMPLED_LINES // 2] + lines[middle:][: _SAMPLED_LINES // 2]
    )


def _without_comments(lines: list[str]) -> list[_Line]:
    kept = []
    for number, line in enumerate(lines, start=1):
        text = line.strip(" \r\x1a\x0c")
        if not text.strip() or (text.lstrip().startswith("#") and _SPREADSHEET_ERROR.match(text) is None):
            continue
        if "#" in text:
            text = re.sub(r"\s#(?:\s.*)?$", "", text)
        kept.append(_Line(number, _joined_uncertainty(text)))
    return kept


def _joined_uncertainty(text: str) -> str:
    """Write ``12.34 +/- 0.05``, ``1.2 × 10-3`` and ``12.3 †`` as one word: their blanks do not make columns."""
    if "±" in text or "+-" in text or "+/-" in text:
        text = re.sub(r"[ \u00a0\u2009]*(?:±|\+/-|\+-)[ \u00a0\u2009]*", "±", text)
    if "10" in text and re.search(r"[×·⋅xX*]", text) is not None:
        text = re.sub(r"(?<=[\d.,)])[ \u00a0\u2009]*([×·⋅xX*])[ \u00a0\u2009]*(?=10[-−^*{⁻⁺⁰¹²³⁴⁵⁶⁷⁸⁹\d])", r"\1", text)
    return re.sub(r"(?<=[\d)])[ \u00a0\u2009]+(?=(?:[*†‡§¶]+|[a-e]\))(?:[\s;,]|$))", "", text)


def _split(text: str, delimiter: str, plain_blanks: bool = False) -> list[str]:
    sign = _DELIMITERS[delimiter]
    if sign is None and plain_blanks:  # the other kinds of blank then stand inside numbers
        return [word.strip('"') for word in re.findall(r'"[^"]*"|[^ \t]+', text)]
    if sign is None:
        return [word.strip('"') for word in re.findall(r'"[^"]*"|\S+', text)]
    cells = text.split(sign)
    if '"' in text:
        with suppress(csv.Error):  # a cell beyond the module's size limit; it is no number either way
            cells = next(csv.reader([text], delimiter=sign, skipinitialspace=True))
    cells = [cell.strip() for cell in cells]
    while cells and not cells[-1]:
        cells.pop()
    return cells


def _find_delimiter(lines: list[_Line]) -> str:
    """Choose the sign that makes most lines into rows of numbers; a tie goes to the order of the list."""
    best, best_score = "blank", (0, 0, 0.0)
    for delimiter in _DELIMITERS:
        rows = [_split(text, delimiter) for _, text in lines]
        counts = [(sum(map(is_number, cells)), len(cells)) for cells in rows]
        numbers, cells = sum(number for number, _ in counts), sum(size for number, size in counts if number)
        score = (
            sum(number >= 2 for number, _ in counts),
            sum(number >= 1 and size >= 2 for number, size in counts),
            numbers / max(cells, 1),
        )
        if score > best_score:
            best, best_score = delimiter, score
    return best


def _header_cells(text: str, cells: list[str], width: int, delimiter: str) -> tuple[str, ...] | None:
    """Return the headers of a line, None where it does not name `width` columns.

    In a table separated by blanks the headers may hold blanks themselves, as in ``T (K)``.
    """
    if delimiter != "blank":
        return tuple(cells)
    bracketed = re.sub(r"\s+(?=[(\[])", " ", text)
    for line in (bracketed, text):
        for pattern in (r"\s+", r"\s{2,}|\t", r"\s+(?![^(\[]*[)\]])(?![(\[])"):
            headers = [part.strip().strip('"') for part in re.split(pattern, line)]
            if len(headers) == width:
                return tuple(headers)
    return tuple(cells) if len(cells) == width else None


def _commented_header(lines: list[str], rows: list[Row], delimiter: str) -> Row | None:
    """Return the comment just above the first row if it names a column each, one of them a temperature."""
    above = rows[0].line - 1
    comment = lines[above - 1].strip() if above >= 1 else ""
    cells = _split(comment.lstrip("# \t"), delimiter) if comment.startswith("#") else []
    width = max(len(row.cells) for row in rows)
    named = any(re.match(r"(?i)t(emp(erature)?)?(?![A-Za-z])", cell) for cell in cells)
    return Row(above, cells) if named and len(cells) == width and not any(map(is_number, cells)) else None


def _check_rows(rows: list[Row], headers: tuple[str, ...] | None, delimiter: str, shown: str) -> None:
    width = max(len(row.cells) for row in rows) if headers is None else len(headers)
    for row in rows:
        if delimiter == "comma":
            comma = next((cell for cell in row.cells if "," in cell and is_number(cell)), None)
            if comma is not None:
                raise _decimal_comma(row, f"{quoted(comma)} has a decimal comma in a comma-separated file", shown)
        if len(row.cells) > width or (delimiter == "blank" and len(row.cells) != width):
            named = (
                f"the header names {counted(width, 'column')}" if headers is not None else f"there are {width} columns"
            )
            found = f"line {row.line} has {counted(len(row.cells), 'cell')} where {named}"
            if delimiter == "comma" and all(is_number(cell) and "." not in cell for cell in row.cells):
                raise _decimal_comma(row, f"{found}, perhaps decimal commas in a comma-separated file", shown)
            raise InputError(f"{shown}: {found}; correct it, or leave the line out by --mask-lines {row.line}")
    if delimiter == "comma" and headers is None:
        _refuse_unclear_commas(rows, shown)


def _refuse_comma_in_header(rows: list[Row], headers: tuple[str, ...], shown: str) -> None:
    """Refuse ``T/K,Cp,m/(J K-1 mol-1)`` over two columns: the comma of a name has divided it."""
    most = max(len(row.cells) for row in rows)
    if most >= len(headers):
        return
    for before, after in pairwise(headers):
        if re.fullmatch(r"(?:Δ|[dD]elta\s*)?[CcSHhs]_?[pvPV]?", before) and re.match(
            r"(?:[mpv]|sat)(?![A-Za-z])", after
        ):
            whole = quoted(f"{before},{after}")
            raise InputError(
                f"{shown}: the header names {counted(len(headers), 'column')} but the rows have "
                f"{counted(most, 'cell')}; a header that holds a comma, as {whole} does, must stand in double quotes"
            )


def _refuse_unclear_commas(rows: list[Row], shown: str) -> None:
    """Refuse whole numbers between commas where nothing tells a separator from a decimal comma."""
    cells = [cell for row in rows for cell in row.cells]
    whole = not any("." in cell for cell in cells)
    leading_zero = any(re.fullmatch(r"0\d+", cell) for cell in cells)
    if whole and (leading_zero or max(len(row.cells) for row in rows) > 2):
        raise _decimal_comma(rows[0], "it is not clear whether its commas separate columns or are decimal", shown)


def _decimal_comma(row: Row, found: str, shown: str) -> InputError:
    where = "" if found.startswith("line") else f"line {row.line}: "
    return InputError(
        f"{shown}: {where}{found}; use decimal points, or separate the columns by semicolons or tabs and name them"
    )

"""From rows of cells to the table among them: preamble, header, units, series, repeated headers, footnotes."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Final, NamedTuple

from ..errors import InputError
from ..units import HeatCapacityUnit, TemperatureUnit
from .headers import Column, describe_columns, names_heat_capacity, names_temperature, unit_of_cell
from .values import is_number
from .wording import counted, quoted

__all__ = ["Parts", "Row", "divide"]

_SERIES: Final = re.compile(r"(?i)(?:series|run|set|sample|cycle)\s*[:#.]?\s*\w{1,20}\W?")
_FOOTNOTE: Final = re.compile(
    r"\s*(?:(?:[*†‡§¶%!;]+|//|--)\s*[^\W\d]|\(?[a-e]\)\s*[^\W\d]|\[[a-e]\]\s*[^\W\d]|(?i:notes?|remarks?|footnotes?)\b)"
)
_NO_VALUE: Final = frozenset({"n/a", "na", "none", "null", "nan", "inf", "infinity", "n.a."})


class Row(NamedTuple):
    """One line of the table: its 1-based number in the file and its cells."""

    line: int
    cells: list[str]


class Parts(NamedTuple):
    """The headers with the units of a row of units, the rows of data, what was left out, and where series begin."""

    headers: tuple[str, ...] | None
    rows: list[Row]
    repairs: tuple[tuple[int | None, str], ...]
    series: tuple[tuple[int, str], ...]


Split = Callable[[Row, int], tuple[str, ...] | None]


@dataclass(frozen=True)
class _Reader:
    """How a row is read as headers, and how many columns it must then have."""

    split: Split
    width: int
    delimiter: str
    shown: str

    def cells(self, row: Row) -> tuple[str, ...] | None:
        return self.split(row, self.width)


def divide(rows: list[Row], split: Split, delimiter: str, shown: str) -> Parts:
    """Divide the rows of a file.

    Parameters
    ----------
    rows : list of Row
        All lines that are no comment, split into cells.
    split : callable
        Returns the headers of a row for a number of columns, None where it cannot name that many.
    delimiter, shown : str
        The delimiter, and the file as messages name it.

    Raises
    ------
    InputError
        If no data follow the header, two headers differ, or numbers stand above the header.
    """
    numeric = [row for row in rows if _numbers(row) >= 2] or [
        row for row in rows if _numbers(row) and len(row.cells) > 1
    ]
    width = Counter(len(row.cells) for row in numeric).most_common(1)[0][0] if numeric else len(rows[0].cells)
    reader = _Reader(split, width, delimiter, shown)
    first = rows.index(numeric[0]) if numeric else len(rows)
    at = _named_header(rows, first, reader)
    if at is None:
        at = _plain_header(rows, first, reader)
    repairs: list[tuple[int | None, str]] = []
    if at is None:
        return Parts(None, *_body(rows, None, None, reader, repairs))
    repairs += _preamble(rows[:at], reader, len(reader.cells(rows[at]) or ()))
    if at + 1 == len(rows):
        raise InputError(f"{shown}: no data follow the header in line {rows[at].line}")
    headers = _headers(rows[at], reader)
    units = _units(rows[at + 1], headers, reader)
    below = rows[at + 1 :]
    if units is not None:
        repairs.append((below[0].line, "read as a row of units"))
        joined = _with_units(headers, units, below[0].line, shown)
        below = below[1:]
        if not below:
            raise InputError(f"{shown}: no data follow the row of units in line {rows[at + 1].line}")
        return Parts(joined, *_body(below, headers, units, reader, repairs))
    return Parts(headers, *_body(below, headers, None, reader, repairs))


def _numbers(row: Row) -> int:
    return sum(map(is_number, row.cells))


# --------------------------------------------------------------------------------------------------- the header


def _named_header(rows: list[Row], first: int, reader: _Reader) -> int | None:
    """Return the row that names a temperature and a heat capacity: the last above the numbers, else the first."""
    above = [i for i in range(min(first, len(rows))) if _names_table(rows[i], reader)]
    if above:
        return above[-1]
    return next(
        (i for i in range(first, len(rows)) if not _starts_as_data(rows[i]) and _names_table(rows[i], reader)), None
    )


def _starts_as_data(row: Row) -> bool:
    return is_number(row.cells[0]) and _numbers(row) >= 2


def _names_table(row: Row, reader: _Reader) -> bool:
    cells = reader.cells(row)
    if cells is None or len(cells) < 2:
        return False
    columns = describe_columns([cell or None for cell in cells])
    warm = [column for column in columns if names_temperature(column.name) and not _other(column, TemperatureUnit)]
    return any(column not in warm and _is_heat_capacity(column) for column in columns) if warm else False


def _other(column: Column, unit: type) -> bool:
    return column.unit is not None and not isinstance(column.unit, unit)


def _is_heat_capacity(column: Column) -> bool:
    named = names_heat_capacity(column.name) and not _other(column, HeatCapacityUnit)
    return named or isinstance(column.unit, HeatCapacityUnit)


def _plain_header(rows: list[Row], first: int, reader: _Reader) -> int | None:
    """Return the row that names the columns by whatever words, None where the numbers begin at once.

    It is the last row above the numbers (or above a row of units) that holds none; a word above a number counts too.
    """
    if first == 0:
        below = rows[1].cells if len(rows) > 1 else [""]
        return 0 if not is_number(rows[0].cells[0]) and is_number(below[0]) else None
    words = [i for i in range(first) if not _numbers(rows[i]) and len(rows[i].cells) > 1]
    if not words:
        return None if any(_numbers(row) for row in rows[:first]) else first - 1
    if len(words) > 1 and words[-1] == words[-2] + 1:
        names = reader.cells(rows[words[-2]])
        if names is not None and _units(rows[words[-1]], names, reader) is not None:
            return words[-2]
    return words[-1]


def _headers(row: Row, reader: _Reader) -> tuple[str, ...]:
    headers = reader.cells(row)
    if headers is None:
        words, columns = counted(len(row.cells), "word"), counted(reader.width, "column")
        raise InputError(
            f"{reader.shown}: line {row.line} has {words} over {columns}; separate the columns by tabs, commas or "
            "semicolons"
        )
    return headers


def _preamble(above: list[Row], reader: _Reader, width: int) -> list[tuple[int | None, str]]:
    if not above:
        return []
    data = next((row for row in above if _starts_as_data(row) and len(row.cells) == width), None)
    if data is not None:
        above_names = f"numbers in {width} columns above the line that names them"
        raise InputError(f"{reader.shown}: line {data.line} holds {above_names}; put the names first")
    first, last = above[0].line, above[-1].line
    lines = "text" if len(above) == 1 else f"text in lines {first} to {last}"
    return [(first, f"{lines} above the table is not read")]


def _units(row: Row, headers: Sequence[str], reader: _Reader) -> tuple[str, ...] | None:
    """Return the cells of a row of units: no numbers, and a unit of temperature or heat capacity among them."""
    if _numbers(row):
        return None
    cells = reader.split(row, len(headers))
    if cells is None or len(cells) > len(headers):
        return None
    units = [unit_of_cell(cell, name) for cell, name in zip(cells, headers, strict=False)]
    known = any(isinstance(unit, HeatCapacityUnit | TemperatureUnit) for unit in units)
    return cells if known and not _same(cells, headers) else None


def _with_units(headers: tuple[str, ...], units: tuple[str, ...], line: int, shown: str) -> tuple[str, ...]:
    joined = []
    described = describe_columns([header or None for header in headers])
    for column, cell in zip(described, (*units, *[""] * len(headers)), strict=False):
        header = column.header or ""
        unit = unit_of_cell(cell, header)
        if unit is not None and column.unit is not None and unit != column.unit:
            against = f"the row of units says {quoted(cell)}, against the header"
            raise InputError(f"{shown}: line {line}, column {quoted(header)}: {against}")
        plain = cell.strip()
        if not plain or column.unit is not None or plain in "-–—":
            joined.append(header)
        else:
            joined.append(f"{header} {plain}" if plain[0] in "([" and plain[-1] in ")]" else f"{header} [{plain}]")
    return tuple(joined)


# ------------------------------------------------------------------------------------------------------ the rest


def _same(cells: Sequence[str], others: Sequence[str]) -> bool:
    def bare(texts: Sequence[str]) -> list[str]:
        return [re.sub(r"\s+", "", text).casefold() for text in texts if text.strip()]

    return bare(cells) == bare(others)


def _body(
    rows: list[Row],
    headers: tuple[str, ...] | None,
    units: tuple[str, ...] | None,
    reader: _Reader,
    repairs: list[tuple[int | None, str]],
) -> tuple[list[Row], tuple[tuple[int | None, str], ...], tuple[tuple[int, str], ...]]:
    """Return the rows of data, the repairs with those of the lines between and below them added, and the series."""
    last = max((i for i, row in enumerate(rows) if _numbers(row)), default=-1)
    kept = []
    for i, row in enumerate(rows):
        note = _what_it_is(row, headers, units, reader, i > last)
        if note is None:
            kept.append(row)
        else:
            repairs.append((row.line, note))
    if not kept:
        raise InputError(f"{reader.shown}: no data follow the header")
    series = [(row.line, words) for row in rows if (words := _series(row, reader)) is not None]
    return kept, tuple(repairs), tuple(series)


def _series(row: Row, reader: _Reader) -> str | None:
    """Return the words of a line that begins a series, None for any other."""
    words = " ".join(cell for cell in row.cells if cell)
    filled = sum(map(bool, row.cells))
    alone = filled == 1 or (reader.delimiter == "blank" and filled == 2)
    return words if alone and not is_number(row.cells[0]) and _SERIES.fullmatch(words) else None


def _what_it_is(
    row: Row, headers: tuple[str, ...] | None, units: tuple[str, ...] | None, reader: _Reader, after_data: bool
) -> str | None:
    """Say what a line in the table is that holds no data; None where it is a row of data, readable or not."""
    if is_number(row.cells[0]):
        return None
    words = " ".join(cell for cell in row.cells if cell)
    if _series(row, reader) is not None:
        return f"a series begins: {quoted(words)}"
    if headers is not None:
        cells = reader.split(row, len(headers))
        if cells is not None and _same(cells, headers):
            return "repeated header left out"
        if cells is not None and units is not None and _same(cells, units):
            return "repeated row of units left out"
        if _numbers(row) == 0 and _names_table(row, reader):
            raise InputError(
                f"{reader.shown}: line {row.line} is a header that differs from the first; put each table into a file"
            )
    return f"text left out: {quoted(words)}" if _is_text(row, words, reader, after_data) else None


def _is_text(row: Row, words: str, reader: _Reader, after_data: bool) -> bool:
    filled = [cell for cell in row.cells if cell]
    numbers = _numbers(row)
    few = numbers < 2 or (len(filled) - numbers >= 3 and len(filled) > 3 * numbers)  # "u(T) = 0.01 K; u(Cp) = 0.5"
    if _FOOTNOTE.match(words) and few and (numbers == 0 or len(row.cells) != reader.width):
        return True
    lettered = re.match(r"[^\W\d]", words) is not None and words.casefold() not in _NO_VALUE
    if not lettered or any(re.match(r"[-+−.,]?\d", cell) for cell in filled[1:] if reader.delimiter != "blank"):
        return False
    if reader.delimiter == "blank":
        return few and len(row.cells) != reader.width
    return numbers == 0 and (len(filled) == 1 or after_data)

"""One file that holds several runs: the values of a column, or the lines that begin a series, tell them apart."""

from __future__ import annotations

import math
import re
from collections import deque
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from ..errors import InputError
from ..records import FloatArray
from .columns import chosen_column, find_column
from .headers import Column
from .rows import decimal_of, place
from .table import Table
from .values import Decimal, is_number, parse_number
from .wording import bare, counted, listed, quoted

__all__ = ["LABEL_COLUMNS", "MAX_RUNS", "Division", "divide_rows", "escaped_label", "order_notes"]

MAX_RUNS: Final = 200
LABEL_COLUMNS: Final = ("run", "label")
"""Headers whose texts are the labels of the runs as they stand."""

_ESCAPE: Final = re.compile(r"\\u\{([0-9a-fA-F]{1,6})\}")


@dataclass(frozen=True)
class Division:
    """The runs of one file in the order of their first rows, and the run of every row of the table.

    `names` say what a run is in the file, `as_labels` where such a name may stand alone as its label; `of_row` has
    shape (m,). A file that is not divided has one run without a name.
    """

    names: tuple[str, ...]
    as_labels: tuple[bool, ...]
    of_row: NDArray[np.intp]
    notes: tuple[str, ...] = ()

    def labels(self, file_label: str, alone: bool) -> tuple[str, ...]:
        """Return the label of each run; `alone` says that no other file is read with this one."""
        return tuple(
            (name if alone and as_label else f"{file_label}, {name}") if name else file_label
            for name, as_label in zip(self.names, self.as_labels, strict=True)
        )


def divide_rows(
    table: Table,
    columns: tuple[Column, ...],
    data: Sequence[Column],
    split_by: str | int | None,
    rows: tuple[NDArray[np.bool_], Sequence[str | None]],
    shown: str,
) -> Division:
    """Divide the rows of a table into runs.

    Cells that hold numbers are one value where the numbers are equal, so that ``5``, ``5.0`` and ``5,0`` give one run;
    other cells are compared as they stand. A text in a column headed as in `LABEL_COLUMNS` is a label by itself; any
    other value becomes ``header = value``.

    Parameters
    ----------
    table : Table
        The rows.
    columns, data : sequence of Column
        All columns, and those of the data, whose decimal sign the others share.
    split_by : str or int
        A column, or the word "series" for the lines that begin a series, where no column bears that name; None leaves
        the file one run.
    rows : ndarray of bool and sequence of (str or None), both of length m
        Which rows can be used, and why some of them are set aside. A row that is not to be fitted may have an empty
        cell; it then goes to the run above it.
    shown : str
        The file as messages name it.

    Raises
    ------
    InputError
        If the column is not there or holds the data, a cell is empty, or there are too many values.
    """
    if split_by is None:
        return Division(("",), (True,), np.zeros(len(table.rows), dtype=np.intp))
    usable, fitted = rows[0], rows[0] & np.array([why is None for why in rows[1]])
    wanted = split_by.strip() if isinstance(split_by, str) else split_by
    column = find_column(columns, wanted, shown)
    if column is None and isinstance(wanted, str) and wanted.casefold() == "series" and table.series:
        return _by_series(table, usable, shown)
    if column is None:
        column = chosen_column(columns, wanted, "--split-by", shown)
    if column in data:
        raise InputError(
            f"{shown}: {quoted(column.label)} holds the data and cannot divide them; choose another column"
        )
    values = _values(table.where(fitted), table, (*data, column), shown)
    for i in np.flatnonzero(fitted):
        if not values[i]:
            raise InputError(
                f"{place(shown, table.rows[i], column)}: is empty, so the row belongs to no run; fill it in, or "
                "mask the line"
            )
    names = tuple(dict.fromkeys(value for value, use in zip(values, usable, strict=True) if use and value))
    _refuse_measured(names, int(usable.sum()), column, shown)
    as_label = tuple(
        column.name.strip().casefold() in LABEL_COLUMNS and _finite(name, "point") is None for name in names
    )
    named = tuple(
        _unescaped(name) if own else f"{column.label} = {name}" for name, own in zip(names, as_label, strict=True)
    )
    numbers = {name: number for number, name in enumerate(names)}
    of_row = _filled([numbers.get(value, -1) for value in values])
    notes = (_summary(quoted(column.label), named, of_row), *_merged(table, column, values))
    return Division(named, as_label, of_row, notes)


def _values(fitted: Table, table: Table, columns: Sequence[Column], shown: str) -> list[str]:
    """Return the cells of the last of some columns, numbers among them in their shortest spelling."""
    cells = [table.cell(row, columns[-1].index) for row in table.rows]
    if not any(map(is_number, cells)):
        return cells
    decimal = decimal_of(fitted, columns, shown)
    values = []
    for cell in cells:
        number = _finite(cell, decimal)
        values.append(cell if number is None else repr(number + 0.0).removesuffix(".0"))
    return values


def _finite(cell: str, decimal: Decimal) -> float | None:
    number = parse_number(cell, decimal) if is_number(cell) else None
    return number.value if number is not None and math.isfinite(number.value) else None


def _refuse_measured(names: tuple[str, ...], rows: int, column: Column, shown: str) -> None:
    numbers = sum(_finite(name, "point") is not None for name in names)
    few = numbers > 10 and 2 * numbers > rows
    if len(names) > MAX_RUNS or few:
        many = f"{len(names)} values in {rows} rows"
        raise InputError(
            f"{shown}: {quoted(column.label)} has {many}, which looks like a measured quantity and not like the names "
            f"of runs (at most {MAX_RUNS}); choose another column, or round its values"
        )


def _filled(numbers: list[int]) -> NDArray[np.intp]:
    """Give a row without a run that of the row above it, the first run where there is none above."""
    filled, last = [], 0
    for number in numbers:
        last = number if number >= 0 else last
        filled.append(last)
    return np.array(filled, dtype=np.intp)


def _summary(by: str, names: tuple[str, ...], of_row: NDArray[np.intp]) -> str:
    counts = np.bincount(of_row, minlength=len(names))
    parts = [f"{bare(name)} ({counted(int(count), 'row')})" for name, count in zip(names, counts, strict=True)]
    shown = parts if len(parts) <= 10 else [*parts[:9], f"and {len(parts) - 9} more"]
    return f"divided by {by} into {counted(len(names), 'run')}: {', '.join(shown)}"


def _merged(table: Table, column: Column, values: list[str]) -> tuple[str, ...]:
    """Say which spellings of one number were taken together."""
    spellings: dict[str, dict[str, None]] = {}
    for row, value in zip(table.rows, values, strict=True):
        spellings.setdefault(value, {})[table.cell(row, column.index)] = None
    return tuple(
        f"{listed(cells)} in {quoted(column.label)} are one value, {value}"
        for value, cells in spellings.items()
        if len(cells) > 1
    )


def _by_series(table: Table, usable: NDArray[np.bool_], shown: str) -> Division:
    """Divide at the lines that begin a series; rows above the first of them are a run of their own."""
    before = f"above {table.series[0][1]}"
    names: dict[str, int] = {}
    numbers, starts = [], deque(table.series)
    current = before
    for row, use in zip(table.rows, usable, strict=True):
        while starts and starts[0][0] < row.line:
            current = starts.popleft()[1]
        numbers.append(names.setdefault(current, len(names)) if use or current in names else -1)
    if len(names) > MAX_RUNS:
        raise InputError(
            f"{shown}: lines that begin a series divide it into {len(names)} runs, more than the {MAX_RUNS} of a file; "
            "divide it by a column, or not at all"
        )
    of_row = _filled(numbers)
    return Division(tuple(names), (False,) * len(names), of_row, (_summary("series", tuple(names), of_row),))


def order_notes(
    temperature: FloatArray, lines: NDArray[np.intp], run: NDArray[np.intp], names: tuple[str, ...]
) -> list[str]:
    """Say for each run where the temperatures do not rise; the order of the file is kept."""
    return [
        f"{bare(name)}: {note}" if name else note
        for number, name in enumerate(names)
        for note in _falls(temperature[run == number], lines[run == number])
    ]


def _falls(temperature: FloatArray, lines: NDArray[np.intp]) -> list[str]:
    falls = np.flatnonzero(np.diff(temperature) < 0)
    if not falls.size:
        return []
    if falls.size == temperature.size - 1:
        return ["the temperatures fall from row to row"] if falls.size > 1 else []
    fall = counted(falls.size, "fall")
    return [f"the temperatures are not in order: {fall}, the first in line {lines[falls[0] + 1]}"]


# ---------------------------------------------------------------------------------------- labels that are hard to write


def escaped_label(label: str) -> str:
    r"""Return a label with all but letters of ASCII as ``\u{HEX}``; in a column of labels it is read as it was."""
    return "".join(each if each.isascii() and each.isalpha() else f"\\u{{{ord(each):x}}}" for each in label)


def _unescaped(text: str) -> str:
    def sign(found: re.Match[str]) -> str:
        code = int(found[1], 16)
        return chr(code) if code <= 0x10FFFF else found[0]

    return _ESCAPE.sub(sign, text)

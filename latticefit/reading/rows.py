"""From cells to numbers, row by row: what cannot be read is refused, what cannot be used is told apart and why."""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ..errors import InputError
from ..records import FloatArray
from .blocks import Row
from .headers import Column
from .table import Table
from .values import Decimal, Number, is_plain, mixed_decimals, parse_number, spelling
from .wording import quoted

__all__ = [
    "Cells",
    "decimal_of",
    "place",
    "read_cells",
    "reasons_against",
    "refuse_bad_sigma",
    "refuse_too_few",
]


@dataclass(frozen=True)
class Cells:
    """Numbers of every row in the file's own units, shape (m,), NaN where missing.

    `written_sigma` holds the uncertainties written with the heat capacities, as in ``12.34(5)``, `repairs` the line
    (None for the whole file) and the words of what was mended in the spelling of the numbers.
    """

    temperature: FloatArray
    heat_capacity: FloatArray
    sigma: FloatArray | None
    written_sigma: FloatArray
    temperature_has_sigma: bool
    decimal: Decimal
    repairs: tuple[tuple[int | None, str], ...]


def read_cells(table: Table, columns: Sequence[Column], shown: str, aside: Sequence[str | None] | None = None) -> Cells:
    """Read the cells of the chosen columns: temperature, heat capacity, and sigma where there is one.

    A row that is set aside need not be readable: `aside` says why it is, None for the others.

    Raises
    ------
    InputError
        If a cell is no number, or decimal points and commas are mixed.
    """
    fitted = [why is None for why in aside or [None] * len(table.rows)]
    decimal = decimal_of(table.where(fitted), columns, shown)
    numbers = [_numbers(table, column, decimal, fitted, shown) for column in columns]
    written = [math.nan if number.uncertainty is None else number.uncertainty for number in numbers[1]]
    arrays = [np.array([number.value for number in column]) for column in numbers]
    return Cells(
        temperature=arrays[0],
        heat_capacity=arrays[1],
        sigma=arrays[2] if len(arrays) > 2 else None,
        written_sigma=np.array(written),
        temperature_has_sigma=any(number.uncertainty is not None for number in numbers[0]),
        decimal=decimal,
        repairs=(*_unclear_commas(table, columns, decimal), *_respelt(table, columns)),
    )


def _unclear_commas(table: Table, columns: Sequence[Column], decimal: Decimal) -> list[tuple[int | None, str]]:
    """Note decimal commas that could be thousands, because three digits follow each of them."""
    if decimal == "point":
        return []
    cells = [cell for row in table.rows for column in columns if "," in (cell := table.cell(row, column.index))]
    if not all(re.fullmatch(r"[+-]?[1-9]\d{0,2},\d{3}", cell, re.ASCII) for cell in cells):
        return []
    return [(None, f"three digits follow every comma, as in {quoted(cells[0])}; read as decimal commas, not thousands")]


def _respelt(table: Table, columns: Sequence[Column]) -> list[tuple[int | None, str]]:
    """List the marks and the grouped digits of the cells that are read, line by line."""
    repairs: list[tuple[int | None, str]] = []
    for row in table.rows:
        for column in columns:
            cell = table.cell(row, column.index)
            if is_plain(cell):
                continue
            found = spelling(cell)
            if found.mark is not None:
                repairs.append((row.line, f"{quoted(cell)} in {_column(column)}: mark {quoted(found.mark)} not read"))
            if found.grouped:
                repairs.append((row.line, f"{quoted(cell)} in {_column(column)} read as {found.plain}"))
    return repairs


def decimal_of(table: Table, columns: Sequence[Column], shown: str) -> Decimal:
    """Return the decimal sign that columns share.

    Raises
    ------
    InputError
        If they have both.
    """
    cells = (table.cell(row, column.index) for row in table.rows for column in columns)
    decimal, with_point, with_comma = mixed_decimals(cells)
    if with_point is not None and with_comma is not None:
        first, other = (_whereabouts(table, columns, cell) for cell in (with_point, with_comma))
        raise InputError(
            f"{shown}: decimal points and decimal commas are mixed ({first} and {other}); write them one way"
        )
    return decimal


def _whereabouts(table: Table, columns: Sequence[Column], cell: str) -> str:
    for row in table.rows:
        for column in columns:
            if table.cell(row, column.index) == cell:
                return f"{quoted(cell)} in line {row.line}, {_column(column)}"
    return quoted(cell)


def _numbers(table: Table, column: Column, decimal: Decimal, fitted: Sequence[bool], shown: str) -> list[Number]:
    numbers = []
    for row, needed in zip(table.rows, fitted, strict=True):
        cell = table.cell(row, column.index)
        number = parse_number(cell, decimal)
        if number is None and not needed:
            number = Number(math.nan, None)
        if number is None:
            raise InputError(
                f"{place(shown, row, column)}: {quoted(cell)} cannot be read as a number; correct it, or leave the "
                f"line out by --mask-lines {row.line}"
            )
        numbers.append(number)
    return numbers


def _column(column: Column) -> str:
    return column.label if column.header is None else f"column {quoted(column.label)}"


def place(shown: str, row: Row, column: Column) -> str:
    """Return where a cell stands: file, line and column."""
    return f"{shown}: line {row.line}, {_column(column)}"


def reasons_against(
    temperature: FloatArray, heat_capacity: FloatArray, sigma: FloatArray | None, written: FloatArray, unit: str
) -> list[str | None]:
    """Say for each row why it cannot be used, None where it can.

    Parameters
    ----------
    temperature, heat_capacity, sigma : ndarray, shape (m,)
        K and any unit of heat capacity.
    written, unit : ndarray and str
        Heat capacity as the file has it, and its unit, for the words.
    """
    reasons: list[str | None] = []
    for i, (t, c) in enumerate(zip(temperature, heat_capacity, strict=True)):
        reason = None
        if not math.isfinite(t):
            reason = "no temperature" if math.isnan(t) else "the temperature is infinite"
        elif t <= 0:
            reason = f"the temperature, {t:g} K, is not above 0 K"
        elif not math.isfinite(c):
            reason = "no heat capacity" if math.isnan(c) else "the heat capacity is infinite"
        elif c <= 0:
            reason = f"the heat capacity, {written[i]:g} {unit}, is not above 0"
        elif sigma is not None and not math.isfinite(sigma[i]):
            reason = "no sigma" if math.isnan(sigma[i]) else "sigma is infinite"
        reasons.append(reason)
    return reasons


def refuse_too_few(
    reasons: Sequence[str | None], table: Table, shown: str, aside: Sequence[str | None] | None = None
) -> None:
    """Raise InputError if fewer than half of the rows can be used, those that are set aside not counted."""
    asked = [i for i, why in enumerate(aside or [None] * len(reasons)) if why is None]
    left_out = [i for i in asked if reasons[i] is not None]
    if 2 * len(left_out) > len(asked):
        used, first = len(asked) - len(left_out), left_out[0]
        raise InputError(
            f"{shown}: only {used} of {len(asked)} rows can be used; the first one left out is line "
            f"{table.rows[first].line} ({reasons[first]})"
        )


def refuse_bad_sigma(sigma: FloatArray, usable: NDArray[np.bool_], table: Table, column: Column, shown: str) -> None:
    """Raise InputError if a usable row states a sigma that is not above 0."""
    bad = np.flatnonzero(usable & (sigma <= 0))
    if bad.size:
        row = table.rows[int(bad[0])]
        cell = quoted(table.cell(row, column.index))
        raise InputError(f"{place(shown, row, column)}: sigma must be above 0, not {cell}; correct or empty the cell")

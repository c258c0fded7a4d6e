"""Rows that are set aside: lines that are masked, and conditions on a column that a row does not meet."""

from __future__ import annotations

import math
import operator
import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np

from ..errors import InputError
from ..records import FloatArray, RunSettings
from .columns import chosen_column, find_column
from .headers import Column
from .options import line_interval_text
from .rows import decimal_of
from .table import Table
from .values import Decimal, parse_number
from .wording import bare, counted, listed, quoted

__all__ = ["check_condition", "condition_column", "reasons_to_leave_out", "set_aside"]

_COMPARISONS: Final[dict[str, Callable[[float, float], bool]]] = {
    "<": operator.lt,
    "<=": operator.le,
    ">": operator.gt,
    ">=": operator.ge,
    "=": operator.eq,
    "!=": operator.ne,
}
_SPELLINGS: Final = {"==": "=", "\u2264": "<=", "\u2265": ">=", "\u2260": "!="}
_SIGN: Final = re.compile(r"<=|>=|!=|==|[<>=\u2264\u2265\u2260]")


@dataclass(frozen=True)
class _Condition:
    """``COLUMN SIGN LIMIT`` with its column; `number` is None where the limit is a text."""

    text: str
    column: Column
    sign: str
    limit: str
    number: float | None


def check_condition(text: str) -> str:
    """Return a condition as it is written.

    Raises
    ------
    InputError
        If it is not ``COLUMN SIGN LIMIT``, in whatever column.
    """
    if not _ways(text):
        raise InputError(
            f"condition {quoted(text)} must be a column, one of <, <=, >, >=, =, != and a limit, as in "
            "'quality >= 0.9' or 'status = ok'"
        )
    return text


def _ways(text: str) -> list[tuple[str, str, str]]:
    """Return every way to take a text apart, since a header may hold a sign itself, as in ``U (k=2) < 0.5``."""
    ways = []
    for found in _SIGN.finditer(text):
        name, limit = text[: found.start()].strip(), text[found.end() :].strip()
        if name and limit and _SIGN.match(limit) is None:
            ways.append((name, _SPELLINGS.get(found[0], found[0]), limit))
    return ways


def set_aside(
    table: Table, columns: tuple[Column, ...], data: Sequence[Column], run: RunSettings, last_line: int, shown: str
) -> tuple[list[str | None], tuple[str, ...]]:
    """Say for each row why it is not to be fitted although it may be readable, and sum that up.

    Parameters
    ----------
    table : Table
        The rows.
    columns, data : sequence of Column
        All columns, and those of the data, whose decimal sign the others share.
    run : RunSettings
        `mask_lines` and `require`; of several conditions all must be met.
    last_line : int
        Number of lines of the file.
    shown : str
        The file as messages name it.

    Returns
    -------
    reasons : list of (str or None), one for each row
    notes : tuple of str

    Raises
    ------
    InputError
        If a line is beyond the file, a condition cannot be read, a column is not there, or no row is left.
    """
    reasons, notes = _masked(table, run.mask_lines, last_line, shown)
    unmasked = table.where(reason is None for reason in reasons)
    for text in run.require:
        condition = _condition(text, columns, shown)
        shared = (*data, condition.column)
        decimal = "point" if condition.number is None else decimal_of(unmasked, shared, shown)
        unmet = _unmet(table, condition, decimal)
        if None not in unmet:
            held = _held(table, condition, decimal)
            raise InputError(f"{shown}: no row meets the condition {quoted(text)}; the column holds {held}")
        count = sum(reason is not None for reason in unmet)
        notes += [f"{counted(count, 'row')} of {len(unmet)} not fitted: {quoted(text)} is not met"] if count else []
        reasons = [before or reason for before, reason in zip(reasons, unmet, strict=True)]
    if None not in reasons:
        raise InputError(f"{shown}: masked lines and conditions together leave no row to fit; loosen one of them")
    return reasons, tuple(notes)


def _masked(
    table: Table, lines: tuple[tuple[int, int], ...], last_line: int, shown: str
) -> tuple[list[str | None], list[str]]:
    notes = []
    row_lines = np.array([row.line for row in table.rows], dtype=np.intp)  # they rise, so each interval is a slice
    masked = np.zeros(row_lines.size, dtype=np.bool_)
    for first, last in lines:
        if last > last_line:
            raise InputError(f"{shown}: there is no line {last} to mask; the last one is {last_line}")
        start, stop = np.searchsorted(row_lines, [first, last + 1])
        masked[start:stop] = True
        count = int(stop - start)
        where = line_interval_text((first, last))
        notes.append(f"{counted(count, 'row') if count else 'no row'} masked by lines {where}")
    return [f"line {row.line} masked" if out else None for row, out in zip(table.rows, masked, strict=True)], notes


# ------------------------------------------------------------------------------------------------------- conditions


def _condition(text: str, columns: tuple[Column, ...], shown: str) -> _Condition:
    ways = _ways(check_condition(text))
    known = next((way for way in ways if find_column(columns, way[0], shown) is not None), ways[0])
    name, sign, limit = known
    column = chosen_column(columns, name, f"the condition {quoted(text)}", shown)
    plain = re.fullmatch(r"(['\"])(.*)\1", limit)
    if plain is not None:
        limit, number = plain[2].strip(), None
    else:
        found = parse_number(limit, "point")
        number = found.value if found is not None and math.isfinite(found.value) else None
        if number is None and parse_number(limit, "comma") not in (None, found):
            raise InputError(f"{shown}: condition {quoted(text)}: write the limit with a decimal point")
    if number is None and sign not in ("=", "!="):
        raise InputError(
            f"{shown}: condition {quoted(text)}: {quoted(limit)} is no number, and a text can only be compared by = "
            "or !="
        )
    return _Condition(text, column, sign, limit, number)


def condition_column(text: str, columns: tuple[Column, ...], shown: str) -> Column:
    """Return the column that a condition is about.

    Raises
    ------
    InputError
        If it cannot be read or the column is not there.
    """
    return _condition(text, columns, shown).column


def _unmet(table: Table, condition: _Condition, decimal: Decimal) -> list[str | None]:
    """Say for each row in which way it does not meet the condition, None where it does."""
    wanted = f"not {condition.sign} {bare(condition.limit)}".replace("not = ", "not ")
    if condition.sign == "!=":
        wanted = f"which the condition {quoted(condition.text)} leaves out"
    name = bare(condition.column.label)
    reasons: list[str | None] = []
    for row in table.rows:
        cell = table.cell(row, condition.column.index)
        reason = _against(cell, condition, decimal)
        reasons.append(None if reason is None else f"{name} is {reason}, {wanted}")
    return reasons


def _held(table: Table, condition: _Condition, decimal: Decimal) -> str:
    """Say what stands in the column: the range of its numbers, or its texts."""
    cells = dict.fromkeys(table.cell(row, condition.column.index) for row in table.rows)
    numbers = [number.value for cell in cells if (number := parse_number(cell, decimal)) is not None]
    finite = [number for number in numbers if math.isfinite(number)]
    if condition.number is None or not finite:
        return listed(cells)
    return f"numbers from {min(finite):g} to {max(finite):g}"


def _against(cell: str, condition: _Condition, decimal: Decimal) -> str | None:
    """Return what a cell is where it does not meet the condition, None where it does."""
    if condition.number is None:
        met = (cell == condition.limit) == (condition.sign == "=")
        return None if met else quoted(cell) if cell else "empty"
    number = parse_number(cell, decimal)
    if number is None or math.isnan(number.value):
        return f"{quoted(cell)}, no number" if cell else "empty"
    return None if _COMPARISONS[condition.sign](number.value, condition.number) else bare(cell)


def reasons_to_leave_out(
    reasons: Sequence[str | None], aside: Sequence[str | None], sigma: FloatArray | None
) -> list[str | None]:
    """Return why rows cannot be kept in the arrays, where one that is set aside need not be readable.

    Parameters
    ----------
    reasons : sequence of (str or None)
        Why a row cannot be used.
    aside : sequence of (str or None)
        Why it is not to be fitted; such a row is left out with that reason before the other.
    sigma : ndarray, shape (m,), or None
        One that is not above 0 is refused in a row that is fitted, and leaves out one that is set aside.
    """
    joined: list[str | None] = []
    for i, (reason, why) in enumerate(zip(reasons, aside, strict=True)):
        if why is not None and reason is None and sigma is not None and sigma[i] <= 0:
            reason = "sigma is not above 0"
        joined.append(reason if why is None or reason is None else f"{why}; {reason}")
    return joined

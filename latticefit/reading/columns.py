"""Which column is which: the choice by name, by number or by recognition."""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass
from typing import Final

from ..errors import InputError
from ..units import HeatCapacityUnit, TemperatureUnit
from .headers import (
    Column,
    is_uncertainty_of_anything,
    names_heat_capacity,
    names_temperature,
    normal_name,
    unit_unread,
)
from .wording import listed, offered, quoted

__all__ = ["choose_columns", "chosen_column", "find_column"]


def choose_columns(
    columns: tuple[Column, ...], temperature: str | int | None, heat_capacity: str | int | None, shown: str
) -> tuple[Column, Column]:
    """Choose the columns of temperature and heat capacity.

    Parameters
    ----------
    columns : tuple of Column
        All columns of the file.
    temperature, heat_capacity : str, int or None
        Header, header without unit, 1-based number, or None to recognise the column.
    shown : str
        The file as messages name it.

    Raises
    ------
    InputError
        If a column is not there, cannot be recognised, or two have an equal claim.
    """
    t_chosen = None if temperature is None else chosen_column(columns, temperature, "--temperature", shown)
    c_chosen = None if heat_capacity is None else chosen_column(columns, heat_capacity, "--heat-capacity", shown)
    if all(column.header is None for column in columns):
        t_chosen, c_chosen = _without_headers(columns, t_chosen, c_chosen, shown)
    t_column = t_chosen or _recognise(columns, c_chosen, _TEMPERATURE, shown)
    c_column = c_chosen or _recognise(columns, t_column, _HEAT_CAPACITY, shown)
    if t_column == c_column:
        raise InputError(f"{shown}: {quoted(t_column.label)} cannot be both temperature and heat capacity")
    return t_column, c_column


def _without_headers(
    columns: tuple[Column, ...], temperature: Column | None, heat_capacity: Column | None, shown: str
) -> tuple[Column | None, Column | None]:
    if len(columns) > 2 and (temperature is None or heat_capacity is None):
        raise InputError(
            f"{shown}: no line names its {len(columns)} columns; say which is which by number, as in "
            "--temperature 1 --heat-capacity 2"
        )
    first = temperature or next(column for column in columns if column != heat_capacity)
    return first, heat_capacity or next(column for column in columns if column != first)


def find_column(columns: tuple[Column, ...], wanted: str | int, shown: str) -> Column | None:
    """Return the column of this header, header without unit, or 1-based number; None if there is none.

    Raises
    ------
    InputError
        If several columns bear that name, or the number is beyond the last column.
    """
    if isinstance(wanted, str):
        exact = [column for column in columns if column.header == wanted.strip()]
        if len(exact) > 1:
            numbers = " and ".join(str(column.index + 1) for column in exact)
            raise InputError(f"{shown}: columns {numbers} are both headed {quoted(wanted)}; choose by number")
        if exact:
            return exact[0]
        if re.fullmatch(r"\s*\d{1,9}\s*", wanted, re.ASCII) is None:
            named = [column for column in columns if column.header and column.name == wanted.strip()]
            if len(named) > 1:
                headers = listed(column.label for column in named)
                raise InputError(f"{shown}: {quoted(wanted)} may be {headers}; write the whole header")
            return named[0] if named else None
    number = int(wanted)
    if not 1 <= number <= len(columns):
        raise InputError(f"{shown}: there is no column {number}; the file has {len(columns)}")
    return columns[number - 1]


def chosen_column(columns: tuple[Column, ...], wanted: str | int, option: str, shown: str) -> Column:
    """Return the column that `option` asks for, as `find_column` finds it.

    Raises
    ------
    InputError
        If there is none; the nearest header is offered.
    """
    column = find_column(columns, wanted, shown)
    if column is None:
        headers = [found.header for found in columns if found.header]
        hint = offered(str(wanted), headers) if headers else f"choose by number, 1 to {len(columns)}"
        raise InputError(f"{shown}: there is no column {quoted(str(wanted))} for {option}; {hint}")
    return column


@dataclass(frozen=True)
class _Role:
    what: str
    option: str
    named: Callable[[str], bool]
    unit: type
    other_name: re.Pattern[str]


_TEMPERATURE: Final = _Role(
    "temperature",
    "--temperature",
    names_temperature,
    TemperatureUnit,
    re.compile(r"\b(?:rise|delta|d ?t|step|ln|log)\b|\^|1 ?/ ?t|δ"),
)
_HEAT_CAPACITY: Final = _Role(
    "heat capacity",
    "--heat-capacity",
    names_heat_capacity,
    HeatCapacityUnit,
    re.compile(r"^s\b|entropy|addenda|/ ?t\b|\b(?:ln|log)\b|\^|δ"),
)


def _recognise(columns: tuple[Column, ...], taken: Column | None, role: _Role, shown: str) -> Column:
    """Take the one column named like the quantity, in its unit or in none; else the one column in its unit."""
    free = [column for column in columns if column != taken and not is_uncertainty_of_anything(column)]
    named = [column for column in free if role.named(column.name) and isinstance(column.unit, role.unit | None)]
    in_unit = [column for column in free if isinstance(column.unit, role.unit)]
    rest = [column for column in in_unit if not role.other_name.search(normal_name(column.name))]
    candidates = named or rest
    if len(candidates) == 1:
        return candidates[0]
    if not candidates and taken is not None and role.named(taken.name):
        raise InputError(f"{shown}: {quoted(taken.label)} looks like the {role.what}, but is chosen as something else")
    unread = next((column for column in free if unit_unread(column, role.named)), None)
    if not candidates and unread is not None:
        raise InputError(
            f"{shown}: the unit in {quoted(unread.label)} cannot be read; choose the column by {role.option} and give "
            f"its unit by {role.option}-unit"
        )
    if not candidates:
        headers = listed(column.label for column in columns)
        raise InputError(f"{shown}: no column is named like a {role.what}; choose one of {headers} by {role.option}")
    labels = [column.label for column in candidates]
    claims = listed(labels)
    if len(set(labels)) < len(labels):
        claims = " and ".join(f"{column.index + 1} ({quoted(column.label)})" for column in candidates[:9])
    raise InputError(f"{shown}: columns {claims} may each be the {role.what}; choose one by {role.option}")

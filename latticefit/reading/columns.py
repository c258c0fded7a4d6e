"""Which column is which: names and units in headers, and the choice by name, number or recognition."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from typing import Final, Literal

from ..errors import InputError
from ..records import Quantity
from ..units import HeatCapacityUnit, TemperatureUnit, find_heat_capacity_unit, find_temperature_unit
from .table import Table
from .wording import listed, offered, quoted

__all__ = [
    "Column",
    "choose_columns",
    "describe_columns",
    "find_column",
    "names_uncertainty",
    "quantity_of",
    "uncertainty_columns",
]

ColumnUnit = HeatCapacityUnit | TemperatureUnit | Literal["percent"]

_PERCENT: Final = frozenset({"%", "percent", "per cent", "pct"})
_TEMPERATURE_NAME: Final = re.compile(r"(?:sample )?(?:t|temp|temperature)(?: ?(?:sample|90|68))?")
_HEAT_CAPACITY_NAME: Final = re.compile(r"(?:sample )?(?:c(?:[ ,]?[pv])?(?:[ ,]?m)?|hc)(?: (?:sample|total))?")
_UNCERTAINTY_NAME: Final = re.compile(
    r"^[uU](?:\s*\(|_|\s|$)|^[uU]_?[cC][pPvV]?$|σ|(?i:(?<![a-z])(?:sigma|error|err|std|stdev|unc|uncertainty)(?![a-z]))"
)
_OF_TEMPERATURE: Final = re.compile(r"(?<![A-Za-z])T(?![A-Za-z])|(?i:temp)")
_COVERAGE: Final = (
    re.compile(r"\(\s*k\s*=\s*(\d+(?:\.\d+)?)\s*\)|[,;]?\s*(?<![A-Za-z])k\s*=\s*(\d+(?:\.\d+)?)"),
    re.compile(r"(?<![\w.])(\d)\s*[-_ ]?(?=sigma|σ)()"),
)


@dataclass(frozen=True)
class Column:
    """A column: 0-based index, header as written (None without), its name without unit, unit, coverage factor."""

    index: int
    header: str | None
    name: str
    unit: ColumnUnit | None
    coverage_factor: float | None

    @property
    def label(self) -> str:
        """What messages and reports call it."""
        return self.header if self.header else f"column {self.index + 1}"


def describe_columns(table: Table) -> tuple[Column, ...]:
    """Return every column of a table with the name, unit and coverage factor that its header states."""
    headers: Iterable[str | None] = [None] * table.width if table.headers is None else table.headers
    return tuple(_describe(index, header or None) for index, header in enumerate(headers))


def _describe(index: int, header: str | None) -> Column:
    if header is None:
        return Column(index, None, "", None, None)
    rest, coverage = header, None
    for pattern in _COVERAGE:
        match = pattern.search(rest)
        if match is not None and coverage is None:
            coverage = float(match[1] or match[2]) or None
            rest = rest[: match.start()] + rest[match.end() :]
    name, unit = _split_header(rest.strip())
    return Column(index, header, name, unit, coverage)


def _split_header(header: str) -> tuple[str, ColumnUnit | None]:
    """Split ``Cp [mJ/mol-K]``, ``T/K``, ``Cp / J mol-1 K-1``, ``Cv_cal_molK`` into name and unit.

    The first place from the left after which a whole unit stands is taken, so that the unit is as long as can be.
    """
    for place, sign in enumerate(header[:200]):
        if sign not in "([/_, " or place == 0:
            continue
        name = header[:place].strip(" _/,")
        unit = _unit_of(_unbracketed(header[place:].lstrip("/_, ")), name)
        if unit is not None:
            return name, unit
    return header, None


def _unbracketed(text: str) -> str:
    text = text.strip()
    pairs = {"(": ")", "[": "]"}
    while len(text) > 1 and text[-1] == pairs.get(text[0]):
        depth, inner = 0, text[1:-1]
        for sign in inner:  # "(mol K)/(g K)" is not one pair of brackets
            depth += (sign in "([") - (sign in ")]")
            if depth < 0:
                return text
        text = inner.strip()
    return text


def _unit_of(text: str, name: str) -> ColumnUnit | None:
    if text.casefold() in _PERCENT:
        return "percent"
    temperature = find_temperature_unit(text)
    if temperature is not None:
        bare_c = text.casefold() == "c"  # "T_C" is in degC, "sample_C" is a heat capacity
        return None if bare_c and not _names_temperature(name) else temperature
    return find_heat_capacity_unit(text)


def _normal(name: str) -> str:
    return re.sub(r"[\s_.°]+", " ", name.casefold()).strip()


def _names_temperature(name: str) -> bool:
    return _TEMPERATURE_NAME.fullmatch(_normal(name)) is not None


def _names_heat_capacity(name: str) -> bool:
    normal = _normal(name)
    return _HEAT_CAPACITY_NAME.fullmatch(normal) is not None or "heat capacity" in normal or "specific heat" in normal


def names_uncertainty(column: Column) -> bool:
    """Say whether a header names an uncertainty of something other than the temperature."""
    stated = column.coverage_factor is not None or _UNCERTAINTY_NAME.search(column.name) is not None
    return stated and _OF_TEMPERATURE.search(column.name) is None


def uncertainty_columns(columns: Sequence[Column], taken: Sequence[Column]) -> list[Column]:
    """Return the columns whose header names an uncertainty and does not give it a unit of something else."""
    usable = [column for column in columns if column not in taken and not isinstance(column.unit, TemperatureUnit)]
    return [column for column in usable if names_uncertainty(column)]


def quantity_of(column: Column) -> Quantity:
    """Return "Cv" for a header that says so, else "Cp"."""
    normal = _normal(column.name)
    says_cv = re.search(r"(?<![a-z])c[ ,]?v(?![a-z])|constant volume|isochoric", normal)
    return "Cv" if says_cv else "Cp"


# ------------------------------------------------------------------------------------------------------- the choice


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
    t_chosen = None if temperature is None else _chosen(columns, temperature, "--temperature", shown)
    c_chosen = None if heat_capacity is None else _chosen(columns, heat_capacity, "--heat-capacity", shown)
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


def _chosen(columns: tuple[Column, ...], wanted: str | int, option: str, shown: str) -> Column:
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
    "temperature", "--temperature", _names_temperature, TemperatureUnit, re.compile(r"\b(?:rise|delta|d ?t|step)\b")
)
_HEAT_CAPACITY: Final = _Role(
    "heat capacity", "--heat-capacity", _names_heat_capacity, HeatCapacityUnit, re.compile(r"^s\b|entropy|addenda")
)


def _recognise(columns: tuple[Column, ...], taken: Column | None, role: _Role, shown: str) -> Column:
    """Take the one column named like the quantity, in its unit or in none; else the one column in its unit."""
    free = [column for column in columns if column != taken and not _is_uncertainty_of_anything(column)]
    named = [column for column in free if role.named(column.name) and isinstance(column.unit, role.unit | None)]
    in_unit = [column for column in free if isinstance(column.unit, role.unit)]
    rest = [column for column in in_unit if not role.other_name.search(_normal(column.name))]
    candidates = named or rest
    if len(candidates) == 1:
        return candidates[0]
    if not candidates and taken is not None and role.named(taken.name):
        raise InputError(f"{shown}: {quoted(taken.label)} looks like the {role.what}, but is chosen as something else")
    if not candidates:
        headers = listed(column.label for column in columns)
        raise InputError(f"{shown}: no column is named like a {role.what}; choose one of {headers} by {role.option}")
    claims = listed(column.label for column in candidates)
    raise InputError(f"{shown}: columns {claims} may each be the {role.what}; choose one by {role.option}")


def _is_uncertainty_of_anything(column: Column) -> bool:
    return column.coverage_factor is not None or _UNCERTAINTY_NAME.search(column.name) is not None

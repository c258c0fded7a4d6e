"""What a setting may be: one check for run sheets, the command line and Python.

A converter takes a value and what to call it in a message, and returns the value that the settings records hold. Lists
are what a sheet has; tuples come from Python only, where (low, high) stands for an interval.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Mapping
from itertools import islice
from numbers import Integral, Real
from types import MappingProxyType
from typing import Any, Final

from ..errors import InputError, nearest
from .conditions import check_condition
from .options import (
    HIGHEST_TEMPERATURE,
    MAX_GRID_POINTS,
    ordered_interval,
    parse_bounds,
    parse_grid,
    parse_interval,
    parse_line_interval,
)
from .wording import quoted, shown_name

__all__ = ["ADDENDA", "MODEL", "REPORT", "RUN", "SAMPLE", "Converter", "checked", "temperatures", "wrong"]

Converter = Callable[[Any, str], Any]


def wrong(where: str, wanted: str, value: Any) -> InputError:
    """Return the refusal of a value: what it is called, what is wanted, and what came instead."""
    return InputError(f"{where} must be {wanted}, not {_kind(value)}")


def _kind(value: Any) -> str:
    if isinstance(value, str):
        return quoted(value)
    names = {bool: "true or false", dict: "a table", list: "a list", tuple: "a tuple", type(None): "None"}
    if type(value) in names:
        return names[type(value)]
    number = _real(value)
    if number is not None:
        return "a huge number" if abs(number) > 1e300 and isinstance(value, Integral) else str(value)
    return f"a value of type {type(value).__name__}"


def checked(
    given: Mapping[str, Any], converters: Mapping[str, Converter], named: Callable[[str], str] = str
) -> dict[str, Any]:
    """Convert the settings that are given; None is left out.

    Parameters
    ----------
    given : mapping
        Values by key.
    converters : mapping
        `SAMPLE`, `RUN`, `MODEL` or `REPORT`.
    named : callable
        What a key is called in a message.

    Raises
    ------
    InputError
        For the first wrong value, with its name.
    """
    return {key: converters[key](value, named(key)) for key, value in given.items() if value is not None}


# ----------------------------------------------------------------------------------------------------- one value each


def _text(value: Any, where: str) -> str:
    if not isinstance(value, str):
        raise wrong(where, "a text in quotes", value)
    if not value.strip():
        raise InputError(f"{where} is empty; leave it out or fill it in")
    return str(value)


def _quantity_like(example: str) -> Converter:
    def convert(value: Any, where: str) -> str:
        if not isinstance(value, str):
            raise wrong(where, f'a text with its unit, such as "{example}"', value)
        return _text(value, where)

    return convert


def _number(value: Any, where: str) -> float:
    number = _real(value)
    if number is None or not math.isfinite(number):
        raise wrong(where, "a number" + (" without quotes" if isinstance(value, str) else ""), value)
    return number


def _real(value: Any) -> float | None:
    """The value as a float, infinite where it is too large for one; None where it is no number."""
    if isinstance(value, bool) or not isinstance(value, Real):
        return None
    try:
        return float(value)
    except OverflowError:
        return math.inf


def _flag(value: Any, where: str) -> bool:
    if not isinstance(value, bool):
        raise wrong(where, "true or false without quotes", value)
    return value


def _positive(value: Any, where: str) -> float:
    number = _number(value, where)
    if number <= 0:
        raise wrong(where, "above 0", value)
    return number


def _whole(value: Any) -> int | None:
    return None if isinstance(value, bool) or not isinstance(value, Integral) else int(value)


def _column(value: Any, where: str) -> str | int:
    number = _whole(value)
    if number is not None and number >= 1:
        return number
    if isinstance(value, str) and value.strip():
        return str(value)
    raise wrong(where, "a header in quotes or a column number from 1 on", value)


def _sigma(value: Any, where: str) -> str | int:
    if not isinstance(value, (str, Integral)):
        raise wrong(where, 'a column or a text such as "0.5%"', value)
    return _column(value, where)


def _seed(value: Any, where: str) -> int:
    number = _whole(value)
    if number is None or number < 0:
        raise wrong(where, "a whole number from 0 on", value)
    return number


def _one_of(*choices: str) -> Converter:
    def convert(value: Any, where: str) -> str:
        if not isinstance(value, str) or value not in choices:
            hint = nearest(value if isinstance(value, str) else "", choices)
            raise InputError(f"{where} cannot be {_kind(value)}: {hint}")
        return str(value)

    return convert


def _scale(value: Any, where: str) -> str:
    if not isinstance(value, str) or value not in ("ITS-90", "IPTS-68"):
        raise InputError(
            f"{where} cannot be {_kind(value)}: only ITS-90 and IPTS-68 are known; convert data on another scale first"
        )
    return str(value)


# --------------------------------------------------------------------------------------- intervals, grids and bounds


def _intervals(value: Any, where: str) -> tuple[tuple[float, float], ...]:
    alone = isinstance(value, str) or (isinstance(value, tuple) and any(_real(side) is not None for side in value))
    several = [value] if alone else value
    if not isinstance(several, (list, tuple)) or not several:
        raise wrong(where, 'a text such as "2:300" or a list of them', value)
    return tuple(_interval(each, where, value) for each in several)


def _lines(value: Any, where: str) -> tuple[tuple[int, int], ...]:
    # (40, 45) is an interval, as (2, 300) is one of temperatures; [40, 45] is two lines
    alone = isinstance(value, tuple) and any(_whole(side) is not None for side in value)
    several = [value] if alone or isinstance(value, str) or _whole(value) is not None else value
    if not isinstance(several, (list, tuple)) or not several:
        raise wrong(where, 'a text such as "40:45" or a list of them', value)
    found = []
    for each in several:
        text = str(each) if _whole(each) is not None else each
        if isinstance(each, tuple) and len(each) == 2 and None not in (_whole(each[0]), _whole(each[1])):
            text = f"{each[0]}:{each[1]}"
        if not isinstance(text, str):
            raise wrong(where, 'a text such as "40:45" or a list of them', value)
        try:
            found.append(parse_line_interval(text))
        except InputError as error:
            raise InputError(f"{where}: {error}") from None
    return tuple(found)


def _texts(example: str) -> Converter:
    def convert(value: Any, where: str) -> tuple[str, ...]:
        several = [value] if isinstance(value, str) else value
        if not isinstance(several, (list, tuple)) or not several:
            raise wrong(where, f'a text such as "{example}" or a list of them', value)
        return tuple(_text(each, where) for each in several)

    return convert


def _conditions(value: Any, where: str) -> tuple[str, ...]:
    try:
        return tuple(check_condition(text) for text in _texts("quality >= 0.9")(value, where))
    except InputError as error:
        raise InputError(str(error) if str(error).startswith(where) else f"{where}: {error}") from None


def _interval(each: Any, where: str, value: Any) -> tuple[float, float]:
    try:
        if isinstance(each, str):
            return parse_interval(each)
        sides = [_real(side) for side in each] if isinstance(each, tuple) else []
        if len(sides) == 2 and sides[0] is not None and sides[1] is not None:
            return ordered_interval(sides[0], sides[1], f"{sides[0]:g}:{sides[1]:g}")
    except InputError as error:
        raise InputError(f"{where}: {error}") from None
    raise wrong(where, 'a text such as "2:300" or a list of them', value)


def temperatures(value: Any, where: str) -> tuple[float, ...]:
    """Return temperatures in K from a grid text, one number, or several numbers in their order.

    Raises
    ------
    InputError
        If there is none or too many, or one is no number, not above 0 K or not finite.
    """
    if isinstance(value, str):
        return parse_grid(_grid(value, where))
    if isinstance(value, Mapping) or not (_real(value) is not None or isinstance(value, Iterable)):
        raise wrong(where, 'numbers in K or a text such as "10:300:10"', value)
    try:
        given = [value] if _real(value) is not None else list(islice(value, MAX_GRID_POINTS + 1))
    except TypeError:  # an array without a dimension calls itself iterable
        raise wrong(where, 'numbers in K or a text such as "10:300:10"', value) from None
    if not 0 < len(given) <= MAX_GRID_POINTS:
        raise InputError(f"{where} must hold 1 to {MAX_GRID_POINTS} temperatures, not {len(given) or 'none'}")
    found = []
    for each in given:
        number = _real(each)
        if number is None or not 0 < number <= HIGHEST_TEMPERATURE:
            raise wrong(where, "above 0 K and finite", each)
        found.append(number)
    return tuple(found)


def _grid(value: Any, where: str) -> str:
    if isinstance(value, tuple):
        return ", ".join(repr(each) for each in temperatures(value, where))
    text = _text(value, where)
    try:
        parse_grid(text)
    except InputError as error:
        raise InputError(f"{where}: {error}") from None
    return text


def _bounds(value: Any, where: str) -> tuple[float, float]:
    if isinstance(value, str):
        try:
            return parse_bounds(f"parameter={value}")[1]
        except InputError:
            raise wrong(where, "[low, high]", value) from None
    sides = [_real(side) for side in value] if isinstance(value, (list, tuple)) else []
    numbers = [side for side in sides if side is not None and not math.isnan(side)]
    if len(sides) != 2 or len(numbers) != 2:
        raise wrong(where, "[low, high], where a side may be -inf or inf", value)
    low, high = numbers
    if low >= high:
        raise InputError(f"{where}: the lower bound must be below the upper one, not [{low:g}, {high:g}]")
    return low, high


def _by_name(convert: Converter) -> Converter:
    def table(value: Any, where: str) -> dict[str, Any]:
        if not isinstance(value, Mapping):
            raise wrong(where, "a table of parameter names", value)
        stray = next((name for name in value if not isinstance(name, str)), None)
        if stray is not None:
            raise wrong(f"a parameter name in {where}", "a text in quotes", stray)
        return {str(name): convert(entry, f"{where} {shown_name(name)}") for name, entry in value.items()}

    return table


# -------------------------------------------------------------------------------------------------- the tables

SAMPLE: Final[Mapping[str, Converter]] = MappingProxyType(
    {
        "name": _text,
        "formula": _text,
        "atoms": _positive,
        "molar_mass": _quantity_like("101.96 g/mol"),
        "mass": _quantity_like("12.3 mg"),
        "melting_point": _quantity_like("1358 K"),
        "insulator": _flag,
        "accept_level": _flag,
    }
)
RUN: Final[Mapping[str, Converter]] = MappingProxyType(
    {
        "file": _text,
        "label": _text,
        "quantity": _one_of("Cp", "Cv"),
        "temperature": _column,
        "heat_capacity": _column,
        "sigma": _sigma,
        "coverage_factor": _positive,
        "temperature_unit": _text,
        "heat_capacity_unit": _text,
        "window": _intervals,
        "mask": _intervals,
        "worksheet": _text,
        "temperature_scale": _scale,
        "require": _conditions,
        "mask_lines": _lines,
        "replicates": _one_of("keep", "average", "drop-first"),
        "split_by": _column,
    }
)
ADDENDA: Final[Mapping[str, Converter]] = MappingProxyType(
    {
        **{key: RUN[key] for key in ("file", "temperature", "heat_capacity", "sigma", "coverage_factor")},
        **{key: RUN[key] for key in ("temperature_unit", "heat_capacity_unit", "worksheet", "temperature_scale")},
        "mass": _quantity_like("0.35 mg"),
        "fraction": _quantity_like("1.2(1)%"),
        "runs": _texts("run1"),
    }
)
MODEL: Final[Mapping[str, Converter]] = MappingProxyType(
    {
        "terms": _text,
        "mode_sum": _one_of("fixed", "free"),
        "cp_cv": _text,
        "start": _by_name(_number),
        "fix": _by_name(_number),
        "fix_u": _by_name(_positive),
        "fix_from": _text,
        "bounds": _by_name(_bounds),
    }
)
REPORT: Final[Mapping[str, Converter]] = MappingProxyType(
    {
        "grid": _grid,
        "figures": _one_of("none", "svg", "png", "all"),
        "out": _text,
        "random_seed": _seed,
    }
)

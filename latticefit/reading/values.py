"""Numbers as people write them: decimal point or comma, ``12.34(5)``, ``12.34 ± 0.05``, and words for nothing."""

from __future__ import annotations

import math
import re
from collections.abc import Iterable
from typing import Final, Literal, NamedTuple

__all__ = ["Decimal", "Number", "is_number", "mixed_decimals", "parse_number"]

Decimal = Literal["point", "comma"]

_MISSING: Final = frozenset({"", "nan", "na", "n/a", "-", "--", "none", "null"})
_INFINITE: Final = frozenset({"inf", "+inf", "-inf", "infinity", "+infinity", "-infinity"})
_DIGITS = r"(?:\d+(?:[.,]\d*)?|[.,]\d+)"
_PATTERN: Final = re.compile(
    rf"([+-]?{_DIGITS})(?:\(({_DIGITS})\))?(?:[eE]([+-]?\d{{1,5}}))?(?:±({_DIGITS}(?:[eE][+-]?\d{{1,5}})?))?", re.ASCII
)


class Number(NamedTuple):
    """A number and the uncertainty written with it; NaN where the cell says that there is none."""

    value: float
    uncertainty: float | None


def _plain(cell: str) -> str:
    return cell.replace("\u2212", "-").strip()


def is_number(cell: str) -> bool:
    """Say whether a cell holds a number, with decimal point or comma, or NaN or infinity (an empty one does not)."""
    plain = _plain(cell)
    return _PATTERN.fullmatch(plain) is not None or plain.casefold() in _INFINITE | {"nan"}


def parse_number(cell: str, decimal: Decimal) -> Number | None:
    """Read one cell.

    Parameters
    ----------
    cell : str
        The cell; ``12.34(5)`` means an uncertainty of 0.05 and ``12.34 ± 0.05`` the same.
    decimal : {"point", "comma"}
        The decimal sign of the file.

    Returns
    -------
    Number or None
        NaN for an empty cell or a word for a missing value; None where the cell cannot be read.
    """
    plain = _plain(cell)
    match = _PATTERN.fullmatch(plain)
    if match is None:
        word = plain.casefold()
        if word in _MISSING:
            return Number(math.nan, None)
        return Number(float(word), None) if word in _INFINITE else None
    if ("," if decimal == "point" else ".") in plain:
        return None
    mantissa, bracket, exponent, after = (part and part.replace(",", ".") for part in match.groups())
    power = int(exponent or 0)
    value = float(f"{mantissa}e{power}")
    if after is not None:
        return Number(value, float(after)) if bracket is None else None
    if bracket is None:
        return Number(value, None)
    if "." not in bracket:  # digits in brackets count from the last decimal of the value
        power -= len(mantissa.partition(".")[2])
    return Number(value, float(f"{bracket}e{power}"))


def mixed_decimals(cells: Iterable[str]) -> tuple[Decimal, str | None, str | None]:
    """Find the decimal sign of some cells.

    Returns
    -------
    decimal : {"point", "comma"}
        "point" where no cell has a decimal sign.
    with_point, with_comma : str or None
        The first number written with each; both are given where the two are mixed.
    """
    with_point = with_comma = None
    for cell in cells:
        if with_comma is None and "," in cell and is_number(cell):
            with_comma = cell
        elif with_point is None and "." in cell and is_number(cell):
            with_point = cell
        if with_point is not None and with_comma is not None:
            break
    return ("comma" if with_comma is not None and with_point is None else "point"), with_point, with_comma

"""Numbers as people write them: decimal point or comma, ``12.34(5)``, ``12.34 ± 0.05``, ``1.2×10−3``, ``12.3†``."""

from __future__ import annotations

import math
import re
from collections.abc import Iterable
from typing import Final, Literal, NamedTuple

__all__ = ["Decimal", "Number", "Spelling", "is_number", "is_plain", "mixed_decimals", "parse_number", "spelling"]

Decimal = Literal["point", "comma"]

_MISSING: Final = frozenset(
    {"", "nan", "na", "n/a", "-", "--", "–", "—", "none", "null"}
    | {"---", "n.a.", ".", "*", "#n/a", "#div/0!", "#value!", "#num!"}
)
_INFINITE: Final = frozenset({"inf", "+inf", "-inf", "infinity", "+infinity", "-infinity"})
_DIGITS = r"(?:\d+(?:[.,]\d*)?|[.,]\d+)"
_PATTERN: Final = re.compile(
    rf"([+-]?{_DIGITS})(?:\(({_DIGITS})\))?(?:[eE]([+-]?\d{{1,5}}))?(?:±({_DIGITS}(?:[eE][+-]?\d{{1,5}})?))?", re.ASCII
)


class Number(NamedTuple):
    """A number and the uncertainty written with it; NaN where the cell says that there is none."""

    value: float
    uncertainty: float | None


def is_plain(cell: str) -> bool:
    """Say whether a cell holds a number in plain spelling, with nothing to mend."""
    return _PATTERN.fullmatch(cell) is not None


class Spelling(NamedTuple):
    """A cell in plain spelling, and what was taken out of it: a mark of a footnote, signs that group digits."""

    plain: str
    mark: str | None
    grouped: bool


_SUPERSCRIPTS: Final = str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹⁻⁺", "0123456789-+")
_POWER: Final = re.compile(r"(?<=[\d.,)])\s*[×·⋅*xX]\s*10\s*(?:\^|\*\*)?\s*\{?([+-]?\d{1,3})\}?(?!\d)")
_POWER_SUPERSCRIPT: Final = re.compile(r"10([⁻⁺]?[⁰¹²³⁴⁵⁶⁷⁸⁹]+)")
_COMMON_POWER: Final = re.compile(r"\(([^()±]+)±([^()±]+)\)e([+-]?\d{1,3})")
_FORTRAN: Final = re.compile(r"(?<=[\d.,])[dD](?=[+-]?\d)")
_MARK_BEFORE: Final = re.compile(r"([*†‡§¶]+)\s*(?=[-+\d.,])")
_MARK_AFTER: Final = re.compile(r"(?<=[\d.)])\s*([*†‡§¶#]+|[ᵃᵇᶜᵈᵉ]+|\(?[a-e]\)|\[[a-e]\])$")
_GROUPING: Final = " '’\u00a0\u2007\u2009\u202f"
_GROUPED: Final = re.compile(
    rf"[+-]?(?:\d{{1,3}}(?:[{_GROUPING}]\d{{3}})+(?:[.,](?:\d{{3}}[{_GROUPING}])*\d*)?"
    rf"|\d{{1,3}}[.,](?:\d{{3}}[{_GROUPING}])+\d{{1,3}})(?![\d{_GROUPING}])",
    re.ASCII,
)
_THOUSANDS: Final = (
    re.compile(r"[+-]?\d{1,3}(?:(?P<sign>,)\d{3})+(?=\.\d)", re.ASCII),
    re.compile(r"[+-]?\d{1,3}(?:(?P<sign>\.)\d{3})+(?=,\d)", re.ASCII),
)


def spelling(cell: str) -> Spelling:
    """Return a cell in plain spelling: ``3×10−2†`` as ``3e-2`` with the mark ``†``.

    Digits are grouped where that is beyond doubt: by blanks or apostrophes in threes, or by the sign that is not the
    decimal one, as in ``1,234.5``. A single sign before three digits, ``1,234``, is a decimal sign.
    """
    plain = cell.replace("\u2212", "-").strip()
    if _PATTERN.fullmatch(plain) is not None:
        return Spelling(plain, None, False)
    plain = re.sub(r"(?:^|(?<=[eE0]))[\u2012\u2013](?=[\d.,])", "-", plain)
    mark = _MARK_BEFORE.match(plain)
    if mark is not None:
        plain = plain[mark.end() :]
    after = _MARK_AFTER.search(plain)
    if after is not None:
        plain = plain[: after.start()]
    plain = _POWER_SUPERSCRIPT.sub(lambda power: "10" + power[1].translate(_SUPERSCRIPTS), plain)
    plain = _FORTRAN.sub("e", _POWER.sub(r"e\1", plain))
    plain = _COMMON_POWER.sub(r"\1e\3±\2e\3", re.sub(r"\s*(?:±|\+/-|\+-)\s*", "±", plain))
    grouped = _GROUPED.match(plain)
    if grouped is not None:
        plain = re.sub(f"[{_GROUPING}]", "", grouped[0]) + plain[grouped.end() :]
    for pattern in _THOUSANDS:
        thousands = pattern.match(plain)
        if thousands is not None:
            grouped = thousands
            plain = thousands[0].replace(thousands["sign"], "") + plain[thousands.end() :]
            break
    marks = [found[1] for found in (mark, after) if found is not None]
    return Spelling(plain, " and ".join(marks) or None, grouped is not None)


def is_number(cell: str) -> bool:
    """Say whether a cell holds a number, with decimal point or comma, or NaN or infinity (an empty one does not)."""
    if _PATTERN.fullmatch(cell) is not None:  # nearly every cell
        return True
    plain = spelling(cell).plain
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
    plain = cell
    match = _PATTERN.fullmatch(plain)
    if match is None:
        plain = spelling(cell).plain
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
        if with_comma is None and "," in cell and "," in spelling(cell).plain and is_number(cell):
            with_comma = cell
        elif with_point is None and "." in cell and "." in spelling(cell).plain and is_number(cell):
            with_point = cell
        if with_point is not None and with_comma is not None:
            break
    return ("comma" if with_comma is not None and with_point is None else "point"), with_point, with_comma

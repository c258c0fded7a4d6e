"""Numbers and units as a person reads them: rounded to the uncertainty."""

from __future__ import annotations

from math import isfinite

from ..rounding import format_value, round_to_uncertainty

__all__ = ["concise", "plain_number", "plus_minus", "shown_scale", "shown_unit", "significant"]

# Units that people read in another power of ten than the SI unit of the records.
_SHOWN = {"J/(mol K^2)": (1e3, "mJ/(mol K^2)"), "J/(mol K^4)": (1e3, "mJ/(mol K^4)")}
_SUPERSCRIPTS = {"^2": "²", "^3": "³", "^4": "⁴"}


def shown_scale(unit: str) -> float:
    """Return the factor from the unit of a record to the one that is shown: gamma is read in mJ/(mol K^2)."""
    return _SHOWN.get(unit, (1.0, unit))[0]


def shown_unit(unit: str) -> str:
    """Return the unit as it is shown, with superscripts; empty for a plain count."""
    text = _SHOWN.get(unit, (1.0, unit))[1]
    for plain, raised in _SUPERSCRIPTS.items():
        text = text.replace(plain, raised)
    return "" if text == "1" else text


def plain_number(value: float | None, digits: int = 4) -> str:
    """Return a number without uncertainty to `digits` significant digits; "-" where there is none."""
    if value is None or not isfinite(value):
        return "-"
    if value != 0 and abs(value) >= 10.0**digits:
        return f"{value:.0f}"
    return _tidy_exponent(f"{value:.{digits}g}")


def significant(value: float | None, digits: int) -> str:
    """Return a number with exactly `digits` significant digits, closing zeros kept; "-" where there is none."""
    if value is None or not isfinite(value):
        return "-"
    if abs(value) >= 10.0**digits:
        return f"{value:.0f}"
    mantissa, mark, power = f"{value:#.{digits}g}".partition("e")
    return _tidy_exponent(f"{mantissa.rstrip('.')}{mark}{power}")


def _tidy_exponent(text: str) -> str:
    mantissa, mark, power = text.partition("e")
    return f"{mantissa}e{int(power)}" if mark else mantissa


def _usable(u: float | None) -> bool:
    return u is not None and isfinite(u) and u > 0


def plus_minus(value: float | None, u: float | None, unit: str = "") -> str:
    """Return value ± u with its unit, u to two digits; where u is withheld the value alone, to four digits.

    Parameters
    ----------
    value, u : float or None
        In the unit of the record.
    unit : str
        Unit of the record; gamma is shown in mJ/(mol K^2).
    """
    scale, shown = shown_scale(unit), shown_unit(unit)
    if value is None or not isfinite(value):
        return "-"
    if u is None or not isfinite(u):
        return f"{significant(value * scale, 4)} {shown}".rstrip()
    return format_value(value * scale, u * scale, shown)


def concise(value: float | None, u: float | None) -> str:
    """Return a value with u in brackets, as ``24.443(52)``; with ``(?)`` where u is withheld.

    The bracket gives u in units of the last digits of the value; where u is 1 or more and has decimals it is written
    with its point, ``5003.2(9.1)``: two of the forms of JCGM 100:2008 (GUM), 7.2.2 (number of the clause from memory).
    """
    if value is None or not isfinite(value):
        return "-"
    if not _usable(u):
        return significant(value, 3) + ("" if u == 0 else "(?)")
    value_text, u_text = round_to_uncertainty(value, u)
    mantissa, mark, power = value_text.partition("e")
    u_mantissa = u_text.removesuffix(f"{mark}{power}")
    digits = u_mantissa.replace(".", "").lstrip("0") if u_mantissa.startswith("0.") else u_mantissa
    return _tidy_exponent(f"{mantissa}({digits}){mark}{power}")

"""Digits that a person reads: a value and its uncertainty, rounded by one published rule."""

from __future__ import annotations

import math
from decimal import ROUND_HALF_EVEN, Context, Decimal

__all__ = ["format_value", "percent_range", "percent_text", "round_to_uncertainty"]

_PLAIN_FIGURES = 6  # of a value without a usable uncertainty
_DOUBLE_FIGURES = 15  # decimal figures that a double holds
_CONTEXT = Context(prec=1000, Emin=-2000, Emax=2000)  # room for any two doubles side by side

_SMALLEST_PART = 1e-5  # 0.001 %: less is rounding


def percent_text(percent: float) -> str:
    """Return a percentage to two figures, never as a power of ten: ``"0.46 %"``, ``"more than 1000 %"``."""
    if abs(percent) > 1000 or math.isnan(percent):
        return "more than 1000 %"
    size = Decimal(repr(float(percent)))
    if size == 0:
        return "0 %"
    return f"{_to_place(size, _two_figure_place(abs(size))):f} %"


def percent_range(low: float, high: float) -> str:
    """Return two parts of a whole as percentages to two figures: ``"12 to 71 %"``, ``"below 0.001 %"``."""
    if high < _SMALLEST_PART:
        return "below 0.001 %"
    low = 0.0 if low < _SMALLEST_PART else low
    first, last = percent_text(100 * low), percent_text(100 * high)
    return last if first == last else f"{first.removesuffix(' %')} to {last}"


def round_to_uncertainty(value: float, u: float | None) -> tuple[str, str]:
    """Round an uncertainty to two significant figures and the value to the same decimal place.

    Parameters
    ----------
    value : float
        The value.
    u : float or None
        Its uncertainty, same unit, not negative.

    Returns
    -------
    tuple of str
        Value and uncertainty, both readable as numbers. Where the larger of the two is below 1e-3 or from 1e6 on, both
        carry the same power of ten. Without a usable uncertainty (None, NaN, 0 or infinite) the value has six
        significant figures and the second text is ``""``, ``""``, ``"0"`` or ``"inf"``.

    Raises
    ------
    ValueError
        If `u` is negative.

    Notes
    -----
    JCGM 100:2008 (GUM), 7.2.6: the uncertainty is quoted to at most two significant figures, and the value is rounded
    to be consistent with it (number of the clause from memory). Ties go to the even digit.
    """
    if u is not None and u < 0:
        raise ValueError(f"an uncertainty cannot be negative: {u}")
    if not math.isfinite(value):
        return f"{value}", ""
    if u is None or math.isnan(u):
        return _six_figures(value), ""
    if u == 0 or math.isinf(u):
        return _six_figures(value), "0" if u == 0 else "inf"
    exact_value, exact_u = Decimal(repr(float(value))), Decimal(repr(float(u)))
    place = _two_figure_place(exact_u)
    if value != 0 and place <= exact_value.adjusted() - _DOUBLE_FIGURES:
        return f"{float(value):.{_DOUBLE_FIGURES}g}", f"{float(u):.1e}"
    rounded_value, rounded_u = _to_place(exact_value, place), _to_place(exact_u, place)
    top = max(rounded_value.copy_abs(), rounded_u)
    if Decimal("1e-3") <= top < Decimal("1e6"):
        return f"{rounded_value:f}", f"{rounded_u:f}"
    power = top.adjusted()
    return _scientific(rounded_value, power), _scientific(rounded_u, power)


def _two_figure_place(u: Decimal) -> int:
    """Return the power of ten of the second figure of `u`, after rounding (0.0996 becomes 0.10, place -2)."""
    place = u.adjusted() - 1
    return place + 1 if _to_place(u, place).adjusted() > u.adjusted() else place


def _to_place(number: Decimal, place: int) -> Decimal:
    rounded = number.quantize(Decimal((0, (1,), place)), rounding=ROUND_HALF_EVEN, context=_CONTEXT)
    return rounded.copy_abs() if rounded == 0 else rounded  # no "-0"


def _scientific(number: Decimal, power: int) -> str:
    mantissa = number.scaleb(-power, context=_CONTEXT)
    return f"{mantissa:f}e{power:+03d}"


def _six_figures(value: float) -> str:
    return f"{value:.{_PLAIN_FIGURES}g}"


def format_value(value: float | None, u: float | None, unit: str = "") -> str:
    """Return a value with its uncertainty and unit as a person reads it.

    Parameters
    ----------
    value : float or None
        None or NaN where it is not determined.
    u : float or None
        Standard uncertainty in the same unit.
    unit : str
        Unit, empty for a pure number.

    Returns
    -------
    str
        ``"344.30 ± 0.20 K"``, ``"(6.910 ± 0.010)e-04 J/(mol K^2)"``; the value alone where `u` is None, NaN or 0.
    """
    if value is None or math.isnan(value):
        return "not determined"
    value_text, u_text = round_to_uncertainty(value, u)
    if u_text in ("", "0"):
        number = value_text
    elif u_text == "inf":
        number = f"{value_text} (uncertainty unbounded)"
    else:
        mantissas = [text.partition("e") for text in (value_text, u_text)]
        shared = mantissas[0][2] == mantissas[1][2] != ""
        number = f"{value_text} ± {u_text}"
        if shared:
            number = f"({mantissas[0][0]} ± {mantissas[1][0]})e{mantissas[0][2]}"
        elif unit:
            number = f"({number})" if "e" in number else number
    return f"{number} {unit}".rstrip()

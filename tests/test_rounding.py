"""Digits by the rule of the GUM."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from latticefit.rounding import format_value, round_to_uncertainty

INF, NAN = math.inf, math.nan

CASES = [
    # JCGM 100:2008, 7.2.6: "10.057 62 ohm with 27 milliohm should be rounded to 10.058 ohm" (from memory)
    (10.05762, 0.027, ("10.058", "0.027")),
    # JCGM 100:2008, 7.2.2: 100.021 47 g with 0.35 mg, there quoted as 100.021 47(35) g (from memory)
    (100.02147, 0.00035, ("100.02147", "0.00035")),
    # the published copper anchor as its authors print it: D. L. Martin, Phys. Rev. B 8, 5357 (1973), 344.3(2) K
    (344.3, 0.2, ("344.30", "0.20")),
    (5004.3, 7.77, ("5004.3", "7.8")),
    (99.99, 0.985, ("99.99", "0.98")),
    (99.99, 0.9951, ("100.0", "1.0")),
    (344.34567, 0.0996, ("344.35", "0.10")),
    (24.5, 0.25, ("24.50", "0.25")),
    (123456, 950, ("123460", "950")),
    (123456, 9500, ("123500", "9500")),
    (-0.3, 12, ("0", "12")),
    (0.0, 0.5, ("0.00", "0.50")),
    (6.91e-4, 1e-6, ("6.910e-04", "0.010e-04")),
    (-1.23e-4, 2e-5, ("-1.23e-04", "0.20e-04")),
    (12345678, 1234, ("1.23457e+07", "0.00012e+07")),
    (1.0, 1e6, ("0.0e+06", "1.0e+06")),
    (1.5e300, 1e298, ("1.500e+300", "0.010e+300")),
    (5e-324, 5e-324, ("5.0e-324", "5.0e-324")),
    (300.0, 1e-20, ("300", "1.0e-20")),
    (5.0, None, ("5", "")),
    (1 / 3, None, ("0.333333", "")),
    (5.0, 0.0, ("5", "0")),
    (5.0, INF, ("5", "inf")),
    (5.0, NAN, ("5", "")),
    (NAN, 1.0, ("nan", "")),
    (INF, 1.0, ("inf", "")),
]


@pytest.mark.parametrize(("value", "u", "texts"), CASES)
def test_round_to_uncertainty(value: float, u: float | None, texts: tuple[str, str]) -> None:
    """Two figures of the uncertainty, the value to the same place; huge, tiny and missing ones stay readable."""
    assert round_to_uncertainty(value, u) == texts


@pytest.mark.parametrize(
    ("value", "u", "unit", "text"),
    [
        (344.3, 0.2, "K", "344.30 ± 0.20 K"),
        (6.91e-4, 1e-6, "J/(mol K^2)", "(6.910 ± 0.010)e-04 J/(mol K^2)"),
        (3.0, 0.1, "", "3.00 ± 0.10"),
        (3.0, None, "K", "3 K"),
        (3.0, 0.0, "K", "3 K"),
        (3.0, INF, "K", "3 (uncertainty unbounded) K"),
        (None, None, "K", "not determined"),
        (NAN, 0.1, "K", "not determined"),
        (300.0, 1e-20, "K", "(300 ± 1.0e-20) K"),
    ],
)
def test_format_value(value: float | None, u: float | None, unit: str, text: str) -> None:
    """Value, uncertainty and unit read as people write them."""
    assert format_value(value, u, unit) == text


def test_negative_uncertainty_is_an_error() -> None:
    """A negative uncertainty is a mistake of the caller, not something to print."""
    with pytest.raises(ValueError, match="cannot be negative"):
        round_to_uncertainty(1.0, -0.1)


@given(
    st.floats(min_value=-1e308, max_value=1e308),
    st.floats(min_value=0, max_value=1e308, exclude_min=True),
)
def test_rounding_moves_nothing_by_more_than_half_a_place(value: float, u: float) -> None:
    """The texts read back within 5 % of u (half of its second figure) or double precision, for any two doubles."""
    value_text, u_text = round_to_uncertainty(value, u)
    assert float(u_text) == pytest.approx(u, rel=0.0501, abs=5e-324)
    assert abs(float(value_text) / 2 - value / 2) <= max(0.0501 * u, 5e-15 * abs(value), 5e-324) / 2 * 1.01

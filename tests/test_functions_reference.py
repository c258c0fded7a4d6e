"""The special functions held against reference values, published tables and another library."""

from __future__ import annotations

import csv
import ctypes
import ctypes.util
from collections.abc import Callable
from importlib import resources
from pathlib import Path

import mpmath
import numpy as np
import pytest

from latticefit import functions

REFERENCE = Path(__file__).parents[1] / "data" / "reference"
SMALLEST_NORMAL = np.finfo(float).tiny


def read_table(name: str) -> dict[str, list[str]]:
    """Return the columns of a reference file as printed."""
    lines = [line for line in (REFERENCE / name).read_text(encoding="utf-8").splitlines() if not line.startswith("#")]
    rows = list(csv.DictReader(lines))
    return {column: [row[column] for row in rows] for column in rows[0]}


def numbers(column: list[str]) -> np.ndarray:
    """Return a printed column as doubles."""
    return np.array([float(text) for text in column])


def assert_relative(x: np.ndarray, found: np.ndarray, expected: np.ndarray, tolerance: float, what: str) -> None:
    """Fail with a list of every row that is off; below the smallest normal double only smallness is asked for."""
    normal = np.abs(expected) >= SMALLEST_NORMAL
    deviation = np.where(normal, found / np.where(normal, expected, 1) - 1, 0)
    bad = (np.abs(deviation) > tolerance) | (~normal & (np.abs(found) > 1.01 * SMALLEST_NORMAL))
    listing = [
        f"  x = {a!r}: found {b!r}, expected {c!r}, relative {d:.2e}"
        for a, b, c, d in zip(x[bad], found[bad], expected[bad], deviation[bad], strict=True)
    ]
    assert not listing, f"{what}: {len(listing)} of {len(x)} rows beyond {tolerance:g}\n" + "\n".join(listing)


# ------------------------------------------------------------------------------------ reference values, 40 digits

REFERENCE_COLUMNS: list[tuple[str, str, Callable[[np.ndarray], np.ndarray]]] = [
    ("debye_functions.csv", "D1", lambda x: functions.debye_function(1, x)),
    ("debye_functions.csv", "D2", lambda x: functions.debye_function(2, x)),
    ("debye_functions.csv", "D3", lambda x: functions.debye_function(3, x)),
    ("debye_functions.csv", "D4", lambda x: functions.debye_function(4, x)),
    ("debye_functions.csv", "cv", functions.debye_heat_capacity),
    ("einstein_functions.csv", "D_u", functions.debye_energy),
    ("einstein_functions.csv", "D_s", functions.debye_entropy),
    ("einstein_functions.csv", "E_cv", functions.einstein_heat_capacity),
    ("einstein_functions.csv", "E_u", functions.einstein_energy),
    ("einstein_functions.csv", "E_s", functions.einstein_entropy),
]


@pytest.mark.parametrize(("file", "column", "function"), REFERENCE_COLUMNS, ids=[row[1] for row in REFERENCE_COLUMNS])
def test_function_agrees_with_reference_values(
    file: str, column: str, function: Callable[[np.ndarray], np.ndarray]
) -> None:
    """Every function is within 1e-14 of values computed at 60 digits by two methods, x from 1e-6 to 1e4."""
    # Source: data/reference/debye_functions.csv and einstein_functions.csv (mpmath at 60 digits; GNU GSL 2.7.1).
    table = read_table(file)
    x, expected = numbers(table["x"]), numbers(table[column])
    if column == "E_s":  # the file's column ends here, see the next test
        x, expected = x[x <= 100], expected[x <= 100]
    assert len(x) > 55
    assert_relative(x, function(x), expected, 1e-14, column)


def test_einstein_entropy_where_the_reference_file_lost_its_logarithm() -> None:
    """Beyond x = 100 the Einstein entropy is (1 + x) e^-x, not the energy alone as in the file's column E_s.

    -ln(1 - e^-x) needs more than the file's 60 digits there, so its column E_s repeats E_u from x = 150 on. Once the
    file is mended this test fails, and both it and the exception above can go.
    """
    table = read_table("einstein_functions.csv")
    x, column, energy = (numbers(table[name]) for name in ("x", "E_s", "E_u"))
    far = (x > 100) & (x < 1000)
    np.testing.assert_allclose(column[far], energy[far], rtol=1e-15)
    with mpmath.workdps(500):
        expected = [float(a / mpmath.expm1(a) - mpmath.log(1 - mpmath.exp(-a))) for a in map(mpmath.mpf, x[far])]
    assert_relative(x[far], functions.einstein_entropy(x[far]), np.array(expected), 1e-14, "E_s")


def test_a_wrong_value_is_listed_with_its_row() -> None:
    """The comparison fails, and names the row, when one value is off by 2e-14."""
    x = np.array([1.0, 2.0])
    with pytest.raises(AssertionError, match=r"(?s)1 of 2 rows.*x = .*2\.0.*relative 2\.\d*e-14"):
        assert_relative(x, np.array([1.0, 1 + 2e-14]), np.array([1.0, 1.0]), 1e-14, "probe")


# ----------------------------------------------------------------------------------------------- published tables


def test_passler_table_to_its_printed_digits() -> None:
    """C and D3 agree with a published table of ten figures; only three of its 70 values differ by more than rounding.

    Those three, D3(0.3), C(0.4) and C(17), are off by 0.53 to 0.92 of a unit of the last printed digit.
    """
    # Source: R. Pässler, Adv. Condens. Matter Phys. 2017, 9321439 (2017), Table 7.
    check = functions.published_check()
    assert len(check.x) == 35
    assert check.beyond_rounding == 3
    assert check.last_digit_deviation < 0.93
    assert check.heat_capacity_deviation == pytest.approx(3.34e-10, rel=0.01)
    assert check.energy_deviation == pytest.approx(1.86e-10, rel=0.01)
    assert check.heat_capacity_deviation < check.heat_capacity_rounding < 5e-10
    assert check.energy_deviation < check.energy_rounding < 5e-10


def test_the_printed_digits_that_differ_are_not_those_of_the_reference_values() -> None:
    """For D3(0.3) and C(0.4) the 40-digit reference stands with latticefit against the printed last digit."""
    # Source: data/reference/debye_functions.csv (mpmath at 60 digits).
    table = read_table("debye_functions.csv")
    rows = {float(x): row for row, x in enumerate(table["x"])}
    assert f"{float(table['D3'][rows[0.3]]):.10f}" == f"{functions.debye_energy(0.3):.10f}" == "0.8919951866"
    assert f"{float(table['cv'][rows[0.4]]):.10f}" == f"{functions.debye_heat_capacity(0.4):.10f}" == "0.9920454896"


def test_packaged_table_is_the_reference_file() -> None:
    """The table shipped with the package holds the reference file, header with its source included."""
    packaged = (resources.files("latticefit.functions") / "published_table.csv").read_text(encoding="utf-8")
    assert packaged == (REFERENCE / "debye_table_passler_2017.csv").read_text(encoding="utf-8")
    assert packaged.startswith("# R. Passler, Adv. Condens. Matter Phys. 2017, 9321439, Table 7")


def test_published_check_hands_out_values_that_cannot_be_changed() -> None:
    """The record of the check is frozen, its arrays too, and its own values are those of the functions."""
    check = functions.published_check()
    assert np.array_equal(check.heat_capacity, functions.debye_heat_capacity(check.x))
    assert np.array_equal(check.energy, functions.debye_energy(check.x))
    with pytest.raises(AttributeError):
        check.beyond_rounding = 0  # type: ignore[misc]
    with pytest.raises(ValueError, match="read-only"):
        check.energy[0] = 1.0


@pytest.mark.parametrize("order", [1, 2, 3, 4])
def test_abramowitz_stegun_table_to_its_printed_digits(order: int) -> None:
    """D1 to D4 agree with the six printed decimals on the grid of the Handbook's table."""
    # Source: M. Abramowitz and I. A. Stegun (eds.), Handbook of Mathematical Functions, NBS AMS 55 (1964), Table 27.1;
    # the file's header says which of its values were read in print and which recomputed.
    table = read_table("debye_table_abramowitz_stegun_27_1.csv")
    x = numbers(table["x"])
    printed = numbers(table[f"D{order}"])
    assert np.max(np.abs(functions.debye_function(order, x) - printed)) <= 0.5e-6 + 1e-15


@pytest.mark.parametrize(
    ("order", "x", "printed"),
    [(1, 0.1, 0.975278), (1, 1, 0.777505), (1, 10, 0.164443), (2, 0.1, 0.967083), (2, 1, 0.707878)],
)
def test_independently_read_values(order: int, x: float, printed: float) -> None:
    """Five values of D1 and D2 read in an independent published list agree to their six decimals."""
    # Source: header of data/reference/debye_table_abramowitz_stegun_27_1.csv.
    assert functions.debye_function(order, x) == pytest.approx(printed, abs=0.5e-6)


# ---------------------------------------------------------------------------------------------------- another library


@pytest.fixture(scope="module")
def gsl() -> ctypes.CDLL:
    """Load GNU GSL, or skip."""
    library, blas = ctypes.util.find_library("gsl"), ctypes.util.find_library("gslcblas")
    if library is None or blas is None:
        pytest.skip("GNU GSL (libgsl) is not installed here")
    try:
        ctypes.CDLL(blas, mode=ctypes.RTLD_GLOBAL)
        loaded = ctypes.CDLL(library)
    except OSError as error:
        pytest.skip(f"GNU GSL is here but cannot be loaded: {error}")
    loaded.gsl_set_error_handler_off()  # GSL ends the process on underflow otherwise
    return loaded


def gsl_debye(gsl: ctypes.CDLL, order: int, x: np.ndarray) -> np.ndarray:
    """Return D_n of GNU GSL, value by value."""
    function = getattr(gsl, f"gsl_sf_debye_{order}")
    function.argtypes, function.restype = [ctypes.c_double], ctypes.c_double
    return np.array([function(value) for value in x])


@pytest.mark.parametrize("order", [1, 2, 3, 4, 5, 6])
def test_debye_functions_agree_with_gsl(gsl: ctypes.CDLL, order: int) -> None:
    """D1 to D5 agree with GNU GSL to 1e-11 and D6 to 2e-11 (GSL itself loses digits just above x = 4)."""
    # Source: GNU Scientific Library, gsl_sf_debye_1 to gsl_sf_debye_6. Its D6 is 1.4e-11 off at x = 4.006, where
    # latticefit agrees with mpmath to 1e-14 (tests/test_functions_behaviour.py).
    x = np.concatenate([np.geomspace(1e-8, 1e4, 301), np.linspace(3.9, 4.1, 101)])
    assert_relative(
        x, functions.debye_function(order, x), gsl_debye(gsl, order, x), 2e-11 if order == 6 else 1e-11, f"D{order}"
    )


def test_debye_heat_capacity_agrees_with_gsl(gsl: ctypes.CDLL) -> None:
    """4 D3 - 3 x/(e^x - 1), with D3 from GNU GSL, gives the same heat capacity to 1e-11."""
    # Source: GNU Scientific Library, gsl_sf_debye_3.
    x = np.geomspace(1e-8, 700, 301)
    expected = 4 * gsl_debye(gsl, 3, x) - 3 * x / np.expm1(x)
    assert_relative(x, functions.debye_heat_capacity(x), expected, 1e-11, "C")

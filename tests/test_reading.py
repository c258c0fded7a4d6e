"""Measurement files in every way of writing of step 1, and the choices that are made about them."""

from __future__ import annotations

import hashlib
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from helpers import REFERENCE
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose, assert_array_equal
from reading_helpers import messages, read_text

from latticefit.reading import read_measurement
from latticefit.records import RunSettings, SampleSettings

NO_SAMPLE = SampleSettings()
M_CU = 63.546  # g/mol, IUPAC standard atomic weight of copper (from memory)

# The same two points, 1.5 K with 2.25 and 3 K with 4.5 J/(mol K), in many ways of writing.
SAME_POINTS = [
    ("comma", "T_K,Cp_J_molK\n1.5,2.25\n3,4.5\n"),
    ("comma and blanks", "T_K, Cp_J_molK\n 1.5, 2.25\n 3.0, 4.50\n"),
    ("semicolon", "T_K;Cp_J_molK\n1.5;2.25\n3;4.5\n"),
    ("semicolon, decimal comma", "T_K;Cp_J_molK\n1,5;2,25\n3;4,5\n"),
    ("tab", "T_K\tCp_J_molK\n1.5\t2.25\n3\t4.5\n"),
    ("tab, decimal comma", "T_K\tCp_J_molK\n1,5\t2,25\n3\t4,5\n"),
    ("blank", "T_K Cp_J_molK\n1.5 2.25\n3 4.5\n"),
    ("blanks, decimal comma", "T_K   Cp_J_molK\n 1,5    2,25\n 3      4,5\n"),
    ("blank, brackets in header", "T (K) Cp (J/(mol K))\n1.5 2.25\n3 4.5\n"),
    ("blanks in header", "T / K   Cp / J mol-1 K-1\n1.5   2.25\n3   4.5\n"),
    ("quoted header", '"T (K)" "Cp (J/(mol K))"\n1.5 2.25\n3 4.5\n'),
    ("quoted cells", '"T (K)","Cp, (J/(mol K))"\n"1.5","2.25"\n3,4.5\n'),
    ("slash", "T/K,Cp/(J K-1 mol-1)\n1.5,2.25\n3,4.5\n"),
    ("comma in header", "T/K;Cp,m/(J K-1 mol-1)\n1.5;2.25\n3;4.5\n"),
    ("square brackets", "T [K],Cp [J/mol-K]\n1.5,2.25\n3,4.5\n"),
    ("superscripts", "T/K;C_p / J K⁻¹ mol⁻¹\n1.5;2.25\n3;4.5\n"),
    ("long words", "temperature_K,heat_capacity_J_mol_K\n1.5,2.25\n3,4.5\n"),
    ("words", "Sample temperature (K),Molar heat capacity (J/mol/K)\n1.5,2.25\n3,4.5\n"),
    ("milli", "T_mK,C_mJ_molK\n1500,2250\n3000,4500\n"),
    ("Celsius", "T (°C),Cp (J/(mol K))\n-271.65,2.25\n-270.15,4.5\n"),
    ("byte order mark", "\ufeffT_K,Cp_J_molK\n1.5,2.25\n3,4.5\n"),
    ("carriage returns", "T_K,Cp_J_molK\r\n1.5,2.25\r\n3,4.5\r\n"),
    ("old line ends", "T_K,Cp_J_molK\r1.5,2.25\r3,4.5\r"),
    ("comments", "# invented data\nT_K,Cp_J_molK\n# first\n1.5,2.25 # good\n\n3,4.5\n#end"),
    ("commented header", "# invented data\n# T_K Cp_J_molK\n1.5 2.25\n3 4.5\n"),
    ("exponents", "T_K,Cp_J_molK\n1.5e0,2.25E+00\n.3e1,45e-1\n"),
    ("minus sign", "T_K,Cp_J_molK\n1.5,225e\u22122\n3,4.5\n"),
    ("empty last cells", "T_K,Cp_J_molK,,\n1.5,2.25,,\n3,4.5,,\n"),
    ("text column", "sample,T_K,note,Cp_J_molK\nA 1,1.5,,2.25\nA 1,3,late,4.5\n"),
    ("other columns", "T_K,Cp_J_molK,S_J_molK,H_J_mol\n1.5,2.25,1,1\n3,4.5,2,2\n"),
]


@pytest.mark.parametrize("text", [text for _, text in SAME_POINTS], ids=[name for name, _ in SAME_POINTS])
def test_way_of_writing(text: str, tmp_path: Path) -> None:
    """Each way of writing gives the same temperatures and heat capacities."""
    measurement = read_text(tmp_path, text)
    assert_allclose(measurement.temperature, [1.5, 3.0], rtol=1e-13)
    assert_allclose(measurement.heat_capacity, [2.25, 4.5], rtol=1e-14)
    assert (measurement.basis, measurement.quantity, measurement.sigma) == ("mol", "Cp", None)


def test_reading_says_how_it_was_read(tmp_path: Path) -> None:
    """The record names encoding, delimiter, decimal sign, columns, units, rows and the hash of the bytes."""
    text = "T/K;Cp/(mJ/(mol K))\n1,5;2,25\n3;4,5\n"
    reading = read_text(tmp_path, text).readings[0]
    assert (reading.encoding, reading.delimiter, reading.decimal) == ("UTF-8", "semicolon", "comma")
    assert (reading.temperature_column, reading.heat_capacity_column) == ("T/K", "Cp/(mJ/(mol K))")
    assert (reading.temperature_unit, reading.heat_capacity_unit) == ("K", "mJ/(mol K)")
    assert (reading.rows, reading.file, reading.label, reading.sigma_column) == (2, "run.csv", "run", None)
    assert reading.sha256 == hashlib.sha256(text.encode()).hexdigest()
    assert reading.path == str(tmp_path / "run.csv")


def test_lines_are_those_of_the_file(tmp_path: Path) -> None:
    """Line numbers count comments, blank lines and the header."""
    measurement = read_text(tmp_path, "# a\n\nT_K,Cp_J_molK\n1,2\n# b\n3,4\n")
    assert_array_equal(measurement.line, [4, 6])


# ------------------------------------------------------------------------------------------------ units and basis


@pytest.mark.parametrize(
    ("unit", "sample", "factor", "basis"),
    [
        ("J/(mol K)", NO_SAMPLE, 1.0, "mol"),
        ("cal/(mol K)", NO_SAMPLE, 4.184, "mol"),
        ("J/(g K)", NO_SAMPLE, 1.0, "gram"),
        ("J/(kg K)", NO_SAMPLE, 1e-3, "gram"),
        ("J/(g K)", SampleSettings(mass="10 mg"), 1.0, "gram"),
        ("J/(g K)", SampleSettings(formula="Cu"), M_CU, "mol"),
        ("J/(kg K)", SampleSettings(molar_mass="100 g/mol"), 0.1, "mol"),
        ("uJ/K", NO_SAMPLE, 1e-6, "sample"),
        ("uJ/K", SampleSettings(formula="Cu"), 1e-6, "sample"),
        ("uJ/K", SampleSettings(mass="10 mg"), 1e-6, "sample"),
        ("uJ/K", SampleSettings(formula="Cu", mass="10 mg"), 1e-6 * M_CU / 0.010, "mol"),
        ("J/(mol-atom K)", SampleSettings(formula="Al2O3"), 5.0, "mol"),
    ],
)
def test_basis(unit: str, sample: SampleSettings, factor: float, basis: str, tmp_path: Path) -> None:
    """Data become J/(mol K) as soon as the sample allows it, and keep their own basis otherwise."""
    measurement = read_text(tmp_path, f"T (K);C ({unit})\n2;3\n", sample)
    assert measurement.heat_capacity[0] == pytest.approx(3 * factor, rel=1e-6)
    assert measurement.basis == basis


def test_unit_by_option(tmp_path: Path) -> None:
    """Without units in the header the options give them; a temperature without any unit is K, and that is noted."""
    text = "T,Cp\n300,2\n310,3\n"
    measurement = read_text(tmp_path, text, heat_capacity_unit="mJ/(mol K)")
    assert_allclose(measurement.heat_capacity, [2e-3, 3e-3])
    assert messages(measurement) == ["the unit of 'T' is not stated; taken as K"]
    measurement = read_text(tmp_path, text, heat_capacity_unit="J/(mol K)", temperature_unit="degC")
    assert_allclose(measurement.temperature, [573.15, 583.15])
    assert messages(measurement) == []


def test_option_against_header_is_noted(tmp_path: Path) -> None:
    """An option stands above the header, and the contradiction is listed."""
    measurement = read_text(tmp_path, "T_K,Cp_J_molK\n1,2\n", heat_capacity_unit="mJ/(mol K)")
    assert measurement.heat_capacity[0] == 2e-3
    assert messages(measurement) == ["'Cp_J_molK' read in mJ/(mol K) as asked, against its header"]


@pytest.mark.parametrize(
    ("header", "asked", "quantity", "notes"),
    [
        ("Cp_J_molK", None, "Cp", 0),
        ("C_J_molK", None, "Cp", 0),
        ("Cv_J_molK", None, "Cv", 0),
        ("C_v (J/(mol K))", None, "Cv", 0),
        ("cV/(J/mol/K)", None, "Cv", 0),
        ("heat capacity at constant volume (J/mol/K)", None, "Cv", 0),
        ("C_J_molK", "Cv", "Cv", 0),
        ("Cv_J_molK", "Cp", "Cp", 1),
    ],
)
def test_quantity(header: str, asked: Any, quantity: str, notes: int, tmp_path: Path) -> None:
    """The quantity is Cv where the header says so, else Cp; the option stands above it and a contradiction is noted."""
    measurement = read_text(tmp_path, f"T_K,{header}\n1,2\n", quantity=asked)
    assert (measurement.quantity, len(messages(measurement))) == (quantity, notes)


# --------------------------------------------------------------------------------------------------------- columns

WIDE = "t,T_K,T2_K,Cp_J_molK,Cp_J_gK,7\n0,1,10,2,3,70\n0,4,40,5,6,71\n"


@pytest.mark.parametrize(
    ("temperature", "heat_capacity", "t_first", "c_first"),
    [
        ("T_K", "Cp_J_molK", 1.0, 2.0),
        ("T", "Cp_J_molK", 1.0, 2.0),
        ("T2", 4, 10.0, 2.0),
        (3, "4", 10.0, 2.0),
        ("2", "Cp_J_gK", 1.0, 3 * M_CU),
    ],
)
def test_columns_by_choice(
    temperature: Any, heat_capacity: Any, t_first: float, c_first: float, tmp_path: Path
) -> None:
    """A column is chosen by its whole header, by its header without unit where that is unique, or by number."""
    measurement = read_text(
        tmp_path, WIDE.replace(",7\n", ",x\n"), temperature=temperature, heat_capacity=heat_capacity
    )
    assert measurement.temperature[0] == t_first
    assert measurement.heat_capacity[0] == pytest.approx(c_first, rel=1e-6)


def test_exact_header_stands_before_column_number(tmp_path: Path) -> None:
    """A header that is itself a number is found before the column of that number."""
    text = "T_K;2;1\n5;6;7\n"
    measurement = read_text(tmp_path, text, heat_capacity="2", sigma="1", heat_capacity_unit="J/(mol K)")
    assert (measurement.heat_capacity[0], measurement.sigma) == (6, [7])


def test_no_header(tmp_path: Path) -> None:
    """Two columns without header are T and C; a choice may turn them round; the unit must be given."""
    measurement = read_text(tmp_path, "1.5 2.5\n3 4\n", heat_capacity_unit="J/(mol K)")
    assert_array_equal(measurement.temperature, [1.5, 3])
    turned = read_text(tmp_path, "1.5 2.5\n3 4\n", heat_capacity_unit="J/(mol K)", heat_capacity=1)
    assert_array_equal(turned.temperature, [2.5, 4])
    assert turned.readings[0].temperature_column == "column 2"


def test_wide_table_without_unit_row(tmp_path: Path) -> None:
    """In a wide table the named column of the sample is found among others, and its own error column with it."""
    text = (
        "t (s),Sample temperature (K),Temperature rise (K),Heat capacity (µJ/K),Addenda (µJ/K),Error (µJ/K),B (T)\n"
        "1,2,.02,30,8,.3,0\n2,4,.04,40,9,.4,0\n"
    )
    measurement = read_text(tmp_path, text)
    assert_array_equal(measurement.temperature, [2, 4])
    assert_allclose(measurement.sigma / measurement.heat_capacity, 0.01)
    assert measurement.readings[0].heat_capacity_column == "Heat capacity (µJ/K)"


# ----------------------------------------------------------------------------------------------------------- sigma

TWO = "T_K,Cp_J_molK{head}\n2,10{first}\n4,20{second}\n"


@pytest.mark.parametrize(
    ("head", "cells", "choices", "expected"),
    [
        (",sigma_J_molK", ("0.1", "0.3"), {}, [0.1, 0.3]),
        (",sigma_mJ_molK", ("100", "300"), {}, [0.1, 0.3]),
        (",u(Cp) (J/(mol K))", ("0.1", "0.3"), {}, [0.1, 0.3]),
        (",err (%)", ("1", "2"), {}, [0.1, 0.4]),
        (",std_percent", ("1", "2"), {}, [0.1, 0.4]),
        (",error_J_gK", ("0.1", "0.3"), {}, [0.1 * M_CU, 0.3 * M_CU]),
        (",U (k=2) [J/(mol K)]", ("0.1", "0.3"), {}, [0.05, 0.15]),
        (",U (k=2)", ("0.1", "0.3"), {}, [0.05, 0.15]),
        (";2 sigma (J/(mol K))".replace(";", ","), ("0.1", "0.3"), {}, [0.05, 0.15]),
        (",U (k=2) [J/(mol K)]", ("0.1", "0.3"), {"coverage_factor": 1.0}, [0.1, 0.3]),
        (",U(Cp)_J_molK", ("0.1", "0.3"), {"coverage_factor": 2.0}, [0.05, 0.15]),
        (",sigma", ("0.1", "0.3"), {"sigma": "sigma"}, [0.1, 0.3]),
        (",err", ("0.1", "0.3"), {"sigma": 3}, [0.1, 0.3]),
        (",err", ("0.1", "0.3"), {"sigma": "3"}, [0.1, 0.3]),
        (",x", ("0.1", "0.3"), {"sigma": "x"}, [0.1, 0.3]),
        (",sigma_J_molK", ("0.1", "0.3"), {"sigma": "1%"}, [0.1, 0.2]),
        (",u(T)_K,sigma_J_molK", ("0.9,0.1", "0.9,0.3"), {}, [0.1, 0.3]),
    ],
)
def test_sigma_column(head: str, cells: tuple[str, str], choices: Any, expected: list[float], tmp_path: Path) -> None:
    """Sigma comes from the column that names an uncertainty with a unit, or the one chosen, as a k = 1 value."""
    text = TWO.format(head=head, first="," + cells[0], second="," + cells[1])
    assert_allclose(read_text(tmp_path, text, **choices).sigma, expected, rtol=1e-6)


def test_unit_of_sigma_by_option(tmp_path: Path) -> None:
    """Where no header has a unit, the unit given for the heat capacity is that of the sigma column too, and noted."""
    measurement = read_text(tmp_path, "T,Cp,sigma\n2,10,1\n4,20,3\n", heat_capacity_unit="mJ/(mol K)")
    assert_allclose(measurement.sigma, [1e-3, 3e-3])
    assert "the unit of 'sigma' is not stated; taken as that of the heat capacity, mJ/(mol K)" in messages(measurement)


def test_sigma_column_without_unit_is_not_guessed(tmp_path: Path) -> None:
    """Beside a heat capacity with unit, a sigma column without one may be in % or not: it is left alone, and listed."""
    measurement = read_text(tmp_path, TWO.format(head=",sigma", first=",1", second=",2"))
    assert measurement.sigma is None
    assert messages(measurement) == ["'sigma' names an uncertainty but no unit; not used, unless --sigma asks for it"]


def test_expanded_uncertainty_is_listed(tmp_path: Path) -> None:
    """Halving a U column is a repair that is listed, and the sigma text says it."""
    measurement = read_text(tmp_path, TWO.format(head=",U (k=2) (J/(mol K))", first=",1", second=",2"))
    assert messages(measurement) == ["sigma is 'U (k=2) (J/(mol K))' divided by the coverage factor 2"]
    assert measurement.sigma_text == "column 'U (k=2) (J/(mol K))', divided by the coverage factor 2"


@pytest.mark.parametrize(
    ("first", "second", "expected"),
    [
        ("12.34(5)", "0.120(11)", [0.05, 0.011]),
        ("12.34(12)", "250(3)", [0.12, 3.0]),
        ("12.34(0.05)", "1.20(5)e1", [0.05, 0.5]),
        ("12.34 ± 0.05", "20±1", [0.05, 1.0]),
        ("12.34 +/- 0.05", "20 +- 1", [0.05, 1.0]),
    ],
)
@pytest.mark.parametrize("delimiter", [",", ";", "\t", " "])
def test_uncertainty_written_with_the_value(
    first: str, second: str, expected: list[float], delimiter: str, tmp_path: Path
) -> None:
    """Digits in brackets count from the last decimal, a value after ± is what it says; both are k = 1, and noted."""
    measurement = read_text(tmp_path, f"T_K{delimiter}Cp_J_molK\n2{delimiter}{first}\n4{delimiter}{second}\n")
    assert_allclose(measurement.sigma, expected, rtol=1e-14)
    assert messages(measurement) == ["sigma is the uncertainty written with the values of 'Cp_J_molK', read as k = 1"]


T6 = np.array([2.0, 9.0, 10.0, 50.0, 100.0, 300.0])


@pytest.mark.parametrize(
    ("text", "percent"),
    [
        ("0.5%", [0.5] * 6),
        ("0.5 percent", [0.5] * 6),
        ("±0.5 %", [0.5] * 6),
        ("1% below 100 K, 0.3% above", [1, 1, 1, 1, 0.3, 0.3]),
        ("1% below 100, 0.3% above 100", [1, 1, 1, 1, 0.3, 0.3]),
        ("2% below 10 K, 1% below 100 K, 0.3% above", [2, 2, 1, 1, 0.3, 0.3]),
        ("0.3% above 100 K, 1% above 10 K, 2% below", [2, 2, 1, 1, 0.3, 0.3]),
        ("1% below 100 K, 0.5%", [1, 1, 1, 1, 0.5, 0.5]),
        ("3% + 4%", [5] * 6),
        ("0.2 J/(mol K)", [2] * 6),
        ("30 mJ/(mol K) + 0.4%", [0.5] * 6),
        ("0.03 J/(mol K) + 0.4% below 10 K, 1% above", [0.5, 0.5, 1, 1, 1, 1]),
    ],
)
def test_sigma_text(text: str, percent: list[float], tmp_path: Path) -> None:
    """Percent of the value, absolute values, quadrature and pieces by temperature; "above" includes its limit."""
    table = "T_K,Cp_J_molK\n" + "".join(f"{t},10\n" for t in T6)
    measurement = read_text(tmp_path, table, sigma=text)
    assert_allclose(measurement.sigma, np.array(percent) / 10, rtol=1e-14)
    assert measurement.sigma_text == text


def test_sigma_text_is_converted_with_the_data(tmp_path: Path) -> None:
    """An absolute sigma has its own unit, and the coverage factor divides a text as well."""
    measurement = read_text(tmp_path, "T_K,cp_J_gK\n2,10\n", sigma="0.2 J/(mol K)", coverage_factor=2.0)
    assert measurement.sigma[0] == pytest.approx(0.1, rel=1e-14)
    assert measurement.heat_capacity[0] == pytest.approx(10 * M_CU, rel=1e-6)


# ------------------------------------------------------------------------------------------------- rows left out


def test_rows_that_cannot_be_used_are_listed(tmp_path: Path) -> None:
    """NaN, infinite, empty and impossible rows are left out, each with line and reason, and nothing else."""
    text = (
        "T_K,Cp_J_molK,sigma_J_molK\n1,2,1\nnan,2,1\n-1,2,1\n0,2,1\n5,,1\n6,inf,1\n7,-3,0\n8,0,1\n9,2,nan\n"
        "10,2,1\n11,2,1\n12,2,1\n13,2,1\n14,2,1\n15,2,1\n16,2,1\n17,2,1\n"
    )
    measurement = read_text(tmp_path, text)
    assert_array_equal(measurement.temperature, [1, *range(10, 18)])
    assert_array_equal(measurement.line, [2, *range(11, 19)])
    expected = {
        3: "no temperature",
        4: "the temperature, -1 K, is not above 0 K",
        5: "the temperature, 0 K, is not above 0 K",
        6: "no heat capacity",
        7: "the heat capacity is infinite",
        8: "the heat capacity, -3 J/(mol K), is not above 0",
        9: "the heat capacity, 0 J/(mol K), is not above 0",
        10: "no sigma",
    }
    assert {row.line: row.reason for row in measurement.excluded} == expected
    assert {repair.line: repair.message for repair in measurement.repairs if repair.line} == {
        line: f"row left out: {reason}" for line, reason in expected.items()
    }
    assert measurement.readings[0].rows == 17
    assert (measurement.excluded[5].heat_capacity, measurement.excluded[5].run) == (-3, 0)


def test_file_order_is_kept(tmp_path: Path) -> None:
    """The arrays are in the order of the file, repeats included."""
    measurement = read_text(tmp_path, "T_K,Cp_J_molK\n30,3\n10,1\n20,2\n10,1.1\n")
    assert_array_equal(measurement.temperature, [30, 10, 20, 10])


# --------------------------------------------------------------------------------------------------- several runs


def test_runs_are_joined_in_order(tmp_path: Path) -> None:
    """Runs keep their order, labels, lines and units; the labels of equal names are told apart."""
    (tmp_path / "a").mkdir()
    (tmp_path / "cold.csv").write_text("T_K,Cp_J_molK\n1,2\nnan,3\n4,5\n")
    (tmp_path / "a" / "cold.csv").write_text("T_K;cp_J_gK\n10;1,5\n")
    runs = (
        RunSettings("cold.csv"),
        RunSettings("a/cold.csv"),
        RunSettings("cold.csv", label="again", window=((2, 9),)),
    )
    measurement = read_measurement(SampleSettings(molar_mass="100 g/mol"), runs, base=tmp_path)
    assert_allclose(measurement.heat_capacity, [2, 5, 150, 2, 5])
    assert_array_equal(measurement.run, [0, 0, 1, 2, 2])
    assert_array_equal(measurement.line, [2, 4, 2, 2, 4])
    assert [reading.label for reading in measurement.readings] == ["cold", "cold 2", "again"]
    assert [row.run for row in measurement.excluded] == [0, 2]
    assert measurement.readings[2].settings.window == ((2, 9),)
    assert "the file of run 'again' is the same, byte for byte, as that of 'cold'" in messages(measurement)
    assert measurement.sample.name == "cold"


def test_sigma_texts_of_runs_are_named(tmp_path: Path) -> None:
    """Where runs state different uncertainties the text says which is whose."""
    (tmp_path / "a.csv").write_text("T_K,Cp_J_molK\n1,2\n")
    runs = (RunSettings("a.csv", sigma="1%"), RunSettings("a.csv", label="b", sigma="2%"))
    measurement = read_measurement(NO_SAMPLE, runs, base=tmp_path)
    assert measurement.sigma_text == "a: 1%; b: 2%"
    assert_allclose(measurement.sigma, [0.02, 0.04])


# ------------------------------------------------------------------------------------------------------ round trips


@pytest.mark.parametrize(
    ("text", "choices"),
    [
        *[(text, {}) for _, text in SAME_POINTS],
        (WIDE, {"temperature": "T", "heat_capacity": 5}),
        ("1.5 2.5\n3 4\n", {"heat_capacity_unit": "uJ/K"}),
        ("T_K,Cp_J_molK,Cp_J_molK\n1,2,3\n", {"heat_capacity": 3}),
        ("T,Cp,U (k=2)\n2,10,1\n4,20,3\n", {"heat_capacity_unit": "mJ/(mol K)"}),
        ("T_K,Cv_J_molK\n2,12.3(4)\n", {"coverage_factor": 2.0}),
        ("T_K,Cv_J_molK\n2,12.3\n", {"sigma": "1% below 100 K, 0.3% above", "mask": ((20.0, 45.0),), "quantity": "Cp"}),
    ],
)
def test_settings_reproduce_the_reading(text: str, choices: Any, tmp_path: Path) -> None:
    """The settings of a reading read the file again in the same way, to the last bit, and are themselves kept."""
    first = read_text(tmp_path, text.replace(",7\n", ",x\n"), **choices)
    again = read_measurement(first.sample_settings, (first.readings[0].settings,), base=tmp_path)
    for name in ("temperature", "heat_capacity", "sigma", "line", "quantity", "basis", "sigma_text", "readings"):
        np.testing.assert_equal(getattr(again, name), getattr(first, name))


POSITIVE = st.floats(min_value=1e-6, max_value=1e6)


@settings(suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(
    rows=st.lists(st.tuples(POSITIVE, POSITIVE, POSITIVE), min_size=1, max_size=8),
    delimiter=st.sampled_from([",", ";", "\t", " ", ", ", "   "]),
    decimal_comma=st.booleans(),
    notation=st.sampled_from(["r", ".17e", ".17g"]),
    line_end=st.sampled_from(["\n", "\r\n"]),
    bom=st.booleans(),
    comments=st.booleans(),
)
def test_any_table_reads_back(
    tmp_path: Path,
    rows: Any,
    delimiter: str,
    decimal_comma: bool,
    notation: str,
    line_end: str,
    bom: bool,
    comments: bool,
) -> None:
    """A random table, written in a random way, reads back to the same doubles."""
    decimal_comma = decimal_comma and "," not in delimiter

    def written(value: float) -> str:
        text = repr(value) if notation == "r" else format(value, notation)
        return text.replace(".", ",") if decimal_comma else text

    lines = [delimiter.join(("T_K", "Cp_J_molK", "sigma_J_molK"))]
    lines += [delimiter.join(map(written, row)) for row in rows]
    if comments:
        lines = ["# invented data", *lines, "", "# end"]
    measurement = read_text(tmp_path, ("\ufeff" if bom else "") + line_end.join(lines))
    assert measurement.sigma is not None
    found = zip(measurement.temperature, measurement.heat_capacity, measurement.sigma, strict=True)
    assert list(found) == rows
    assert not [note for note in messages(measurement) if not note.startswith("the temperatures")]


# -------------------------------------------------------------------------------------------------- reference files


def test_copper_with_its_stated_uncertainty() -> None:
    """White and Collocott's copper table is read with the uncertainty that its authors state (header of the file)."""
    run = RunSettings("copper_white_collocott_1984.csv", sigma="1% below 100 K, 0.3% above")
    copper = read_measurement(SampleSettings(formula="Cu"), (run,), base=REFERENCE)
    assert (copper.temperature.size, copper.temperature[0], copper.temperature[-1]) == (35, 1.0, 300.0)
    assert (copper.heat_capacity[0], copper.heat_capacity[-1]) == (0.000743, 24.45)
    assert copper.sigma is not None
    relative = copper.sigma / copper.heat_capacity
    assert_allclose(relative, np.where(copper.temperature < 100, 0.01, 0.003), rtol=1e-14)
    assert (copper.quantity, copper.basis, messages(copper)) == ("Cp", "mol", [])


def test_aluminium_in_calories_is_cv() -> None:
    """Giauque and Meads's column in cal/(mol K) is Cv and agrees with the file's own column in J to its rounding."""
    file = "aluminium_cv_giauque_meads_1941.csv"
    runs = [RunSettings(file, heat_capacity=name) for name in ("Cv_cal_molK", "Cv_J_molK")]
    in_cal, in_joule = (read_measurement(SampleSettings(formula="Al"), (run,), base=REFERENCE) for run in runs)
    assert in_cal.quantity == in_joule.quantity == "Cv"
    assert_allclose(in_cal.heat_capacity, in_joule.heat_capacity, rtol=0, atol=5.1e-5)
    assert in_cal.readings[0].heat_capacity_unit == "cal/(mol K)"


def test_aluminium_per_gram_becomes_molar() -> None:
    """NBS Monograph 21's J/(g K) times the molar mass is the file's third column (26.9815 g/mol) to its digits."""
    file = "aluminium_nbs_monograph_21.csv"
    runs = [RunSettings(file, heat_capacity=name) for name in ("cp_J_gK", "Cp_J_molK")]
    per_gram, molar = (read_measurement(SampleSettings(formula="Al"), (run,), base=REFERENCE) for run in runs)
    assert_allclose(per_gram.heat_capacity, molar.heat_capacity, rtol=4e-5)

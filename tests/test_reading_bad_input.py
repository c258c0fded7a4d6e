"""Every wrong file or choice is refused in one clear sentence with file, line, column and value where they exist."""

from __future__ import annotations

import os
from pathlib import Path
from typing import Any

import pytest
from helpers import REFERENCE
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from reading_helpers import read_text

from latticefit.errors import InputError
from latticefit.reading import read_measurement, text
from latticefit.records import Measurement, RunSettings, SampleSettings

GOOD = "T_K,Cp_J_molK\n1,2\n2,3\n"
GRAM = SampleSettings()

FILES = [
    # what the file is
    ("", "run.csv: the file is empty"),
    (" \n\n\t\n", "run.csv: the file is empty"),
    ("# only\n#\n", "run.csv: holds comments only, no data"),
    (b"\x7fELF\x00\x01", "run.csv: is a binary file, not text; save the table as CSV"),
    (bytes(range(1, 32)) * 9, "run.csv: is a binary file, not text; save the table as CSV"),
    (b"PK\x03\x04 xl", "run.csv: the spreadsheet is damaged (BadZipFile); save it once more, or as CSV"),
    (
        b"\xd0\xcf\x11\xe0 old",
        "run.csv: is an old binary spreadsheet or document, or one with a password; save the table as .xlsx or CSV",
    ),
    (GOOD.encode("utf-16")[:-1], "run.csv: is UTF-16 text, damaged at byte 45; save it once more as UTF-8"),
    (b"T_K\nC_\xc2\xb5J_K,\xb5\n", "run.csv: line 2: byte 0xb5 is not UTF-8 text; save the file as UTF-8"),
    (b"T_K\n\x81,\n", "run.csv: line 2: byte 0x81 is neither UTF-8 nor cp1252 text; save the file as UTF-8"),
    # what the table is
    ("one word\n", "run.csv: no column holds numbers"),
    ("T_K,Cp_J_molK\na,b\n", "run.csv: no column holds numbers"),
    ("T_K,Cp_J_molK\n", "run.csv: no column holds numbers"),
    ("Cp\n1\n2\n", "run.csv: has one column; temperature and heat capacity are needed side by side"),
    ("1\n2\n3\n", "run.csv: has one column; temperature and heat capacity are needed side by side"),
    ("1,0" + ",0" * 1001, "run.csv: line 1 has 1003 columns, more than the 1000 that are read"),
    (
        "T_K Cp_J_molK note\n1 2 ok\n2 3\n",
        "run.csv: line 3 has 2 cells where the header names 3 columns; "
        "correct it, or leave the line out by --mask-lines 3",
    ),
    (
        "T_K;Cp_J_molK\n1;2;3\n",
        "run.csv: line 2 has 3 cells where the header names 2 columns; "
        "correct it, or leave the line out by --mask-lines 2",
    ),
    (
        "T in K and C in J\n1 2\n3 4\n",
        "run.csv: line 1 has 7 words over 2 columns; separate the columns by tabs, commas or semicolons",
    ),
    # decimal commas
    (
        "T_K,Cp_J_molK\n1,5,2,25\n2,5,3,25\n",
        "run.csv: line 2 has 4 cells where the header names 2 columns, perhaps decimal commas in a comma-separated "
        "file; use decimal points, or separate the columns by semicolons or tabs and name them",
    ),
    (
        'T_K,Cp_J_molK\n1,2\n"1,5","2,25"\n',
        "run.csv: line 3: '1,5' has a decimal comma in a comma-separated file; use decimal points, or separate the "
        "columns by semicolons or tabs and name them",
    ),
    (
        "1,5,2,25\n2,5,3,25\n",
        "run.csv: line 1: it is not clear whether its commas separate columns or are decimal; use decimal points, or "
        "separate the columns by semicolons or tabs and name them",
    ),
    (
        "T_K;Cp_J_molK\n1;2,5\n2.5;3\n",
        "run.csv: decimal points and decimal commas are mixed ('2.5' in line 3, column 'T_K' and '2,5' in line 2, "
        "column 'Cp_J_molK'); write them one way",
    ),
    # cells
    (
        "T_K,Cp_J_molK\n1,2\n2,x\n",
        "run.csv: line 3, column 'Cp_J_molK': 'x' cannot be read as a number; "
        "correct it, or leave the line out by --mask-lines 3",
    ),
    (
        "T_K,Cp_J_molK\n1,2\n2,1_0\n",
        "run.csv: line 3, column 'Cp_J_molK': '1_0' cannot be read as a number; "
        "correct it, or leave the line out by --mask-lines 3",
    ),
    (
        "T_K;Cp_J_molK\n1;1.23,5\n2;3\n",
        "run.csv: line 2, column 'Cp_J_molK': '1.23,5' cannot be read as a number; "
        "correct it, or leave the line out by --mask-lines 2",
    ),
    (
        "T_K,Cp_J_molK\n1,2\n\x1b[2J,3\n",
        "run.csv: line 3, column 'T_K': '\\x1b[2J' cannot be read as a number; "
        "correct it, or leave the line out by --mask-lines 3",
    ),
    (
        "T_K,Cp_J_molK\n1,2\nT_K,Cp_J_gK\n",
        "run.csv: line 3 is a header that differs from the first; put each table into a file",
    ),
    (
        "T_K,Cp_J_molK,sigma_J_molK\n1,2,1\n2,3,0\n",
        "run.csv: line 3, column 'sigma_J_molK': sigma must be above 0, not '0'; correct or empty the cell",
    ),
    (
        "T_K,Cp_J_molK,err (%)\n1,2,1\n2,3,-1\n",
        "run.csv: line 3, column 'err (%)': sigma must be above 0, not '-1'; correct or empty the cell",
    ),
    (
        "T_K,Cp_J_molK\n1,2.0(1)\n2,3.0(0)\n",
        "run.csv: line 3, column 'Cp_J_molK': sigma must be above 0, not '3.0(0)'; correct or empty the cell",
    ),
    (
        "T_K,Cp_J_molK\n1,2.0(1)\n2,3.0\n",
        "run.csv: 1 of 2 values of 'Cp_J_molK' are written without an uncertainty, the others with one; give --sigma, "
        "or write it with all of them",
    ),
    # rows
    (
        "T_K,Cp_J_molK\n1,2\n2,nan\n-3,3\n",
        "run.csv: only 1 of 3 rows can be used; the first one left out is line 3 (no heat capacity)",
    ),
    (
        "T_K,Cp_J_molK\n-1,2\n-2,3\n",
        "run.csv: only 0 of 2 rows can be used; the first one left out is line 2 (the temperature, -1 K, is not above "
        "0 K)",
    ),
    # which column, which unit
    (
        "T_K,Cp_J_molK,Cp_J_gK\n1,2,3\n",
        "run.csv: columns 'Cp_J_molK' and 'Cp_J_gK' may each be the heat capacity; choose one by --heat-capacity",
    ),
    (
        "T_K,Temperature_K,Cp_J_molK\n1,2,3\n",
        "run.csv: columns 'T_K' and 'Temperature_K' may each be the temperature; choose one by --temperature",
    ),
    (
        "T_K,Cp_J_molK,sigma_J_molK,err (%)\n1,2,3,1\n",
        "run.csv: columns 'sigma_J_molK' and 'err (%)' may each be the sigma; choose one by --sigma",
    ),
    (
        "x,y\n1,2\n",
        "run.csv: no column is named like a temperature; choose one of 'x' and 'y' by --temperature",
    ),
    (
        "1,2,3.5\n2,3,4.5\n",
        "run.csv: no line names its 3 columns; say which is which by number, as in --temperature 1 --heat-capacity 2",
    ),
    (
        "1.5,2\n2.5,3\n",
        "run.csv: the unit of 'column 2' is not stated; write it into the header, as in 'Cp (J/(mol K))', or give "
        "--heat-capacity-unit 'J/(mol K)'",
    ),
    (
        "T_K,Cp\n1,2\n",
        "run.csv: the unit of 'Cp' is not stated; write it into the header, as in 'Cp (J/(mol K))', or give "
        "--heat-capacity-unit 'J/(mol K)'",
    ),
    (
        "T_K,Cp_J_molK,U(Cp)_J_molK\n1,2,1\n",
        "run.csv: 'U(Cp)_J_molK' reads like an expanded uncertainty; give --coverage-factor 2, or 1 if it is standard",
    ),
]


@pytest.mark.parametrize(("content", "sentence"), FILES, ids=[sentence[9:50] for _, sentence in FILES])
def test_wrong_file(content: str | bytes, sentence: str, tmp_path: Path) -> None:
    """The file is refused, and the sentence says what is wrong, where, and how to mend it."""
    with pytest.raises(InputError) as caught:
        read_text(tmp_path, content)
    assert str(caught.value) == sentence


CHOICES: list[tuple[str, dict[str, Any], str]] = [
    (GOOD, {"heat_capacity": "cp_J_molK"}, "run.csv: there is no column 'cp_J_molK' for --heat-capacity; did you mean "
     "'Cp_J_molK'?"),
    (GOOD, {"heat_capacity": "3"}, "run.csv: there is no column 3; the file has 2"),
    (GOOD, {"temperature": 0}, "run.csv: there is no column 0; the file has 2"),
    (GOOD, {"heat_capacity": 1}, "run.csv: 'T_K' looks like the temperature, but is chosen as something else"),
    (GOOD, {"temperature": 2}, "run.csv: 'Cp_J_molK' looks like the heat capacity, but is chosen as something else"),
    (GOOD, {"temperature": 2, "heat_capacity": 1}, "run.csv: 'Cp_J_molK' is in J/(mol K), which is no unit of "
     "temperature; choose another column, or give --temperature-unit"),
    (GOOD, {"temperature": 1, "heat_capacity": 1}, "run.csv: 'T_K' cannot be both temperature and heat capacity"),
    ("1.5 2\n", {"temperature": "T"}, "run.csv: there is no column 'T' for --temperature; choose by number, 1 to 2"),
    ("T_K,Cp_J_molK,Cp_J_gK\n1,2,3\n", {"heat_capacity": "Cp"},
     "run.csv: 'Cp' may be 'Cp_J_molK' and 'Cp_J_gK'; write the whole header"),
    ("T_K,Cp_J_molK,Cp_J_molK\n1,2,3\n", {"heat_capacity": "Cp_J_molK"},
     "run.csv: columns 2 and 3 are both headed 'Cp_J_molK'; choose by number"),
    (GOOD, {"heat_capacity_unit": "J/(mol k)"},
     "'J/(mol k)' is not a unit of heat capacity that latticefit knows: did you mean 'J/(mol K)'?"),
    (GOOD, {"temperature_unit": "F"},
     "'F' is not a unit of temperature that latticefit knows: known are K, degC, degF, degR and mK"),
    (GOOD, {"sigma": "sigm"}, "run.csv: --sigma 'sigm' is neither a column nor a sigma text such as '0.5%'; the "
     "columns are 'T_K' and 'Cp_J_molK'"),
    (GOOD, {"sigma": "0.5"}, "run.csv: --sigma '0.5' is no column number; for a percentage write 0.5%"),
    (GOOD, {"sigma": "3"}, "run.csv: there is no column 3; the file has 2"),
    (GOOD, {"sigma": "Cp_J_molK"}, "run.csv: 'Cp_J_molK' holds the data and cannot be their sigma"),
    ("T_K,Cp_J_molK,u_T_K\n1,2,3\n", {"sigma": 3},
     "run.csv: 'u_T_K' is in K and cannot be the sigma of a heat capacity"),
    (GOOD, {"sigma": "1% below 2 K"}, "run.csv: sigma '1% below 2 K' says nothing about 2 K; close the gap"),
    (GOOD, {"sigma": "0%"}, "run.csv: sigma '0%': '0%' must be above 0"),
    (GOOD, {"sigma": "1% 2%"}, "run.csv: sigma '1% 2%': '% 2%' is not a unit of heat capacity that latticefit knows: "
     "known are J/(g K), J/(kg K), J/(mol K), J/K, cal/(g K), cal/(mol K), mJ/(g K), mJ/(mol K), mJ/K and uJ/K"),
    (GOOD, {"sigma": "-1%"}, "run.csv: sigma '-1%': '-1%' cannot be read; write it as in '0.5%', '0.02 mJ/(mol K) + "
     "0.3%' or '1% below 100 K, 0.3% above'"),
    (GOOD, {"sigma": "0,5%"}, "run.csv: sigma '0,5%': write a decimal point; a comma separates pieces, as in '0.5%', "
     "'0.02 mJ/(mol K) + 0.3%' or '1% below 100 K, 0.3% above'"),
    (GOOD, {"sigma": "1% above"}, "run.csv: sigma '1% above': above which temperature? write it as in '0.5%', '0.02 "
     "mJ/(mol K) + 0.3%' or '1% below 100 K, 0.3% above'"),
    (GOOD, {"sigma": "1% below 9 K, 2% above 3 K"}, "run.csv: sigma '1% below 9 K, 2% above 3 K' states two values for "
     "one temperature; write it as in '0.5%', '0.02 mJ/(mol K) + 0.3%' or '1% below 100 K, 0.3% above'"),
    ("T_K,cp_J_gK\n1,2\n", {"sigma": "1 J/(mol K)", "sample": GRAM}, "run.csv: sigma is in J/(mol K) and the heat "
     "capacity in J/(g K); give --formula or --molar-mass (and --mass for a whole sample)"),
    ("T_K,C (J/(mol-atom K))\n1,2\n", {"sample": GRAM},
     "run.csv: J/(mol-atom K) is per mole of atoms; give --formula or --atoms"),
    (GOOD, {"coverage_factor": 2.0},
     "run.csv: a coverage factor is given, but no uncertainty is stated; give --sigma as well"),
    (GOOD, {"coverage_factor": 0.0, "sigma": "1%"}, "run.csv: the coverage factor must be above 0, not 0"),
    (GOOD, {"sample": SampleSettings(formula="Xx")}, "formula 'Xx': 'Xx' is not a chemical element"),
]  # fmt: skip


@pytest.mark.parametrize(
    ("content", "choices", "sentence"), CHOICES, ids=[str(choices)[:45] for _, choices, _ in CHOICES]
)
def test_wrong_choice(content: str, choices: dict[str, Any], sentence: str, tmp_path: Path) -> None:
    """A wrong option is refused with what was asked for and what there is."""
    with pytest.raises(InputError) as caught:
        read_text(tmp_path, content, **choices)
    assert str(caught.value) == sentence


def test_aluminium_with_two_columns_of_equal_claim() -> None:
    """The aluminium Cv table names the heat capacity twice and is refused with both named."""
    run = RunSettings("aluminium_cv_giauque_meads_1941.csv")
    with pytest.raises(InputError, match=r"columns 'Cv_cal_molK' and 'Cv_J_molK' may each be the heat capacity"):
        read_measurement(SampleSettings(formula="Al"), (run,), base=REFERENCE)


@pytest.mark.parametrize(
    ("name", "sentence"),
    [
        ("missing.csv", "missing.csv: there is no such file"),
        (".", ".: is a folder, not a file"),
        ("run.csv/x", "run.csv/x: the file cannot be opened (Not a directory)"),
        ("a\x00b", "'a\\x00b': the file cannot be opened (embedded null byte)"),
        ("a" * 300, "a" * 300 + ": the file cannot be opened (File name too long)"),
    ],
)
def test_what_is_no_file(name: str, sentence: str, tmp_path: Path) -> None:
    """A path that leads to no readable file is refused in words."""
    (tmp_path / "run.csv").write_text(GOOD)
    with pytest.raises(InputError) as caught:
        read_measurement(SampleSettings(), (RunSettings(name),), base=tmp_path)
    assert str(caught.value) == sentence


def test_pipe_is_refused(tmp_path: Path) -> None:
    """A named pipe is refused instead of waited for."""
    os.mkfifo(tmp_path / "pipe.csv")
    with pytest.raises(InputError, match=r"^pipe\.csv: is not a regular file; save the data to one$"):
        read_measurement(SampleSettings(), (RunSettings("pipe.csv"),), base=tmp_path)


def test_large_file_is_refused_before_it_is_read(tmp_path: Path) -> None:
    """A file over the limit is refused by its size alone (a sparse file: its bytes are not there)."""
    with (tmp_path / "big.csv").open("wb") as stream:
        stream.truncate(text.MAX_BYTES + 1_000_000)
    with pytest.raises(InputError, match=r"^big\.csv: 201 MB is more than the 200 MB that are read; thin it out$"):
        read_measurement(SampleSettings(), (RunSettings("big.csv"),), base=tmp_path)


def test_no_run_is_refused() -> None:
    """A measurement of nothing is refused."""
    with pytest.raises(InputError, match="no file is given"):
        read_measurement(SampleSettings(), ())


@pytest.mark.parametrize(
    ("first", "second", "choices", "sentence"),
    [
        (
            "T_K,Cp_J_molK\n1,2\n",
            "T_K,Cv_J_molK\n1,2\n",
            {},
            "runs 'a' and 'b' are Cp and Cv; they cannot be fitted as one",
        ),
        (
            "T_K,Cp_J_molK\n1,2\n",
            "T_K,Cp_J_gK\n1,2\n",
            {},
            "runs 'a' and 'b' are in J/(mol K) and J/(g K); give --formula or --molar-mass (and --mass) to join them",
        ),
        (
            "T_K,Cp_J_molK\n1,2\n",
            "T_K,Cp_J_molK,sigma_J_molK\n1,2,1\n",
            {},
            "runs 'a' and 'b': only one states an uncertainty; give 'a' one in a run sheet, as sigma = '1%' in its "
            "[[run]], or estimate both by --sigma scatter",
        ),
        (
            "T_K,Cp_J_molK\n1,2\n",
            "T_K,Cp_J_molK\n1,2\n",
            {"label": "x"},
            "two runs carry the label 'x'; give each its own",
        ),
    ],
)
def test_runs_that_do_not_belong_together(
    first: str, second: str, choices: dict[str, Any], sentence: str, tmp_path: Path
) -> None:
    """Runs of different quantity, basis or with half a sigma are refused with both named."""
    (tmp_path / "a.csv").write_text(first)
    (tmp_path / "b.csv").write_text(second)
    with pytest.raises(InputError) as caught:
        read_measurement(
            SampleSettings(), (RunSettings("a.csv", **choices), RunSettings("b.csv", **choices)), base=tmp_path
        )
    assert str(caught.value) == sentence


@settings(suppress_health_check=[HealthCheck.function_scoped_fixture], max_examples=200)
@given(
    place=st.integers(min_value=0, max_value=80),
    junk=st.one_of(
        st.binary(max_size=6), st.text(alphabet="0123456789.,;\t ()±e-\n#\"'%k=_/", max_size=6).map(str.encode)
    ),
    removed=st.integers(min_value=0, max_value=5),
    choices=st.sampled_from(
        [{}, {"heat_capacity_unit": "J/(mol K)"}, {"sigma": "1%"}, {"sigma": 3}, {"heat_capacity": 2}]
    ),
)
def test_damaged_file_is_read_or_refused(
    tmp_path: Path, place: int, junk: bytes, removed: int, choices: dict[str, Any]
) -> None:
    """Bytes put into or cut from a valid file give a reading of possible values or one line of words, never more."""
    good = b"# invented\nT (K);Cp (J/(mol K));U (k=2)\n1,5;2,25;0,1\n2;3,5;0,2\n3;4,5;0,3\n"
    found = read_or_sentence(tmp_path, good[:place] + junk + good[place + removed :], choices)
    if isinstance(found, str):
        assert found.isprintable()
    else:
        assert (found.temperature > 0).all()
        assert (found.heat_capacity > 0).all()


def read_or_sentence(folder: Path, content: bytes, choices: dict[str, Any]) -> Measurement | str:
    """What the reader makes of it: a measurement, or the sentence that refuses it."""
    try:
        return read_text(folder, content, **choices)
    except InputError as error:
        return str(error)

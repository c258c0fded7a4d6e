"""Rows that are set aside and files that hold several runs, beyond what the corpus shows (invented data throughout)."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from reading_helpers import messages, read_text

import latticefit
from latticefit.cli import main
from latticefit.errors import InputError
from latticefit.preparing import prepare
from latticefit.reading import division, read_measurement
from latticefit.reading.sheets import read_sheet
from latticefit.records import RunSettings, SampleSettings

TABLE = "T/K;Cp/(J/(mol K));q;U (k=2) of q\n1;2;0.5;0.1\n3;4;0.9;0.4\n5;6;1;0.6\n7;8;0.9(1);0.2\n"


@pytest.mark.parametrize(
    ("condition", "met"),
    [
        ("q < 0.9", [1]),
        ("q<=0.9", [1, 3, 7]),
        ("q > 0.9", [5]),
        ("q >=0.9", [3, 5, 7]),
        ("q \u2265 0.9", [3, 5, 7]),
        ("q \u2264 0.5", [1]),
        ("q = 0.90", [3, 7]),
        ("q == 9e-1", [3, 7]),
        ("q != 0.9", [1, 5]),
        ("q \u2260 1", [1, 3, 7]),
        ("q = '0.9'", [3]),
        ("3 > -1", [1, 3, 5, 7]),
        ("U (k=2) of q < 0.5", [1, 3, 7]),
        ("T/K >= 3", [3, 5, 7]),
    ],
)
def test_condition_keeps_the_rows_that_meet_it(condition: str, met: list[int], tmp_path: Path) -> None:
    """Every comparison, in each spelling; a quoted limit is a text; a header may hold a sign of comparison itself."""
    measurement = read_text(tmp_path, TABLE, require=(condition,))
    assert prepare(measurement).temperature.tolist() == met
    assert measurement.temperature.tolist() == [1, 3, 5, 7]


def test_all_conditions_must_be_met_and_the_first_unmet_is_the_reason(tmp_path: Path) -> None:
    """Two conditions and a masked line: each row has one reason, that of the line before those of the conditions."""
    measurement = read_text(tmp_path, TABLE, require=("q > 0.6", "q < 1"), mask_lines=((2, 2),))
    assert measurement.set_aside == ("line 2 masked", None, "q is 1, not < 1", None)
    with pytest.raises(InputError, match="together leave no row to fit"):
        read_text(tmp_path, TABLE, require=("q > 0.6", "q < 0.6"))


@pytest.mark.parametrize(
    ("condition", "words"),
    [
        ("q", "condition 'q' must be a column, one of <, <=, >, >=, =, != and a limit"),
        ("> 3", "must be a column, one of"),
        ("q =< 3", r"there is no column 'q =' for the condition"),
        ("q >= 0,5", "write the limit with a decimal point"),
        ("q > high", "'high' is no number, and a text can only be compared by = or !="),
        ("\x1b[31m = 1", r"there is no column '\\x1b\[31m' for the condition"),
    ],
)
def test_condition_that_cannot_be_followed(condition: str, words: str, tmp_path: Path) -> None:
    """What is no condition, or names no column, is refused in one printable sentence."""
    with pytest.raises(InputError, match=words) as caught:
        read_text(tmp_path, TABLE, require=(condition,))
    assert str(caught.value).isprintable()


def test_condition_is_checked_before_a_file_is_opened(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """The command line and Python refuse a text that is no condition by its option, whatever the file."""
    assert main(["fit", str(tmp_path / "none.csv"), "--require", "quality"]) == 2
    assert "--require: condition 'quality' must be a column" in capsys.readouterr().err
    with pytest.raises(InputError, match=r"^require: condition 'quality' must be a column"):
        latticefit.read(tmp_path / "none.csv", require="quality")


def test_decimal_signs_that_differ_are_refused_unless_masked(tmp_path: Path) -> None:
    """A quality with a comma beside temperatures with a point is refused; in a masked line it does not matter."""
    table = "T/K;Cp/R;q\n1.5;2.5;0.5\n2.5;3.5;0,6\n3.5;4.5;0.7\n"
    with pytest.raises(InputError, match="decimal points and decimal commas are mixed"):
        read_text(tmp_path, table, require=("q > 0.1",))
    assert read_text(tmp_path, table, require=("q > 0.1",), mask_lines=((3, 3),)).set_aside[1] == "line 3 masked"


def test_row_that_is_set_aside_need_not_be_usable(tmp_path: Path) -> None:
    """A masked row with a sigma of 0, no number or a comma is left out with its line; it is not counted as a loss."""
    table = "T/K;Cp/R;sigma/R\n1.5;1;0.1\n2.5;2;0\n3.5;3;ERR\n4,5;4;0.1\n5.5;ERR;0.1\n6.5;6;0.1\n"
    measurement = read_text(tmp_path, table, mask_lines=((3, 6),))
    assert measurement.temperature.tolist() == [1.5, 6.5]
    assert [each.reason for each in measurement.excluded] == [
        "line 3 masked; sigma is not above 0",
        "line 4 masked; no sigma",
        "line 5 masked; no temperature",
        "line 6 masked; no heat capacity",
    ]


def test_line_numbers_end_with_the_file(tmp_path: Path) -> None:
    """The last line can be masked with and without a line end; the one after it is refused."""
    for end in ("", "\n"):
        table = f"T_K,Cp_J_molK\n1,2\n3,4{end}"
        assert read_text(tmp_path, table, mask_lines=((3, 3),)).set_aside == (None, "line 3 masked")
        with pytest.raises(InputError, match="there is no line 4 to mask; the last one is 3"):
            read_text(tmp_path, table, mask_lines=((3, 4),))


def test_masked_intervals_may_overlap_and_miss_the_rows(tmp_path: Path) -> None:
    """Both ends of an interval are masked, rows in two of them counted in each, and lines without a row in none."""
    lines = ((5, 6), (6, 7), (1, 3))
    measurement = read_text(
        tmp_path, "# a\n# b\nT/K,Cp/R\n" + "".join(f"{k},1\n" for k in range(4, 10)), mask_lines=lines
    )
    assert measurement.set_aside == (None, *(f"line {k} masked" for k in (5, 6, 7)), None, None)
    assert [each for each in messages(measurement) if "masked by" in each] == [
        "2 rows masked by lines 5:6", "2 rows masked by lines 6:7", "no row masked by lines 1:3",
    ]  # fmt: skip


def test_pair_of_lines_is_an_interval(tmp_path: Path) -> None:
    """From Python (2, 4) are three lines, as windows are; [2, 4] are two; three numbers in brackets are refused."""
    (tmp_path / "run.csv").write_text(TABLE, encoding="utf-8")
    for given, lines in (
        ((2, 4), [2, 3, 4]),
        ([2, 4], [2, 4]),
        ("2:4", [2, 3, 4]),
        (3, [3]),
        ([(2, 3), "5"], [2, 3, 5]),
    ):
        measured = latticefit.read(tmp_path / "run.csv", mask_lines=given)  # type: ignore[arg-type]
        found = [line for line, why in zip(measured.line, measured.set_aside, strict=True) if why]
        assert found == lines
    with pytest.raises(InputError, match="mask_lines must be a text such as"):
        latticefit.read(tmp_path / "run.csv", mask_lines=(2, 3, 4))


def test_windows_and_what_is_set_aside_in_one_list_of_reasons(tmp_path: Path) -> None:
    """A point that is set aside keeps that reason; the others have those of their run's windows."""
    measurement = read_text(tmp_path, TABLE, require=("q < 1",), window=((2.0, 9.0),))
    assert prepare(measurement).reasons == ("outside window 2-9 K", None, "q is 1, not < 1", None)


def test_order_is_judged_run_by_run(tmp_path: Path) -> None:
    """Two runs that rise are in order, although the temperature falls where the second begins."""
    table = "T/K,Cp/R,B\n1,1,0\n2,2,0\n1,1,5\n2,2,5\n1.5,1.5,5\n"
    whole = messages(read_text(tmp_path, table))
    assert whole == ["the temperatures are not in order: 2 falls, the first in line 4"]
    parts = messages(read_text(tmp_path, table, split_by="B"))
    assert "B = 5: the temperatures are not in order: 1 fall, the first in line 6" in parts
    assert not [each for each in parts if "2 falls" in each]


def test_runs_of_one_file_share_path_and_settings(tmp_path: Path) -> None:
    """They differ in label and rows; no note says that two files are the same, and left-out rows go to their run."""
    table = "T/K,Cp/R,B\n1,1,0\n2,2,5\n3,nan,5\n4,4,0\n"
    measurement = read_text(tmp_path, table, split_by="B")
    first, second = measurement.readings
    assert (first.path, first.sha256, first.settings) == (second.path, second.sha256, second.settings)
    assert (first.rows, second.rows) == (2, 2)
    assert first.settings.label == "run"
    assert measurement.run.tolist() == [0, 1, 0]
    assert [each.run for each in measurement.excluded] == [1]
    assert not [each for each in messages(measurement) if "byte for byte" in each]


def test_several_files_that_are_divided(tmp_path: Path) -> None:
    """Runs are counted on from file to file, and labels from a column carry their file's label then."""
    for name in ("a.csv", "b.csv"):
        (tmp_path / name).write_text("T/K,Cp/R,run\n1,1,up\n2,nan,down\n3,3,down\n", encoding="utf-8")
    runs = tuple(RunSettings(name, split_by="run") for name in ("a.csv", "b.csv"))
    measurement = read_measurement(SampleSettings(), runs, base=tmp_path)
    assert [each.label for each in measurement.readings] == ["a, up", "a, down", "b, up", "b, down"]
    assert measurement.run.tolist() == [0, 1, 2, 3]
    assert [each.run for each in measurement.excluded] == [1, 3]
    clash = (*runs[:1], RunSettings("b.csv", label="a, up"))
    with pytest.raises(InputError, match="two runs would carry the label 'a, up'"):
        read_measurement(SampleSettings(), clash, base=tmp_path)


def test_too_many_runs_are_refused(tmp_path: Path) -> None:
    """More values than runs can have, be they texts, are no names of runs."""
    rows = "".join(f"{k},1,r{k}x\n" for k in range(1, division.MAX_RUNS + 2))
    with pytest.raises(InputError, match="'run' has 201 values in 201 rows, which looks like a measured quantity"):
        read_text(tmp_path, "T/K,Cp/R,run\n" + rows, split_by="run")
    series = [f"Series {k}\n{k},1\n" for k in range(1, division.MAX_RUNS + 2)]
    with pytest.raises(InputError, match="begin a series divide it into 201 runs, more than the 200 of a file; divide"):
        read_text(tmp_path, "T/K,Cp/R\n" + "".join(series), split_by="series")
    assert len(read_text(tmp_path, "T/K,Cp/R\n" + "".join(series[:-1]), split_by="series").readings) == 200


def test_rows_above_the_first_series(tmp_path: Path) -> None:
    """Rows that stand above the first line of a series are a run of their own; a column of that name goes first."""
    table = "T/K;Cp/R\n1;1\nSeries 2\n3;3\n"
    assert [each.label for each in read_text(tmp_path, table, split_by="series").readings] == [
        "run, above Series 2",
        "run, Series 2",
    ]
    table = "T/K;Cp/R;Series\n1;1;x\nSeries 2\n3;3;y\n"
    labels = [each.label for each in read_text(tmp_path, table, split_by="Series").readings]
    assert labels == ["run, Series = x", "run, Series = y"]


def test_label_with_control_characters_stays_harmless(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A label from a file is shown with its control characters escaped."""
    (tmp_path / "run.csv").write_text("T/K,Cp/R,run\n1,1,a\x1b[31m\n2,2,b\n", encoding="utf-8")
    with pytest.raises(InputError) as caught:
        latticefit.read(tmp_path / "run.csv", split_by="\x1b[31m")
    measurement = latticefit.read(tmp_path / "run.csv", split_by="run")
    assert str(caught.value).isprintable()
    assert all(each.isprintable() for each in messages(measurement))
    assert measurement.readings[0].label == "a\x1b[31m"


def test_report_of_a_divided_file_is_reproduced_by_its_sheet(tmp_path: Path) -> None:
    """One [[run]] and one copy of the file; fitting the sheet gives the same points, labels, reasons and parameters."""
    from latticefit.models import build_model, heat_capacity
    from latticefit.report import residuals_csv

    T = np.geomspace(20, 300, 15)
    C = heat_capacity(build_model("debye"), T, np.array([320.0, 3.0]))
    rows = [
        f"{t!r};{c!r};{k % 5};{field}"
        for field in ("0", "5")
        for k, (t, c) in enumerate(zip(T.tolist(), C.tolist(), strict=True))
    ]
    (tmp_path / "fields.csv").write_text("T_K;Cp_J_molK;q;B (T)\n" + "\n".join(rows) + "\n", encoding="utf-8")
    how = {"formula": "Cu", "sigma": "1%", "split_by": "B (T)", "require": "q != 4", "mask_lines": (3, 5)}
    measured = latticefit.read(tmp_path / "fields.csv", **how)
    fit = latticefit.fit(measured, "debye")
    out = fit.save(tmp_path / "out", figures="none")
    sheet = read_sheet(out / "run_sheet.toml")
    assert len(sheet.runs) == 1
    assert [each.name for each in (out / "inputs").iterdir()] == ["fields.csv"]
    again = latticefit.fit(read_measurement(sheet.sample, sheet.runs, out), "debye")
    assert [each.label for each in again.analysis.measurement.readings] == [
        "fields, B (T) = 0",
        "fields, B (T) = 5",
    ]
    text = residuals_csv(fit.analysis)
    assert residuals_csv(again.analysis).replace("inputs/", "") == text.replace(f"{tmp_path}/", "")
    assert all(f"line {k} masked" in text for k in (3, 4, 5))
    assert "\"q is 4, which the condition 'q != 4' leaves out\"" in text
    assert main(["fit", str(out / "run_sheet.toml"), "--out", str(tmp_path / "out2"), "--figures", "none"]) == 0
    assert (tmp_path / "out2" / "run_sheet.toml").read_bytes() == (out / "run_sheet.toml").read_bytes()

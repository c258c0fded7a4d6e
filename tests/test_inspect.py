"""The inspect command: one screen a file, the record of the contract, and the sheet that repeats the reading."""

from __future__ import annotations

import json
import tomllib
from pathlib import Path

import numpy as np
import pytest
from helpers import DEMO
from reading_helpers import read_text

import latticefit as lf
from latticefit.cli import main
from latticefit.diagnosing import examination, level
from latticefit.preparing import prepare
from latticefit.records import Measurement, PreparedData
from latticefit.report.inspection import inspection_record, inspection_text

TRUTH = tomllib.loads((DEMO / "truth.toml").read_text(encoding="utf-8"))


@pytest.mark.parametrize("file", sorted(each.name for each in DEMO.glob("*.csv")))
def test_each_demo_file_is_inspected_on_one_screen(file: str, capsys: pytest.CaptureFixture[str]) -> None:
    """At most 36 lines of 80 columns say how it was read, points, spread, repeats, outliers, features and level."""
    facts = TRUTH[file.partition("_")[0].removesuffix(".csv")]
    mass = ["--mass", f"{facts['mass_mg']} mg"] if "mass_mg" in facts else []
    assert main(["inspect", str(DEMO / file), "--formula", facts["formula"], *mass]) == 0
    lines = capsys.readouterr().out.splitlines()
    assert len(lines) <= 36
    assert max(map(len, lines)) <= 80
    labels = [line[2:13].strip() for line in lines if line[2:3].strip() and not line[2:3].isdigit()]
    for label in ("written", "temperature", "Cp", "sigma", "points", "spread", "repeats", "outliers", "level"):
        assert label in labels


def test_the_record_holds_the_arrays_of_the_contract(capsys: pytest.CaptureFixture[str]) -> None:
    """inspect --json: file, encoding, delimiter, decimal, columns, unit, points, repairs, warnings and the arrays."""
    assert main(["inspect", str(DEMO / "halvite.csv"), "--formula", "NeKr", "--json"]) == 0
    (record,) = json.loads(capsys.readouterr().out)["files"]
    data = lf.read(DEMO / "halvite.csv", formula="NeKr")
    assert record["columns"] == {"temperature": "T_K", "heat_capacity": "Cp_J_molK", "sigma": "sigma_J_molK"}
    assert (record["encoding"], record["delimiter"], record["decimal"]) == ("UTF-8", ",", ".")
    assert record["points"] == data.temperature.size
    assert record["measurement"]["temperature_K"] == data.temperature.tolist()
    assert record["measurement"]["heat_capacity_J_mol_K"] == data.heat_capacity.tolist()
    assert record["measurement"]["sigma_J_mol_K"] == data.sigma.tolist()
    assert record["warnings"] == []


def test_gaps_repeats_outliers_and_features_are_shown(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A gap, a set of repeats, a glitch and a peak of an invented table stand in the record and in the text."""
    lines = (DEMO / "halvite.csv").read_text(encoding="utf-8").splitlines()
    header, rows = lines[:4], [[float(cell) for cell in line.split(",")] for line in lines[4:]]
    kept = [row for row in rows if not 60 < row[0] < 80]
    kept[20][1] *= 1.08  # the glitch
    for row in kept:
        if 111 < row[0] < 141:
            row[1] *= 1 + 0.2 * max(0.0, 1 - abs(row[0] - 126) / 15)  # the peak
    table = [",".join(map(repr, row)) for row in kept]
    path = tmp_path / "peak.csv"
    path.write_text("\n".join([*header, *table]), encoding="utf-8")
    assert main(["inspect", str(path), "--formula", "NeKr", "--json"]) == 0
    (record,) = json.loads(capsys.readouterr().out)["files"]
    gaps = [gap for decade in record["decades"] for gap in decade["gaps_K"]]
    assert any(gap[0] < 62 and gap[1] > 78 for gap in gaps)
    assert [each["kind"] for each in record["features"]] == ["peak"]
    assert record["features"][0]["temperature_K"] == pytest.approx(126, abs=6)
    assert any(words.startswith("outlier: line 25") for words in record["warnings"])
    assert main(["inspect", str(path), "--formula", "NeKr"]) == 0
    text = " ".join(capsys.readouterr().out.split())
    assert "peak at" in text
    assert "(none from" in text


def test_a_saved_sheet_repeats_the_reading(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """--save-sheet writes NAME_sheet.toml with all that was recognised; the fit of it is that of the options."""
    path = tmp_path / "run.csv"
    path.write_bytes((DEMO / "sjelite.csv").read_bytes())
    formula = TRUTH["sjelite"]["formula"]
    options = ["--formula", formula, "--window", "3:300", "--mask-lines", "10:12", "--accept-level"]
    assert main(["inspect", str(path), *options, "--save-sheet"]) == 0
    sheet = tomllib.loads((tmp_path / "run_sheet.toml").read_text(encoding="utf-8"))
    assert sheet["sample"] == {"formula": formula, "accept_level": True}
    assert sheet["run"][0]["file"] == "run.csv"
    assert sheet["run"][0]["temperature"] == "T [K]"
    assert sheet["run"][0]["heat_capacity_unit"] == "J/(g K)"
    assert sheet["run"][0]["mask_lines"] == ["10:12"]
    capsys.readouterr()
    assert main(["inspect", str(tmp_path / "run_sheet.toml"), "--json"]) == 0
    again = json.loads(capsys.readouterr().out)["files"][0]
    assert main(["inspect", str(path), *options, "--json"]) == 0
    first = json.loads(capsys.readouterr().out)["files"][0]
    assert again | {"file": ""} == first | {"file": ""} | {
        "repairs": [each | {"file": "run.csv"} for each in first["repairs"]]
    }


def test_a_saved_sheet_is_not_overwritten_and_stays_with_its_files(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """An existing sheet, a file outside its folder and a sheet of a sheet are refused with exit code 2."""
    (tmp_path / "a").mkdir()
    for name in ("a/run.csv", "b.csv"):
        (tmp_path / name).write_bytes((DEMO / "halvite.csv").read_bytes())
    first = str(tmp_path / "a" / "run.csv")
    assert main(["inspect", first, str(tmp_path / "b.csv"), "--formula", "NeKr", "--save-sheet"]) == 2
    assert "lies outside" in capsys.readouterr().err
    assert not (tmp_path / "a" / "run_sheet.toml").exists()
    assert main(["inspect", first, "--formula", "NeKr", "--save-sheet"]) == 0
    capsys.readouterr()
    assert main(["inspect", first, "--formula", "NeKr", "--save-sheet"]) == 2
    assert "exists already and is not overwritten" in capsys.readouterr().err
    assert main(["inspect", str(tmp_path / "a" / "run_sheet.toml"), "--save-sheet"]) == 2
    assert "a run sheet was given" in capsys.readouterr().err


def test_runs_that_overlap_are_compared(capsys: pytest.CaptureFixture[str]) -> None:
    """Two files of one sample: a line with the ratio, its u and the range; a record in --json."""
    files = [str(DEMO / "grannese_warm.csv"), str(DEMO / "grannese_cold.csv")]
    options = ["--formula", "HeNeAr", "--mass", "4.8 mg"]
    assert main(["inspect", *files, *options, "--json"]) == 0
    record = json.loads(capsys.readouterr().out)
    assert [each["file"] for each in record["files"]] == files
    (overlap,) = record["overlaps"]
    assert overlap["ratio"] == pytest.approx(1 / 1.025, abs=4 * overlap["u"])
    assert main(["inspect", *files, *options]) == 0
    assert "grannese_warm / grannese_cold = 0.97" in capsys.readouterr().out


@pytest.fixture
def repeats(tmp_path: Path) -> str:
    """Thirty sets of three repeats, 2 to 300 K (invented data)."""
    T = np.geomspace(2.0, 300.0, 30)
    rows = [f"{t * (1 + 0.0002 * k):.6g},{20 * t**3 / (t**3 + 5e4) * (1 + 0.002 * k):.6g}" for t in T for k in range(3)]
    path = tmp_path / "repeats.csv"
    path.write_text("# invented data\nT_K,Cp_J_molK\n" + "\n".join(rows), encoding="utf-8")
    return str(path)


@pytest.mark.parametrize(
    ("options", "words"),
    [
        (["--window", "50:100"], "12 to be fitted (78 outside window 50-100 K)"),
        (
            ["--formula", "Ne", "--replicates", "average", "--window", "50:100"],
            "4 to be fitted (78 outside window 50-100 K; 12 averaged into the means of 4 sets)",
        ),
        (["--replicates", "average"], "30 to be fitted (90 averaged into the means of 30 sets)"),
        (
            ["--formula", "Ne", "--replicates", "drop-first"],
            "60 to be fitted (30 first of their sets, dropped as asked)",
        ),
        (["--mask", "50:100"], "78 to be fitted (12 masked 50-100 K)"),
        (["--window", "400:500"], "none to be fitted (90 outside window 400-500 K)"),
    ],
    ids=["window", "averaged in a window", "averaged", "dropped", "mask", "none left"],
)
def test_points_that_will_not_be_fitted_are_counted(
    repeats: str, options: list[str], words: str, capsys: pytest.CaptureFixture[str]
) -> None:
    """Windows, masks and repeats show their effect, with a formula or without, and where no point is left."""
    assert main(["inspect", repeats, *options]) == 0
    text = " ".join(capsys.readouterr().out.split())
    assert f"90 of 90 rows, 2 to 300.1 K; {words}" in text


def test_a_file_is_prepared_once(monkeypatch: pytest.MonkeyPatch, repeats: str) -> None:
    """One preparation serves the screen, the level and the overlaps of runs."""
    calls: list[Measurement] = []

    def counted(measurement: Measurement) -> PreparedData:
        calls.append(measurement)
        return prepare(measurement)

    monkeypatch.setattr(examination, "prepare", counted)
    monkeypatch.setattr(level, "prepare", counted)
    assert main(["inspect", repeats, "--formula", "Ne"]) == 0
    assert len(calls) == 1


def test_columns_that_were_not_used_are_listed(tmp_path: Path) -> None:
    """JSON lists every column that nothing was taken from; the screen names one that looks like an uncertainty."""
    header = "T/K,Cp/(J/(mol K)),s/(J/(mol K)),remark,quality"
    rows = "".join(f"{10 * k},{k},0.1,ok,1\n" for k in range(1, 7))
    found = read_text(tmp_path, f"{header}\n{rows}", require=("quality >= 0.9",))
    assert inspection_record(found, examination.examine(found))["unused_columns"] == ["s/(J/(mol K))", "remark"]
    assert "not used    s/(J/(mol K))\n" in inspection_text(found, examination.examine(found))
    plain = read_text(tmp_path, "T/K,Cp/(J/(mol K)),remark\n1,2,a\n2,3,b\n")
    assert "  not used  " not in inspection_text(plain, examination.examine(plain))

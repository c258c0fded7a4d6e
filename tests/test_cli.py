"""The command line as a person meets it: exit codes, one sentence per mistake, nothing half-written."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest
from helpers import DEMO, REFERENCE, ROOT

from latticefit.cli import COMMANDS, main

COPPER = str(REFERENCE / "copper_white_collocott_1984.csv")
FIT = ["fit", COPPER, "--formula", "Cu", "--terms", "debye + einstein + electronic", "--cp-cv", "nernst-lindemann"]
SIGMA = ["--sigma", "1% below 100 K, 0.3% above"]


def run(*words: str, folder: Path) -> subprocess.CompletedProcess[str]:
    """Run the command as its own process in a folder, so that exit code and streams are the real ones."""
    environment = {**os.environ, "PYTHONWARNINGS": "error"}
    return subprocess.run(
        [sys.executable, "-m", "latticefit", *words],
        capture_output=True,
        text=True,
        cwd=folder,
        env=environment,
        check=False,
        stdin=subprocess.DEVNULL,
    )


@pytest.fixture(scope="module")
def copper(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The report folder of the acceptance command."""
    folder = tmp_path_factory.mktemp("copper")
    done = run(*FIT, *SIGMA, "--out", "cu", folder=folder)
    assert done.returncode == 0, done.stderr
    return folder / "cu"


def record(folder: Path) -> dict:  # type: ignore[type-arg]
    return json.loads((folder / "result.json").read_text(encoding="utf-8"))


@pytest.mark.slow
def test_copper_acceptance(copper: Path) -> None:
    """The acceptance command gives CODATA's S and H, Martin's theta and gamma, and chi2 below 1 in result.json."""
    found = record(copper)
    row = next(each for each in found["thermodynamic_functions"] if each["temperature_K"] == 298.15)
    assert row["entropy_J_mol_K"] == pytest.approx(33.15, abs=0.05)  # CODATA 1989
    assert row["enthalpy_J_mol"] == pytest.approx(5004, abs=8)  # CODATA 1989
    theta = found["characteristic_temperatures"]["theta_debye_low_temperature"]
    assert theta["value"] == pytest.approx(344.3, rel=0.01)  # Martin 1973
    assert found["parameters"]["electronic_gamma"]["value"] == pytest.approx(0.691e-3, rel=0.015)  # Martin 1973
    assert found["fit"]["reduced_chi_square"] < 1
    assert sorted(each.name for each in copper.iterdir()) == [
        "figures",
        "inputs",
        "report.html",
        "report.txt",
        "residuals.csv",
        "result.json",
        "run_sheet.toml",
        "table.csv",
    ]


@pytest.mark.slow
def test_the_sheet_of_a_report_gives_the_same_numbers_even_when_moved(copper: Path, tmp_path: Path) -> None:
    """A moved report folder repeats itself from its own run sheet, number for number."""
    moved = tmp_path / "elsewhere"
    copper.rename(moved)
    try:
        done = run("fit", "elsewhere/run_sheet.toml", "--out", "again", folder=tmp_path)
        assert done.returncode == 0, done.stderr
        first, second = record(moved), record(tmp_path / "again")
        for each in (first, second):
            each["provenance"].pop("created")
            each["provenance"].pop("command")
            for source in each["data"]["sources"]:
                source["file"] = Path(source["file"]).name  # the copy stands in inputs/
        assert first == second
    finally:
        moved.rename(copper)


@pytest.mark.slow
def test_json_goes_to_stdout_alone_and_writes_nothing(tmp_path: Path) -> None:
    """--json prints one JSON record on stdout, notes go to stderr, and no folder is made."""
    done = run(*FIT, *SIGMA, "--json", folder=tmp_path)
    assert done.returncode == 0
    assert json.loads(done.stdout)["schema"] == "latticefit-result/1"
    assert list(tmp_path.iterdir()) == []
    quiet = run(*FIT, *SIGMA, "--json", "--quiet", folder=tmp_path)
    assert quiet.stderr == ""


@pytest.mark.slow
def test_default_folder_is_named_after_the_file_and_not_overwritten(tmp_path: Path) -> None:
    """The report lands in NAME_latticefit; a second run is refused, and replaces it only when asked."""
    words = ["fit", str(DEMO / "norrium.csv"), "--atoms", "1", "--terms", "debye", "--figures", "none", "--quiet"]
    assert run(*words, folder=tmp_path).returncode == 0
    folder = tmp_path / "norrium_latticefit"
    before = (folder / "result.json").read_bytes()
    refused = run(*words, folder=tmp_path)
    assert refused.returncode == 2
    assert "--replace" in refused.stderr
    assert (folder / "result.json").read_bytes() == before
    assert run(*words, "--replace", folder=tmp_path).returncode == 0


BAD = {
    "no file": (["fit", "nothing.csv", "--terms", "debye"], "there is no such file"),
    "no words": (["fit"], "required"),
    "electrons in an insulator": (
        ["fit", COPPER, "--formula", "Cu", "--insulator", "--terms", "debye + electronic"],
        "declared an insulator",
    ),
    "strange parameter in the ladder": (
        ["fit", COPPER, "--formula", "Cu", "--fix", "electronic_gama=7e-4"],
        "did you mean 'electronic_gamma'",
    ),
    "u of a free parameter": (
        ["fit", COPPER, "--formula", "Cu", "--terms", "debye", "--fix-u", "debye_theta=3"],
        "not fixed",
    ),
    "no saved result": (["table", "nothing.json"], "no such file"),
    "table of something else": (["table", COPPER], "not JSON"),
    "bad amount": (["table", "nothing.json", "--per", "lb"], "--per cannot be 'lb'"),
    "bad pair": (["table", "nothing.json", "--between", "77:4"], "77:4"),
    "terms for rank": (["rank", COPPER, "--terms", "debye"], "has no option '--terms'"),
    "unknown command": (["fti"], "did you mean 'fit'"),
    "unknown option": (["fit", COPPER, "--trems", "debye"], "did you mean '--terms'"),
    "later option": (
        ["fit", COPPER, "--terms", "debye", "--scale-uncertainty", "0.5%"],
        "--scale-uncertainty is not available in this version",
    ),
    "later command": (["excess", COPPER], "the command excess is not available in this version"),
    "empty value": (["fit", COPPER, "--terms", "debye", "--temperature", ""], "--temperature must be a header"),
    "negative coverage": (["fit", COPPER, "--terms", "debye", "--coverage-factor", "-2"], "must be above 0"),
    "huge atoms": (["fit", COPPER, "--terms", "debye", "--atoms", "1e999"], "--atoms must be a number, not inf"),
    "no column of that number": (["fit", COPPER, "--terms", "debye", "--temperature", "9"], "there is no column 9"),
    "shortened option": (["fit", COPPER, "--term", "debye"], "did you mean '--terms'"),
    "missing value": (["fit", COPPER, "--terms"], "--terms needs a value"),
    "unknown term": (["fit", COPPER, "--terms", "debye + einstien"], "did you mean 'einstein'"),
    "unknown form": (["fit", COPPER, "--terms", "debye", "--cp-cv", "nernst"], "did you mean 'nernst-lindemann'"),
    "unknown formula": (["fit", COPPER, "--formula", "Xx2O", "--terms", "debye"], "Xx2O"),
    "unknown unit": (["fit", COPPER, "--terms", "debye", "--heat-capacity-unit", "J/(mol Q)"], "J/\\(mol Q\\)"),
    "unknown column": (["fit", COPPER, "--terms", "debye", "--heat-capacity", "Cp_J_mol"], "Cp_J_molK"),
    "bad quantity": (["fit", COPPER, "--terms", "debye", "--quantity", "Cq"], "--quantity cannot be 'Cq'"),
    "bad mode sum": (["fit", COPPER, "--terms", "debye", "--mode-sum", "fix"], "did you mean 'fixed'"),
    "bad figures": (["fit", COPPER, "--formula", "Cu", "--terms", "debye", "--figures", "pgn"], "did you mean 'png'"),
    "bad seed": (["fit", COPPER, "--terms", "debye", "--random-seed", "x"], "whole number"),
    "bad atoms": (["fit", COPPER, "--terms", "debye", "--atoms", "two"], "--atoms needs a number"),
    "bad window": (["fit", COPPER, "--formula", "Cu", "--terms", "debye", "--window", "2-300"], "2-300"),
    "bad grid": (["fit", COPPER, "--formula", "Cu", "--terms", "debye", "--grid", "1:x:2"], "1:x:2"),
    "bad start": (["fit", COPPER, "--formula", "Cu", "--terms", "debye", "--start", "theta"], "NAME=VALUE"),
    "unknown parameter": (
        ["fit", COPPER, "--formula", "Cu", "--terms", "debye", "--fix", "debye_thteta=300"],
        "did you mean 'debye_theta'",
    ),
    "named twice": (
        ["fit", COPPER, "--terms", "debye", "--fix", "debye_theta=300", "--fix", "debye_theta=301"],
        "twice",
    ),
    "all masked": (["fit", COPPER, "--formula", "Cu", "--terms", "debye", "--mask", "0.1:400"], "mask"),
    "too few points": (
        ["fit", COPPER, "--formula", "Cu", "--terms", "debye + einstein + electronic", "--window", "1:2"],
        "too few",
    ),
    "Cp-Cv of Cv": (
        ["fit", COPPER, "--formula", "Cu", "--terms", "debye", "--quantity", "Cv", "--cp-cv", "anharmonic"],
        "the data are Cv",
    ),
    "fixed sum without atoms": (
        ["fit", COPPER, "--molar-mass", "63.5 g/mol", "--terms", "debye", "--mode-sum", "fixed"],
        "atoms",
    ),
    "missing sheet": (["fit", "nothing.toml"], "there is no such file"),
    "folder": (["fit", str(ROOT), "--terms", "debye"], "folder|directory"),
    "unwritable parent": (
        ["fit", COPPER, "--formula", "Cu", "--terms", "debye", "--out", "no/such/place"],
        "does not exist",
    ),
}


@pytest.mark.parametrize("case", BAD)
def test_mistakes_get_one_sentence_and_exit_code_2(
    case: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """Every mistake ends with exit code 2 and one sentence on stderr, and nothing is written."""
    words, said = BAD[case]
    monkeypatch.chdir(tmp_path)
    code = main(words)
    out, err = capsys.readouterr()
    last = err.strip().splitlines()[-1]
    assert code == 2
    assert last.startswith("latticefit: ")
    import re

    assert re.search(said, last), last
    assert "Traceback" not in err
    assert out == ""
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("[model]\nterms = 'debye'\n", r"\[\[run\]\]"),
        ("[run]\nfile = 'a.csv'\n", r"\[\[run\]\]"),
        ("[[run]]\nfile = 'a.csv'\nsigam = '1%'\n", "sigma"),
        ("[[run]]\nfile = '../a.csv'\n", "--allow-outside"),
        ("[[run]]\nfile = 'a.csv'\n[model]\nterms = 3\n", "terms"),
        ("[[run]\n", "TOML"),
        ("[[run]]\nfile = 'a.csv'\n[sample]\ndensity = '3 g/cm3'\n", "not available in this version"),
    ],
)
def test_wrong_sheets_are_refused(
    text: str, words: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """A wrong run sheet is refused with the key and how to mend it."""
    import re

    monkeypatch.chdir(tmp_path)
    Path("sheet.toml").write_text(text)
    assert main(["fit", "sheet.toml"]) == 2
    said = capsys.readouterr().err.strip()
    assert re.search(words, said), said
    assert len(said.splitlines()) == 1


@pytest.mark.parametrize(
    ("model", "words"),
    [
        ("terms = 'debey'", "did you mean 'debye'"),
        ("terms = 'debye'\ncp_cv = 'nernst'", "did you mean 'nernst-lindemann'"),
        ("terms = 'debye'\n[model.fix]\ndebye_thteta = 300", "did you mean 'debye_theta'"),
        ("terms = 'debye'\n[model.bounds]\neinstein_theta = [1, 2]", "bounds names 'einstein_theta'"),
    ],
)
def test_the_model_of_a_sheet_is_checked_before_its_files_are_read(
    model: str, words: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """A wrong term, form or parameter name is told first: the file of the sheet need not even exist."""
    monkeypatch.chdir(tmp_path)
    Path("sheet.toml").write_text(f"[[run]]\nfile = 'missing.csv'\n[model]\n{model}\n")
    assert main(["fit", "sheet.toml"]) == 2
    assert words in capsys.readouterr().err


@pytest.mark.parametrize(
    ("words", "noted"),
    [
        (["--cp-cv", "none"], True),
        (["--cp-cv", "anharmonic"], True),
        (["--cp-cv", "nernst-lindemann"], False),
        (["--cp-cv", "nernst-lindemann", "--fix", "nernst_lindemann_coefficient=1e-6"], True),
        (["--quiet"], False),
    ],
)
def test_a_melting_point_without_use_is_noted(
    words: list[str], noted: bool, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """A melting point that the model has no place for is not dropped in silence."""
    monkeypatch.chdir(tmp_path)
    assert main(["fit", "missing.csv", "--terms", "debye", "--melting-point", "1358 K", *words]) == 2
    assert ("the melting point is not used" in capsys.readouterr().err) is noted


def test_a_header_of_digits_stands_above_the_number(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A COLUMN that is the exact header of one column is that column, also when it reads as a number."""
    (tmp_path / "a.csv").write_text("# invented data\nT_K,Cp_J_molK,2\n10,1,5\n20,2,6\n30,3,7\n")
    words = ["inspect", str(tmp_path / "a.csv"), "--heat-capacity-unit", "J/(mol K)", "--json"]
    for column, header in (("2", "2"), ("3", "2"), ("Cp_J_molK", "Cp_J_molK")):
        assert main([*words, "--heat-capacity", column]) == 0
        assert json.loads(capsys.readouterr().out)["files"][0]["columns"]["heat_capacity"] == header


@pytest.mark.parametrize("encoding", ["ascii", "cp1252"])
def test_any_encoding_of_the_terminal_will_do(encoding: str, tmp_path: Path) -> None:
    """What a terminal cannot encode is shown as an escape, never a traceback; JSON stays JSON."""
    name = "θ±\x81.csv"
    (tmp_path / name).write_text("# invented data\nT_K,Cp_J_molK\n10,1\n20,2\n30,3\n")
    for words, code in ((["inspect", name], 0), (["inspect", name, "--json"], 0), (["θ"], 2), (["verify"], 0)):
        done = subprocess.run(
            [sys.executable, "-m", "latticefit", *words],
            capture_output=True,
            cwd=tmp_path,
            env={**os.environ, "PYTHONIOENCODING": encoding, "PYTHONWARNINGS": "error"},
            check=False,
        )
        assert done.returncode == code, done.stderr
        assert b"Traceback" not in done.stderr
        if "--json" in words:
            assert json.loads(done.stdout.decode(encoding))["files"][0]["file"] == name
        elif "inspect" in words:
            assert done.stdout.startswith(b"\\u03b8")
        elif code:
            assert b"\\u03b8" in done.stderr


def test_options_beside_a_sheet_are_refused_not_ignored(capsys: pytest.CaptureFixture[str]) -> None:
    """A model option beside a sheet is refused: it stands in the sheet."""
    assert main(["fit", "sheet.toml", "--terms", "debye"]) == 2
    assert "write it into the sheet" in capsys.readouterr().err


@pytest.mark.slow
def test_an_interrupted_run_leaves_nothing(tmp_path: Path) -> None:
    """Ctrl-C at any moment leaves no half report and no stray folder."""
    for delay in (0.8, 1.6, 2.0, 2.3):
        process = subprocess.Popen(
            [sys.executable, "-m", "latticefit", *FIT, *SIGMA, "--out", "cu", "--figures", "all"],
            cwd=tmp_path,
            stdout=subprocess.PIPE,
            stderr=subprocess.PIPE,
        )
        time.sleep(delay)
        process.send_signal(signal.SIGINT)
        process.communicate(timeout=60)
        left = [each.name for each in tmp_path.iterdir()]
        assert left in ([], ["cu"])
        if left == ["cu"]:  # it had finished before the signal came
            assert record(tmp_path / "cu")["schema"] == "latticefit-result/1"
            break


@pytest.mark.slow
def test_nothing_trustworthy_is_exit_code_3_with_a_report(tmp_path: Path) -> None:
    """Where no parameter is determined the report is written, says why, and the exit code is 3."""
    rows = "\n".join(f"{t},{24.9 + 0.001 * (t % 3)}" for t in range(300, 330, 2))
    (tmp_path / "flat.csv").write_text(f"# invented data\nT_K,Cp_J_molK\n{rows}\n")
    words = ["fit", "flat.csv", "--atoms", "1", "--terms", "einstein", "--sigma", "20%", "--out", "flat"]
    done = run(*words, folder=tmp_path)
    assert done.returncode == 3, done.stdout + done.stderr
    found = record(tmp_path / "flat")
    assert found["parameters"]["einstein_theta"]["status"] in ("undetermined", "at_bound")
    assert found["parameters"]["einstein_theta"]["u"] is None


@pytest.mark.slow
def test_a_poor_fit_is_exit_code_0_with_a_verdict(tmp_path: Path) -> None:
    """A model that does not describe the data is a result, with the verdict in words."""
    words = ["fit", COPPER, "--formula", "Cu", "--terms", "debye", *SIGMA, "--figures", "none", "--out", "poor"]
    done = run(*words, folder=tmp_path)
    assert done.returncode == 0
    assert "does not describe" in " ".join(done.stdout.split())


def test_overview_names_every_command(capsys: pytest.CaptureFixture[str]) -> None:
    """--help lists all commands, and each has a help with an example."""
    assert main(["--help"]) == 0
    overview = capsys.readouterr().out
    for name in COMMANDS:
        assert name in overview
        with pytest.raises(SystemExit) as stopped:
            main([name, "--help"])
        assert stopped.value.code == 0
        assert "example:" in capsys.readouterr().out


def test_verify_shows_the_largest_deviation(capsys: pytest.CaptureFixture[str]) -> None:
    """`verify` prints the table with the largest deviation and agrees within a unit of the last printed digit."""
    assert main(["verify"]) == 0
    text = capsys.readouterr().out
    assert "largest relative deviation" in text
    assert "Pässler" in text
    assert max(len(line) for line in text.splitlines()) <= 110
    assert main(["verify", "--json"]) == 0
    found = json.loads(capsys.readouterr().out)
    assert found["agrees"]
    assert found["heat_capacity_deviation"] < 1e-9


def test_inspect_json_holds_the_arrays_of_the_contract(capsys: pytest.CaptureFixture[str]) -> None:
    """`inspect --json` gives every value read, in J/(mol K) with a formula and per gram without."""
    path = str(DEMO / "tvorrite.csv")
    assert main(["inspect", path, "--json"]) == 0
    per_gram = json.loads(capsys.readouterr().out)["files"][0]
    assert main(["inspect", path, "--json", "--formula", "NeKr2Xe2"]) == 0
    per_mole = json.loads(capsys.readouterr().out)["files"][0]
    assert per_gram["delimiter"] == ";"
    assert per_gram["decimal"] == ","
    assert per_gram["points"] == len(per_gram["measurement"]["temperature_K"]) == 140
    assert per_mole["measurement"]["heat_capacity_J_mol_K"][3] == pytest.approx(
        450.3617 * per_gram["measurement"]["heat_capacity_J_g_K"][3]
    )
    assert per_gram["columns"]["temperature"] == "T (K)"


@pytest.mark.parametrize("name", ["halvite", "norrium", "tvorrite", "drommenite"])
def test_inspect_shows_each_demo_file(name: str, capsys: pytest.CaptureFixture[str]) -> None:
    """`inspect` of every demo file fits 80 columns and names columns, units and range."""
    assert main(["inspect", str(DEMO / f"{name}.csv")]) == 0
    text = capsys.readouterr().out
    assert "points" in text
    assert "repairs" in text
    body = [line for line in text.splitlines() if str(DEMO) not in line]
    assert max(len(line) for line in body) <= 80

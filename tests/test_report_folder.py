"""The report folder: complete or not there, never in the way of what was there before."""

from __future__ import annotations

import hashlib
import json
import os
import stat
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from analysis_factory import CASES, build, renamed

from latticefit.errors import InputError
from latticefit.reading.sheets import read_sheet
from latticefit.records import Analysis
from latticefit.report import (
    FIGURES,
    check_out_folder,
    folder,
    json_text,
    result_record,
    table_csv,
    text_report,
    write_report,
)

CONTENTS = {
    "result.json", "report.html", "report.txt", "table.csv", "residuals.csv", "run_sheet.toml", "inputs", "figures",
}  # fmt: skip


@pytest.fixture
def metal(tmp_path: Path) -> Analysis:
    """Two runs whose files have one basename, in two folders."""
    return build(CASES["metal"], tmp_path / "measured")


def _names(place: Path) -> set[str]:
    return {each.name for each in place.iterdir()}


def _snapshot(place: Path) -> dict[str, bytes]:
    return {str(each.relative_to(place)): each.read_bytes() for each in sorted(place.rglob("*")) if each.is_file()}


def _with_settings(analysis: Analysis, **changes: Any) -> Analysis:
    """The analysis with its first reading changed, in measurement and prepared data."""
    first, *rest = analysis.measurement.readings
    measurement = replace(analysis.measurement, readings=(replace(first, **changes), *rest))
    return replace(analysis, measurement=measurement)


def test_folder_holds_what_the_contract_says(metal: Analysis, tmp_path: Path) -> None:
    """Eight names, the same renderings as the functions give, and nothing left beside the folder."""
    out = write_report(metal, tmp_path / "out", figures="none")
    assert out == tmp_path / "out"
    assert _names(out) == CONTENTS
    assert (out / "result.json").read_text("utf-8") == json_text(result_record(metal))
    assert (out / "table.csv").read_text("utf-8") == table_csv(metal)
    assert (out / "report.txt").read_text("utf-8") == text_report(metal)
    assert _names(tmp_path) == {"measured", "out"}


@pytest.mark.parametrize(
    ("choice", "endings"), [("none", set()), ("svg", {".svg"}), ("png", {".png"}), ("all", {".svg", ".png"})]
)
def test_figures_by_choice(choice: str, endings: set[str], metal: Analysis, tmp_path: Path) -> None:
    """Every figure in each format asked for; the page shows drawings unless there are none."""
    out = write_report(metal, tmp_path / "out", figures=choice)
    assert _names(out / "figures") == {f"{name}{ending}" for name in FIGURES for ending in endings}
    assert ("<svg" in (out / "report.html").read_text("utf-8")) is (choice != "none")


def test_unknown_choice_of_figures_is_refused(metal: Analysis, tmp_path: Path) -> None:
    """A misspelt choice is refused in words before anything is written."""
    with pytest.raises(InputError, match="did you mean 'svg'"):
        write_report(metal, tmp_path / "out", figures="svgs")
    assert _names(tmp_path) == {"measured"}


def test_inputs_are_copied_apart_and_the_sheet_points_to_them(metal: Analysis, tmp_path: Path) -> None:
    """Two files of one name are kept apart, byte for byte; the sheet finds both and names no folder to write to."""
    out = write_report(metal, tmp_path / "out", figures="none")
    assert _names(out / "inputs") == {"halden.csv", "halden-2.csv"}
    sheet = read_sheet(out / "run_sheet.toml")
    assert sheet.report.out is None
    assert sheet.report.figures == "none"
    assert [each.label for each in sheet.runs] == ["run 1", "run 2"]
    assert [each.mask for each in sheet.runs] == [((28.0, 33.0),)] * 2
    for run, reading in zip(sheet.runs, metal.measurement.readings, strict=True):
        assert hashlib.sha256((out / run.file).read_bytes()).hexdigest() == reading.sha256


@pytest.mark.parametrize("name", ["../../evil.csv", "a\nb.csv", "..", "x" * 400 + ".csv", "C:\\x\\y.csv", "a?.csv", ""])
def test_input_names_stay_in_their_folder(name: str, metal: Analysis, tmp_path: Path) -> None:
    """Whatever a file is called, its copy lies in inputs/ under a name that any system accepts."""
    out = write_report(_with_settings(metal, file=name), tmp_path / "out", figures="none")
    copies = _names(out / "inputs")
    assert len(copies) == 2
    for copy in copies:
        assert copy.isprintable()
        assert len(copy) <= 130
        assert not set(copy) & set('<>:"/\\|?*')
        assert not copy.startswith(".")
    assert read_sheet(out / "run_sheet.toml").runs[0].file.startswith("inputs/")
    assert _names(tmp_path) == {"measured", "out"}


@pytest.mark.parametrize(
    ("name", "copy"),
    [
        ("CON.csv", "_CON.csv"),
        ("aux", "_aux"),
        ("Com1 .tar.gz", "_Com1 .tar.gz"),
        ("lpt\u00b2.txt", "_lpt\u00b2.txt"),
        (".nul.csv", "_nul.csv"),
        ("console.csv", "console.csv"),
        ("com10.csv", "com10.csv"),
        ("\u71b1" * 90 + ".csv", "\u71b1" * 38 + ".csv"),
    ],
)
def test_input_names_that_some_systems_refuse(name: str, copy: str, metal: Analysis, tmp_path: Path) -> None:
    """Names of devices get a sign before them, whatever their ending, and long ones are cut by their bytes.

    The names: common practice, no source.
    """
    out = write_report(_with_settings(metal, file=name), tmp_path / "out", figures="none")
    assert copy in _names(out / "inputs")


def test_names_that_differ_in_case_only_are_kept_apart(metal: Analysis, tmp_path: Path) -> None:
    """Some file systems know no case: HALDEN.CSV and halden.csv get two names."""
    out = write_report(_with_settings(metal, file="HALDEN.CSV"), tmp_path / "out", figures="none")
    assert len({each.casefold() for each in _names(out / "inputs")}) == 2


def test_a_file_fitted_twice_is_kept_once(metal: Analysis, tmp_path: Path) -> None:
    """Two runs from one file (other columns) share its copy."""
    first, second = metal.measurement.readings
    shared = replace(second, path=first.path, sha256=first.sha256)
    measurement = replace(metal.measurement, readings=(first, shared))
    out = write_report(replace(metal, measurement=measurement), tmp_path / "out", figures="none")
    assert _names(out / "inputs") == {"halden.csv"}
    assert len(read_sheet(out / "run_sheet.toml").runs) == 2


@pytest.mark.parametrize("damage", ["changed", "gone"])
def test_a_changed_input_is_refused(damage: str, metal: Analysis, tmp_path: Path) -> None:
    """A file that is no longer the one that was read is not passed off as the input: nothing is written."""
    path = Path(metal.measurement.readings[0].path)
    path.unlink()
    if damage == "changed":
        path.write_text("T_K,Cp_J_molK\n1,1\n", encoding="utf-8")
    with pytest.raises(InputError, match="has changed since it was read" if damage == "changed" else "any more"):
        write_report(metal, tmp_path / "out", figures="none")
    assert _names(tmp_path) == {"measured"}


def test_existing_folder_is_refused_without_replace(metal: Analysis, tmp_path: Path) -> None:
    """An existing folder or file stays as it is, and the sentence names both ways out."""
    (tmp_path / "out").mkdir()
    (tmp_path / "file").write_text("mine", encoding="utf-8")
    for name in ("out", "file"):
        with pytest.raises(InputError, match=r"exists already; .*--out.*--replace"):
            check_out_folder(tmp_path / name, replace=False)
        with pytest.raises(InputError, match="exists already"):
            write_report(metal, tmp_path / name, figures="none")
    assert _names(tmp_path / "out") == set()
    assert (tmp_path / "file").read_text("utf-8") == "mine"


@pytest.mark.parametrize("content", [None, "{", "[]", '{"schema": "other/1"}', '{"schema": 1}'])
def test_replace_spares_a_folder_that_is_no_report(content: str | None, metal: Analysis, tmp_path: Path) -> None:
    """Only a folder whose result.json latticefit wrote is replaced."""
    (tmp_path / "out").mkdir()
    (tmp_path / "out" / "thesis.tex").write_text("years of work", encoding="utf-8")
    if content is not None:
        (tmp_path / "out" / "result.json").write_text(content, encoding="utf-8")
    before = _snapshot(tmp_path / "out")
    with pytest.raises(InputError, match="is not a latticefit report"):
        write_report(metal, tmp_path / "out", replace=True, figures="none")
    assert _snapshot(tmp_path / "out") == before


def test_replace_puts_the_new_report_and_keeps_foreign_files(metal: Analysis, tmp_path: Path) -> None:
    """Old figures and inputs go, a note that somebody put into the folder stays."""
    out = write_report(metal, tmp_path / "out", figures="png")
    (out / "notes.txt").write_text("mine", encoding="utf-8")
    (out / "more").mkdir()
    (out / "more" / "deep.txt").write_text("mine too", encoding="utf-8")
    write_report(renamed(metal, "Second"), out, replace=True, figures="none")
    assert json.loads((out / "result.json").read_text("utf-8"))["sample"]["name"] == "Second"
    assert _names(out) == CONTENTS | {"notes.txt", "more"}
    assert _names(out / "figures") == set()
    assert (out / "more" / "deep.txt").read_text("utf-8") == "mine too"
    assert _names(tmp_path) == {"measured", "out"}


def test_a_report_can_be_refitted_from_its_own_inputs(metal: Analysis, tmp_path: Path) -> None:
    """Fitting the sheet of a report with --replace reads from the very folder that is replaced."""
    out = write_report(metal, tmp_path / "out", figures="none")
    first, second = metal.measurement.readings
    inside = (
        replace(first, path=str(out / "inputs" / "halden.csv")),
        replace(second, path=str(out / "inputs" / "halden-2.csv"), file="halden-2.csv"),
    )
    before = _snapshot(out / "inputs")
    again = replace(metal, measurement=replace(metal.measurement, readings=inside))
    write_report(again, out, replace=True, figures="none")
    assert _snapshot(out / "inputs") == before


@pytest.mark.parametrize("error", [RuntimeError("broken"), KeyboardInterrupt(), OSError(28, "No space left on device")])
@pytest.mark.parametrize("replaced", [False, True])
def test_a_failing_run_leaves_what_was_there(
    error: BaseException, replaced: bool, metal: Analysis, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Failure or interruption half way: no half report, the old one untouched, nothing left beside it."""
    out = tmp_path / "out"
    if replaced:
        write_report(metal, out, figures="none")
    before = _snapshot(tmp_path)

    def fail(analysis: Analysis) -> str:
        raise error

    monkeypatch.setattr(folder, "residuals_csv", fail)
    with pytest.raises(InputError if isinstance(error, OSError) else type(error)):
        write_report(renamed(metal, "Second"), out, replace=replaced, figures="none")
    assert _snapshot(tmp_path) == before
    assert _names(tmp_path) == ({"measured", "out"} if replaced else {"measured"})


def test_the_old_report_comes_back_when_the_last_step_fails(
    metal: Analysis, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """If the new folder cannot take its place, the old one returns to it."""
    out = write_report(metal, tmp_path / "out", figures="none")
    before, rename = _snapshot(out), Path.rename

    def refuse_the_new(self: Path, target: Path) -> Path:
        if self.suffix == ".partial":
            raise OSError(5, "Input/output error")
        return rename(self, target)

    monkeypatch.setattr(Path, "rename", refuse_the_new)
    with pytest.raises(InputError, match="Input/output error"):
        write_report(renamed(metal, "Second"), out, replace=True, figures="none")
    assert _snapshot(out) == before
    assert _names(tmp_path) == {"measured", "out"}


def test_missing_parent_is_refused(tmp_path: Path) -> None:
    """The folder for the report must exist, and the sentence says which one does not."""
    with pytest.raises(InputError, match=r"nowhere' for the report does not exist"):
        check_out_folder(tmp_path / "nowhere" / "out", replace=False)


def test_unwritable_parent_is_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A parent where nothing can be made is found out before the fit, in one sentence."""

    def refuse(self: Path, *_: Any, **__: Any) -> None:
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(Path, "mkdir", refuse)
    with pytest.raises(InputError, match=r"cannot be written \(Permission denied\)"):
        check_out_folder(tmp_path / "out", replace=False)


def test_a_link_is_refused(metal: Analysis, tmp_path: Path) -> None:
    """A link in place of the folder is not followed and not replaced."""
    out = write_report(metal, tmp_path / "out", figures="none")
    (tmp_path / "link").symlink_to(out)
    with pytest.raises(InputError, match="is a link"):
        write_report(metal, tmp_path / "link", replace=True, figures="none")


def test_check_writes_nothing(tmp_path: Path) -> None:
    """The check before the fit leaves no trace."""
    check_out_folder(tmp_path / "out", replace=False)
    check_out_folder(tmp_path / "out", replace=True)
    assert _names(tmp_path) == set()


@pytest.mark.skipif(os.name == "nt", reason="file modes are those of POSIX systems")
def test_folder_has_the_usual_permissions(metal: Analysis, tmp_path: Path) -> None:
    """The report can be read by whom the user's mask allows, unlike a private temporary folder."""
    (tmp_path / "plain").mkdir()
    out = write_report(metal, tmp_path / "out", figures="none")
    assert stat.S_IMODE(out.stat().st_mode) == stat.S_IMODE((tmp_path / "plain").stat().st_mode)

"""Any measurement that latticefit writes reads back identical (invented data throughout)."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from reading_helpers import read_text

import latticefit
from latticefit.errors import InputError
from latticefit.reading import read_measurement
from latticefit.records import Measurement, Reading, RunSettings, Sample, SampleSettings

LABELS = [
    *("run 1", "run, Field (T) = 5", "cooling", "1", "1.0", "5e3", "1 2 3", "run 1 2 3", "a,b", 'a"b', "a;b", "a\tb"),
    *("x\ny", "#1", " edge ", "=1+1", "-", "nan", "1 \u00b1 2", "2 x 10", "run 1 a)", "\\u{41}", "\u202eabc", "\ud800"),
    *(
        "\u03b8 = 0\u00b0",
        "run",
        "label",
        "T_K",
        "Series 2",
        "used",
        "yes",
        "12.3(4)",
        "'",
        "\x00",
        "\U0001f600",
        "1,5",
    ),
]
POSITIVE = st.floats(min_value=5e-324, max_value=1.7e308, exclude_min=False, allow_subnormal=True)


def build(
    T: list[float],
    C: list[float],
    sigma: list[float] | None,
    labels: list[str],
    basis: Any = "mol",
    quantity: Any = "Cp",
    set_aside: tuple[str | None, ...] = (),
) -> Measurement:
    """A measurement of invented points; those of the runs stand one after the other."""
    readings = tuple(
        Reading("/nowhere/invented.csv", "invented.csv", "0" * 64, each, *("",) * 5, None, "K", "", 1, RunSettings("a"))
        for each in labels
    )
    n = len(T)
    run = np.sort(np.arange(n, dtype=np.intp) % len(labels))
    return Measurement(
        *(Sample("invented\n# x"), np.array(T), np.array(C), None if sigma is None else np.array(sigma), run),
        *(np.arange(n, dtype=np.intp) + 2, quantity, basis, "", readings, (), (), SampleSettings(), set_aside),
    )


@settings(suppress_health_check=[HealthCheck.function_scoped_fixture], max_examples=200, deadline=None)
@given(
    points=st.lists(st.tuples(POSITIVE, POSITIVE, POSITIVE), min_size=1, max_size=12),
    labels=st.lists(
        st.one_of(st.sampled_from(LABELS), st.text(min_size=1, max_size=12)), min_size=1, max_size=5, unique=True
    ),
    basis=st.sampled_from(["mol", "gram", "sample"]),
    quantity=st.sampled_from(["Cp", "Cv"]),
    stated=st.booleans(),
    aside=st.booleans(),
)
def test_any_measurement_reads_back_identical(
    tmp_path: Path, points: Any, labels: list[str], basis: str, quantity: str, stated: bool, aside: bool
) -> None:
    """Arrays to the last bit, labels, quantity, basis, and which points are set aside."""
    labels = labels[: len(points)]
    T, C, sigma = ([point[k] for point in points] for k in range(3))
    why = (*("line 2 masked",) * (len(points) - 1), None) if aside and len(points) > 1 else ()
    written = build(T, C, sigma if stated else None, labels, basis, quantity, why)
    path = latticefit.write_measurement(written, tmp_path / "back.csv", replace=True)
    how: dict[str, Any] = {"split_by": "run"} if len(labels) > 1 else {"label": labels[0]}
    how |= {"require": ("used = yes",)} if why else {}
    back = read_measurement(SampleSettings(), (RunSettings(path.name, **how),), base=tmp_path)
    assert back.temperature.tolist() == written.temperature.tolist()
    assert back.heat_capacity.tolist() == written.heat_capacity.tolist()
    assert (back.sigma is None) == (written.sigma is None)
    assert back.sigma is None or written.sigma is None or back.sigma.tolist() == written.sigma.tolist()
    assert back.run.tolist() == written.run.tolist()
    assert [each.label for each in back.readings] == labels
    assert (back.quantity, back.basis) == (quantity, basis)
    assert [each is not None for each in back.set_aside] == [each is not None for each in why]
    expected = ("in order", "fall from row", "divided by", "not fitted")
    assert all(any(words in each.message for words in expected) for each in back.repairs)


def test_what_is_read_is_written_and_read_again(tmp_path: Path) -> None:
    """A file divided by a column of fields, in mJ and degC, comes back with its labels through Python's own calls."""
    table = "invented data\nt/\u00b0C;Cp/(mJ/(g K));u;Field (T)\n-200,5;1,25;0,1;0\n-100;2,5;0,1;5\n1,1;3;0,2;5,0\n"
    read = read_text(tmp_path, table, sigma="u", split_by="Field (T)")
    assert [each.label for each in read.readings] == ["run, Field (T) = 0", "run, Field (T) = 5"]
    latticefit.write_measurement(read, tmp_path / "again.csv")
    text = (tmp_path / "again.csv").read_text("utf-8")
    assert text.startswith("# written by latticefit ")
    assert '"run, Field (T) = 5"' in text
    again = latticefit.read(tmp_path / "again.csv", formula="Cu", mass="10 mg", split_by="run")
    for name in ("temperature", "heat_capacity", "sigma", "run"):
        assert getattr(again, name).tolist() == getattr(read, name).tolist()
    assert [each.label for each in again.readings] == [each.label for each in read.readings]


def test_no_label_is_a_formula_of_a_spreadsheet() -> None:
    """A label that begins as a formula does is written as escapes."""
    from latticefit.report import measurement_csv

    text = measurement_csv(build([1.0, 2.0], [1.0, 2.0], None, ["=cmd()", "@b"]))
    assert "1.0,1.0,\\u{3d}cmd\\u{28}\\u{29}\n" in text
    assert "\n2.0,2.0,\\u{40}b\n" in text


def test_files_are_kept(tmp_path: Path) -> None:
    """A file is replaced only when that is allowed, one that was read never; nothing is left beside it."""
    read = read_text(tmp_path, "T_K,Cp_J_molK\n1,2\n3,4\n")
    (tmp_path / "mine.csv").write_text("mine", encoding="utf-8")
    for name, words in {
        "mine.csv": "exists already; name another file",
        "run.csv": "was read for this measurement; it is never replaced",
        ".": "is a folder; name a file",
        "nowhere/x.csv": r"cannot be written \(No such file or directory\)",
        "a\x00b": "cannot be written",
    }.items():
        with pytest.raises(InputError, match=words):
            latticefit.write_measurement(read, tmp_path / name, replace=name == "run.csv")
    assert latticefit.write_measurement(read, tmp_path / "mine.csv", replace=True) == tmp_path / "mine.csv"
    assert "1.0,2.0\n3.0,4.0\n" in (tmp_path / "mine.csv").read_text("utf-8")
    assert {each.name for each in tmp_path.iterdir()} == {"run.csv", "mine.csv"}


def test_addenda_file_is_never_replaced(tmp_path: Path) -> None:
    """The file that was taken off is one that was read, by whatever name it is reached."""
    (tmp_path / "blank.csv").write_text("T_K,C_J_K\n1,1e-3\n3,2e-3\n", encoding="utf-8")
    (tmp_path / "other").symlink_to("blank.csv")
    read = read_text(tmp_path, "T_K,C_J_K\n1,2\n3,4\n")
    blank = replace(read.readings[0], path=str(tmp_path / "blank.csv"), file="blank.csv")
    gone = replace(blank, path=str(tmp_path / "gone.csv"))
    for name in ("blank.csv", "other"):
        with pytest.raises(InputError, match="was read for this measurement; it is never replaced"):
            latticefit.write_measurement(replace(read, addenda_readings=(gone, blank)), tmp_path / name, replace=True)


def test_what_would_not_read_back_is_refused() -> None:
    """Too many runs and endless labels are refused before a file is written."""
    from latticefit.report import measurement_csv

    with pytest.raises(InputError, match="201 runs, more than the 200"):
        measurement_csv(build([1.0] * 201, [1.0] * 201, None, [f"r{k}" for k in range(201)]))
    with pytest.raises(InputError, match="has 1001 characters"):
        measurement_csv(build([1.0, 2.0], [1.0, 2.0], None, ["a" * 1001, "b"]))
    with pytest.raises(InputError, match="no points"):
        measurement_csv(build([], [], None, ["a"]))


@pytest.mark.parametrize("wrong", [None, "run.csv", 3])
def test_wrong_arguments_are_refused(wrong: Any, tmp_path: Path) -> None:
    """What is no measurement, or no path, is refused in words."""
    with pytest.raises(InputError, match="measurement must be a Measurement"):
        latticefit.write_measurement(wrong, tmp_path / "x.csv")
    with pytest.raises(InputError, match="path must be the path"):
        latticefit.write_measurement(build([1.0], [1.0], None, ["a"]), [])  # type: ignore[arg-type]

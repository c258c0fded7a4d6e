"""Random tables in random dialects read back the same; damaged files are read or refused, never more."""

from __future__ import annotations

import io
import os
import zipfile
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from helpers import ROOT
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from reading_helpers import SAMPLE, read_text

from latticefit.errors import InputError
from latticefit.reading import read_measurement
from latticefit.records import RunSettings

CASES = int(os.environ.get("LATTICEFIT_CASES", "200"))
CORPUS = ROOT / "tests" / "corpus"
VALID = [
    *("preamble.csv", "unit_row_wide.txt", "letters.txt", "series_blanks.txt", "utf16_le.txt", "cp1252_micro.csv"),
    *("common_power.csv", "repeated_header_and_units.txt", "thin_spaces.csv", "sheet.xlsx", "sheet_among_others.xlsx"),
    *("require_decimal_comma.csv", "split_field.csv", "split_run.csv", "sheet.ods", "worksheets.ods"),
]
CHOICES: list[dict[str, Any]] = [
    {},
    {"require": ("3 > 0.5",)},
    {"require": ("2 != 1", "1 < 1e9")},
    {"split_by": 3},
    {"split_by": "series", "mask_lines": ((2, 3),)},
    {"split_by": "run", "require": ("run != x",)},
    {"mask_lines": ((1, 4),), "require": ("Field (T) = 0",)},
    {"worksheet": "2"},
]
HEADERS = [
    ("T/K", "Cp/(J/(mol\u00b7K))", None),
    ("T (K)", "C_p (J/mol/K)", None),
    ("T [K]", "Cp [J/mol-K]", None),
    ("T", "Cp", ("K", "J/(mol-K)")),
    ("Temperature", "C_p", ("[K]", "[J/mol/K]")),
]
several = settings(
    suppress_health_check=[HealthCheck.function_scoped_fixture, HealthCheck.too_slow], max_examples=CASES, deadline=None
)


@st.composite
def numbers(draw: st.DrawFn) -> tuple[str, float]:
    """A positive number with 1 to 7 digits, written with a point, and its value."""
    digits, decimals = draw(st.integers(1, 9_999_999)), draw(st.integers(0, 6))
    text = f"{digits / 10**decimals:.{decimals}f}"
    power = draw(st.sampled_from([None, None, "e{}", "E{:+03d}", "\u00d710{}", "\u00b710^{}"]))
    if power is None:
        return text, float(text)
    exponent = draw(st.integers(-9, 9))
    return text + power.format(exponent), float(f"{text}e{exponent}")


@several
@given(
    table=st.lists(
        st.tuples(numbers(), numbers(), st.sampled_from(["", "", "*", "\u2020", "a)"])), min_size=2, max_size=7
    ),
    headers=st.sampled_from(HEADERS),
    delimiter=st.sampled_from([";", "\t", "  ", ",", " ; "]),
    decimal_comma=st.booleans(),
    minus=st.sampled_from(["-", "\u2212"]),
    encoding=st.sampled_from(["utf-8", "utf-8-sig", "utf-16", "utf-8"]),
    preamble=st.sampled_from([[], ["# invented data"], ["invented data", "Mass in mg: ten"], ["invented data", ""]]),
    between=st.sampled_from(["nothing", "series", "header"]),
    line_end=st.sampled_from(["\n", "\r\n"]),
)
def test_any_dialect_reads_back(tmp_path: Path, **drawn: Any) -> None:
    """A random table in a random dialect reads back to the same numbers, and every mark is listed."""
    measurement = read_text(tmp_path, _written(**drawn))
    table = drawn["table"]
    assert list(measurement.temperature) == [value for (_, value), _, _ in table]
    assert list(measurement.heat_capacity) == [value for _, (_, value), _ in table]
    marks = [repair.line for repair in measurement.repairs if "mark " in repair.message]
    assert len(marks) == sum(bool(mark) for _, _, mark in table)
    assert None not in marks


def _written(
    table: Any,
    headers: Any,
    delimiter: str,
    decimal_comma: bool,
    minus: str,
    encoding: str,
    preamble: list[str],
    between: str,
    line_end: str,
) -> bytes:
    def cell(text: str) -> str:
        text = text.replace("-", minus)
        return text.replace(".", ",") if decimal_comma and delimiter != "," else text

    def joined(words: Any) -> str:
        return delimiter.join(words)

    name_t, name_c, units = headers
    if delimiter == "  ":
        name_t, name_c = name_t.replace(" ", "\u00a0"), name_c.replace(" ", "\u00a0")
    head = [joined((name_t, name_c)), *([joined(units)] if units else [])]
    rows = [joined((cell(t), cell(c) + mark)) for (t, _), (c, _), mark in table]
    middle = {"nothing": [], "series": ["Series 2"], "header": head}[between]
    lines = [*preamble, *head, rows[0], *middle, *rows[1:]]
    return line_end.join(lines).encode(encoding)


@several
@given(
    name=st.sampled_from(VALID),
    start=st.floats(0, 1),
    junk=st.one_of(st.binary(max_size=8), st.sampled_from([b"\x00", b"\xff", b"\n", b"\t", b";", b"\xe2\x88\x92"])),
    removed=st.integers(0, 12),
    kept=st.floats(0, 1.5),
    bit=st.integers(0, 7),
    choices=st.sampled_from(CHOICES),
)
def test_damaged_file_of_the_corpus(
    tmp_path: Path,
    name: str,
    start: float,
    junk: bytes,
    removed: int,
    kept: float,
    bit: int,
    choices: dict[str, Any],
) -> None:
    """Bytes put in or cut out, a flipped bit, a truncated file: possible values or one line of words, never more."""
    data = bytearray((CORPUS / name).read_bytes())
    if name.endswith(".ods"):  # damage the table itself, which lies packed in the file
        with zipfile.ZipFile(CORPUS / name) as archive:
            data = bytearray(archive.read("content.xml"))
    place = int(start * (len(data) - 1))
    data[place] ^= 1 << bit
    data[place : place + removed] = junk
    damaged = bytes(data[: int(kept * len(data))])
    _read_or_refused(tmp_path, name, _packed(damaged) if name.endswith(".ods") else damaged, choices)


def _packed(content: bytes) -> bytes:
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w") as archive:
        archive.writestr("content.xml", content)
    return stream.getvalue()


@several
@given(
    data=st.binary(max_size=300),
    head=st.sampled_from([b"", b"PK\x03\x04", b"\xff\xfe", b"\xef\xbb\xbf", b"T/K;Cp/R\n", b"T/K;Cp/R;run\n1;2;a\n"]),
    choices=st.sampled_from(CHOICES),
)
def test_random_bytes(tmp_path: Path, data: bytes, head: bytes, choices: dict[str, Any]) -> None:
    """Any bytes at all are read or refused in one line of words."""
    _read_or_refused(tmp_path, "run.csv", head + data, choices)


@several
@given(
    text=st.text(
        alphabet="0123456789.,;\t ()[]\u00b1e-+\n#\"'%k=_/TKCpJmolSeries*\u2020\u2212\u00d7\u2009\u00b5", max_size=120
    ),
    head=st.sampled_from(["", "T/K;Cp/R;run\n1;2;3\n4;5;6\n"]),
    choices=st.sampled_from(CHOICES),
)
def test_random_text(tmp_path: Path, text: str, head: str, choices: dict[str, Any]) -> None:
    """Any text made of the signs of measurement files is read or refused in one line of words."""
    _read_or_refused(tmp_path, "run.csv", (head + text).encode(), choices)


@several
@given(text=st.text(alphabet="qr <>=!\u2264'\"0123.,e-x\x1b", max_size=14), mask=st.integers(1, 6))
def test_random_conditions(tmp_path: Path, text: str, mask: int) -> None:
    """Any text at all as a condition chooses rows or is refused in one line of words."""
    choices = {"require": (text,), "mask_lines": ((1, mask),)}
    _read_or_refused(tmp_path, "run.csv", b"T/K;Cp/R;q;r\n1;2;3;x\n4;5;6;q\n7;8;;'1'\n", choices)


def _read_or_refused(folder: Path, name: str, data: bytes, choices: dict[str, Any]) -> None:
    (folder / name).write_bytes(data)
    try:
        measurement = read_measurement(SAMPLE, (RunSettings(name, **choices),), base=folder)
    except InputError as error:
        sentence = str(error)
    else:
        assert measurement.temperature.size
        assert np.all(np.isfinite(measurement.temperature) & (measurement.temperature > 0))
        assert np.all(np.isfinite(measurement.heat_capacity) & (measurement.heat_capacity > 0))
        assert set(measurement.run.tolist()) == set(range(len(measurement.readings)))
        assert not measurement.set_aside or None in measurement.set_aside
        assert all(repair.message.isprintable() for repair in measurement.repairs)
        return
    assert sentence.isprintable()
    assert sentence.startswith((name, "condition ", "two runs"))


@pytest.mark.parametrize("mark", ["", "Series 2"])
def test_dialects_are_told_apart(mark: str, tmp_path: Path) -> None:
    """A series label in a table is no data and is listed with its line."""
    measurement = read_text(tmp_path, f"T/K;Cp/(J/(mol K))\n1;2\n{mark}\n3;4\n")
    assert [repair.line for repair in measurement.repairs if repair.line] == ([3] if mark else [])

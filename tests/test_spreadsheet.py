"""Spreadsheets: cached values only, and nothing that fills the memory (invented data throughout)."""

from __future__ import annotations

import io
import zipfile
from pathlib import Path
from typing import Any

import openpyxl
import pytest
from reading_helpers import messages, read_text

from latticefit.cli import main
from latticefit.errors import InputError
from latticefit.reading import spreadsheet, text

TABLE = [["invented data", None], ["T (K)", "Cp (J/(mol K))"], [1.5, 2.25], [3, 4.5]]


def book(rows: list[list[Any]], **formats: str) -> bytes:
    """A spreadsheet of one sheet; `formats` gives number formats by cell."""
    workbook = openpyxl.Workbook()
    for row in rows:
        workbook.active.append(row)
    for cell, shown in formats.items():
        workbook.active[cell].number_format = shown
    stream = io.BytesIO()
    workbook.save(stream)
    return stream.getvalue()


def with_part(data: bytes, name: str, change: Any) -> bytes:
    """The same spreadsheet with one part of its archive changed."""
    stream = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(data)) as old, zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED) as new:
        for part in old.namelist():
            new.writestr(part, change(old.read(part)) if part == name else old.read(part))
    return stream.getvalue()


SHEET = "xl/worksheets/sheet1.xml"


def test_lines_are_rows_of_the_sheet(tmp_path: Path) -> None:
    """Line numbers are those that the spreadsheet shows, empty rows included."""
    measurement = read_text(tmp_path, book([TABLE[0], [], *TABLE[1:]]))
    assert list(measurement.line) == [4, 5]
    assert (measurement.readings[0].encoding, list(measurement.heat_capacity)) == ("spreadsheet", [2.25, 4.5])


def test_cached_value_of_a_formula_is_read_and_nothing_computed(tmp_path: Path) -> None:
    """A formula gives the value that was last computed, even where it is not what the formula says."""
    data = with_part(book(TABLE), SHEET, lambda xml: xml.replace(b"<v>4.5</v>", b"<f>1+1</f><v>7.5</v>"))
    assert list(read_text(tmp_path, data).heat_capacity) == [2.25, 7.5]


def test_cell_shown_in_percent_is_not_taken_as_its_hundredth(tmp_path: Path) -> None:
    """A sigma cell that shows 1 % holds 0.01; it is refused rather than read a hundred times too small."""
    table = [["T_K", "Cp_J_molK", "err (%)"], [1, 2, 0.01], [2, 3, 0.01]]
    with pytest.raises(InputError, match=r"^run\.csv: line 2, column 'err \(%\)': '1\.0 %' cannot be read as a number"):
        read_text(tmp_path, book(table, C2="0.0%"))


def test_bomb_is_refused_by_its_declared_size(tmp_path: Path) -> None:
    """A part that unpacks to more than the limit is refused before it is unpacked."""
    stream = io.BytesIO(book(TABLE))
    with zipfile.ZipFile(stream, "a", zipfile.ZIP_DEFLATED) as archive:
        archive.writestr("xl/more.xml", b" " * (spreadsheet.MAX_UNPACKED + 1))
    assert len(stream.getvalue()) < 200_000
    with pytest.raises(InputError, match=r"unpacks to 100 MB in .* save the table as CSV"):
        read_text(tmp_path, stream.getvalue())


def test_entities_are_refused(tmp_path: Path) -> None:
    """XML entities, with which a small file can unfold without bound, are refused."""
    bomb = b'<!DOCTYPE x [<!ENTITY a "aaaaaaaa">]>'
    data = with_part(book(TABLE), SHEET, lambda xml: xml.replace(b"<worksheet", bomb + b"<worksheet", 1))
    with pytest.raises(InputError, match="defines XML entities"):
        read_text(tmp_path, data)


@pytest.mark.parametrize(
    ("rows", "words"),
    [([[1.0] * 1001, [2.0] * 1001], "row 1 has more than the 1000 columns"), ([["x"]], "no worksheet holds")],
)
def test_sheet_without_a_readable_table(rows: list[list[Any]], words: str, tmp_path: Path) -> None:
    """Too many columns, or no numbers, are refused in words."""
    with pytest.raises(InputError, match=words):
        read_text(tmp_path, book(rows))


def test_row_far_down_is_refused(tmp_path: Path) -> None:
    """A row number of a million, with nothing above it, is not filled up with empty rows."""
    data = with_part(book(TABLE), SHEET, lambda xml: xml.replace(b'r="4"', b'r="9000000"').replace(b'4"', b'9000000"'))
    with pytest.raises(InputError, match=r"more than the 2000000 cells that are read|damaged"):
        read_text(tmp_path, data)


def test_missing_library_is_named(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Without the extra the sentence says what to install."""
    monkeypatch.setitem(__import__("sys").modules, "openpyxl", None)
    with pytest.raises(InputError, match=r"install openpyxl to read it, or save the table as CSV"):
        read_text(tmp_path, book(TABLE))


def test_text_limits(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Too many lines, columns or signs in a line are refused before the table is taken apart."""
    with pytest.raises(InputError, match="line 2 has 10000 columns, more than the 1000 that are read"):
        read_text(tmp_path, "# invented data\n" + ",".join("1" * 10_000) + "\n")
    with pytest.raises(InputError, match="line 1 has 100001 characters, more than the 100000 that are read"):
        read_text(tmp_path, "1" * 100_001)
    monkeypatch.setattr(text, "MAX_LINES", 5)
    with pytest.raises(InputError, match="has 6 lines, more than the 5 that are read"):
        read_text(tmp_path, "1,2\n" * 6)


def test_sheet_is_named_where_there_are_several(tmp_path: Path) -> None:
    """The note says which sheet was read."""
    workbook = openpyxl.Workbook()
    workbook.active.title = "remarks"
    sheet = workbook.create_sheet("run 1")
    for row in TABLE:
        sheet.append(row)
    stream = io.BytesIO()
    workbook.save(stream)
    assert "read from worksheet 'run 1', the only one of 2 that holds a table" in messages(
        read_text(tmp_path, stream.getvalue())
    )


def test_inspect_says_that_it_read_a_spreadsheet(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A spreadsheet has no delimiter to speak of: `inspect` says what it is."""
    (tmp_path / "run.xlsx").write_bytes(book(TABLE))
    assert main(["inspect", str(tmp_path / "run.xlsx")]) == 0
    text_shown = capsys.readouterr().out
    assert "a spreadsheet" in text_shown
    assert "separated by" not in text_shown

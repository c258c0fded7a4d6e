"""Spreadsheets: cached values only, and nothing that fills the memory (invented data throughout)."""

from __future__ import annotations

import io
import zipfile
from pathlib import Path
from typing import Any

import openpyxl
import pytest
from reading_helpers import messages, read_text

import latticefit
from latticefit.cli import main
from latticefit.errors import InputError
from latticefit.reading import sheet_size, spreadsheet, table, text

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


def test_empty_cells_beside_the_table_do_not_count(tmp_path: Path) -> None:
    """Two columns of 2500 rows under a long note with many words are read, with a gap in a row and one in the rows."""
    rows = [
        ["invented data, " * 100],
        [*TABLE[1], "q"],
        *([1.5 + k, 2.25] for k in range(2500)),
        [],
        [9e3, None, 7],
        [1e4, 8],
    ]
    measurement = read_text(tmp_path, book(rows))
    assert measurement.temperature.size == 2501
    assert (measurement.line[-1], measurement.heat_capacity[-1]) == (2505, 8)
    assert [(each.line, each.reason) for each in measurement.excluded] == [(2504, "no heat capacity")]


def test_note_of_many_words_is_no_table_of_many_columns(tmp_path: Path) -> None:
    """Blanks and commas in a cell of a spreadsheet separate no columns."""
    rows = [["invented, data " * 1100], *TABLE[1:]]
    assert list(read_text(tmp_path, book(rows)).heat_capacity) == [2.25, 4.5]


def test_text_without_end_is_refused(tmp_path: Path) -> None:
    """The text of a cell has a limit, and that of all cells together, as often as it stands there."""
    long = with_part(book([["x"], *TABLE]), SHEET, lambda xml: xml.replace(b">x<", b">" + b"x" * 200_000 + b"<"))
    with pytest.raises(InputError) as caught:
        read_text(tmp_path, long)
    assert str(caught.value) == (
        "run.csv: row 1 has a cell of 200000 characters, more than the 32767 that are read; shorten it, or save the "
        "table as CSV"
    )
    with pytest.raises(InputError, match="its cells hold more than the 50 MB of text that are read"):
        read_text(tmp_path, book([["x" * 32_000] * 40] * 40))


def test_memory_that_ends_is_told_in_words(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Where the memory ends although no limit is passed, that is no damage and no traceback."""

    def full(rows: list[list[str]]) -> list[str]:
        raise MemoryError

    monkeypatch.setattr(spreadsheet, "_lines", full)
    with pytest.raises(InputError, match="needs more memory than there is; save the table as CSV"):
        read_text(tmp_path, book(TABLE))


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
    assert table.MAX_TABLE_CELLS > 100_000 * 40  # a long log of many columns is read
    monkeypatch.setattr(table, "MAX_TABLE_CELLS", 9)
    with pytest.raises(InputError, match="has more than 9 cells down to line 5, the most that are read; keep the"):
        read_text(tmp_path, "1,2\n" * 9)
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


# ------------------------------------------------------------------------------------------------ OpenDocument, .ods

NAMESPACES = " ".join(
    f'xmlns:{name}="urn:oasis:names:tc:opendocument:xmlns:{whole}:1.0"'
    for name, whole in {"office": "office", "table": "table", "text": "text", "draw": "drawing"}.items()
)


def ods(*sheets: str) -> bytes:
    """An .ods file of sheets, each given by its rows as XML."""
    tables = "".join(
        f'<table:table table:name="{name}">{rows}</table:table>' for name, rows in zip("abc", sheets, strict=False)
    )
    body = f"<office:body><office:spreadsheet>{tables}</office:spreadsheet></office:body>"
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED) as archive:
        archive.writestr("mimetype", "application/vnd.oasis.opendocument.spreadsheet")
        archive.writestr("content.xml", f"<office:document-content {NAMESPACES}>{body}</office:document-content>")
    return stream.getvalue()


def row(*cells: str | float, more: str = "") -> str:
    """A row; a text that is XML already stands as it is."""
    return f"<table:table-row {more}>{''.join(map(cell, cells))}</table:table-row>"


def cell(value: str | float, more: str = "") -> str:
    if isinstance(value, str):
        text = f'<table:table-cell office:value-type="string" {more}><text:p>{value}</text:p></table:table-cell>'
        return value if value.startswith("<table") else text
    return f'<table:table-cell office:value-type="float" office:value="{value!r}" {more}/>'


HEAD = row("T (K)", "Cp (J/(mol K))")
EMPTY = "<table:table-cell/>"


def test_ods_lines_are_rows_and_repeats_are_unfolded(tmp_path: Path) -> None:
    """Empty rows count, a repeated row stands twice, and the emptiness to the last row of a sheet is not unfolded."""
    tail = row('<table:table-cell table:number-columns-repeated="16384"/>', more='table:number-rows-repeated="1048000"')
    rows = HEAD + row(EMPTY, more='table:number-rows-repeated="3"') + row(1.5, 2.25)
    rows += row(3.0, 4.5, more='table:number-rows-repeated="2"') + tail
    measurement = read_text(tmp_path, ods(rows))
    assert list(measurement.line) == [5, 6, 7]
    assert list(measurement.temperature) == [1.5, 3.0, 3.0]
    assert measurement.readings[0].encoding == "spreadsheet"


def test_ods_cell_is_read_without_notes_drawings_and_blanks(tmp_path: Path) -> None:
    """Words of a note or a drawing in a cell, of the record of changes and of a table in a cell are not the cell's."""
    note = "<office:annotation><text:p>99</text:p></office:annotation>"
    drawing = "<draw:frame><draw:text-box><text:p>88</text:p></draw:text-box></draw:frame>"
    inner = f"<table:table table:name='x'>{row(7.0, 7.0)}</table:table>"
    first = (
        f'<table:table-cell office:value-type="string">{note}<text:p>T<text:s/>(K)</text:p>{drawing}</table:table-cell>'
    )
    changes = f"<table:tracked-changes>{row(5.0, 6.0)}</table:tracked-changes>"
    number = f'<table:table-cell office:value-type="float" office:value="2.25">{note}{inner}</table:table-cell>'
    rows = changes + row(first, "Cp<text:tab/><text:span>(J/(mol K))</text:span>") + row(1.5, number) + row(3.0, 4.5)
    measurement = read_text(tmp_path, ods(rows))
    assert measurement.readings[0].temperature_column == "T (K)"
    assert list(measurement.heat_capacity) == [2.25, 4.5]


def test_ods_value_is_the_stored_one(tmp_path: Path) -> None:
    """Full precision comes from the stored value, not from the shown text; a formula is not evaluated."""
    typed = '<table:table-cell {} office:value-type="float" office:value="{}"><text:p>2</text:p></table:table-cell>'
    formula, precise = typed.format('table:formula="of:=1+1"', 7.5), typed.format("", "1.23456789012345")
    measurement = read_text(tmp_path, ods(HEAD + row(precise, formula) + row(3.0, 8.0)))
    assert (measurement.temperature[0], measurement.heat_capacity[0]) == (1.23456789012345, 7.5)


REPEATED = 'table:number-columns-repeated="{}"'


@pytest.mark.parametrize(
    ("rows", "words"),
    [
        (HEAD + row(1.5, 2.5, more='table:number-rows-repeated="900000000"'), "more than the 2000000 cells that are"),
        (HEAD + row(cell(1.5, REPEATED.format(999_999_999))), "row 2 has more than the 1000 columns that are read"),
        (row(EMPTY, more='table:number-rows-repeated="999999999"') + row(1.5, 2.5), "more than the 2000000 cells"),
        (HEAD + row(f"<table:table-cell {REPEATED.format(9999)}/>", 1.5), "row 2 has more than the 1000 columns"),
        (HEAD + row("x" * 200_000), "row 2 has a cell of 200000 characters, more than the 32767 that are read"),
        (
            HEAD + row(cell("x" * 9_000, REPEATED.format(900)), more='table:number-rows-repeated="1500"'),
            "its cells hold more than the 50 MB of text that are read",
        ),
        (row(cell(1.5, REPEATED.format("9" * 30))), r"the spreadsheet is damaged \(ValueError\)"),
        (row(cell(1.5, REPEATED.format(-1))), r"the spreadsheet is damaged \(ValueError\)"),
        (row("x") * 3, "no worksheet holds two columns of numbers"),
        ("<table:table-row>", r"the spreadsheet is damaged \(ValueError\)"),
        (row('<table:table-cell office:value-type="float" office:value="1_000"/>', 2.0), "the spreadsheet is damaged"),
        ('<!DOCTYPE x [<!ENTITY a "aaaaaaaa">]>', "defines XML entities"),
    ],
)
def test_ods_that_would_fill_the_memory_or_is_damaged(rows: str, words: str, tmp_path: Path) -> None:
    """Cells, columns and rows that repeat without end are refused before one is repeated, damage in one sentence."""
    with pytest.raises(InputError, match=words):
        read_text(tmp_path, ods(rows))


def test_cells_are_counted_over_all_sheets(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Sheets that are each within the limit pass it together; one that is chosen is counted alone."""
    monkeypatch.setattr(sheet_size, "MAX_CELLS", 10)
    sheet = HEAD + row(1.5, 2.25) + row(3.0, 4.5)
    for data in (ods(sheet, sheet), books("b", "a")):
        with pytest.raises(InputError, match="has more than the 10 cells that are read"):
            read_text(tmp_path, data)
        assert read_text(tmp_path, data, worksheet="a").temperature.size == 2


def test_ods_without_the_library_for_xlsx(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """An .ods file needs nothing beyond the standard library, and its content counts, not its name."""
    monkeypatch.setitem(__import__("sys").modules, "openpyxl", None)
    (tmp_path / "run.xlsx").write_bytes(ods(HEAD + row(1.5, 2.25) + row(3.0, 4.5)))
    assert latticefit.read(tmp_path / "run.xlsx").temperature.tolist() == [1.5, 3.0]


def test_worksheet_that_is_not_chosen_is_not_unfolded(tmp_path: Path) -> None:
    """Limits count for the sheet that is read: a huge one beside it does not matter once the choice is made."""
    huge = HEAD + row(1.5, 2.5, more='table:number-rows-repeated="900000000"')
    data = ods(huge, HEAD + row(1.5, 2.25) + row(3.0, 4.5))
    assert list(read_text(tmp_path, data, worksheet="b").temperature) == [1.5, 3.0]
    with pytest.raises(InputError, match="2000000 cells"):
        read_text(tmp_path, data)


def books(*titles: str) -> bytes:
    """A spreadsheet whose sheets hold one row more each."""
    workbook = openpyxl.Workbook()
    workbook.remove(workbook.active)
    for number, title in enumerate(titles, start=2):
        sheet = workbook.create_sheet(title)
        for line in (TABLE[1], *([float(k), 2.0] for k in range(number))):
            sheet.append(line)
    stream = io.BytesIO()
    workbook.save(stream)
    return stream.getvalue()


@pytest.mark.parametrize(("worksheet", "rows"), [("2", 3), ("3", 4), (" run ", 2), ("4", 5), ("run", 2)])
def test_worksheet_by_name_goes_before_its_number(worksheet: str, rows: int, tmp_path: Path) -> None:
    """A sheet that is called 3 is read for "3", be it the second or the third; any other number counts from 1."""
    data = books("run", "x", "3", " ")  # once: the library writes the time into it
    measurement = read_text(tmp_path, data, worksheet=worksheet)
    assert measurement.readings[0].rows == rows
    settings = measurement.readings[0].settings
    again = read_text(tmp_path, data, **{"worksheet": settings.worksheet})
    assert again.readings == measurement.readings


def test_worksheet_that_is_not_there(tmp_path: Path) -> None:
    """The nearest name is offered, or all of them; names with control characters are escaped."""
    data = with_part(books("cooling", "heating"), "xl/workbook.xml", lambda xml: xml.replace(b"heating", b"h&#x202e;t"))
    with pytest.raises(InputError, match=r"no worksheet 'coolin'; did you mean 'cooling'\?"):
        read_text(tmp_path, data, worksheet="coolin")
    for wrong in ("x", "0", "3"):
        with pytest.raises(InputError, match=r"'cooling' and 'h\\u202et'") as caught:
            read_text(tmp_path, data, worksheet=wrong)
        assert str(caught.value).isprintable()
    with pytest.raises(InputError, match=r"worksheets 'cooling' and 'h\\u202et' all hold numbers; choose one by"):
        read_text(tmp_path, data)

"""The text report, the summary on stdout, and how numbers and names are worded."""

from __future__ import annotations

import re
import unicodedata
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from analysis_factory import CASES, build, renamed, undetermined

from latticefit.records import Analysis
from latticefit.report import CAUTIONS, summary_text, text_report
from latticefit.report.wording import concise, plain_number, plus_minus, significant
from latticefit.wording import harmless

NASTY = "wide 試料の名前 \x1b[31mred\x07 \u202egnp.exe\n  new line " + "x" * 120


def _columns(line: str) -> int:
    return sum(2 if unicodedata.east_asian_width(each) in "WF" else 1 for each in line)


@pytest.mark.parametrize("name", [*CASES, "undetermined", "nasty"])
def test_text_fits_eighty_columns(name: str, tmp_path: Path) -> None:
    """No line of report or summary is wider than a terminal, whatever the sample is called."""
    if name == "undetermined":
        found = undetermined(tmp_path)
    else:
        found = build(CASES.get(name, CASES["metal"]), tmp_path)
    found = renamed(found, NASTY) if name == "nasty" else found
    lines = (text_report(found) + summary_text(found, Path("a" * 150))).splitlines()
    assert len(lines) > 60
    assert max(map(_columns, lines)) <= 80


def test_names_cannot_act_on_a_terminal(tmp_path: Path) -> None:
    """Escape sequences, bells and direction marks in names are shown as escapes."""
    found = renamed(build(CASES["metal"], tmp_path), NASTY)
    for text in (text_report(found), summary_text(found, None)):
        assert {unicodedata.category(each) for each in text if each != "\n"}.isdisjoint({"Cc", "Cf", "Cs"})
    assert "\\x1b[31m" in text_report(found)


def test_no_colour_even_when_the_surroundings_ask_for_it(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """FORCE_COLOR and COLUMNS in the environment change nothing: the report is a file."""
    found = build(CASES["metal"], tmp_path)
    plain = text_report(found)
    monkeypatch.setenv("FORCE_COLOR", "1")
    monkeypatch.setenv("COLUMNS", "200")
    monkeypatch.setenv("TERM", "dumb")
    assert text_report(found) == plain


def test_sections_stand_in_their_order(tmp_path: Path) -> None:
    """From what was measured to where it came from."""
    text = text_report(build(CASES["metal"], tmp_path))
    heads = [
        "What was measured", "Verdict", "Model", "Parameters", "Characteristic temperatures", "At 298.15 K",
        "Thermodynamic functions", "Residuals", "Validity of the fit", "Warnings", "Repairs", "Cautions", "Provenance",
    ]  # fmt: skip
    places = [text.index(f"\n{head}") for head in heads]
    assert places == sorted(places)


def test_a_model_that_does_not_describe_the_data_is_said_so_first(tmp_path: Path) -> None:
    """The line below the title says it, before anything else; a good fit has no such line."""
    bad = text_report(build(CASES["misfit"], tmp_path)).splitlines()
    assert "does not describe the data" in " ".join(bad[2:4])
    good = text_report(build(CASES["metal"], tmp_path))
    assert "NOT TO BE RELIED ON" not in good


def test_withheld_quantity_is_named_beside_the_verdict(tmp_path: Path) -> None:
    """A stop-level warning stands with the verdict, and the value is given in a word, not as a number."""
    text = text_report(build(CASES["coldstop"], tmp_path))
    assert "Withheld: The lowest point fitted" in text
    row = next(line for line in text.splitlines() if "theta_D(T->0)  " in line)
    assert row.split()[-1] == "undetermined"


def test_people_read_the_numbers_of_the_record_rounded(tmp_path: Path) -> None:
    """Two digits of u, the value to match, gamma in mJ, modes also in atoms."""
    found = build(CASES["metal"], tmp_path)
    text = text_report(found)
    for words in (
        "290.00 ± 0.88 K",
        "2.100 ± 0.023 modes = 0.7000 ± 0.0077 atoms",
        "0.7200 ± 0.0035 mJ/(mol K²)",
        "326.61 ± 0.61 K",
        "34.508 ± 0.059 J/(mol K)",
        "34.508(59)",
    ):
        assert words in text
    row = int(np.flatnonzero(found.derived.table.temperature == 298.15)[0])
    assert found.derived.table.entropy[row] == pytest.approx(34.508, abs=5e-4)
    assert found.derived.table.entropy_u[row] == pytest.approx(0.059, abs=5e-4)


def test_summary_is_a_dozen_lines_with_the_folder(tmp_path: Path) -> None:
    """What fit prints: verdict, parameters, key numbers, where the report is; the same strings as in the report."""
    found = build(CASES["metal"], tmp_path)
    summary = summary_text(found, Path("out"))
    assert summary.splitlines()[-1].endswith("out/report.html")
    assert 10 <= len(summary.splitlines()) <= 18
    report = text_report(found)
    for words in ("290.00 ± 0.88 K", "34.508 ± 0.059 J/(mol K)", "5107.9 ± 5.6 J/mol"):
        assert words in summary
        assert words in report
    assert "report.html" not in summary_text(found, None)


def test_long_tables_are_shortened_with_a_note(tmp_path: Path) -> None:
    """Of a hundred rows the text shows the round temperatures and says that table.csv has all."""
    found = build(CASES["metal"], tmp_path)
    long = replace(found, derived=replace(found.derived, table=found.derived.curve))
    at_standard = replace(long.derived.table, temperature=np.linspace(1.15, 298.15, 400))
    odd = text_report(replace(long, derived=replace(long.derived, table=at_standard)))
    assert odd.count("(?)") + odd.count(")") > 400  # hardly a round temperature: all rows stand
    round_T = replace(long.derived.table, temperature=np.append(np.arange(1.0, 400.0), 298.15))
    text = text_report(replace(long, derived=replace(long.derived, table=round_T)))
    assert "of 400 rows; the others stand in table.csv" in text.replace("\n  ", " ")


def test_cautions_stand_in_the_report(tmp_path: Path) -> None:
    """The cautions on extrapolated values and on cryogens are in every text report, word for word."""
    text = " ".join(text_report(build(CASES["metal"], tmp_path)).split())
    assert all(caution in text for caution in CAUTIONS)
    assert "asphyxiation" in text


@pytest.mark.parametrize(
    ("value", "u", "shown"),
    [
        (24.4434, 0.0523, "24.443(52)"),
        (5003.21, 9.13, "5003.2(9.1)"),
        (5003.21, 91.3, "5003(91)"),
        (0.0001234, 0.0000012, "1.234(12)e-4"),
        (0.1, 0.0996, "0.10(10)"),
        (33.16, None, "33.2(?)"),
        (24.0, float("nan"), "24.0(?)"),
        (735.4, None, "735(?)"),
        (5003.2, None, "5003(?)"),
        (None, 0.1, "-"),
        (float("nan"), 0.1, "-"),
        (2.5, 0.0, "2.50"),
    ],
)
def test_concise_notation(value: float | None, u: float | None, shown: str) -> None:
    """A bracket without a point counts last digits, one with a point is in the unit (JCGM 100:2008, 7.2.2)."""
    assert concise(value, u) == shown


@pytest.mark.parametrize(
    ("arguments", "shown"),
    [
        ((6.9123e-4, 5.1e-6, "J/(mol K^2)"), "0.6912 ± 0.0051 mJ/(mol K²)"),
        ((344.3, None, "K"), "344.3 K"),
        ((3.0, 0.0, "1"), "3"),
        ((None, None, "K"), "-"),
        ((5.6e-6, 3e-8, "mol/J"), "(5.600 ± 0.030)e-06 mol/J"),
    ],
)
def test_value_with_uncertainty(arguments: tuple[float | None, float | None, str], shown: str) -> None:
    """Value, u and unit as a person reads them; the value alone where u is withheld or zero."""
    assert plus_minus(*arguments) == shown


def test_plain_numbers() -> None:
    """Without u: as many digits as asked for, large numbers in full, nothing for NaN."""
    assert (plain_number(61234.5), plain_number(0.5), plain_number(1e-7)) == ("61234", "0.5", "1e-7")
    assert (significant(1.0, 3), significant(735.4, 3), significant(61234.5, 3)) == ("1.00", "735", "61234")
    assert (plain_number(float("nan")), plain_number(None), significant(None, 2)) == ("-", "-", "-")


def test_harmless_keeps_what_people_write() -> None:
    """Accents, Greek and other scripts stay; control, direction and surrogate characters become escapes."""
    assert harmless("Åsgård µ-α 試料") == "Åsgård µ-α 試料"
    assert harmless("a\n\x1b\u202e\udc80\u2028") == r"a\n\x1b\u202e\udc80\u2028"


def test_report_of_a_failed_fit_can_be_read(tmp_path: Path) -> None:
    """Nothing determined (exit code 3): every value is given without u or as undetermined, no nan in sight."""
    found: Analysis = undetermined(tmp_path)
    text = text_report(found)
    assert re.search(r"\b(nan|inf)\b", text) is None
    assert "(u not determined)" in text

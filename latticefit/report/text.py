"""The report as plain text for an 80-column terminal, and the dozen lines that `fit` prints."""

from __future__ import annotations

import io
from collections.abc import Iterable, Sequence
from pathlib import Path

from rich.console import Console
from rich.padding import Padding
from rich.table import Table
from rich.text import Text

from ..records import Analysis
from ..wording import harmless
from . import content
from .cautions import CAUTIONS
from .content import Grid, Row
from .level import level_is_in_doubt, level_text
from .ranking import ranking_lines

__all__ = ["WIDTH", "summary_text", "text_report"]

WIDTH = 80
"""Columns of the text report."""

_LABEL_WIDTH = 34


def text_report(analysis: Analysis) -> str:
    """Return the whole report as text that fits 80 columns.

    Parameters
    ----------
    analysis : Analysis
        All records of one run.
    """
    page = _Page()
    page.title(f"latticefit report: {content.headline(analysis)}")
    if not analysis.diagnosis.describes:
        page.say(f"NOT TO BE RELIED ON. {harmless(analysis.diagnosis.verdict)}")
    page.section("What was measured")
    page.rows(content.measured_rows(analysis))
    page.section("Verdict")
    page.say(harmless(analysis.diagnosis.verdict))
    for note in content.withheld_notes(analysis):
        page.say(f"Withheld: {note}")
    page.section("Model")
    page.rows(content.model_rows(analysis))
    if len(analysis.comparison.candidates) > 1:
        page.section("Candidate models (same points, same uncertainties)")
        page.lines(ranking_lines(analysis.comparison))
    page.section("Parameters (value ± u, k = 1)")
    page.rows(content.parameter_rows(analysis))
    page.section("Characteristic temperatures")
    page.rows(content.temperature_rows(analysis))
    page.section("At 298.15 K and at 0 K")
    page.rows(content.standard_rows(analysis))
    page.section("Thermodynamic functions (all digits: table.csv)")
    table = analysis.derived.table
    page.grid(content.function_grid(table, content.round_rows(table)))
    page.section("Residuals (every point: residuals.csv)")
    page.rows(content.fit_rows(analysis))
    page.say("")
    page.grid(content.band_grid(analysis))
    page.section("Validity of the fit")
    page.rows(content.validity_rows(analysis))
    page.section("Warnings")
    page.rows(content.warning_rows(analysis), none="None.")
    page.section("Repairs made while reading")
    page.rows(content.repair_rows(analysis), none="None.")
    page.section("Cautions")
    for caution in CAUTIONS:
        page.say(caution)
    page.section("Provenance")
    page.rows(content.provenance_rows(analysis))
    return page.text()


def summary_text(analysis: Analysis, folder: Path | None) -> str:
    """Return what `fit` prints: sample, model, verdict, key numbers and where the report is.

    Parameters
    ----------
    analysis : Analysis
        All records of one run.
    folder : Path or None
        The report folder; None when none was written.
    """
    points, fit_range = content.measured_rows(analysis)[3:5]
    model = content.model_rows(analysis)[0]
    form = "" if analysis.fit.cp_cv == "none" else f" with {analysis.fit.cp_cv}"
    fit_quality, residuals = content.fit_rows(analysis)[:2]
    keys = content.standard_rows(analysis)
    low = [row for row in content.temperature_rows(analysis) if row.label == "theta_D(T->0)"]
    rows = [
        Row("sample", f"{content.headline(analysis)}, {points.value}, {fit_range.value}"),
        Row("model", f"{model.value}{form}; {model.note}"),
        *([Row("chosen", analysis.comparison.because)] if len(analysis.comparison.candidates) > 1 else []),
        Row("verdict", analysis.diagnosis.verdict),
        *(Row(each.label, each.value) for each in content.parameter_rows(analysis)),
        *(Row(each.label, each.value) for each in low),
        *(Row(f"{each.label} at 298.15 K", each.value) for each in (keys[1], keys[2])),
        Row("residuals", f"{residuals.value}, {residuals.note}; reduced chi-square {fit_quality.value}"),
    ]
    if analysis.level is not None and level_is_in_doubt(analysis.level):
        rows.append(Row("level", level_text(analysis.level)))
    if analysis.warnings:
        rows.append(Row("warnings", ", ".join(f"{each.code} ({each.level})" for each in analysis.warnings)))
    if folder is not None:
        rows.append(Row("report", str(folder / "report.html")))
    page = _Page()
    page.rows(tuple(rows), indent=0)
    return page.text()


class _Page:
    """Lines of plain text under construction; rich counts the columns, so that wide characters wrap rightly."""

    def __init__(self) -> None:
        self._out = io.StringIO()
        self._console = Console(
            file=self._out,
            width=WIDTH,
            color_system=None,
            force_terminal=False,
            force_jupyter=False,
            force_interactive=False,
            legacy_windows=False,
            markup=False,
            emoji=False,
            highlight=False,
        )

    def text(self) -> str:
        return "\n".join(line.rstrip() for line in self._out.getvalue().splitlines()) + "\n"

    def title(self, words: str) -> None:
        self._console.print(Text(words))
        self._console.print("=" * min(WIDTH, Text(words).cell_len))

    def section(self, words: str) -> None:
        self._console.print(f"\n{words}\n{'-' * len(words)}")

    def say(self, words: str) -> None:
        self._console.print(Padding(Text(words), (0, 0, 0, 2)))

    def lines(self, lines: Sequence[str]) -> None:
        """Write lines that have their layout already."""
        for each in lines:
            self._console.print(Text(each), soft_wrap=True)

    def rows(self, rows: Sequence[Row], none: str = "", indent: int = 2) -> None:
        """Write label, value and remark; the remark follows where all three fit on the line, else stands below."""
        if not rows:
            self.say(none)
            return
        table = Table.grid(padding=(0, 2, 0, 0))
        table.add_column(no_wrap=False, max_width=_LABEL_WIDTH)
        table.add_column(overflow="fold")
        room = WIDTH - indent - 2 - min(_LABEL_WIDTH, max(Text(row.label).cell_len for row in rows))
        for row in rows:
            for label, value in _lines(row, room):
                table.add_row(Text(label, overflow="fold"), Text(value, overflow="fold"))
        self._console.print(Padding(table, (0, 0, 0, indent)))

    def grid(self, grid: Grid) -> None:
        table = Table(box=None, pad_edge=False, padding=(0, 1), show_header=True)
        for number, head in enumerate(grid.heads):
            table.add_column(Text(head.replace(" / ", "\n", 1)), justify="left" if number == 0 else "right")
        for row in grid.rows:
            table.add_row(*(Text(cell, overflow="fold") for cell in row))
        self._console.print(Padding(table, (0, 0, 0, 2)))
        for note in grid.notes:
            self.say(note)


def _lines(row: Row, room: int) -> Iterable[tuple[str, str]]:
    joined = f"{row.value}  ({row.note})"
    if not row.note:
        return [(row.label, row.value)]
    if Text(joined).cell_len <= room:
        return [(row.label, joined)]
    return [(row.label, row.value), ("", row.note)]

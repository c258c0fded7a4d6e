"""``latticefit fit``: from files or a run sheet to a report folder."""

from __future__ import annotations

import argparse
import shlex
import sys
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING

from ..wording import harmless
from . import options
from .parsing import CommandParser
from .request import request
from .streams import print_json

if TYPE_CHECKING:
    from ..records import Analysis, Measurement, ModelSettings, Sheet

__all__ = ["parser", "run"]

_EXAMPLE = (
    "latticefit fit run.csv --formula Cu --terms 'debye + einstein + electronic' \\\n"
    "      --cp-cv nernst-lindemann --sigma '1% below 100 K, 0.3% above'"
)


def parser() -> CommandParser:
    """Return the command's parser."""
    made = CommandParser("fit", "Fit a lattice model to measured heat capacities and write a report folder.", _EXAMPLE)
    made.add_argument("files", nargs="+", metavar="FILE|SHEET", help="files of one sample, or one run sheet (.toml)")
    options.add_sample_options(made)
    options.add_column_options(made)
    options.add_point_options(made)
    options.add_model_options(made)
    options.add_report_options(made)
    made.add_argument("--allow-outside", action="store_true", help="let a sheet name files outside its own folder")
    return made


def _out_folder(arguments: argparse.Namespace, sheet: Sheet, from_sheet: Path | None) -> Path | None:
    """Where the report goes; None when only JSON is wanted."""
    if arguments.out is not None:
        return Path(arguments.out)
    if arguments.json:
        return None
    return from_sheet or Path(f"{Path(sheet.runs[0].file).stem}_latticefit")


def run(arguments: argparse.Namespace) -> int:
    """Fit, write the report, print the summary or the JSON record."""
    from ..fitting import requested_model
    from ..reading import read_measurement

    sheet, base, from_sheet = request(arguments, parser())
    if sheet.model.terms is not None:
        requested_model(sheet.model)  # a misspelt term or parameter is told before anything is read
    out = _out_folder(arguments, sheet, from_sheet)
    if out is not None:
        from ..report import check_out_folder

        check_out_folder(out, arguments.replace)

    def tell(words: str) -> None:
        if not arguments.quiet:
            print(f"latticefit: {words}", file=sys.stderr, flush=True)

    if sheet.sample.melting_point is not None and not _holds_coefficient(sheet.model):
        tell(
            "the melting point is not used: it only holds the coefficient of --cp-cv nernst-lindemann, where that is "
            "not named itself"
        )
    measurement = read_measurement(sheet.sample, sheet.runs, base, sheet.addenda)
    _tell_repairs(measurement, tell)
    return _finish(arguments, sheet, measurement, base, out, tell)


def _holds_coefficient(settings: ModelSettings) -> bool:
    """Whether a melting point has something to hold: the Cp-Cv coefficient, unless the user names it."""
    named = {*settings.start, *settings.fix, *settings.bounds}
    possible = settings.cp_cv == "nernst-lindemann" or (settings.cp_cv is None and settings.terms is None)
    return possible and "nernst_lindemann_coefficient" not in named


def _tell_repairs(measurement: Measurement, tell: Callable[[str], None]) -> None:
    for repair in measurement.repairs:
        where = repair.file if repair.line is None else f"{repair.file}, line {repair.line}"
        tell(harmless(f"{where}: {repair.message}"))


def _finish(
    arguments: argparse.Namespace,
    sheet: Sheet,
    measurement: Measurement,
    base: Path,
    out: Path | None,
    tell: Callable[[str], None],
) -> int:
    from ..analysis import analyse
    from ..report import json_text, result_record, summary_text, write_report

    command = shlex.join(["latticefit", *sys.argv[1:]])
    analysis = analyse(sheet, measurement, command, tell, base)
    if out is not None:
        tell("writing the report")
        write_report(analysis, out, arguments.replace, sheet.report.figures)
    if arguments.json:
        print_json(json_text(result_record(analysis)))
    else:
        print(summary_text(analysis, out), end="")
    return 0 if _trustworthy(analysis) else 3


def _trustworthy(analysis: Analysis) -> bool:
    """Whether anything came out: the fit converged and determined at least one free parameter, or had none."""
    free = [each for each in analysis.fit.parameters if each.status not in ("fixed", "tied")]
    return analysis.fit.converged and (not free or any(each.status == "fitted" for each in free))

"""``latticefit rank``: candidate models on the same data."""

from __future__ import annotations

import argparse
import sys

from . import options
from .parsing import CommandParser
from .request import request

__all__ = ["parser", "run"]


def parser() -> CommandParser:
    """Return the command's parser."""
    made = CommandParser(
        "rank",
        "Compare candidate models on the same data. Writes nothing.",
        "latticefit rank run.csv --formula Cu --sigma '1% below 100 K, 0.3% above'",
    )
    made.add_argument("files", nargs="+", metavar="FILE|SHEET", help="files of one sample, or one run sheet (.toml)")
    options.add_sample_options(made)
    options.add_column_options(made)
    options.add_point_options(made)
    options.add_model_options(made, terms=False)
    made.add_argument("--random-seed", metavar="N", help="seed of everything random (default: 0)")
    made.add_argument("--json", action="store_true", help="print the ranking as JSON")
    made.add_argument("--quiet", action="store_true", help="no notes and no progress")
    made.add_argument("--allow-outside", action="store_true", help="let a sheet name files outside its own folder")
    return made


def run(arguments: argparse.Namespace) -> int:
    """Print the ranking; a sheet's own terms are set aside, because the ladder is what is asked for."""
    from dataclasses import replace

    from ..analysis import ranked
    from ..reading import read_measurement
    from ..report.ranking import comparison_record, ranking_text
    from ..report.result import json_text

    sheet, base, _ = request(arguments, parser())

    def tell(words: str) -> None:
        if not arguments.quiet:
            print(f"latticefit: {words}", file=sys.stderr, flush=True)

    measurement = read_measurement(sheet.sample, sheet.runs, base, sheet.addenda)
    comparison = ranked(replace(sheet, model=replace(sheet.model, terms=None)), measurement, tell, base)
    if arguments.json:
        print(json_text(comparison_record(comparison)), end="")
    else:
        print(ranking_text(comparison, measurement.sample.name), end="")
    return 0

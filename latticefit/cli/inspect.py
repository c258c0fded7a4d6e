"""``latticefit inspect``: what was read from files, before any fit; writes nothing."""

from __future__ import annotations

import argparse

from ..errors import InputError
from . import options
from .parsing import CommandParser
from .streams import print_json

__all__ = ["parser", "run"]


def parser() -> CommandParser:
    """Return the command's parser."""
    made = CommandParser(
        "inspect",
        "Show what was read from files: columns, units, points, range, repairs. Writes nothing.",
        "latticefit inspect run.csv --formula Al2O3",
    )
    made.add_argument("files", nargs="+", metavar="FILE", help="files of temperature and heat capacity")
    options.add_sample_options(made)
    options.add_column_options(made)
    made.add_argument("--json", action="store_true", help="print everything that was read as JSON")
    return made


def run(arguments: argparse.Namespace) -> int:
    """Print what was read from each file."""
    from ..reading import read_measurement
    from ..report.inspection import inspection_record, inspection_text
    from ..report.result import json_text

    if any(options.is_sheet(file) for file in arguments.files):
        raise InputError("inspect reads data files; a run sheet is read by latticefit fit")
    sample = options.sample_settings(arguments)
    addenda = options.addenda_settings(arguments)
    measurements = [
        read_measurement(sample, (options.run_settings(arguments, file),), None, addenda) for file in arguments.files
    ]
    if arguments.json:
        print_json(json_text({"files": [inspection_record(each) for each in measurements]}))
    else:
        print("\n".join(inspection_text(each) for each in measurements), end="")
    return 0

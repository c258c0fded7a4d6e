"""``latticefit table``: a saved result on any grid, without a refit."""

from __future__ import annotations

import argparse
from pathlib import Path

from ..errors import InputError, nearest
from .parsing import CommandParser

__all__ = ["parser", "run"]

_AMOUNTS = ("mol", "g", "kg")


def parser() -> CommandParser:
    """Return the command's parser."""
    made = CommandParser(
        "table",
        "Evaluate a saved result on any grid, without a refit: Cp, H, S, Gibbs energy function, each with u.",
        "latticefit table cu/result.json --grid '0.5:5:0.5, 10:300:10' --per kg --between 4:77",
    )
    made.add_argument("result", metavar="RESULT.json", help="a result.json, or the report folder that holds it")
    made.add_argument("--grid", metavar="TEXT", help="temperatures in K, e.g. '0.5:5:0.5, 10:300:10, 298.15'")
    made.add_argument("--per", metavar="mol|g|kg", default="mol", help="amount of substance or mass (default: mol)")
    made.add_argument(
        "--between",
        metavar="LOW:HIGH",
        action="append",
        default=[],
        help="also the differences of H and S between two temperatures in K (repeatable)",
    )
    form = made.add_mutually_exclusive_group()
    form.add_argument("--csv", action="store_true", help="print CSV with full digits")
    form.add_argument("--json", action="store_true", help="print JSON with full digits")
    return made


def _pair(text: str) -> tuple[float, float]:
    from ..reading.settings import temperatures

    sides = text.split(":")
    if len(sides) != 2:
        raise InputError(f"--between {text!r}: give two temperatures in K, the lower one first, e.g. 4:77")
    (low,), (high,) = (temperatures(side, "--between") for side in sides)
    if not low < high:
        raise InputError(f"--between {text!r}: give the lower temperature first, e.g. 4:77")
    return low, high


def run(arguments: argparse.Namespace) -> int:
    """Print the table."""
    from ..report.evaluation import evaluation_csv, evaluation_record, evaluation_text
    from ..report.result import json_text
    from ..report.saved import evaluate, read_result

    if arguments.per not in _AMOUNTS:
        raise InputError(f"--per cannot be {arguments.per!r}; {nearest(arguments.per, _AMOUNTS)}")
    pairs = [_pair(text) for text in arguments.between]
    saved = read_result(Path(arguments.result))
    table, differences = evaluate(saved, arguments.grid, pairs, arguments.per)
    if arguments.json:
        print(json_text(evaluation_record(table, differences)), end="")
    elif arguments.csv:
        print(evaluation_csv(table, differences), end="")
    else:
        print(evaluation_text(saved, table, differences, arguments.result), end="")
    return 0

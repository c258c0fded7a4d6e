"""``latticefit verify``: the tool's Debye functions beside a published table."""

from __future__ import annotations

import argparse

from .parsing import CommandParser
from .streams import print_json

__all__ = ["parser", "run"]


def parser() -> CommandParser:
    """Return the command's parser."""
    made = CommandParser("verify", "Compare the tool's Debye functions with a published table.", "latticefit verify")
    made.add_argument("--json", action="store_true", help="print the comparison as JSON")
    return made


def run(arguments: argparse.Namespace) -> int:
    """Print the comparison; exit code 3 when it fails."""
    import json

    from ..functions import published_check
    from ..report.verification import agrees, verification_record, verification_text

    check = published_check()
    if arguments.json:
        print_json(json.dumps(verification_record(check), indent=2))
    else:
        print(verification_text(check))
    return 0 if agrees(check) else 3

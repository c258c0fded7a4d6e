"""The command line: one thin file per command; nothing heavy is imported before a command runs."""

from __future__ import annotations

import os
import sys
from argparse import Namespace
from importlib import import_module
from typing import Protocol

from .._version import __version__
from ..errors import FitError, InputError, nearest
from ..later import LATER_COMMANDS
from ..wording import harmless
from .parsing import CommandParser
from .streams import tolerate_any_encoding

__all__ = ["COMMANDS", "main"]

COMMANDS = {
    "fit": "fit a lattice model to measured heat capacities and write a report folder",
    "rank": "compare candidate models on the same data",
    "table": "evaluate a saved result on any grid, without a refit",
    "inspect": "show what was read from files: columns, units, points, range, repairs",
    "verify": "compare the tool's Debye functions with a published table",
}
"""Every command with its one-line summary; each lives in a module of its name. A new one is a file and a line."""

_INPUT_ERROR, _NOTHING_TRUSTWORTHY, _INTERRUPTED = 2, 3, 130

_HEAD = """usage: latticefit COMMAND ...

Einstein, Debye and mixed lattice models for measured heat capacities.

commands:
"""
_TAIL = """
  latticefit COMMAND --help   options of a command, with an example
  latticefit --version        version
"""


class _Command(Protocol):
    def parser(self) -> CommandParser: ...
    def run(self, arguments: Namespace) -> int: ...


def _overview() -> str:
    return _HEAD + "".join(f"  {name:<9}{summary}\n" for name, summary in COMMANDS.items()) + _TAIL


def _run(words: list[str]) -> int:
    if not words or words[0] in ("-h", "--help"):
        print(_overview(), end="")
        return 0
    if words[0] == "--version":
        print(f"latticefit {__version__}")
        return 0
    if words[0] in LATER_COMMANDS:
        raise InputError(f"the command {words[0]} is not available in this version (see latticefit --help)")
    if words[0] not in COMMANDS:
        kind = "option" if words[0].startswith("-") else "command"
        raise InputError(f"there is no {kind} {words[0]!r}; {nearest(words[0], COMMANDS)} (see latticefit --help)")
    command: _Command = import_module(f".{words[0]}", __name__)
    return command.run(command.parser().read(words[1:]))


def main(words: list[str] | None = None) -> int:
    """Run the command line and return its exit code.

    Parameters
    ----------
    words : list of str, optional
        Command and options; those of the process when left out.

    Returns
    -------
    int
        0 a result was written; 2 the input or the options are wrong; 3 nothing trustworthy came out; 130 interrupted.
    """
    tolerate_any_encoding()
    try:
        return _run(sys.argv[1:] if words is None else words)
    except InputError as error:
        print(f"latticefit: {harmless(str(error))}", file=sys.stderr)
        return _INPUT_ERROR
    except FitError as error:
        print(f"latticefit: {harmless(str(error))}", file=sys.stderr)
        return _NOTHING_TRUSTWORTHY
    except KeyboardInterrupt:
        print("latticefit: interrupted; nothing was written", file=sys.stderr)
        return _INTERRUPTED
    except BrokenPipeError:
        # the reader of a pipe has gone; python would complain again when it flushes stdout at exit
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 0

"""An argument parser whose complaints are one sentence each."""

from __future__ import annotations

import argparse
import re
from typing import NoReturn

from ..errors import InputError, nearest
from ..later import LATER_OPTIONS

__all__ = ["CommandParser"]


class CommandParser(argparse.ArgumentParser):
    """The parser of one command.

    Parameters
    ----------
    name : str
        The command.
    summary : str
        What it does, for the help.
    example : str
        One example, shown below the options.
    """

    def __init__(self, name: str, summary: str, example: str) -> None:
        super().__init__(
            prog=f"latticefit {name}",
            description=summary,
            epilog=f"example:\n  {example}",
            formatter_class=argparse.RawDescriptionHelpFormatter,
            allow_abbrev=False,
        )

    def error(self, message: str) -> NoReturn:
        """Raise an InputError instead of printing the usage."""
        expected = re.fullmatch(r"argument (.+): expected one argument", message)
        if expected:
            message = f"{expected[1]} needs a value"
        raise InputError(f"{message} (see {self.prog} --help)")

    def read(self, words: list[str]) -> argparse.Namespace:
        """Parse the words after the command; an unknown option is refused with the nearest known one."""
        known, rest = self.parse_known_args(words)
        for word in rest:
            if word.startswith("-"):
                option = word.split("=")[0]
                if option in LATER_OPTIONS:
                    raise InputError(f"{option} is not available in this version; leave it out")
                options = [each for action in self._actions for each in action.option_strings if each.startswith("--")]
                raise InputError(f"{self.prog} has no option {option!r}; {nearest(option, options)}")
        if rest:
            raise InputError(f"{rest[0]!r} is one argument too many (see {self.prog} --help)")
        return known

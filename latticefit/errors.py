"""Exceptions that latticefit raises on purpose. Each message says what, where and how to mend it."""

from __future__ import annotations

import difflib
from collections.abc import Iterable

__all__ = ["FitError", "InputError", "LatticefitError", "nearest"]


class LatticefitError(Exception):
    """Base class: anything latticefit reports to a person in one sentence."""


class InputError(LatticefitError, ValueError):
    """Raised when a file, an option, a sheet or an argument is wrong; exit code 2."""


class FitError(LatticefitError, RuntimeError):
    """Raised when no fit can be started although the input is in order; exit code 3."""


def nearest(word: str, known: Iterable[str]) -> str:
    """Return a hint that names the known word nearest to `word`, or all of them.

    Parameters
    ----------
    word : str
        What was written.
    known : iterable of str
        What would have been accepted.

    Returns
    -------
    str
        ``"did you mean 'x'?"`` or ``"known are a, b and c"``.
    """
    choices = sorted(known)
    begun = [choice for choice in choices if word and choice.startswith(word)]
    match = begun if len(begun) == 1 else difflib.get_close_matches(word, choices, n=1, cutoff=0.6)
    if match:
        return f"did you mean {match[0]!r}?"
    listed = ", ".join(choices[:-1]) + (" and " if len(choices) > 1 else "") + choices[-1] if choices else "none"
    return f"known are {listed}"

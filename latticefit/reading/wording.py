"""How messages show what a file holds: quoted, shortened, control characters escaped."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from ..errors import nearest

__all__ = ["bare", "counted", "listed", "offered", "quoted", "shown_name"]

_LONGEST = 60


def quoted(text: str) -> str:
    """Return a cell, header or option in quotes, shortened, with control characters escaped."""
    return repr(text if len(text) <= _LONGEST else text[: _LONGEST - 3] + "...")


def bare(text: str) -> str:
    """Return a name or a number without quotes where it is short and prints, else as `quoted`."""
    return text if text.isprintable() and len(text) <= _LONGEST else quoted(text)


def shown_name(name: str) -> str:
    """Return a file name as it is, or quoted where it holds characters that do not print."""
    return name if name.isprintable() else quoted(name)


def listed(words: Iterable[str]) -> str:
    """Return quoted words as ``'a', 'b' and 'c'``; beyond ten only their number is given."""
    shown = [quoted(word) for word in words]
    if len(shown) > 10:
        shown = [*shown[:9], f"{len(shown) - 9} more"]
    return ", ".join(shown[:-1]) + " and " + shown[-1] if len(shown) > 1 else "".join(shown)


def offered(word: str, headers: Sequence[str]) -> str:
    """Return a hint that names the header nearest to a word, or all of them."""
    hint = nearest(word, map(shown_name, headers))
    return hint if hint.startswith("did you mean") else f"the columns are {listed(headers)}"


def counted(number: int, noun: str) -> str:
    """Return ``1 word`` or ``2 words``."""
    return f"{number} {noun}" if number == 1 else f"{number} {noun}s"

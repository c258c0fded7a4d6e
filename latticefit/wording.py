"""Text from outside, made safe to show: names in files and sheets may hold anything."""

from __future__ import annotations

import unicodedata

__all__ = ["harmless"]

# Control and format characters (among them those that turn the direction of text), lone surrogates, line separators.
_HARMFUL = frozenset(("Cc", "Cf", "Cs", "Zl", "Zp"))


def harmless(text: str) -> str:
    r"""Return `text` with control, format and surrogate characters written as escapes, e.g. ``\x1b``.

    A sample name or a file label may come from anywhere; on a terminal or in a file it must not act.
    """
    return "".join(
        each.encode("unicode_escape").decode("ascii") if unicodedata.category(each) in _HARMFUL else each
        for each in text
    )

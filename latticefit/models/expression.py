"""Model expressions: terms joined by ``+``, with an optional count before a term."""

from __future__ import annotations

import re

from ..errors import InputError
from ..terms import term

__all__ = ["format_expression", "parse_expression"]

_PART = re.compile(r"^(?:(\d+)\s*)?([A-Za-z][A-Za-z0-9_]*)$")
_MOST = 9


def parse_expression(text: str) -> tuple[tuple[str, int], ...]:
    """Return the terms of an expression with their counts, in the order of first mention.

    Parameters
    ----------
    text : str
        For example ``"debye + 2 einstein + electronic"``.

    Raises
    ------
    InputError
        For an empty expression, an unknown term (the nearest name is offered) or a count outside 1 to 9.
    """
    counts: dict[str, int] = {}
    for part in text.split("+"):
        found = _PART.match(part.strip())
        if found is None:
            raise InputError(
                f"model expression {text!r}: cannot read {part.strip()!r}; write terms joined by '+', each with an "
                "optional count before it, e.g. 'debye + 2 einstein'"
            )
        name = term(found[2].lower()).name
        counts[name] = counts.get(name, 0) + int(found[1] or 1)
        if not 1 <= counts[name] <= _MOST:
            raise InputError(f"model expression {text!r}: the number of {name} terms must be 1 to {_MOST}")
        if counts[name] > 1 and all(spec.role == "amplitude" for spec in term(name).parameters):
            raise InputError(f"model expression {text!r}: one {name} term is enough; a second is the same function")
    if not any(term(name).lattice for name in counts):
        raise InputError(f"model expression {text!r} has no lattice term; add 'debye' or 'einstein'")
    return tuple(counts.items())


def format_expression(terms: tuple[tuple[str, int], ...]) -> str:
    """Return the standard spelling of an expression."""
    return " + ".join(name if count == 1 else f"{count} {name}" for name, count in terms)

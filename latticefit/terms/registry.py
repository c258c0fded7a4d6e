"""The physical terms by name. A new term is one file beside this one and one line here."""

from __future__ import annotations

from types import MappingProxyType

from ..errors import InputError, nearest
from . import debye, einstein, electronic
from .term import Term

__all__ = ["TERMS", "term"]

TERMS = MappingProxyType(
    {
        each.name: each
        for each in (
            debye.TERM,
            einstein.TERM,
            electronic.TERM,
        )
    }
)
"""Every term a model expression can name."""


def term(name: str) -> Term:
    """Return the term of that name.

    Raises
    ------
    InputError
        When there is no such term; the nearest name is offered.
    """
    try:
        return TERMS[name]
    except KeyError:
        raise InputError(f"{name!r} is not a term of a lattice model; {nearest(name, TERMS)}") from None

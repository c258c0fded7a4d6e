"""The physical terms by name. A new term is one file beside this one and one line here."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType

from ..errors import InputError, nearest
from . import debye, einstein, electronic
from .term import Term

__all__ = ["TERMS", "term"]

_TERMS: dict[str, Term] = {
    each.name: each
    for each in (
        debye.TERM,
        einstein.TERM,
        electronic.TERM,
    )
}

TERMS: Mapping[str, Term] = MappingProxyType(_TERMS)
"""Every term a model expression can name: a view, so that whoever imports it sees what is registered."""


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

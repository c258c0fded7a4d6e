"""Sigma texts: the stated uncertainty of a measurement in words, such as ``1% below 100 K, 0.3% above``."""

from __future__ import annotations

import math
import re
from collections.abc import Callable
from dataclasses import dataclass
from typing import Final

import numpy as np

from ..errors import InputError
from ..records import FloatArray
from ..units import HeatCapacityUnit, heat_capacity_unit
from .wording import quoted

__all__ = ["SigmaModel", "parse_sigma_text"]

_NUMBER: Final = r"(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d{1,3})?"
_RANGE: Final = re.compile(rf"(.*?)\s+(below|above)(?:\s+({_NUMBER})\s*K?)?", re.ASCII | re.IGNORECASE)
_TERM: Final = re.compile(rf"±?\s*({_NUMBER})\s*(.+)", re.ASCII)
_FORMS: Final = "'0.5%', '0.02 mJ/(mol K) + 0.3%' or '1% below 100 K, 0.3% above'"


@dataclass(frozen=True)
class _Term:
    """A percentage of the measured value (`unit` None) or an absolute value in a unit of heat capacity."""

    value: float
    unit: HeatCapacityUnit | None


@dataclass(frozen=True)
class _Piece:
    """The sigma for low <= T < high, K: its terms added in quadrature. `low` and `high` are None for elsewhere."""

    low: float | None
    high: float | None
    terms: tuple[_Term, ...]


@dataclass(frozen=True)
class SigmaModel:
    """A sigma text that has been read: its pieces by temperature."""

    text: str
    pieces: tuple[_Piece, ...]

    def evaluate(
        self,
        temperature: FloatArray,
        heat_capacity: FloatArray,
        factor_of: Callable[[HeatCapacityUnit], float],
        shown: str,
    ) -> FloatArray:
        """Return sigma at each point.

        Parameters
        ----------
        temperature, heat_capacity : ndarray, shape (n,)
            K, and the unit that `factor_of` converts to.
        factor_of : callable
            Factor from a unit of heat capacity to that of `heat_capacity`; raises InputError where there is none.
        shown : str
            The file as messages name it.

        Raises
        ------
        InputError
            If no piece covers a temperature.
        """
        sigma = np.full(temperature.shape, math.nan)
        for piece in sorted(self.pieces, key=lambda piece: piece.low is not None):  # "elsewhere" first
            square = np.zeros(temperature.shape)
            for term in piece.terms:
                part = heat_capacity * (term.value / 100) if term.unit is None else term.value * factor_of(term.unit)
                square = square + np.square(part)
            low, high = piece.low or 0.0, math.inf if piece.high is None else piece.high
            sigma = np.where((temperature >= low) & (temperature < high), np.sqrt(square), sigma)
        missing = np.flatnonzero(np.isnan(sigma))
        if missing.size:
            where = f"{temperature[missing[0]]:g} K"
            raise InputError(f"{shown}: sigma {quoted(self.text)} says nothing about {where}; close the gap")
        return sigma


def parse_sigma_text(text: str) -> SigmaModel:
    """Read a sigma text.

    Parameters
    ----------
    text : str
        Pieces separated by commas, each an uncertainty and optionally ``below T K`` or ``above T K``. "above" includes
        the limit, "below" does not; without a temperature they use the limit of the piece before. A piece without
        either holds elsewhere. Within a piece, percentages of the measured value and absolute values are added in
        quadrature by ``+``.

    Raises
    ------
    InputError
        If it cannot be read, or two pieces hold at one temperature.
    """
    if re.search(r"\d,\d", text):
        raise InputError(f"sigma {quoted(text)}: write a decimal point; a comma separates pieces, as in {_FORMS}")
    below: list[tuple[float, tuple[_Term, ...]]] = []
    above: list[tuple[float, tuple[_Term, ...]]] = []
    elsewhere: list[tuple[_Term, ...]] = []
    limit: float | None = None
    for part in text.split(","):
        match = _RANGE.fullmatch(part.strip())
        terms = _terms(match[1] if match else part.strip(), text)
        if match is None:
            elsewhere.append(terms)
            continue
        limit = float(match[3]) if match[3] else limit
        if limit is None or not 0 < limit < math.inf:
            raise InputError(f"sigma {quoted(text)}: {match[2].lower()} which temperature? write it as in {_FORMS}")
        (below if match[2].lower() == "below" else above).append((limit, terms))
    return SigmaModel(
        " ".join(text.split()), _pieces(sorted(below, key=_limit), sorted(above, key=_limit), elsewhere, text)
    )


def _limit(piece: tuple[float, tuple[_Term, ...]]) -> float:
    return piece[0]


def _pieces(
    below: list[tuple[float, tuple[_Term, ...]]],
    above: list[tuple[float, tuple[_Term, ...]]],
    elsewhere: list[tuple[_Term, ...]],
    text: str,
) -> tuple[_Piece, ...]:
    """Turn limits into intervals: each "below" starts at the lower one, each "above" ends at the next one."""
    limits = [[limit for limit, _ in side] for side in (below, above)]
    repeated = any(len(set(side)) < len(side) for side in limits) or len(elsewhere) > 1
    crossed = bool(below and above) and below[-1][0] > above[0][0]
    if repeated or crossed:
        raise InputError(f"sigma {quoted(text)} states two values for one temperature; write it as in {_FORMS}")
    starts, ends = [0.0, *limits[0]], [*limits[1][1:], math.inf]
    return (
        *(_Piece(None, None, terms) for terms in elsewhere),
        *(_Piece(start, limit, terms) for start, (limit, terms) in zip(starts, below, strict=False)),
        *(_Piece(limit, end, terms) for (limit, terms), end in zip(above, ends, strict=False)),
    )


def _terms(expression: str, text: str) -> tuple[_Term, ...]:
    """Read ``0.02 mJ/(mol K) + 0.3%``."""
    terms = []
    for part in re.split(r"(?<![eE])\+", expression):
        match = _TERM.fullmatch(part.strip())
        if match is None:
            raise InputError(f"sigma {quoted(text)}: {quoted(part.strip())} cannot be read; write it as in {_FORMS}")
        value, unit = float(match[1]), match[2].strip()
        if not 0 < value < math.inf:
            raise InputError(f"sigma {quoted(text)}: {quoted(part.strip())} must be above 0")
        if unit.casefold() in ("%", "percent", "per cent"):
            terms.append(_Term(value, None))
            continue
        try:
            terms.append(_Term(value, heat_capacity_unit(unit)))
        except InputError as error:
            raise InputError(f"sigma {quoted(text)}: {error}") from None
    return tuple(terms)

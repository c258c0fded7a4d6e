"""Where the stated uncertainty comes from: a column, a sigma text, or what is written with the values."""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from dataclasses import dataclass

from ..errors import InputError, nearest
from ..records import RunSettings
from ..units import HeatCapacityUnit, TemperatureUnit
from .columns import find_column
from .headers import Column, is_uncertainty_of_anything, uncertainty_columns
from .sigma import SigmaModel, parse_sigma_text
from .wording import listed, offered, quoted

__all__ = ["ESTIMATED", "SigmaSource", "find_sigma_source"]

ESTIMATED = ("scatter", "replicates")
"""Words that leave sigma to be estimated from the data."""


@dataclass(frozen=True)
class SigmaSource:
    """A column of sigma (in `unit`, or in % where that is None), or a model, or neither; and what it is divided by.

    `estimate` is the word of an estimate that is asked for, over whatever the file states.
    """

    column: Column | None
    unit: HeatCapacityUnit | None
    model: SigmaModel | None
    coverage_factor: float | None
    text: str
    notes: tuple[str, ...]
    estimate: str | None = None


def find_sigma_source(
    columns: tuple[Column, ...], taken: tuple[Column, Column], unit: HeatCapacityUnit, run: RunSettings, shown: str
) -> SigmaSource:
    """Find the stated uncertainty of one file.

    Parameters
    ----------
    columns : tuple of Column
        All columns of the file.
    taken : tuple of Column
        Those of temperature and heat capacity.
    unit : HeatCapacityUnit
        Unit of the heat capacity, which a column of sigma without a unit shares.
    run : RunSettings
        `sigma` is read as an exact header, then a column number, then "scatter" or "replicates", then a sigma text.
    shown : str
        The file as messages name it.

    Raises
    ------
    InputError
        If the choice cannot be read, two columns have an equal claim, or a column is in another unit.
    """
    stated = run.coverage_factor
    if stated is not None and not (math.isfinite(stated) and stated > 0):
        raise InputError(f"{shown}: the coverage factor must be above 0, not {stated:g}")
    if run.sigma is not None:
        column = find_column(columns, run.sigma, shown)
        word = str(run.sigma).strip().casefold()
        if column is None and word in ESTIMATED:
            return _to_estimate(word, columns, taken, stated, shown)
        if column is None:
            return _from_text(str(run.sigma), columns, stated, shown)
        _refuse_number_alone(column, run.sigma, shown)
        return _from_column(column, taken, unit, stated, (), shown)
    column, notes = _recognised(columns, taken, shown)
    if column is not None:
        return _from_column(column, taken, unit, stated, notes, shown)
    text = f"written with the values of {quoted(taken[1].label)}"
    return SigmaSource(None, None, None, stated, text + _divided(stated), notes)


def _refuse_number_alone(column: Column, asked: str | int, shown: str) -> None:
    """Refuse a column chosen by number whose header speaks neither of an uncertainty nor of a unit."""
    by_name = isinstance(asked, str) and asked.strip() in (column.header, column.name)
    if by_name or column.header is None or column.unit is not None or is_uncertainty_of_anything(column):
        return
    raise InputError(
        f"{shown}: column {column.index + 1}, {quoted(column.label)}, names neither an uncertainty nor a unit; if it "
        f"is the sigma, ask for it by its header: --sigma {quoted(column.label)}"
    )


def _to_estimate(
    word: str, columns: tuple[Column, ...], taken: tuple[Column, Column], coverage: float | None, shown: str
) -> SigmaSource:
    if coverage is not None:
        raise InputError(
            f"{shown}: a coverage factor is given, but --sigma {word} estimates the standard uncertainty; leave one of "
            "the two out"
        )
    notes = tuple(
        f"{quoted(column.label)} is not used: sigma is estimated from {word}, as asked"
        for column in uncertainty_columns(columns, taken)
    )
    return SigmaSource(None, None, None, None, f"estimated from {word}", notes, word)


def _divided(coverage: float | None) -> str:
    return "" if coverage is None or coverage == 1 else f", divided by the coverage factor {coverage:g}"


def _from_text(text: str, columns: Sequence[Column], coverage: float | None, shown: str) -> SigmaSource:
    if re.fullmatch(r"\s*[\d.]+\s*", text, re.ASCII):
        raise InputError(f"{shown}: --sigma {quoted(text)} is no column number; for a percentage write {text.strip()}%")
    if re.match(r"\s*±?\s*[-+.\d]", text) is None:
        headers = [column.header for column in columns if column.header]
        hint = f"; {offered(text, headers)}" if headers else ""
        word = nearest(text, ESTIMATED)
        if word.startswith("did you mean") and "did you mean" not in hint:
            hint = f"; {word}"
        raise InputError(f"{shown}: --sigma {quoted(text)} is neither a column nor a sigma text such as '0.5%'{hint}")
    try:
        model = parse_sigma_text(text)
    except InputError as error:
        raise InputError(f"{shown}: {error}") from None
    return SigmaSource(None, None, model, coverage, model.text + _divided(coverage), ())


def _recognised(
    columns: tuple[Column, ...], taken: tuple[Column, Column], shown: str
) -> tuple[Column | None, tuple[str, ...]]:
    """Take the column that names an uncertainty in a unit.

    One without a unit counts where its header states k, or where the header of the heat capacity has no unit either.
    """
    candidates = uncertainty_columns(columns, taken)
    unit_by_option = taken[1].unit is None
    usable = [
        column
        for column in candidates
        if column.unit is not None or column.coverage_factor is not None or (unit_by_option and column.header)
    ]
    if len(usable) > 1:
        claims = listed(column.label for column in usable)
        raise InputError(f"{shown}: columns {claims} may each be the sigma; choose one by --sigma")
    if usable:
        return usable[0], ()
    names = [quoted(column.label) for column in candidates]
    return None, tuple(
        f"{name} names an uncertainty but no unit; not used, unless --sigma asks for it" for name in names
    )


def _from_column(
    column: Column,
    taken: tuple[Column, Column],
    unit: HeatCapacityUnit,
    stated: float | None,
    notes: tuple[str, ...],
    shown: str,
) -> SigmaSource:
    label = quoted(column.label)
    if column in taken:
        raise InputError(f"{shown}: {label} holds the data and cannot be their sigma")
    if isinstance(column.unit, TemperatureUnit):
        raise InputError(f"{shown}: {label} is in {column.unit.text} and cannot be the sigma of a heat capacity")
    coverage = column.coverage_factor if stated is None else stated
    if coverage is None and re.match(r"U(?![a-z])", column.name):
        raise InputError(
            f"{shown}: {label} reads like an expanded uncertainty; give --coverage-factor 2, or 1 if it is standard"
        )
    found: HeatCapacityUnit | None = unit
    if column.unit == "percent":
        found = None
    elif isinstance(column.unit, HeatCapacityUnit):
        found = column.unit
    else:
        notes = (*notes, f"the unit of {label} is not stated; taken as that of the heat capacity, {unit.text}")
    if coverage is not None and coverage != 1:
        notes = (*notes, f"sigma is {label} divided by the coverage factor {coverage:g}")
    return SigmaSource(column, found, None, coverage, f"column {label}{_divided(coverage)}", notes)

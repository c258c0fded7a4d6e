"""Known heat capacities that are in the data and are taken off: addenda, exchange gas and grease, an impurity.

What is measured of a whole sample is C_total = C_sample + sum C_addenda, and C_addenda is taken off before anything is
per mole. A foreign substance that makes up the part f of the sample's mass is in the mass by which C is divided, so

    C_sample = (C_total - sum C_addenda - f k c) / (1 - f),

with c its heat capacity per gram and k what takes that to the basis of the data. All arrays of the result are for the
sample proper: the stated sigma, which is that of the measured total (a percentage is one of the total as the file has
it), is divided by 1 - f too, and C_sample plus the addenda of the record is the measured total.

The uncertainty of what is taken off belongs to a curve, so that it is common to neighbouring points.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from ..errors import InputError, nearest
from ..exclusion import kept_out
from ..records import (
    AddendaSettings,
    AddendaShare,
    ExcludedRow,
    FloatArray,
    Measurement,
    Repair,
    RunSettings,
)
from ..rounding import percent_range
from ..units import heat_capacity_unit
from .addenda_file import Known, read_known
from .wording import counted, quoted, shown_name

__all__ = ["take_off"]

_MOST_ADDENDA = (
    0.95  # of the measured total, beyond which a point says nothing of the sample (common practice, no source)
)
_LEAST_LEFT = 0.5  # of the points of a measurement that must stay above 0


def take_off(
    measurement: Measurement,
    addenda: Sequence[AddendaSettings],
    folder: Path,
    read: Callable[[RunSettings], Measurement],
) -> Measurement:
    """Take known heat capacities off a measurement.

    Parameters
    ----------
    measurement : Measurement
        With nothing taken off.
    addenda : sequence of AddendaSettings
        Their order does not matter.
    folder : Path
        Where relative file names start from.
    read : callable
        Reads one file as a run of a sample of which nothing is known.

    Returns
    -------
    Measurement
        Without the points that do not stay above 0, and without those beyond an addenda file that are not to be fitted;
        both are among the excluded rows.

    Raises
    ------
    InputError
        If a file cannot be read or is no addenda of these runs, or a point that may be fitted lies beyond its range.
    """
    if not addenda:
        return measurement
    entries = [read_known(each, folder, read) for each in addenda]
    concerned = [_points_of(each, measurement) for each in entries]
    _refuse_twice(entries, concerned)
    measurement, kept = _covered(measurement, entries, concerned)
    return _mostly_addenda(_subtracted(measurement, entries, [points[kept] for points in concerned]))


def _refuse_twice(entries: Sequence[Known], concerned: Sequence[NDArray[np.bool_]]) -> None:
    """Refuse one column of one file that is to be taken off the same points twice."""
    for i, one in enumerate(entries):
        for other, points in zip(entries[:i], concerned[:i], strict=True):
            first, second = other.file.readings[0], one.file.readings[0]
            same = (first.sha256, first.heat_capacity_column) == (second.sha256, second.heat_capacity_column)
            if same and (points & concerned[i]).any():
                raise InputError(f"{one.shown} would be taken off twice; name each addenda file once")


def _mostly_addenda(measurement: Measurement) -> Measurement:
    """Set aside the points at which hardly anything is the sample's own: a small difference of large numbers."""
    if measurement.addenda is None:
        return measurement
    share = measurement.addenda / (measurement.addenda + measurement.heat_capacity)
    aside = list(measurement.set_aside or (None,) * share.size)
    heavy = np.flatnonzero(share > _MOST_ADDENDA).tolist()
    for i in heavy:
        aside[i] = aside[i] or f"addenda are above {100 * _MOST_ADDENDA:.0f} % of the measured heat capacity"
    if not heavy:
        return measurement
    words = (
        f"{counted(len(heavy), 'point')} set aside: addenda are above {100 * _MOST_ADDENDA:.0f} % of what was measured"
    )
    note = Repair(measurement.readings[0].file, None, words)
    return replace(measurement, set_aside=tuple(aside), repairs=(*measurement.repairs, note))


# ---------------------------------------------------------------------------------------------- which runs and points


def _points_of(entry: Known, measurement: Measurement) -> NDArray[np.bool_]:
    """Say which points an entry is taken off, shape (n,); refuse runs that it cannot be taken off."""
    readings = measurement.readings
    labels = [each.label for each in readings]
    unknown = next((label for label in entry.settings.runs if label not in labels), None)
    if unknown is not None:
        hint = nearest(unknown, map(shown_name, labels))
        raise InputError(f"the addenda {entry.shown} name a run {quoted(unknown)} that there is not; {hint}")
    chosen = [k for k, label in enumerate(labels) if not entry.settings.runs or label in entry.settings.runs]
    for k in chosen:
        run, unit = quoted(labels[k]), readings[k].heat_capacity_unit
        if not entry.amount.of_sample and heat_capacity_unit(unit).basis != "sample":
            raise InputError(
                f"{entry.shown} cannot be taken off run {run}, which is in {unit}: a heat capacity per mole or per "
                "mass has its addenda off already; leave it out, or name by runs = [...] in its [[addenda]] the runs "
                "that it concerns"
            )
        entry.amount.refuse_lacking(measurement, entry.shown, run)
        own = entry.file.readings[0]
        if (own.sha256, own.heat_capacity_column) == (readings[k].sha256, readings[k].heat_capacity_column):
            raise InputError(f"{entry.shown}: the addenda are the heat capacity of run {run} itself; name another file")
    return np.isin(measurement.run, chosen)


def _covered(
    measurement: Measurement, entries: Sequence[Known], concerned: Sequence[NDArray[np.bool_]]
) -> tuple[Measurement, NDArray[np.bool_]]:
    """Leave out the points that a file does not cover and that are not to be fitted; refuse any other."""
    T, aside = measurement.temperature, kept_out(measurement)
    reasons: list[str | None] = [None] * T.size
    for entry, points in zip(entries, concerned, strict=True):
        low, high = f"{entry.curve.low:.4g}", f"{entry.curve.high:.4g}"
        beyond = points & ~entry.curve.covers(T)
        missed = np.flatnonzero(beyond & ~aside)
        if missed.size:
            i = int(missed[0])
            more = f" (and {missed.size - 1} more)" if missed.size > 1 else ""
            raise InputError(
                f"{shown_name(measurement.readings[measurement.run[i]].file)}: {T[i]:g} K in line "
                f"{measurement.line[i]}{more} lies outside the addenda file {entry.shown}, {low}-{high} K; measure the "
                "addenda there, or leave such points out by --window, --mask or --mask-lines"
            )
        for i in np.flatnonzero(beyond).tolist():
            reasons[i] = f"outside the addenda file {entry.shown}, {low}-{high} K"
    return _without(measurement, reasons), np.array([reason is None for reason in reasons])


def _without(measurement: Measurement, reasons: Sequence[str | None]) -> Measurement:
    """Move the points that have a reason to the excluded rows."""
    kept = np.array([reason is None for reason in reasons])
    if kept.all():
        return measurement
    if not kept.any():
        raise InputError(f"no point is left once the addenda are taken off (the first: {reasons[0]})")
    T, C, sigma = measurement.temperature, measurement.heat_capacity, measurement.sigma
    rows, repairs = [], []
    for i, reason in enumerate(reasons):
        if reason is not None:
            u = math.nan if sigma is None else float(sigma[i])
            left = math.nan if measurement.addenda is None else float(C[i])  # not known without the addenda
            run, line = int(measurement.run[i]), int(measurement.line[i])
            rows.append(ExcludedRow(run, line, float(T[i]), left, u, reason))
            repairs.append(Repair(measurement.readings[run].file, line, f"row left out: {reason}"))
    # empty where no point is set aside
    aside = tuple(why for why, stays in zip(measurement.set_aside, kept, strict=False) if stays)
    return replace(
        measurement,
        temperature=T[kept],
        heat_capacity=C[kept],
        sigma=None if sigma is None else sigma[kept],
        run=measurement.run[kept],
        line=measurement.line[kept],
        set_aside=aside,
        addenda=None if measurement.addenda is None else measurement.addenda[kept],
        addenda_u=None if measurement.addenda_u is None else measurement.addenda_u[kept],
        repairs=(*measurement.repairs, *repairs),
        excluded=(*measurement.excluded, *rows),
    )


# --------------------------------------------------------------------------------------------------- the subtraction


@dataclass(frozen=True)
class _Taken:
    """What one entry takes off, shape (n,), 0 where it does not concern a point, and the u of it."""

    points: NDArray[np.bool_]
    heat_capacity: FloatArray
    u: FloatArray


def _subtracted(
    measurement: Measurement, entries: Sequence[Known], concerned: Sequence[NDArray[np.bool_]]
) -> Measurement:
    total = np.array(measurement.heat_capacity)
    foreign = np.zeros(total.shape)
    for entry, points in zip(entries, concerned, strict=True):
        foreign += np.where(points & entry.amount.of_sample, entry.amount.value, 0.0)
    if foreign.size and foreign.max() >= 1:
        raise InputError(f"the addenda are {100 * foreign.max():.4g} % of the sample's mass together; correct fraction")
    scale = 1 / (1 - foreign)
    curves = [_curve(*each, measurement, scale) for each in zip(entries, concerned, strict=True)]
    added = np.sum([each.heat_capacity for each in curves], axis=0)
    left = total * scale - added
    taken = [_with_amount(*each, left, scale) for each in zip(entries, curves, strict=True)]
    whole = replace(
        measurement,
        heat_capacity=left,
        sigma=None if measurement.sigma is None else measurement.sigma * scale,
        addenda=added,
        addenda_u=np.sqrt(np.sum([np.square(each.u) for each in taken], axis=0)),
        addenda_settings=tuple(each.settings for each in entries),
        addenda_readings=tuple(each.file.readings[0] for each in entries),
    )
    found = _without(whole, _spent(whole))
    kept = left > 0
    shares = tuple(_share(each, whole, kept) for each in taken)
    notes = [note for each in zip(entries, taken, shares, strict=True) for note in _notes(*each, whole)]
    return replace(
        found, addenda_shares=shares, repairs=(*measurement.repairs, *notes, *found.repairs[len(measurement.repairs) :])
    )


def _curve(entry: Known, points: NDArray[np.bool_], measurement: Measurement, scale: FloatArray) -> _Taken:
    """Return what an entry takes off, with the u of its curve alone."""
    heat_capacity, u = np.zeros(scale.shape), np.zeros(scale.shape)
    c, c_u = entry.curve.evaluate(measurement.temperature[points])
    factor = entry.amount.factor(measurement.sample, measurement.basis) * scale[points]
    heat_capacity[points], u[points] = factor * c, factor * c_u
    return _Taken(points, heat_capacity, u)


def _with_amount(entry: Known, curve: _Taken, left: FloatArray, scale: FloatArray) -> _Taken:
    """Add the u of the amount: of a mass, or of a fraction, with which what is left changes as well."""
    amount = entry.amount
    slope = curve.heat_capacity / amount.value - (scale * left if amount.of_sample else 0.0)
    return replace(curve, u=np.where(curve.points, np.hypot(curve.u, slope * amount.u), 0.0))


def _spent(whole: Measurement) -> list[str | None]:
    """Say which points are not above 0 any more; refuse where these are most of them."""
    left, taken = whole.heat_capacity, np.asarray(whole.addenda)
    gone = np.flatnonzero(left <= 0)
    unit = {"mol": "J/(mol K)", "gram": "J/(g K)", "sample": "J/K"}[whole.basis]
    reasons: list[str | None] = [None] * left.size
    for i in gone.tolist():
        total = f"{left[i] + taken[i]:.4g} {unit} measured less {taken[i]:.4g} {unit} of addenda"
        reasons[i] = f"{total} is not above 0"
    if gone.size > (1 - _LEAST_LEFT) * left.size:
        first = int(gone[0])
        raise InputError(
            f"the addenda leave {left.size - gone.size} of {left.size} points above 0 (line {whole.line[first]}: "
            f"{reasons[first]}); check the unit of the addenda and whether they are in the data at all"
        )
    return reasons


# -------------------------------------------------------------------------------------------------------- in words


def _share(taken: _Taken, whole: Measurement, kept: NDArray[np.bool_]) -> AddendaShare:
    points = taken.points & kept
    if not points.any():
        return AddendaShare(0, 0.0, 0.0, 0.0, 0.0)
    left = whole.heat_capacity[points]
    share = taken.heat_capacity[points] / (left + np.asarray(whole.addenda)[points])
    u = taken.u[points] / left
    return AddendaShare(
        points=int(points.sum()),
        lowest=float(share.min()),
        highest=float(share.max()),
        u_lowest=float(u.min()),
        u_highest=float(u.max()),
    )


def _notes(entry: Known, taken: _Taken, share: AddendaShare, whole: Measurement) -> list[Repair]:
    """Say how much was taken off, from which column, and what is odd about the file."""
    file = entry.settings.file
    column = quoted(entry.file.readings[0].heat_capacity_column)
    of = f" ({entry.amount.words} of the sample's mass)" if entry.amount.of_sample else ""
    of = f" ({entry.amount.words})" if entry.amount.words and not of else of
    runs = f" run {' and '.join(map(quoted, entry.settings.runs))}" if entry.settings.runs else ""
    notes = [
        f"addenda {entry.shown}{of}, column {column}, taken off{runs}: {percent_range(share.lowest, share.highest)} of "
        f"the measured heat capacity, u {percent_range(share.u_lowest, share.u_highest)} of the sample's"
    ]
    if entry.curve.excess is not None:
        notes.append(
            f"the points lie {entry.curve.excess:.2g} times further from a smooth curve than their sigma says "
            "(scatter, a narrow feature, or too few points); u of the curve follows from that"
        )
    T = whole.temperature[taken.points]
    beyond = np.maximum(entry.curve.low - T, T - entry.curve.high) / T
    if (beyond > 0).any():
        points, most = counted(int((beyond > 0).sum()), "point"), 100 * float(beyond.max())
        notes.append(f"{points} up to {most:.1g} % beyond the addenda, taken off by their continued curve")
    scales = {whole.readings[k].settings.temperature_scale for k in np.unique(whole.run[taken.points])}
    if "IPTS-68" in scales and entry.settings.temperature_scale is None:
        notes.append(
            "the temperature scale of the addenda is not declared, that of the run is IPTS-68; taken as ITS-90"
        )
    return [*entry.file.repairs, *(Repair(file, None, note) for note in notes)]

"""Sets of repeats by choice: kept, averaged or without their first point; and the sigma that they show."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass, replace
from typing import Final

import numpy as np
from numpy.typing import NDArray
from scipy.stats import f as f_distribution

from ..constants import REPEAT_FACTOR
from ..errors import InputError
from ..records import ExcludedRow, FloatArray, Measurement, Repair
from ..rounding import percent_text
from .scatter import Spread, repeat_sets, spread_of_sets

__all__ = ["Repeated", "asks_for_replicates", "sigma_from_replicates", "with_replicates"]

_FEWEST_FREEDOM: Final = 5
_LEAST_SPREAD: Final = 1e-4  # relative: repeats that agree better were not measured apart
_ENOUGH_OF_A_HALF: Final = 10  # degrees of freedom on each side before one sigma is compared with two
_UNEQUAL: Final = 2.0  # ratio of the spreads of the two halves from which it is said
_BY_CHANCE: Final = 0.01


@dataclass(frozen=True)
class Repeated:
    """A measurement with its sets of repeats as asked.

    `size` is the number of points behind each of its points, shape (n,); `dropped` says why a point is not to be
    fitted, None for the others.
    """

    measurement: Measurement
    size: NDArray[np.intp]
    dropped: tuple[str | None, ...]


@dataclass(frozen=True)
class _Set:
    """Positions in the measurement of the points of one set, in file order."""

    run: int
    members: NDArray[np.intp]


def with_replicates(measurement: Measurement) -> Repeated:
    """Average the sets of repeats, or drop the first point of each, where a run asks for it.

    Points of one run belong to a set where their temperatures differ by less than 0.3 % and the sets lie much further
    apart (`repeat_sets`). A point that is set aside enters no mean; the first of a set counts in file order. Runs whose
    sets were averaged before are left as they are.

    Raises
    ------
    InputError
        If no run that asks has sets.
    """
    done = {row.run for row in measurement.excluded if row.averaged_into is not None}
    asking = {
        number: reading.settings.replicates
        for number, reading in enumerate(measurement.readings)
        if reading.settings.replicates not in (None, "keep") and number not in done
    }
    sets = {number: _sets(measurement, number, word == "average") for number, word in asking.items()}
    if asking and not any(sets.values()):
        raise InputError(_none_found(measurement, dict(asking)))
    notes = [
        Repair(measurement.readings[number].file, None, f"run {_label(measurement, number)} has no sets of repeats")
        for number in asking
        if not sets[number]
    ]
    to_drop = [each for number, word in asking.items() if word == "drop-first" for each in sets[number]]
    to_average = [each for number, word in asking.items() if word == "average" for each in sets[number]]
    dropped = _dropped(measurement, to_drop)
    notes += _counted(measurement, to_drop, "the first point of each of {sets} sets of repeats dropped as asked")
    if not to_average:
        new = tuple(each for each in notes if each not in measurement.repairs)
        worked = replace(measurement, repairs=(*measurement.repairs, *new)) if new else measurement
        return Repeated(worked, np.ones(measurement.run.size, dtype=np.intp), dropped)
    words = "{points} points in {sets} sets of repeats averaged as asked, the mean of each set stands for it"
    return _averaged(measurement, to_average, dropped, [*notes, *_counted(measurement, to_average, words)])


def _label(measurement: Measurement, number: int) -> str:
    return repr(measurement.readings[number].label)


def _sets(measurement: Measurement, number: int, only_usable: bool) -> list[_Set]:
    own = measurement.run == number
    if only_usable and measurement.set_aside:
        own = own & np.array([each is None for each in measurement.set_aside])
    place = np.flatnonzero(own)
    place = place[np.argsort(measurement.temperature[place], kind="stable")]
    numbers = repeat_sets(measurement.temperature[place], asked=True) if place.size > 1 else None
    if numbers is None:
        return []
    several = np.flatnonzero(np.bincount(numbers) > 1)
    return [_Set(number, np.sort(place[numbers == each])) for each in several]


def _none_found(measurement: Measurement, asking: dict[int, object]) -> str:
    number, word = next(iter(asking.items()))
    T = np.sort(measurement.temperature[measurement.run == number])
    close = T.size > 1 and bool((T[1:] < REPEAT_FACTOR * T[:-1]).any())
    why = (
        "its points follow each other so closely that sets cannot be told apart"
        if close
        else "no two of its points lie within 0.3 % in temperature"
    )
    return (
        f"--replicates {word}: run {_label(measurement, number)} has no sets of repeats ({why}); leave the option out"
    )


def _counted(measurement: Measurement, sets: Iterable[_Set], words: str) -> list[Repair]:
    by_run: dict[int, list[_Set]] = {}
    for each in sets:
        by_run.setdefault(each.run, []).append(each)
    return [
        Repair(
            measurement.readings[number].file,
            None,
            words.format(sets=len(own), points=sum(each.members.size for each in own)),
        )
        for number, own in by_run.items()
    ]


def _dropped(measurement: Measurement, sets: Iterable[_Set]) -> tuple[str | None, ...]:
    reasons: list[str | None] = [None] * measurement.run.size
    for each in sets:
        reasons[int(each.members[0])] = f"first of a set of {each.members.size}, dropped as asked"
    return tuple(reasons)


# --------------------------------------------------------------------------------------------------------- averages


def _averaged(
    measurement: Measurement, sets: list[_Set], dropped: tuple[str | None, ...], notes: list[Repair]
) -> Repeated:
    """Put the mean of each set in the place of its first point, and list the points that are in it as excluded."""
    shared = {number: _shares_error(measurement, number) for number in {each.run for each in sets}}
    size = np.ones(measurement.run.size, dtype=np.intp)
    kept = np.ones(measurement.run.size, dtype=bool)
    for each in sets:
        size[each.members[0]] = each.members.size
        kept[each.members[1:]] = False

    def means(values: FloatArray | None) -> FloatArray | None:
        return None if values is None else _with_means(values, sets)[kept]

    temperature, place = _with_means(measurement.temperature, sets), np.cumsum(kept) - 1
    rows = [
        _row(measurement, int(i), each, float(temperature[each.members[0]]), int(place[each.members[0]]))
        for each in sets
        for i in each.members
    ]
    worked = replace(
        measurement,
        temperature=temperature[kept],
        heat_capacity=_with_means(measurement.heat_capacity, sets)[kept],
        sigma=_sigma_of_means(measurement, sets, shared)[kept] if measurement.sigma is not None else None,
        addenda=means(measurement.addenda),
        addenda_u=means(measurement.addenda_u),  # an error that is common to a set does not average out
        run=measurement.run[kept],
        line=measurement.line[kept],
        set_aside=_chosen(measurement.set_aside, kept) if measurement.set_aside else (),
        sigma_text=_sigma_text(measurement, shared),
        repairs=(*measurement.repairs, *notes),
        excluded=(*measurement.excluded, *rows),
    )
    return Repeated(worked, size[kept], _chosen(dropped, kept))


def _with_means(values: FloatArray, sets: list[_Set]) -> FloatArray:
    found = np.array(values)
    for each in sets:
        found[each.members[0]] = values[each.members].mean()
    return found


def _sigma_of_means(measurement: Measurement, sets: list[_Set], shared: dict[int, bool]) -> FloatArray:
    found = np.array(measurement.sigma)
    for each in sets:
        square = float(np.mean(found[each.members] ** 2))
        found[each.members[0]] = math.sqrt(square / (1 if shared[each.run] else each.members.size))
    return found


def _chosen(words: tuple[str | None, ...], kept: NDArray[np.bool_]) -> tuple[str | None, ...]:
    return tuple(each for each, keep in zip(words, kept, strict=True) if keep)


def _row(measurement: Measurement, i: int, own: _Set, temperature: float, mean: int) -> ExcludedRow:
    others = own.members.size - 1
    return ExcludedRow(
        own.run,
        int(measurement.line[i]),
        float(measurement.temperature[i]),
        float(measurement.heat_capacity[i]),
        math.nan if measurement.sigma is None else float(measurement.sigma[i]),
        f"averaged with {others} other{'s' if others > 1 else ''} into {temperature:.5g} K",
        averaged_into=mean,
    )


def _shares_error(measurement: Measurement, number: int) -> bool:
    """Whether the means of a run's sets scatter by more than the spread within the sets explains."""
    place = np.flatnonzero(measurement.run == number)
    place = place[np.argsort(measurement.temperature[place], kind="stable")]
    spread = spread_of_sets(
        measurement.temperature[place], measurement.heat_capacity[place], measurement.run[place], asked=True
    )
    return spread is not None and bool(spread.shared)


def _sigma_text(measurement: Measurement, shared: dict[int, bool]) -> str:
    if measurement.sigma is None:
        return measurement.sigma_text
    smaller = [_label(measurement, number) for number, common in shared.items() if not common]
    same = [_label(measurement, number) for number, common in shared.items() if common]
    parts = []
    if smaller:
        which = f" (run {', '.join(smaller)})" if same else ""
        parts.append(
            f"that of the mean of m repeats{which} divided by sqrt(m), which holds where the repeats of a set do not "
            "share an error"
        )
    if same:
        which = f" (run {', '.join(same)})" if smaller else ""
        parts.append(
            f"that of a mean{which} not made smaller, because the sets differ by more than the spread within them "
            "explains"
        )
    return "; ".join([measurement.sigma_text, *parts])


# ---------------------------------------------------------------------------------------------- sigma of replicates


def asks_for_replicates(measurement: Measurement) -> bool:
    """Whether sigma is to be that of repeats; it is one model for all runs.

    Raises
    ------
    InputError
        If runs ask for different estimates.
    """
    words = [reading.settings.sigma == "replicates" for reading in measurement.readings]
    if any(words) and not all(words):
        one, other = words.index(True), words.index(False)
        raise InputError(
            f"run {_label(measurement, one)} asks for sigma from replicates and run {_label(measurement, other)} from "
            "scatter; sigma is estimated in one way for all runs: give all of them the same --sigma"
        )
    return any(words)


def sigma_from_replicates(
    measurement: Measurement, index: NDArray[np.intp], total: FloatArray, size: NDArray[np.intp]
) -> tuple[FloatArray, str]:
    """Estimate sigma from the spread within sets of repeats.

    Parameters
    ----------
    measurement : Measurement
        Before any averaging.
    index : ndarray of int
        Its points that count, by ascending temperature.
    total : ndarray, shape (m,)
        The measured heat capacity of the points that need a sigma, addenda included.
    size : ndarray of int, shape (m,)
        How many repeats each of them is the mean of.

    Returns
    -------
    tuple
        sigma, shape (m,), unit of `total`, and where it comes from in words.

    Raises
    ------
    InputError
        If there are too few repeats, or they agree too well to be measurements of their own.
    """
    T, run = measurement.temperature[index], measurement.run[index]
    C = np.asarray(measurement.heat_capacity[index])
    if measurement.addenda is not None:
        C = C + measurement.addenda[index]
    spread = spread_of_sets(T, C, run, asked=True)
    freedom = 0 if spread is None else spread.freedom
    if spread is None or freedom < _FEWEST_FREEDOM:
        raise InputError(
            f"--sigma replicates: sets of repeats give {freedom or 'no'} degrees of freedom, and {_FEWEST_FREEDOM} are "
            "needed; state sigma, e.g. '0.5%', or take it from the local scatter by --sigma scatter"
        )
    if spread.within < _LEAST_SPREAD:
        raise InputError(
            "--sigma replicates: the repeats agree to better than 0.01 %, so they do not show an uncertainty; state "
            "sigma, e.g. '0.5%', or take it from the local scatter by --sigma scatter"
        )
    text = (
        f"estimated from replicates: {percent_text(100 * spread.within)} of the heat capacity, pooled within "
        f"{spread.sets} sets of repeats ({freedom} degrees of freedom); {_between(spread)}{_by_half(T, C, run)}"
    )
    if size.max() > 1:
        text += "; that of the mean of m repeats divided by sqrt(m)"
    return spread.within * total / np.sqrt(size), text


def _between(spread: Spread) -> str:
    shared = "what disturbs a whole set is not in it"
    if spread.between is None:
        return shared
    mean = f"{percent_text(100 * spread.between)} against {percent_text(100 * spread.within / math.sqrt(spread.size))}"
    return f"{shared}: the means of the sets scatter by {mean} that it explains"


def _by_half(T: FloatArray, C: FloatArray, run: NDArray[np.intp]) -> str:
    """Say so where repeats at low and at high T clearly differ in their relative spread."""
    middle = float(np.median(T))
    halves = [spread_of_sets(T[half], C[half], run[half], asked=True) for half in (middle > T, middle <= T)]
    low, high = halves
    if low is None or high is None or min(low.freedom, high.freedom) < _ENOUGH_OF_A_HALF:
        return ""
    ratio = max(low.within, high.within) / max(min(low.within, high.within), 1e-12)
    freedoms = (low.freedom, high.freedom) if low.within > high.within else (high.freedom, low.freedom)
    if ratio < _UNEQUAL or 2 * f_distribution.sf(ratio**2, *freedoms) > _BY_CHANCE:
        return ""
    below, above = (percent_text(100 * each.within).replace(" ", "") for each in (low, high))
    return f"; it is not the same everywhere, better state '{below} below {middle:.3g} K, {above} above'"

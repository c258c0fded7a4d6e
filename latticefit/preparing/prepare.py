"""From a Measurement to the points that are fitted: windows, masks, order, and a sigma for each."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np
from numpy.typing import NDArray

from ..errors import InputError
from ..records import FloatArray, Measurement, PreparedData, SigmaKind
from .addenda import measured_total, with_addenda
from .outliers import outliers_of_runs
from .overlap import run_overlaps, worst_overlaps
from .replicates import asks_for_replicates, sigma_from_replicates, with_replicates
from .scatter import FEWEST_POINTS, pooled_scatter

__all__ = ["prepare"]

Interval = tuple[float, float]

_LEAST_SCATTER: Final = 1e-4
_ASSUMED: Final = 0.01
_ASSUMED_WORD: Final = "assumed"


def prepare(measurement: Measurement, window: Sequence[Interval] = (), mask: Sequence[Interval] = ()) -> PreparedData:
    """Choose the points to fit and give each a standard uncertainty.

    Where its runs ask for it, sets of repeats are averaged first, so that the measurement in the result is another one,
    or their first point is left out, or sigma is taken from them. Outliers are flagged and overlapping runs compared.

    Parameters
    ----------
    measurement : Measurement
        Per mole of formula unit.
    window, mask : sequence of (low, high)
        Closed intervals in K for all runs, beside those in the settings of each run. Several windows count as their
        union; a point must lie in those of its run and in those given here. A point in any mask is left out.

    Returns
    -------
    PreparedData
        By ascending temperature, equal temperatures in file order. Without a stated sigma one relative sigma is
        estimated from the local scatter of the points used, the same for every model that is fitted to them. Where
        addenda were taken off, sigma is that of the measured total and of the addenda together.

    Raises
    ------
    InputError
        If the heat capacity is not per mole, no point is left, or repeats are asked for and there are none.
    """
    _refuse_other_basis(measurement)
    single, repeated = measurement, with_replicates(measurement)
    measurement = repeated.measurement
    reasons = tuple(
        why or dropped for why, dropped in zip(_reasons(measurement, window, mask), repeated.dropped, strict=True)
    )
    index = _used(measurement, reasons)
    temperature, heat_capacity = measurement.temperature[index], measurement.heat_capacity[index]
    if measurement.sigma is not None:
        kind: SigmaKind = "stated"
        sigma, text = measurement.sigma[index], f"stated: {measurement.sigma_text}"
    elif asks_for_replicates(measurement):
        kind = "estimated"
        singly = index if single.run.size == measurement.run.size else _used(single, _reasons(single, window, mask))
        total = measured_total(measurement)[index]
        sigma, text = sigma_from_replicates(single, singly, total, repeated.size[index])
    else:
        kind = "estimated"
        sigma, text = _estimated(temperature, measured_total(measurement)[index], measurement.run[index])
    sigma, text = with_addenda(measurement, index, sigma, text)
    overlaps = run_overlaps(measurement, temperature, heat_capacity, sigma, measurement.run[index])
    return PreparedData(
        measurement=measurement,
        temperature=temperature,
        heat_capacity=heat_capacity,
        sigma=sigma,
        run=measurement.run[index],
        index=index,
        reasons=reasons,
        sigma_kind=kind,
        sigma_text=text,
        sigma_assumed=kind == "estimated" and text.startswith(_ASSUMED_WORD),
        outlier_sizes=outliers_of_runs(measurement, index, sigma if kind == "stated" else None),
        overlaps=worst_overlaps(overlaps),
        overlaps_compared=len(overlaps),
    )


def _refuse_other_basis(measurement: Measurement) -> None:
    if measurement.basis == "gram":
        raise InputError("the heat capacity is per gram: give --formula or --molar-mass to make it per mole")
    if measurement.basis == "sample":
        sample = measurement.sample
        missing = ["--mass"] if sample.mass is None else []
        missing += ["--formula or --molar-mass"] if sample.molar_mass is None else []
        raise InputError(f"the heat capacity is per sample: give {' and '.join(missing)} to make it per mole")


def _used(measurement: Measurement, reasons: Sequence[str | None]) -> NDArray[np.intp]:
    """Return the positions of the points that no reason speaks against, by ascending temperature."""
    used = np.array([i for i, reason in enumerate(reasons) if reason is None], dtype=np.intp)
    if used.size == 0:
        first = next((reason for reason in reasons if reason), "none was read")
        raise InputError(f"no point is left to fit: all {len(reasons)} are left out (the first: {first})")
    return used[np.argsort(measurement.temperature[used], kind="stable")]


# ------------------------------------------------------------------------------------------------ windows and masks


def _reasons(measurement: Measurement, window: Sequence[Interval], mask: Sequence[Interval]) -> tuple[str | None, ...]:
    by_run = [(reading.settings.window, reading.settings.mask) for reading in measurement.readings]
    reasons: list[str | None] = []
    points = zip(measurement.temperature.tolist(), measurement.run.tolist(), strict=True)
    for i, (temperature, run) in enumerate(points):
        if measurement.set_aside and measurement.set_aside[i] is not None:
            reasons.append(measurement.set_aside[i])
            continue
        run_window, run_mask = by_run[run]
        masked = next((interval for interval in (*run_mask, *mask) if _inside(temperature, interval)), None)
        if not _in_any(temperature, run_window):
            reasons.append(_outside(run_window))
        elif not _in_any(temperature, window):
            reasons.append(_outside(window))
        else:
            reasons.append(None if masked is None else f"masked {_words(masked)}")
    return tuple(reasons)


def _inside(temperature: float, interval: Interval) -> bool:
    return interval[0] <= temperature <= interval[1]


def _in_any(temperature: float, windows: Sequence[Interval]) -> bool:
    return not windows or any(_inside(temperature, window) for window in windows)


def _outside(windows: Sequence[Interval]) -> str:
    return f"outside window{'s' if len(windows) > 1 else ''} {' and '.join(map(_words, windows))}"


def _words(interval: Interval) -> str:
    low, high = interval
    if np.isinf(high):
        return f"from {low:g} K"
    return f"up to {high:g} K" if low <= 0 else f"{low:g}-{high:g} K"


# ------------------------------------------------------------------------------------------------------------ sigma


def _estimated(temperature: FloatArray, heat_capacity: FloatArray, run: NDArray[np.intp]) -> tuple[FloatArray, str]:
    found = pooled_scatter(temperature, heat_capacity, run)
    enough = temperature.size >= FEWEST_POINTS
    scatter = found.scatter
    if scatter is not None and scatter >= _LEAST_SCATTER:
        text = f"estimated from local scatter: {_percent(scatter)} of the heat capacity"
        text += " (of one point, between and within sets of repeats)" if found.sets else ""
        return scatter * heat_capacity, text
    why = "the local scatter is too small to be noise"
    if scatter is None:
        why = "the points are too far apart to estimate it" if enough else "too few points to estimate it from"
    return _ASSUMED * heat_capacity, f"{_ASSUMED_WORD}: {_ASSUMED * 100:g} % of the heat capacity ({why})"


def _percent(scatter: float) -> str:
    return f"{100 * scatter:.3f} %" if scatter < 1e-3 else f"{100 * scatter:.2f} %"

"""From a Measurement to the points that are fitted: windows, masks, order, and a sigma for each."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np
from numpy.typing import NDArray

from ..errors import InputError
from ..exclusion import reasons_kept_out
from ..records import FloatArray, Measurement, PreparedData, SigmaKind
from .addenda import measured_total, with_addenda
from .outliers import outliers_of_runs
from .overlap import run_overlaps, worst_overlaps
from .replicates import Repeated, asks_for_replicates, sigma_from_replicates, with_replicates
from .scatter import FEWEST_POINTS, pooled_scatter

__all__ = ["points_to_fit", "prepare"]

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
    single = measurement
    repeated, reasons = points_to_fit(measurement, window, mask)
    measurement = repeated.measurement
    index = _used(measurement, reasons)
    temperature, heat_capacity = measurement.temperature[index], measurement.heat_capacity[index]
    if measurement.sigma is not None:
        kind: SigmaKind = "stated"
        sigma, text = measurement.sigma[index], f"stated: {measurement.sigma_text}"
    elif asks_for_replicates(measurement):
        kind = "estimated"
        singly = (
            index if single.run.size == measurement.run.size else _used(single, reasons_kept_out(single, window, mask))
        )
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


def points_to_fit(
    measurement: Measurement, window: Sequence[Interval] = (), mask: Sequence[Interval] = ()
) -> tuple[Repeated, tuple[str | None, ...]]:
    """Return the measurement with its repeats as asked, on any basis, and why each point of it is not fitted.

    Raises
    ------
    InputError
        If repeats are asked for and there are none.
    """
    repeated = with_replicates(measurement)
    kept_out = reasons_kept_out(repeated.measurement, window, mask)
    return repeated, tuple(why or dropped for why, dropped in zip(kept_out, repeated.dropped, strict=True))


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

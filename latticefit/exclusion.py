"""Which points of a measurement are kept out of a fit by what was asked: windows, masks, lines and conditions."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from .records import FloatArray, Measurement

__all__ = ["kept_out", "reasons_kept_out"]

Interval = tuple[float, float]


def kept_out(measurement: Measurement) -> NDArray[np.bool_]:
    """Say for each point whether what its run asks for keeps it out, shape (n,); corrections need not cover it."""
    return np.array([why is not None for why in reasons_kept_out(measurement)], dtype=bool)


def reasons_kept_out(
    measurement: Measurement, window: Sequence[Interval] = (), mask: Sequence[Interval] = ()
) -> tuple[str | None, ...]:
    """Say why each point is kept out; None for those that are not.

    Parameters
    ----------
    measurement : Measurement
        On any basis.
    window, mask : sequence of (low, high)
        Closed intervals in K for all runs, beside those in the settings of each run. Several windows count as their
        union; a point must lie in those of its run and in those given here. A point in any mask is kept out.
    """
    T = measurement.temperature
    reasons: list[str | None] = list(measurement.set_aside or (None,) * T.size)

    def give(points: NDArray[np.bool_], reason: str) -> None:
        for i in np.flatnonzero(points).tolist():
            reasons[i] = reasons[i] or reason

    for number, reading in enumerate(measurement.readings):
        own = measurement.run == number
        for windows in (reading.settings.window, window):
            if windows:
                give(own & ~_inside_any(T, windows), _outside(windows))
        for interval in (*reading.settings.mask, *mask):
            give(own & _inside_any(T, [interval]), f"masked {_words(interval)}")
    return tuple(reasons)


def _inside_any(values: FloatArray, intervals: Sequence[Interval]) -> NDArray[np.bool_]:
    inside = np.zeros(values.shape, dtype=bool)
    for low, high in intervals:
        inside |= (values >= low) & (values <= high)
    return inside


def _outside(windows: Sequence[Interval]) -> str:
    return f"outside window{'s' if len(windows) > 1 else ''} {' and '.join(map(_words, windows))}"


def _words(interval: Interval) -> str:
    low, high = interval
    if np.isinf(high):
        return f"from {low:g} K"
    return f"up to {high:g} K" if low <= 0 else f"{low:g}-{high:g} K"

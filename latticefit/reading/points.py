"""Which points of a measurement are kept out of a fit by what was asked, before anything is prepared."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
from numpy.typing import NDArray

from ..records import FloatArray, Measurement

__all__ = ["kept_out"]


def kept_out(measurement: Measurement) -> NDArray[np.bool_]:
    """Say for each point whether the window or a mask of its run, or a reason set aside, keeps it out, shape (n,).

    Corrections need not cover such a point.
    """
    out = np.zeros(measurement.temperature.shape, dtype=bool)
    for number, reading in enumerate(measurement.readings):
        mine, settings = measurement.run == number, reading.settings
        if settings.window:
            out |= mine & ~_inside_any(measurement.temperature, settings.window)
        out |= mine & _inside_any(measurement.temperature, settings.mask)
    if measurement.set_aside:
        out |= np.array([why is not None for why in measurement.set_aside])
    return out


def _inside_any(values: FloatArray, intervals: Iterable[tuple[float, float]]) -> NDArray[np.bool_]:
    inside = np.zeros(values.shape, dtype=bool)
    for low, high in intervals:
        inside |= (values >= low) & (values <= high)
    return inside

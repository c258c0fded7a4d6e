"""Which points of a run its settings keep out of a fit, before anything is prepared."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from .run import RunData

__all__ = ["kept_out"]


def kept_out(part: RunData) -> NDArray[np.bool_]:
    """Say for each point whether a window, a mask or masked lines of its run keep it out, shape (n,).

    Corrections need not cover such a point.
    """
    settings = part.reading.settings
    out = np.zeros(part.temperature.shape, dtype=bool)
    if settings.window:
        out |= ~_inside_any(part.temperature, settings.window)
    return out | _inside_any(part.temperature, settings.mask) | _inside_any(part.line, settings.mask_lines)


def _inside_any(
    values: NDArray[np.float64] | NDArray[np.intp], intervals: tuple[tuple[float, float], ...]
) -> NDArray[np.bool_]:
    inside = np.zeros(values.shape, dtype=bool)
    for low, high in intervals:
        inside |= (values >= low) & (values <= high)
    return inside

"""The scatter of a measurement without a model: what sigma is when none is stated."""

from __future__ import annotations

import math
from typing import Final

import numpy as np

from ..records import FloatArray

__all__ = ["local_scatter", "neighbour_span"]

_NEIGHBOURS: Final = 7
_NORMAL_MEDIAN: Final = 1.4826  # standard deviation of a normal distribution over the median of its absolute values
_LEAST_FREEDOM: Final = 1e-6


def neighbour_span(temperature: FloatArray) -> float:
    """Median over the points of the factor in T that the 7 nearest neighbours span; `temperature` ascending, K."""
    size = min(_NEIGHBOURS, temperature.size)
    return float(np.median(temperature[size - 1 :] / temperature[: temperature.size - size + 1]))


def local_scatter(temperature: FloatArray, heat_capacity: FloatArray) -> float | None:
    """Estimate the relative standard deviation of a heat capacity from its own local scatter.

    Parameters
    ----------
    temperature, heat_capacity : ndarray, shape (n,)
        Ascending temperature in K, equal ones allowed; heat capacity in any unit, above 0.

    Returns
    -------
    float or None
        sigma/C, the same at every point; None where no point says anything about it.

    Notes
    -----
    At each point the deviation of ln C from a quadratic in ln T through its 7 nearest neighbours in order (itself
    included), divided by sqrt(1 - leverage); 1.4826 times the median of the absolute values, the consistent estimate
    of a normal standard deviation. Repeats at one temperature lower the degree that a neighbourhood determines: the
    singular value decomposition then fits what is left. A point that its own fit must pass through says nothing and
    is left out.
    """
    count = temperature.size
    if count <= 1:
        return None
    size = min(_NEIGHBOURS, count)
    log_t, log_c = np.log(temperature), np.log(heat_capacity)
    starts = np.clip(np.arange(count) - size // 2, 0, count - size)
    members = starts[:, None] + np.arange(size)
    x, y = log_t[members], log_c[members]
    x = x - x.mean(axis=1, keepdims=True)
    spread = np.abs(x).max(axis=1, keepdims=True)
    x = np.divide(x, spread, out=np.zeros_like(x), where=spread > 1e-12)
    design = np.stack([np.ones_like(x), x, x * x], axis=-1)
    basis, singular, _ = np.linalg.svd(design, full_matrices=False)
    basis = basis * (singular > 1e-9 * singular[:, :1])[:, None, :]
    own = np.arange(count) - starts
    row = basis[np.arange(count), own]
    fitted = np.einsum("ik,ijk,ij->i", row, basis, y)
    freedom = 1.0 - np.einsum("ik,ik->i", row, row)
    useful = freedom > _LEAST_FREEDOM
    if not useful.any():
        return None
    deviation = (log_c - fitted)[useful] / np.sqrt(freedom[useful])
    scatter = _NORMAL_MEDIAN * float(np.median(np.abs(deviation)))
    return scatter if math.isfinite(scatter) else None

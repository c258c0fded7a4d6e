"""The sigma of points from which addenda were taken off.

What scatters is the measured total, so a sigma that nobody stated is estimated from the total; to the sigma of the
point comes the standard uncertainty of what was taken off. That one is common to neighbouring points, because it is of
a smooth curve: a fit takes it for independent scatter, and S and H carry more of it than their u says. The warning
`addenda-uncertainty` gives the size of what they carry.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from ..records import FloatArray, Measurement

__all__ = ["measured_total", "with_addenda"]


def measured_total(measurement: Measurement) -> FloatArray:
    """Return the heat capacity with everything in it that was measured, shape (n,), unit of the measurement."""
    if measurement.addenda is None:
        return measurement.heat_capacity
    return np.asarray(measurement.heat_capacity + measurement.addenda)


def with_addenda(
    measurement: Measurement, index: NDArray[np.intp], sigma: FloatArray, text: str
) -> tuple[FloatArray, str]:
    """Add the uncertainty of the addenda to the sigma of the points at `index`, in quadrature, and say so.

    Parameters
    ----------
    measurement : Measurement
    index : ndarray of int, shape (m,)
    sigma : ndarray, shape (m,)
        Of the measured total, unit of the measurement.
    text : str
        Where sigma comes from.
    """
    if measurement.addenda_u is None:
        return sigma, text
    return np.hypot(
        sigma, measurement.addenda_u[index]
    ), f"{text}, addenda included; and the uncertainty of the addenda"

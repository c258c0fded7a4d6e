"""The sigma of points from which addenda were taken off.

What scatters is the measured total, so a sigma that nobody stated is estimated from the total; to the sigma of the
point comes the standard uncertainty of what was taken off. That one is common to neighbouring points, because it is of
a smooth curve: a fit takes it for independent scatter, and S and H carry more of it than their u says. The warning
`addenda-uncertainty` gives the size of what they carry.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from ..records import FloatArray, Measurement, PreparedData

__all__ = ["measured_total", "sigma_of_all", "with_addenda"]


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


def sigma_of_all(prepared: PreparedData) -> FloatArray:
    """Return the sigma of every measured point, also of those that are not fitted, shape (n,), J/(mol K).

    Where it was estimated, it is the same fraction of the measured total everywhere.
    """
    measurement, first = prepared.measurement, int(prepared.index[0])
    if measurement.sigma is not None:
        sigma = np.asarray(measurement.sigma)
    else:
        total, known = measured_total(measurement), measurement.addenda_u
        own = float(prepared.sigma[0]) ** 2 - (0.0 if known is None else float(known[first]) ** 2)
        sigma = total * (max(own, 0.0) ** 0.5 / float(total[first]))
    found = np.array(with_addenda(measurement, np.arange(sigma.size), sigma, "")[0])
    found[prepared.index] = prepared.sigma
    return found

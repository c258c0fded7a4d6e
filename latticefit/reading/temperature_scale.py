"""From IPTS-68 to ITS-90: the temperatures of a run, and its heat capacities with them.

The difference T90 - T68 is that of H. Preston-Thomas, Metrologia 27, 3-10 (1990): polynomials from 13.8 K to 83.8 K and
from there to 630.6 degC (coefficients from memory; checked against the fixed points of both scales). Heat capacity is
dQ/dT, so it changes with the scale too: C90 = C68 dT68/dT90, in which the shift of the point itself is the conversion
of T (R. L. Rusby, J. Chem. Thermodyn. 23, 1153-1161 (1991); R. N. Goldberg and R. D. Weir, Pure Appl. Chem. 64,
1545-1562 (1992)).
"""

from __future__ import annotations

from dataclasses import replace
from typing import Final

import numpy as np
from numpy.polynomial import polynomial
from numpy.typing import NDArray

from ..errors import InputError
from ..exclusion import kept_out
from ..records import ExcludedRow, FloatArray, Measurement, Repair
from .wording import counted, shown_name

__all__ = ["on_its90", "scale_difference", "scale_slope"]

_LOWEST: Final = 13.8
"""Where the conversion begins, K: IPTS-68 is defined from the triple point of hydrogen on, 13.81 K."""

_HIGHEST: Final = 903.75
"""Where the conversion ends, K: 630.6 degC."""

_JOIN: Final = 83.8
_COLD: Final = (  # of (T68/K - 40)/40
    *(-0.005903, 0.008174, -0.061924, -0.193388, 1.490793, 1.252347, -9.835868, 1.411912, 25.277595),
    *(-19.183815, -18.437089, 27.000895, -8.716324),
)
_WARM: Final = (  # of t68/(630 degC)
    (0.0, -0.148759, -0.267408, 1.080760, 1.269056, -4.089591, -1.871251, 7.438081, -3.536296)
)


def scale_difference(temperature: FloatArray) -> FloatArray:
    """Return T90 - T68 in K at temperatures on IPTS-68 from `_LOWEST` to `_HIGHEST`, shape (n,)."""
    x, y = (temperature - 40) / 40, (temperature - 273.15) / 630
    cold, warm = polynomial.polyval(x, _COLD), polynomial.polyval(y, _WARM)
    return np.asarray(np.where(temperature < _JOIN, cold, warm))


def scale_slope(temperature: FloatArray) -> FloatArray:
    """Return d(T90 - T68)/dT68 at temperatures on IPTS-68, shape (n,)."""
    x, y = (temperature - 40) / 40, (temperature - 273.15) / 630
    cold = polynomial.polyval(x, polynomial.polyder(_COLD)) / 40
    warm = polynomial.polyval(y, polynomial.polyder(_WARM)) / 630
    return np.asarray(np.where(temperature < _JOIN, cold, warm))


def on_its90(measurement: Measurement) -> Measurement:
    """Convert the runs that are declared to be on IPTS-68; all others stay as they are.

    Parameters
    ----------
    measurement : Measurement
        As read. Points below 13.81 K stay as they are, and so do points above 903.75 K that are not to be fitted.

    Returns
    -------
    Measurement
        T, C and sigma on ITS-90, with the size of the conversion among the repairs.

    Raises
    ------
    InputError
        If a point that may be fitted lies above 903.75 K.
    """
    declared = np.array([each.settings.temperature_scale == "IPTS-68" for each in measurement.readings])
    if not declared.any():
        return measurement
    T, concerned = measurement.temperature, declared[measurement.run]
    _refuse_above(measurement, concerned)
    inside = concerned & (T >= _LOWEST) & (T <= _HIGHEST)
    factor = np.where(inside, 1 / (1 + scale_slope(T)), 1.0)
    notes = [
        Repair(reading.file, None, note)
        for number, reading in enumerate(measurement.readings)
        for note in _notes(T[concerned & (measurement.run == number)])
    ]
    return replace(
        measurement,
        temperature=T + np.where(inside, scale_difference(T), 0.0),
        heat_capacity=measurement.heat_capacity * factor,
        sigma=None if measurement.sigma is None else measurement.sigma * factor,
        repairs=(*measurement.repairs, *notes),
        excluded=tuple(_converted(row) if declared[row.run] else row for row in measurement.excluded),
    )


def _refuse_above(measurement: Measurement, concerned: NDArray[np.bool_]) -> None:
    above = np.flatnonzero(concerned & (measurement.temperature > _HIGHEST) & ~kept_out(measurement))
    if above.size:
        i = int(above[0])
        file = shown_name(measurement.readings[measurement.run[i]].file)
        raise InputError(
            f"{file}: {measurement.temperature[i]:g} K in line {measurement.line[i]} lies above {_HIGHEST:g} K, where "
            "the conversion from IPTS-68 ends; leave out such rows, or convert the file beforehand"
        )


def _converted(row: ExcludedRow) -> ExcludedRow:
    if not _LOWEST <= row.temperature <= _HIGHEST:
        return row
    T = np.array([row.temperature])
    factor = 1 / (1 + float(scale_slope(T)[0]))
    return replace(
        row,
        temperature=row.temperature + float(scale_difference(T)[0]),
        heat_capacity=row.heat_capacity * factor,
        sigma=row.sigma * factor,
    )


def _notes(T: FloatArray) -> list[str]:
    """Say how the temperatures of one run (K, on IPTS-68) and their heat capacities change."""
    notes = []
    inside = T[(T >= _LOWEST) & (T <= _HIGHEST)]
    if inside.size:
        shift, percent = scale_difference(inside), 100 * np.abs(scale_slope(inside))
        notes.append(
            f"temperatures converted from IPTS-68 to ITS-90: by {shift.min():+.3f} to {shift.max():+.3f} K, heat "
            f"capacities by up to {percent.max():.2g} %"
        )
    below, above = int((T < _LOWEST).sum()), int((T > _HIGHEST).sum())
    if below:
        notes.append(f"{counted(below, 'row')} below 13.81 K, where IPTS-68 is not defined: T and C kept as they are")
    if above:
        notes.append(f"{counted(above, 'row')} above {_HIGHEST:g} K not converted from IPTS-68 and not fitted")
    return notes

"""Named warnings: what was corrected before the fit, and the errors that the corrections share between points."""

from __future__ import annotations

import numpy as np

from ..records import FloatArray, NamedWarning
from ..sample import converted_by_mass
from .case import Case

__all__ = ["addenda_share", "addenda_uncertainty", "mass_uncertainty"]

_SHARE = 0.70  # of the measured total (common practice, no source)
_CARRIED_NOTE, _CARRIED_WARN = 0.001, 0.01  # of the entropy within the data
_MASS_WARN = 0.01  # of the mass: as much as a good measurement scatters (common practice, no source)


def addenda_share(case: Case) -> NamedWarning | None:
    """What is left is a small difference of large numbers."""
    measurement, index = case.prepared.measurement, case.prepared.index
    if measurement.addenda is None:
        return None
    addenda = measurement.addenda[index]
    share = addenda / (addenda + measurement.heat_capacity[index])
    worst = float(share.max())
    if worst <= _SHARE:
        return None
    T = np.asarray(measurement.temperature[index])[share > _SHARE]
    return NamedWarning(
        code="addenda-share",
        level="warn",
        concerns="data",
        message=(
            f"addenda are up to {100 * worst:.0f} % of what was measured (above {100 * _SHARE:.0f} % at {T.size} "
            f"points, {T.min():.4g} to {T.max():.4g} K): an error of what was measured comes into the sample's heat "
            f"capacity {1 / max(1 - worst, 1e-6):.1f} times larger"
        ),
        found=worst,
        threshold=_SHARE,
        advice="leave those points out by --mask, or measure with more sample or less grease",
    )


def _carried(case: Case) -> float | None:
    """Uncertainty of the entropy within the data from the addenda, all points together, as a part of that entropy."""
    measurement, index = case.prepared.measurement, case.prepared.index
    if measurement.addenda_u is None or index.size < 2:
        return None
    ln_t = np.log(np.asarray(case.prepared.temperature))

    def over_ln_t(values: FloatArray) -> float:
        return float(np.sum(0.5 * (values[1:] + values[:-1]) * np.diff(ln_t)))

    entropy = over_ln_t(np.asarray(case.prepared.heat_capacity))
    return over_ln_t(np.asarray(measurement.addenda_u[index])) / entropy if entropy > 0 else None


def addenda_uncertainty(case: Case) -> NamedWarning | None:
    """The error of the addenda is common to neighbouring points, so S and H carry it in full."""
    carried = _carried(case)
    if carried is None or carried <= _CARRIED_NOTE:
        return None
    return NamedWarning(
        code="addenda-uncertainty",
        level="warn" if carried > _CARRIED_WARN else "note",
        concerns="S, H",
        message=(
            "the uncertainty of the addenda is common to neighbouring points and does not average out as scatter does: "
            f"it may move S by up to {100 * carried:.2g} % within the range of the data, and H likewise, on top of u"
        ),
        found=carried,
        threshold=_CARRIED_WARN if carried > _CARRIED_WARN else _CARRIED_NOTE,
        advice="measure the addenda with more points or less scatter",
    )


def mass_uncertainty(case: Case) -> NamedWarning | None:
    """The mass makes a scale error that no residual shows."""
    measurement = case.prepared.measurement
    mass, u, labels = measurement.sample.mass, measurement.sample.mass_u, converted_by_mass(measurement)
    if mass is None or u is None or not labels:
        return None
    part = u / mass
    return NamedWarning(
        code="mass-uncertainty",
        level="warn" if part > _MASS_WARN else "note",
        concerns="scale",
        message=(
            f"the mass of the sample is uncertain by {100 * part:.2g} %: heat capacities, H and S that come from it "
            "carry this scale error on top of their u, and no residual shows it"
        ),
        found=part,
        threshold=_MASS_WARN,
        advice="add it to the u of Cp, H and S when quoting them; weigh the sample again if it is the largest part",
    )

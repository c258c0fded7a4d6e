"""What was done to the data before the fit, in words and for machines: addenda, the scale of T, the mass."""

from __future__ import annotations

from typing import Any

from ..records import AddendaSettings, AddendaShare, Measurement, Reading
from ..rounding import format_value, percent_range, percent_text
from ..sample import converted_by_mass
from .wording import plain_number

__all__ = ["addenda_record", "correction_words", "mass_words"]


def mass_words(measurement: Measurement) -> str:
    """Return the mass of the sample with its u, and whether it is used at all."""
    sample = measurement.sample
    mass = 1e6 * (sample.mass or 0.0)
    shown = f"{plain_number(mass, 6)} mg" if sample.mass_u is None else format_value(mass, 1e6 * sample.mass_u, "mg")
    return f"mass {shown}" + ("" if converted_by_mass(measurement) else " (not used: no run is in J/K)")


def correction_words(measurement: Measurement) -> tuple[tuple[str, str, str], ...]:
    """Return label, statement and remark of each correction; empty where there was none."""
    found = []
    for settings, reading, share in _entries(measurement):
        part = f"{percent_range(share.lowest, share.highest)} of the measured heat capacity taken off"
        u = f"{share.points} points, u {percent_range(share.u_lowest, share.u_highest)} of the sample's"
        found.append(("addenda", f"{reading.file}: {part}", f"{_amount(settings)}{u}"))
    old = [each.label for each in measurement.readings if each.settings.temperature_scale == "IPTS-68"]
    if old:
        found.append(("temperature scale", "ITS-90", f"T and C of {', '.join(old)} converted from IPTS-68"))
    sample, labels = measurement.sample, converted_by_mass(measurement)
    if sample.mass is not None and sample.mass_u is not None and labels:
        of_runs = "" if len(labels) == len(measurement.readings) else f" from {', '.join(labels)}"
        u = percent_text(100 * sample.mass_u / sample.mass)
        words = f"the mass is uncertain by {u}: every {measurement.quantity}, H and S{of_runs} carries this scale error"
        found.append(("scale", f"{words} on top of its u", ""))
    return tuple(found)


def addenda_record(measurement: Measurement) -> list[dict[str, Any]]:
    """Return each known heat capacity that was taken off, with its share, for result.json."""
    return [
        {
            "file": reading.file,
            "sha256": reading.sha256,
            "runs": list(settings.runs) or [each.label for each in measurement.readings],
            "heat_capacity_unit": reading.heat_capacity_unit,
            "mass": settings.mass,
            "fraction": settings.fraction,
            "points": share.points,
            "share_min": share.lowest,
            "share_max": share.highest,
            "u_share_min": share.u_lowest,
            "u_share_max": share.u_highest,
        }
        for settings, reading, share in _entries(measurement)
    ]


def _entries(measurement: Measurement) -> list[tuple[AddendaSettings, Reading, AddendaShare]]:
    return list(
        zip(
            measurement.addenda_settings,
            measurement.addenda_readings,
            measurement.addenda_shares,
            strict=True,
        )
    )


def _amount(settings: AddendaSettings) -> str:
    if settings.fraction is not None:
        return f"{settings.fraction} of the sample's mass, "
    return "" if settings.mass is None else f"{settings.mass}, "

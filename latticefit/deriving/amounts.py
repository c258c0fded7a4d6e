"""The same table per gram or per kilogram."""

from __future__ import annotations

from dataclasses import fields, replace
from typing import Literal

from ..errors import InputError
from ..records import EnergyDifference, Sample, ThermodynamicTable

__all__ = ["Amount", "difference_per", "table_per"]

Amount = Literal["mol", "g", "kg"]

_KEPT = {"temperature", "entropy_fraction_below_data"}


def _factor(sample: Sample, per: Amount) -> float:
    """Moles in the amount."""
    if per == "mol":
        return 1.0
    if sample.molar_mass is None:
        raise InputError(f"values per {per} need the molar mass, which the result does not hold; fit with --formula")
    return (1.0 if per == "kg" else 1e-3) / sample.molar_mass


def table_per(table: ThermodynamicTable, sample: Sample, per: Amount) -> ThermodynamicTable:
    """Return a table per mole of formula unit, gram or kilogram.

    Raises
    ------
    InputError
        When the molar mass is not known.
    """
    factor = _factor(sample, per)
    scaled = {
        entry.name: getattr(table, entry.name) * factor
        for entry in fields(table)
        if entry.name not in _KEPT and entry.type == "FloatArray"
    }
    parts = {name: values * factor for name, values in table.components.items()}
    return replace(table, **scaled, components=parts, per=per)


def difference_per(each: EnergyDifference, sample: Sample, per: Amount) -> EnergyDifference:
    """Return a difference per mole of formula unit, gram or kilogram; errors as `table_per`."""
    factor = _factor(sample, per)
    return replace(
        each,
        energy=None if each.energy is None else each.energy * factor,
        energy_u=None if each.energy_u is None else each.energy_u * factor,
        entropy=None if each.entropy is None else each.entropy * factor,
        entropy_u=None if each.entropy_u is None else each.entropy_u * factor,
        per=per,
    )

"""The single slips that can have happened on the way of a heat capacity from its file to J/(mol K).

Which are possible depends on that way: a mass was used only for data per sample, a molar mass only for data per gram
or per sample. Each slip states by what factor it changes C/(3nR). The list is that of common practice, no source.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from math import isclose

from ..records import Measurement, Sample
from ..sample import parse_formula
from ..units import KELVIN_ASSUMED, UnitBasis, find_heat_capacity_unit
from .hydrates import Slip, molar_mass_slips, shown, water_slips

__all__ = ["Slip", "addenda_left_in", "kelvin_assumed", "possible_slips"]

_PREFIXES = {"k": 3, "": 0, "m": -3, "u": -6, "n": -9}  # power of ten
_DENOMINATORS = ("(mol K)", "(g K)", "(kg K)", "(mol-atom K)", "K")


def possible_slips(measurement: Measurement, warmest: float) -> tuple[Slip, ...]:
    """Return the slips that can have happened.

    Parameters
    ----------
    measurement : Measurement
        Per mole, with known atoms.
    warmest : float
        Highest temperature of its points, K.
    """
    texts = sorted({each.heat_capacity_unit for each in measurement.readings})
    units = [find_heat_capacity_unit(text) for text in texts]
    bases = {unit.basis for unit in units if unit is not None}
    found = list(_unit_slips(texts[0], measurement.sample)) if len(texts) == 1 else []
    if len(bases) == 1:
        basis = bases.pop()
        found += [*_amount_slips(measurement, basis), *molar_mass_slips(measurement, basis)]
        found += water_slips(measurement, basis, warmest)
    return tuple(found)


def addenda_left_in(measurement: Measurement) -> bool:
    """Whether the data are of whole samples, in J/K, and nothing was taken off."""
    units = [find_heat_capacity_unit(each.heat_capacity_unit) for each in measurement.readings]
    return not measurement.addenda_settings and all(each is not None and each.basis == "sample" for each in units)


def kelvin_assumed(measurement: Measurement) -> bool:
    """Whether no file states the unit of its temperatures, so that they were taken as K."""
    assumed = {each.file for each in measurement.repairs if each.message.endswith(KELVIN_ASSUMED)}
    return all(each.file in assumed for each in measurement.readings)


# ------------------------------------------------------------------------------------------------------------- units


def _unit_slips(text: str, sample: Sample) -> Iterator[Slip]:
    """The numbers are in a unit that differs in one thing: the prefix, joule or calorie, or per what."""
    here = _to_mole(text, sample)
    alike: dict[float, list[tuple[str, float]]] = {}  # units of one size are one slip: mJ/(g K) and J/(kg K)
    for other, doubt in _other_units(text):
        there = _to_mole(other, sample)
        if here is not None and there is not None and not isclose(here, there, rel_tol=1e-9):
            alike.setdefault(float(f"{there:.9g}"), []).append((other, doubt))
    for there, others in alike.items():
        names = [other for other, _ in others]
        words = f"values in {' or '.join(names)} that are read as {text}"
        remedy = f"give --heat-capacity-unit '{names[0]}'"
        yield Slip("unit", words, (here or there) / there, remedy, min(doubt for _, doubt in others))


def _other_units(text: str) -> Iterator[tuple[str, float]]:
    found = re.fullmatch(r"([kmun]?)(J|cal)/(.+)", text)
    if found is None:
        yield from ((f"J/{each}", 2.0) for each in _DENOMINATORS)
        return
    prefix, energy, per = found.groups()
    for each, power in _PREFIXES.items():
        step = abs(power - _PREFIXES[prefix])
        if 0 < step <= 6:
            yield f"{each}{energy}/{per}", 0.5 if step == 3 and each != "k" else 1.5
    yield f"{prefix}{'cal' if energy == 'J' else 'J'}/{per}", 1.0
    yield from ((f"{prefix}{energy}/{each}", 1.0) for each in _DENOMINATORS if each != per)
    if per in ("(mol K)", "(mol-atom K)"):
        yield "R", 2.0


def _to_mole(text: str, sample: Sample) -> float | None:
    """Factor from a unit to J/(mol K); None where the sample does not allow it."""
    unit = find_heat_capacity_unit(text)
    molar_mass, mass = sample.molar_mass, sample.mass
    factors: dict[UnitBasis, float | None] = {
        "mol": 1.0,
        "mol_atoms": sample.atoms,
        "gram": None if molar_mass is None else 1e3 * molar_mass,
        "sample": None if molar_mass is None or mass is None else molar_mass / mass,
    }
    factor = None if unit is None else factors[unit.basis]
    return None if unit is None or factor is None else unit.factor * factor


# -------------------------------------------------------------------------------- mass, molar mass, number of atoms


def _amount_slips(measurement: Measurement, basis: UnitBasis) -> Iterator[Slip]:
    sample = measurement.sample
    formula = None if sample.formula is None else parse_formula(sample.formula)
    by_mass = basis in ("gram", "sample")
    if basis == "sample":
        yield Slip("mass", "a mass 1000 times too small", 1e3, "check the unit of --mass", 1.0)
        yield Slip("mass", "a mass 1000 times too large", 1e-3, "check the unit of --mass", 1.0)
    if by_mass and measurement.sample_settings.molar_mass is not None:
        yield Slip("molar-mass", "a molar mass 1000 times too large", 1e3, "check the unit of --molar-mass", 2.0)
        yield Slip("molar-mass", "a molar mass 1000 times too small", 1e-3, "check the unit of --molar-mass", 2.0)
    stated = sample.atoms or 0.0
    if formula is not None and basis != "mol_atoms" and not isclose(formula.atoms, stated, rel_tol=1e-9):
        words = f"{'1 atom' if stated == 1 else f'{stated:g} atoms'} where {shown(formula)} has {formula.atoms:g}"
        yield Slip("atoms", words, formula.atoms / stated, "leave --atoms out", 0.0)
    if basis == "mol" or (by_mass and formula is None):
        what = "values per mole" if basis == "mol" else "a molar mass"
        remedy = "give the formula that the values are for" if basis == "mol" else "check --molar-mass and --atoms"
        for times, expected in (("twice", 2.0), ("half", 0.5)):
            yield Slip("formula-unit", f"{what} of {times} the formula unit", expected, remedy, 3.0)

"""Slips of the composition: water of crystallisation left out or lost, and the molar mass of another formula."""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from math import isclose

from ..records import LevelExplanation, Measurement
from ..sample import Formula, element_counts, parse_formula
from ..units import UnitBasis

__all__ = ["Slip", "merged_waters", "molar_mass_slips", "shown", "water_slips"]

_WATERS = (0.5, 1.0, 1.5, *map(float, range(2, 13)))  # per formula unit
# of one H2O; the stiff ones, at most, are its O-H vibrations, 2300 to 5000 K, and its librations, 600 to 1200 K
_ATOMS, _STIFF_MODES = 3, 6
_COLD = 600.0  # K: below, they are not excited
_SAME_MASS = 1e-3  # relative; the rounding of a molar mass is below
_SAME_WATER = 0.02  # of one H2O


@dataclass(frozen=True)
class Slip:
    """One slip: its kind, what was slipped, the factor by which it changes C/(3nR), and how to mend it.

    `doubt` is how unusual it is, in units of a squared deviation in standard uncertainties: it tells slips apart that
    explain a level equally well. `stiff` is the share of the modes that may not be excited where the slip is the
    reason, so that the level may be lower by it; `waters` the H2O that a formula lacks.
    """

    kind: str
    words: str
    expected: float
    remedy: str
    doubt: float
    stiff: float = 0.0
    waters: float | None = None


def shown(formula: Formula) -> str:
    """Return a formula as options take it: plain letters, ``*`` before water."""
    return formula.read_as.replace("+", "*")


def _parts(formula: Formula) -> tuple[list[str], float]:
    """The parts of a formula without water, and its waters of crystallisation."""
    dry, waters = [], 0.0
    for part in formula.read_as.split("+"):
        found = re.fullmatch(r"(\d*\.?\d*)H2O", part)
        if found is None:
            dry.append(part)
        else:
            waters += float(found[1] or 1)
    return dry, waters


def _with_waters(formula: Formula, waters: float) -> str:
    """The formula with that many waters of crystallisation in place of its own."""
    water = [] if waters == 0 else ["H2O" if waters == 1 else f"{waters:g}H2O"]
    return "*".join([*_parts(formula)[0], *water])


def molar_mass_slips(measurement: Measurement, basis: UnitBasis) -> Iterator[Slip]:
    """Give the slips in a stated molar mass that is not the one of the formula: the first suspect, where it was used.

    Parameters
    ----------
    measurement : Measurement
    basis : {"mol", "mol_atoms", "gram", "sample"}
        What the values of the file are per.
    """
    sample = measurement.sample
    if basis not in ("gram", "sample") or sample.formula is None or sample.molar_mass is None:
        return
    formula, stated = parse_formula(sample.formula), sample.molar_mass
    ratio = stated / formula.molar_mass
    if isclose(ratio, 1.0, rel_tol=_SAME_MASS):
        return
    remedy = f"give --formula '{shown(formula)}' without --molar-mass"
    missing = (formula.molar_mass - stated) / parse_formula("H2O").molar_mass
    own = _parts(formula)[1]
    waters = next((each for each in _WATERS if abs(abs(missing) - each) < _SAME_WATER), None)
    if waters is not None and missing < 0:
        yield Slip(
            "hydrate-water",
            f"a formula without the {waters:g} H2O of its molar mass",
            1 + _ATOMS * waters / formula.atoms,
            f"give --formula '{_with_waters(formula, own + waters)}' without --molar-mass",
            0.0,
        )
        words = f"a molar mass with {waters:g} H2O that the sample does not hold"
        yield Slip("hydrate-water", words, ratio, remedy, 0.0)
    elif waters is not None and waters <= own:
        yield Slip("hydrate-water", f"a molar mass without its {waters:g} H2O", ratio, remedy, 0.0)
    else:
        yield Slip("molar-mass", _other_molar_mass(formula, stated), ratio, remedy, 0.0)


def _other_molar_mass(formula: Formula, stated: float) -> str:
    """What a stated molar mass is instead of the one of the formula, in words."""
    for whole in (2, 3, 4):
        if isclose(stated, whole * formula.molar_mass, rel_tol=_SAME_MASS):
            return f"the molar mass of {whole} {shown(formula)}"
        if isclose(whole * stated, formula.molar_mass, rel_tol=_SAME_MASS):
            return f"the molar mass of 1/{whole} {shown(formula)}"
    return f"the molar mass {1e3 * stated:.6g} g/mol where {shown(formula)} has {1e3 * formula.molar_mass:.6g}"


def water_slips(measurement: Measurement, basis: UnitBasis, warmest: float) -> Iterator[Slip]:
    """Give the slips in the water of crystallisation: a formula that lacks it, or a sample that has lost it.

    Data per gram or per sample change with the molar mass and the atoms, data per mole with the atoms alone. Below
    600 K the stiff vibrations of water are not excited, so that it may count 3 to 9 modes.

    Parameters
    ----------
    measurement : Measurement
    basis : {"mol", "mol_atoms", "gram", "sample"}
        What the values of the file are per.
    warmest : float
        Highest temperature of the points, K.
    """
    sample = measurement.sample
    if basis == "mol_atoms" or sample.atoms is None or not _consistent(measurement):
        return
    formula = None if sample.formula is None else parse_formula(sample.formula)
    by_mass = basis in ("gram", "sample")
    if (formula is None and not by_mass) or (formula is not None and len(element_counts(formula.text)) < 2):
        return
    mass = sample.molar_mass if by_mass else None
    for waters in _WATERS:
        words = f"{waters:g} H2O left out of --atoms and --molar-mass"
        remedy = "add 3 atoms and 18.015 g/mol for each H2O"
        if formula is not None:
            words = f"a formula without its {waters:g} H2O"
            remedy = f"give --formula '{_with_waters(formula, _parts(formula)[1] + waters)}'"
        doubt = 2.0 + 0.3 * waters + (2.0 if waters % 1 else 0.0)
        stiff = _STIFF_MODES * waters / (3 * (sample.atoms + _ATOMS * waters)) if warmest < _COLD else 0.0
        yield Slip("hydrate-water", words, _changed(sample.atoms, mass, waters), remedy, doubt, stiff, waters)
    if formula is not None:
        own = _parts(formula)[1]
        for kept in (0.0, *(each for each in _WATERS if each < own)):
            if formula.atoms > _ATOMS * (own - kept) and own > 0:
                words = f"a sample that has lost {f'{own - kept:g} of ' if kept else ''}its {own:g} H2O"
                remedy = f"give --formula '{_with_waters(formula, kept)}'"
                doubt = 2.0 + 0.2 * kept + (2.0 if kept % 1 else 0.0)
                yield Slip("lost-water", words, _changed(sample.atoms, mass, kept - own), remedy, doubt)


def merged_waters(full: Sequence[Slip], stiff: Sequence[Slip], formula: str | None) -> LevelExplanation:
    """Make one explanation of all numbers of H2O that a formula may lack, so that none is stated as the fact.

    Parameters
    ----------
    full, stiff : sequence of Slip
        Those that explain the level with all their modes excited, and those that do with stiff ones not excited.
    formula : str or None
    """
    if len(full) + len(stiff) == 1 and full:
        return LevelExplanation(full[0].kind, full[0].words, full[0].expected, full[0].remedy)
    factor = f" (factor {full[0].expected:.3g})" if len(full) == 1 else ""
    said = [f"{_amounts(full)}{factor}"] if full else []
    if stiff:
        said.append(f"{_amounts(stiff)} whose stiff vibrations are not excited")
    words, kind = ", or ".join(said), (full or stiff)[0].kind
    if formula is None:
        return LevelExplanation(kind, f"{words}, left out of --atoms and --molar-mass", None, (full or stiff)[0].remedy)
    dry = parse_formula(formula)
    lowest, highest = (_with_waters(dry, _parts(dry)[1] + each) for each in _ends([*full, *stiff]))
    ends = f"'{lowest}'" if lowest == highest else f"'{lowest}' to '{highest}'"
    return LevelExplanation(kind, f"a formula without its {words}", None, f"give --formula with its water, {ends}")


def _ends(slips: Sequence[Slip]) -> tuple[float, float]:
    waters = [each.waters or 0.0 for each in slips]
    return min(waters), max(waters)


def _amounts(slips: Sequence[Slip]) -> str:
    lowest, highest = _ends(slips)
    return f"{lowest:g} H2O" if lowest == highest else f"{lowest:g} to {highest:g} H2O"


def _consistent(measurement: Measurement) -> bool:
    """Whether atoms and molar mass are those of the formula, where there is one."""
    sample = measurement.sample
    if sample.formula is None or sample.atoms is None:
        return True
    formula = parse_formula(sample.formula)
    same_mass = sample.molar_mass is None or isclose(sample.molar_mass, formula.molar_mass, rel_tol=_SAME_MASS)
    return same_mass and isclose(sample.atoms, formula.atoms, rel_tol=1e-9)


def _changed(atoms: float, molar_mass: float | None, waters: float) -> float:
    """C/(3nR) over the right one where `waters` more belong to the formula unit."""
    modes = (atoms + _ATOMS * waters) / atoms
    return modes if molar_mass is None else modes / (1 + waters * parse_formula("H2O").molar_mass / molar_mass)

"""The sample: from what was written (formula, quantities with units) to atoms, molar mass and mass in SI."""

from __future__ import annotations

import math
import re
import unicodedata
from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache
from typing import Final

from .errors import InputError
from .records import Measurement, Sample, SampleSettings
from .units import heat_capacity_unit, parse_quantity

__all__ = [
    "Formula",
    "WrittenNumber",
    "build_sample",
    "converted_by_mass",
    "element_counts",
    "parse_formula",
    "parse_mass",
    "sample_notes",
    "written_number",
]

_LONGEST_FORMULA = 200
_NOTED_DIFFERENCE = 1e-3  # rounding of a molar mass is below 0.1 %


@dataclass(frozen=True)
class Formula:
    """A chemical formula: as written, as read, atoms per formula unit, molar mass in kg/mol."""

    text: str
    read_as: str
    atoms: float
    molar_mass: float


@lru_cache(maxsize=256)
def parse_formula(text: str) -> Formula:
    """Read a chemical formula with standard atomic weights.

    Parameters
    ----------
    text : str
        For example ``Al2O3``, ``Mg0.9Fe0.1O``, ``Ca(OH)2``, ``Li[7]F`` or ``⁷LiF``; hydrates as
        ``CaSO4·2H2O``, also with ``*``, ``.`` or ``+``. A point before water is a hydrate point (``CaSO4.2H2O`` holds
        two waters), any other point between digits is a decimal point.

    Raises
    ------
    InputError
        If it is not a formula, or names an unknown element.

    Notes
    -----
    Atomic weights are those of the `periodictable` package (IUPAC standard atomic weights).
    """
    plain = _one_separator(text)
    if not plain:
        raise InputError("the formula is empty: write it as in 'Al2O3'")
    if len(plain) > _LONGEST_FORMULA:
        raise InputError(f"the formula {plain[:30] + '...'!r} is longer than {_LONGEST_FORMULA} characters")
    _refuse_unknown_elements(text, plain)
    _refuse_leading_number(text, plain)
    atoms, molar_mass = _count(text, plain)
    if not (math.isfinite(molar_mass) and molar_mass > 0 and math.isfinite(atoms) and atoms > 0):
        raise InputError(f"formula {text!r} has no atoms with a known atomic weight: write it as in 'Al2O3'")
    return Formula(text.strip(), plain, atoms, molar_mass)


def _one_separator(text: str) -> str:
    plain = re.sub(r"\^?\{?([⁰¹²³⁴⁵⁶⁷⁸⁹]{1,3}|(?<=\^)\d{1,3}|(?<=\^\{)\d{1,3})\}?([A-Z][a-z]?)", _isotope, text)
    plain = unicodedata.normalize("NFKC", plain).strip()
    plain = re.sub(r"\s*[·⋅•∙*+]\s*", "+", plain)
    plain = re.sub(r"(?<=\+)([\d./\u2044]+)\s+", r"\1", plain)
    plain = re.sub(r"(?<=[A-Z)\]a-z\d])\.(?=[A-Z(])", "+", plain)
    # "CaSO4.2H2O": a point before a count of waters, unless the digits before it are a plain 0 ("Mg0.9H2O")
    plain = re.sub(r"(?<![A-Za-z+.]0)\.(?=\d*(?:\.\d+)?(?:H2O|D2O)(?![\d.]))", "+", plain)
    return re.sub(r"(?<=\+)(\d+)[/\u2044](\d+)", lambda part: _fraction(part[1], part[2]), plain)


def _isotope(found: re.Match[str]) -> str:
    """Write ``⁷Li`` and ``^7Li`` as ``Li[7]``."""
    return f"{found[2]}[{unicodedata.normalize('NFKC', found[1])}]"


def _fraction(above: str, below: str) -> str:
    if len(above) > 4 or len(below) > 4 or int(below) == 0:
        return f"{above}/{below}"
    return repr(int(above) / int(below))


def _refuse_unknown_elements(text: str, plain: str) -> None:
    import periodictable

    stray = re.search(r"[^A-Za-z0-9.()\[\]+]", plain)
    if stray is not None:
        raise InputError(f"formula {text!r} holds {stray[0]!r}, which latticefit cannot read: write it as in 'Al2O3'")
    known = {element.symbol for element in periodictable.elements if element.number > 0} | {"D", "T"}
    for symbol in re.findall(r"[A-Z][a-z]*|[a-z]+", plain):
        if symbol not in known:
            hint = f"; did you mean {symbol.capitalize()!r}?" if symbol.capitalize() in known else ""
            raise InputError(f"formula {text!r}: {symbol!r} is not a chemical element{hint}")


def _refuse_leading_number(text: str, plain: str) -> None:
    """Refuse ``13CH4`` and ``2NaCl``; a coefficient among several, as in ``3Al2O3*2SiO2``, is read."""
    import periodictable

    found = re.fullmatch(r"([\d.]+)([A-Z][a-z]?)?(.*)", plain)
    if found is None:
        return
    number, symbol, rest = found[1], found[2], found[3]
    isotopes = [] if symbol in (None, "D", "T") else periodictable.elements.symbol(symbol).isotopes
    isotope = number.isdigit() and int(number) in isotopes
    if "+" in rest and not isotope:
        return
    meant = f"an isotope is written {f'{symbol}[{number}]{rest}'!r}; else " if isotope else ""
    raise InputError(
        f"formula {text!r} begins with a number, which would multiply what follows: {meant}leave the number out"
    )


def _count(text: str, plain: str) -> tuple[float, float]:
    import periodictable
    from pyparsing import ParseBaseException

    try:
        formula = periodictable.formula(plain)
        return float(f"{sum(formula.atoms.values()):.12g}"), float(formula.mass) / 1000
    except (ParseBaseException, ValueError, KeyError, TypeError, AttributeError, RecursionError):
        # the library's own words name positions in its grammar, which help nobody
        raise InputError(f"formula {text!r} cannot be read: write it as in 'Al2O3' or 'CaSO4·2H2O'") from None


def element_counts(text: str) -> Mapping[str, float]:
    """Return the atoms of each element in a formula unit, by symbol (D and T apart from H).

    Raises
    ------
    InputError
        If it is not a formula.
    """
    import periodictable

    counts: dict[str, float] = {}
    for atom, count in periodictable.formula(parse_formula(text).read_as).atoms.items():
        counts[atom.symbol] = counts.get(atom.symbol, 0.0) + float(count)
    return counts


def build_sample(settings: SampleSettings, fallback_name: str) -> Sample:
    """Build the sample from its settings.

    Parameters
    ----------
    settings : SampleSettings
        Formula, and quantities with unit as text, the mass also with its uncertainty. An explicit number of atoms or
        molar mass stands above the formula (an enriched or non-stoichiometric sample); `sample_notes` lists where
        they differ.
    fallback_name : str
        The name of a sample that has none.

    Raises
    ------
    InputError
        If a formula or a quantity cannot be read, or is not positive.
    """
    formula = None if settings.formula is None else parse_formula(settings.formula)
    atoms, molar_mass = settings.atoms, _positive(settings.molar_mass, "kg/mol", "molar mass")
    if atoms is not None and not (math.isfinite(atoms) and atoms > 0):
        raise InputError(f"the number of atoms per formula unit must be above 0, not {atoms:g}")
    if formula is not None:
        atoms = formula.atoms if atoms is None else atoms
        molar_mass = formula.molar_mass if molar_mass is None else molar_mass
    mass, mass_u = (None, None) if settings.mass is None else parse_mass(settings.mass)
    return Sample(
        name=settings.name or fallback_name,
        formula=None if formula is None else formula.text,
        atoms=None if atoms is None else float(atoms),
        molar_mass=molar_mass,
        mass=mass,
        melting_point=_positive(settings.melting_point, "K", "melting point"),
        insulator=settings.insulator,
        mass_u=mass_u,
    )


def _positive(text: str | None, unit: str, name: str) -> float | None:
    if text is None:
        return None
    return _above_zero(parse_quantity(text, unit, name), text, unit, name)  # type: ignore[arg-type]


def _above_zero(value: float, text: str, unit: str, name: str) -> float:
    if value <= 0:
        raise InputError(f"{name} {text!r} must be above {'0 K' if unit == 'K' else '0'}")
    return value


@dataclass(frozen=True)
class WrittenNumber:
    """A number as written: its value, the uncertainty written with it, and what follows."""

    value: float
    uncertainty: float
    rest: str


_PLAIN: Final = r"(?:\d+\.?\d*|\.\d+)"
_SIGN: Final = r"\s*(?:±|\+/-|\+-)\s*"
_WITH_UNCERTAINTY: Final = tuple(
    re.compile(pattern, re.ASCII)
    for pattern in (
        rf"(?P<value>{_PLAIN})\((?P<digits>{_PLAIN})\)(?P<power>[eE][+-]?\d{{1,3}})?(?P<rest>.*)",
        rf"(?P<open>\()?\s*(?P<value>{_PLAIN}){_SIGN}(?P<u>{_PLAIN})\s*(?(open)\))(?P<power>(?(open)(?:[eE][+-]?\d{{1,3}})?))"
        rf"(?P<rest>(?!\d).*)",
        rf"(?P<value>{_PLAIN})\s*(?P<rest>[^\d\s].*?){_SIGN}(?P<u>{_PLAIN})\s*(?:(?P=rest)|(?P<percent>%))",
    )
)


def written_number(text: str) -> WrittenNumber | None:
    """Read a number with an uncertainty: ``12.3(2) mg``, ``12.3 ± 0.2 mg``, ``(12.3 ± 0.2) mg``, ``12.3 mg ± 1 %``.

    Digits in brackets count from the last decimal of the number. Returns None where no uncertainty is written.
    """
    for pattern in _WITH_UNCERTAINTY:
        match = pattern.fullmatch(text.strip())
        if match is None:
            continue
        found = match.groupdict()
        value, power = found["value"], found.get("power") or ""
        if found.get("digits"):
            last = 0 if "." in found["digits"] else -len(value.partition(".")[2])
            u = float(f"{found['digits']}e{last + int(power[1:] or 0)}")
        else:
            u = float(f"{found['u']}{power}") * (float(value) / 100 if found.get("percent") else 1.0)
        return WrittenNumber(float(f"{value}{power}"), u, found["rest"].strip())
    return None


def parse_mass(text: str, name: str = "mass") -> tuple[float, float | None]:
    """Read a mass with the standard uncertainty that may be written with it, as `written_number` reads it.

    Returns
    -------
    mass, u : float, float or None
        kg; u is None where none is written.

    Raises
    ------
    InputError
        If it cannot be read or is not above 0, or its uncertainty is not above 0 and below the mass.
    """
    number = written_number(text)
    if number is None:
        return _above_zero(parse_quantity(text, "kg", name), text, "kg", name), None
    mass = parse_quantity(f"{number.value!r} {number.rest}", "kg", name)
    if not 0 < number.uncertainty < number.value:
        raise InputError(f"{name} {text!r}: its uncertainty must be above 0 and below the mass itself")
    return mass, mass * (number.uncertainty / number.value)


def sample_notes(settings: SampleSettings) -> tuple[str, ...]:
    """Return in words what was decided about the sample that a person should know.

    These are: atoms or molar mass that differ from those of the formula, a point read as a hydrate point, and
    a leading number.
    """
    if settings.formula is None:
        return ()
    formula = parse_formula(settings.formula)
    notes = []
    if "+" in formula.read_as and formula.text.count(".") > formula.read_as.count("."):
        grams = f"{formula.molar_mass * 1000:.6g} g/mol, {formula.atoms:g} atoms"
        notes.append(f"formula {formula.text!r} read as {formula.read_as!r} ({grams})")
    if formula.read_as[0].isdigit():
        notes.append(f"formula {formula.text!r} begins with a number, which multiplies its first part only")
    if settings.atoms is not None and not math.isclose(settings.atoms, formula.atoms, rel_tol=1e-9):
        notes.append(f"{settings.atoms:g} atoms as stated, although {formula.text!r} has {formula.atoms:g}")
    if settings.molar_mass is not None:
        stated = parse_quantity(settings.molar_mass, "kg/mol", "molar mass")
        if not math.isclose(stated, formula.molar_mass, rel_tol=_NOTED_DIFFERENCE):
            own = f"{formula.molar_mass * 1000:.6g} g/mol"
            notes.append(f"molar mass {stated * 1000:.6g} g/mol as stated, although {formula.text!r} has {own}")
    return tuple(notes)


def converted_by_mass(measurement: Measurement) -> tuple[str, ...]:
    """Return the labels of the runs in J/K that the mass of the sample made per mole.

    An error of the mass is a scale error of everything that comes from them.
    """
    if measurement.basis != "mol":
        return ()
    readings = measurement.readings
    return tuple(each.label for each in readings if heat_capacity_unit(each.heat_capacity_unit).basis == "sample")

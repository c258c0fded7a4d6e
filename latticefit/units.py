"""Units at the edge: what people write into headers and options, and the factor to what latticefit holds inside.

Inside there are only K, J/(mol K), J/(g K), J/K and SI. The registry below holds the units of the trade and no more,
so that a short symbol means one thing (``C`` is never a coulomb) and building it costs a few milliseconds.
"""

from __future__ import annotations

import math
import re
import unicodedata
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING, Any, Final, Literal

from .constants import AVOGADRO_CONSTANT, CALORIE_THERMOCHEMICAL, GAS_CONSTANT
from .errors import InputError, nearest

if TYPE_CHECKING:
    import pint

__all__ = [
    "HEAT_CAPACITY_EXAMPLES",
    "KELVIN_ASSUMED",
    "HeatCapacityUnit",
    "TemperatureUnit",
    "find_heat_capacity_unit",
    "find_temperature_unit",
    "heat_capacity_unit",
    "parse_quantity",
    "temperature_unit",
]

KELVIN_ASSUMED: Final = "is not stated; taken as K"
"""How the note ends that the reader makes of temperatures without a unit."""

UnitBasis = Literal["mol", "mol_atoms", "gram", "sample"]

# The pound is 0.45359237 kg exactly (international yard and pound agreement, 1959). The Btu is the International
# Table one, defined by 1 Btu/(lb degF) = 1 cal_IT/(g K) = 4.1868 J/(g K) (ISO 80000-5:2007; from memory). The
# electronvolt, N_A and k_B = R/N_A are exact in the SI of 2019.
_DEFINITIONS: Final = f"""
kilo- = 1e3 = k-
milli- = 1e-3 = m-
micro- = 1e-6 = u-
nano- = 1e-9 = n-
gram = [mass] = g
pound = 453.59237 gram = lb
mole = [substance] = mol
mole_of_atoms = [substance_of_atoms] = molatom
kelvin = [temperature] = K
rankine = 5 / 9 kelvin = degR
joule = [energy] = J
calorie = {CALORIE_THERMOCHEMICAL!r} joule = cal
calorie_international = 4.1868 joule = calIT
btu = 1055.05585262 joule = Btu = BTU
electronvolt = 1.602176634e-19 joule = eV
atom = {1 / AVOGADRO_CONSTANT!r} mole_of_atoms
formula_unit = {1 / AVOGADRO_CONSTANT!r} mole = fu
boltzmann_constant = {GAS_CONSTANT / AVOGADRO_CONSTANT!r} joule / kelvin = kB
molar_gas_constant = {GAS_CONSTANT!r} joule / mole / kelvin = R
"""

HEAT_CAPACITY_EXAMPLES: Final = (
    "J/(mol K)",
    "mJ/(mol K)",
    "J/(g K)",
    "mJ/(g K)",
    "J/(kg K)",
    "cal/(mol K)",
    "cal/(g K)",
    "J/K",
    "mJ/K",
    "uJ/K",
)
"""Spellings that messages offer; any product of the known units with the right dimension is read."""

_BASIS_OF_DIMENSION: Final[dict[str | None, tuple[UnitBasis, str]]] = {
    "[substance]": ("mol", "J/(mol K)"),
    "[substance_of_atoms]": ("mol_atoms", "J/(molatom K)"),
    "[mass]": ("gram", "J/(g K)"),
    None: ("sample", "J/K"),
}


@dataclass(frozen=True)
class HeatCapacityUnit:
    """A unit of heat capacity.

    Attributes
    ----------
    text : str
        Standard spelling, e.g. ``"mJ/(mol K)"``.
    factor : float
        To J/(mol K) for basis "mol" and (per mole of atoms) "mol_atoms", J/(g K) for "gram", J/K for "sample".
    basis : {"mol", "mol_atoms", "gram", "sample"}
        What the heat capacity is divided by.
    """

    text: str
    factor: float
    basis: UnitBasis


@dataclass(frozen=True)
class TemperatureUnit:
    """A unit of temperature: T in K = (value + offset) * factor. The degree Celsius is K less 273.15 (SI brochure).

    0 degF is 459.67 degR, and 1 degR is 5/9 K (NIST Special Publication 811, 2008, appendix B; from memory).
    """

    text: str
    factor: float
    offset: float


_TEMPERATURE_UNITS: Final = {
    "K": TemperatureUnit("K", 1.0, 0.0),
    "mK": TemperatureUnit("mK", 1e-3, 0.0),
    "degC": TemperatureUnit("degC", 1.0, 273.15),
    "degF": TemperatureUnit("degF", 5 / 9, 459.67),
    "degR": TemperatureUnit("degR", 5 / 9, 0.0),
}
_TEMPERATURE_SPELLINGS: Final = {
    "kelvin": "K",
    "kelvins": "K",
    "millikelvin": "mK",
    "c": "degC",
    "°c": "degC",
    "degc": "degC",
    "celsius": "degC",
    "°f": "degF",
    "degf": "degF",
    "fahrenheit": "degF",
    "°r": "degR",
    "degr": "degR",
    "rankine": "degR",
    "degreecelsius": "degC",
    "degreescelsius": "degC",
}


def heat_capacity_unit(text: str) -> HeatCapacityUnit:
    """Return the unit of heat capacity that `text` names.

    Parameters
    ----------
    text : str
        In any usual spelling: ``J/(mol K)``, ``J/mol/K``, ``J mol^-1 K^-1``, ``J K-1 mol-1``, ``J/mol-K``, or with
        underscores as in headers, ``J_molK``, ``J_mol_K``. A denominator without brackets, ``J/mol K``, is read as
        ``J/(mol K)``, since nothing else is a heat capacity. cal is the thermochemical calorie (4.184 J) and Btu the
        International Table one.

    Raises
    ------
    InputError
        If it is not a unit of heat capacity.
    """
    unit = find_heat_capacity_unit(text)
    if unit is None:
        hint = nearest(text, HEAT_CAPACITY_EXAMPLES)
        raise InputError(f"{text!r} is not a unit of heat capacity that latticefit knows: {hint}")
    return unit


def temperature_unit(text: str) -> TemperatureUnit:
    """Return the unit of temperature that `text` names: K, mK, degC, degF or degR, in the usual spellings.

    Raises
    ------
    InputError
        If it is not a unit of temperature.
    """
    unit = find_temperature_unit(text)
    if unit is None:
        known = nearest(text, _TEMPERATURE_UNITS)
        raise InputError(f"{text!r} is not a unit of temperature that latticefit knows: {known}")
    return unit


def find_temperature_unit(text: str) -> TemperatureUnit | None:
    """Return the unit of temperature that `text` names, or None."""
    plain = unicodedata.normalize("NFKC", text).strip()
    if plain in _TEMPERATURE_UNITS:  # the case counts here: mK is not MK
        return _TEMPERATURE_UNITS[plain]
    name = _TEMPERATURE_SPELLINGS.get(re.sub(r"[\s._]", "", plain).casefold())
    return None if name is None else _TEMPERATURE_UNITS[name]


@lru_cache(maxsize=4096)
def find_heat_capacity_unit(text: str) -> HeatCapacityUnit | None:
    """Return the unit of heat capacity that `text` names, or None."""
    for expression in _readings(text):
        unit = _pint_unit(expression)
        if unit is None:
            continue
        dimension = dict(unit.dimensionality)
        if dimension.pop("[energy]", 0) != 1 or dimension.pop("[temperature]", 0) != -1:
            continue
        per = next(iter(dimension), None)
        if per is None and "kB" in expression:
            return None  # k_B per atom or per formula unit: n times apart
        if len(dimension) <= 1 and per in _BASIS_OF_DIMENSION and dimension.get(per, -1) == -1:
            basis, target = _BASIS_OF_DIMENSION[per]
            return HeatCapacityUnit(_standard_spelling(unit), _factor(unit, target), basis)
    return None


def parse_quantity(text: str, unit: Literal["kg", "kg/mol", "K"], name: str = "quantity") -> float:
    """Read a number with a unit, such as ``"12.3 mg"``, ``"101.96 g/mol"`` or ``"1358 K"``.

    Parameters
    ----------
    text : str
        The number and its unit.
    unit : {"kg", "kg/mol", "K"}
        The SI unit of the value returned; it also says which dimension is wanted.
    name : str
        What the quantity is called in a message, e.g. "mass".

    Returns
    -------
    float
        The value in `unit`.

    Raises
    ------
    InputError
        If the number cannot be read, the unit is missing or unknown, or it has another dimension.
    """
    example = {"kg": "12.3 mg", "kg/mol": "101.96 g/mol", "K": "1358 K"}[unit]
    match = re.fullmatch(r"\s*([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)(.*)", text, re.ASCII | re.DOTALL)
    if match is None or re.match(r"[,.\d]", match[2]):
        raise InputError(f"{name} {text!r} cannot be read: write a number and a unit, as in {example!r}")
    value, written = float(match[1]), match[2].strip()
    if not written:
        raise InputError(f"{name} {text!r} has no unit: write it with one, as in {example!r}")
    if not math.isfinite(value):
        raise InputError(f"{name} {text!r} is too large a number")
    if unit == "K":
        scale = find_temperature_unit(written)
        if scale is not None:
            return (value + scale.offset) * scale.factor
    else:
        for found in map(_pint_unit, _readings(written)):
            if found is not None and found.is_compatible_with(unit):
                return value * _factor(found, unit)
    raise InputError(f"{name} {text!r}: {written!r} is not a unit of {name}; write it as in {example!r}")


# ------------------------------------------------------------------------------------------- from text to the library


@lru_cache(maxsize=1)
def _registry() -> pint.UnitRegistry[Any]:
    import pint  # costs 0.2 s, so only when a unit is read

    registry: pint.UnitRegistry[Any] = pint.UnitRegistry(None)
    registry.load_definitions(_DEFINITIONS.splitlines())
    return registry


# words, products, quotients, brackets, and digits only as exponents: nothing else reaches the library
_UNIT_EXPRESSION: Final = re.compile(r"(?:[A-Za-z]+|\*\*-?[1-9](?!\d)|\*(?!\*)|[/() ])+", re.ASCII)

_PREFIXED: Final = re.compile(r"\b[kmun](?:R|kB|atom|fu)\b")  # "nR" is n times R, not a nano-R


def _pint_unit(expression: str) -> Any | None:
    """Return the unit of an expression made of unit symbols, or None where it is none."""
    from tokenize import TokenError

    import pint

    if (
        len(expression) > 80
        or "//" in expression
        or _PREFIXED.search(expression)
        or _UNIT_EXPRESSION.fullmatch(expression) is None
    ):
        return None
    try:
        unit = _registry().parse_units(expression)
    except (pint.PintError, TokenError, SyntaxError, AssertionError, AttributeError, TypeError, ValueError, KeyError):
        return None  # the library's parser has no single exception for what it cannot read
    return unit


def _factor(unit: Any, target: str) -> float:
    value = float(_registry().Quantity(1.0, unit).to(target).magnitude)
    return float(f"{value:.15g}")  # 1e-3, not 0.0010000000000000002


def _standard_spelling(unit: Any) -> str:
    numerator, *denominators = f"{unit:~C}".split("/")
    denominators.sort(key=lambda symbol: symbol == "K" or symbol == "degR")
    below = " ".join(denominators).replace("molatom", "mol-atom").replace("degR", "degF")
    if not below:
        return numerator
    return f"{numerator}/({below})" if len(denominators) > 1 else f"{numerator}/{below}"


_REWRITES: Final = (
    (r"[−–]", "-"),
    (r"μ", "u"),
    (r"[·⋅•∙×]", " "),
    (r"\*\*|\^", "^"),
    (r"\b[Jj]oules?\b", "J"),
    (r"\bKelvins?\b", "K"),
    (r"\bmoles\b|\bM(?:OL|ol)(?:ES?|es?)?\b", "mol"),
    (r"\b(k?cal)_?\{?(?:th)\}?(?![A-Za-z])", r"\1"),
    (r"\b(k?cal)(?:_?\{?IT\}?(?![A-Za-z])|\s?\(IT\))|\bIT (k?cal)\b", r"\1\2IT"),
    (r"\bk_?\{?(?:B|\(B\))\}?(?![A-Za-z])", "kB"),
    (r"\bf\.\s?u\.?|\bformula[-_ ]units?\b|\bmolecules?\b", "fu"),
    (r"(?<=[\w)]) per (?=\w)", "/"),
    (r"\bmol(?:es?)? (?:of )?atoms?\b", "molatom"),
    (r"\b(?:g|mol)[-_ ]?(?:atoms?|at)\b", "molatom"),
    (r"(?:°|\bdeg[_ ]?)C\b|(?<![A-Za-z])C\b", "K"),
    (r"(?:°|\bdeg[_ ]?)R\b", "degR"),
    (r"(?:°|\bdeg[_ ]?)F\b|(?<![A-Za-z])F\b", "degR"),
    (r"\bper\b", "/"),
)
_GLUED: Final = (
    (r"\b([mkun]?J)K(?![a-z])", r"\1 K"),
    (r"\b([mku]?(?:mol|g))K\b", r"\1 K"),
    (r"\bK([mku]?(?:mol|g))\b", r"K \1"),
)
_EXPONENTS: Final = (
    (r"(?<=[A-Za-z])\s*\^?\s*\{?(-?\d)\}?", r"**\1 "),
    (r"-(?=[A-Za-z(])", " "),
    (r"\.(?=\s*[A-Za-z(])", " "),
    (r"\*(?!\*|-?\d)(?<!\*\*)", " "),
)


def _readings(text: str) -> list[str]:
    """Return the ways to read a unit, strictest first, in the spelling of the units library.

    ``J/mol K`` is tried as written and then with everything below the line, as people mean it.
    """
    plain = unicodedata.normalize("NFKC", text)
    for pattern, replacement in _REWRITES:
        plain = re.sub(pattern, replacement, plain)
    head, underscore, rest = plain.partition("_")
    if underscore:
        joined = rest.replace("_", " ")
        plain = f"{head} {joined}" if "/" in plain or re.search(r"-\d", joined) else f"{head}/({joined})"
    for pattern, replacement in (*_GLUED, *_EXPONENTS):
        plain = re.sub(pattern, replacement, plain)
    plain = " ".join(plain.split())
    above, slash, below = plain.partition("/")
    grouped = [f"{above}/({below})"] if slash and "/" not in below else []
    return [plain, *grouped]

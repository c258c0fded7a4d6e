"""What a header says: the name, the unit and the coverage factor of a column, in the ways people write them."""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Final, Literal

from ..records import Quantity
from ..units import HeatCapacityUnit, TemperatureUnit, find_heat_capacity_unit, find_temperature_unit

__all__ = [
    "Column",
    "describe_columns",
    "is_uncertainty_of_anything",
    "names_heat_capacity",
    "names_temperature",
    "names_uncertainty",
    "normal_name",
    "power_of_ten",
    "quantity_of",
    "uncertainty_columns",
    "unit_of_cell",
    "unit_unread",
]

ColumnUnit = HeatCapacityUnit | TemperatureUnit | Literal["percent"]

_PERCENT: Final = frozenset({"%", "percent", "per cent", "pct"})
_TEMPERATURE_NAME: Final = re.compile(
    r"(?:sample |absolute |mean )?(?:t|temp|temperature)(?: ?(?:sample|mean|avg|90|68))?(?: t)?"
)
_HEAT_CAPACITY_NAME: Final = re.compile(r"(?:sample )?(?:c(?:[ ,]?[pv])?(?:[ ,]*m)?|hc)(?: (?:sample|total))?")
_UNCERTAINTY_NAME: Final = re.compile(
    r"^[uU](?:\s*\(|_|\s|$)|^[uU]_?[cC][pPvV]?$|σ|(?i:(?<![a-z])(?:sigma|error|err|std|stdev|unc|uncertainty)(?![a-z]))"
)
_OF_TEMPERATURE: Final = re.compile(r"(?<![A-Za-z])T(?![A-Za-z])|(?i:temp)")
_COVERAGE: Final = (
    re.compile(r"\(\s*k\s*=\s*(\d+(?:\.\d+)?)\s*\)|[,;]?\s*(?<![A-Za-z])k\s*=\s*(\d+(?:\.\d+)?)"),
    re.compile(r"(?<![\w.])(\d)\s*[-_ ]?(?=sigma|σ)()"),
)


@dataclass(frozen=True)
class Column:
    """A column: 0-based index, header as written (None without), its name without unit, unit, coverage factor."""

    index: int
    header: str | None
    name: str
    unit: ColumnUnit | None
    coverage_factor: float | None

    @property
    def label(self) -> str:
        """What messages and reports call it."""
        return self.header if self.header else f"column {self.index + 1}"


def describe_columns(headers: Sequence[str | None]) -> tuple[Column, ...]:
    """Return every column with the name, unit and coverage factor that its header states."""
    return tuple(_describe(index, header or None) for index, header in enumerate(headers))


def _describe(index: int, header: str | None) -> Column:
    if header is None:
        return Column(index, None, "", None, None)
    rest, coverage = _without_typesetting(header), None
    for pattern in _COVERAGE:
        match = pattern.search(rest)
        if match is not None and coverage is None:
            coverage = float(match[1] or match[2]) or None
            rest = rest[: match.start()] + rest[match.end() :]
    name, unit = _split_header(rest.strip())
    return Column(index, header, name, unit, coverage)


def _split_header(header: str) -> tuple[str, ColumnUnit | None]:
    """Split ``Cp [mJ/mol-K]``, ``T/K``, ``Cp / J mol-1 K-1``, ``Cv_cal_molK`` into name and unit.

    The first place from the left after which a whole unit stands is taken, so that the unit is as long as can be.
    """
    for place, sign in enumerate(header[:200]):
        if sign not in "([/_, " or place == 0:
            continue
        name = header[:place].strip(" _/,")
        written = _unbracketed(header[place:].lstrip("/_, "))
        if written == "R" and sign not in "(/[":  # "Cp/R" is in units of R, "thermometer R" is a resistance
            continue
        unit = _unit_of(written, name)
        if unit is not None:
            return name, unit
    return header, None


def _without_typesetting(header: str) -> str:
    """Remove the signs of mathematical typesetting: ``$C_{p,m}$`` becomes ``C_p,m``."""
    plain = re.sub(r"\\(?:mathrm|text|rm)\b\s*|\\[,;:! ]", " ", header) if "\\" in header else header
    plain = plain.replace("$", "")
    return re.sub(r"_\{([^{}]*)\}", r"_\1", plain).strip()


def power_of_ten(column: Column) -> bool:
    """Say whether a header holds a power of ten, as ``10^3 Cp`` does: multiplied or to be multiplied is not clear."""
    pattern = r"(?<![\d.])10\s*(?:\^|\*\*|\{?[-−+]\d|[⁻⁺⁰¹²³⁴⁵⁶⁷⁸⁹])"
    return column.header is not None and re.search(pattern, column.header) is not None


def unit_unread(column: Column, named: Callable[[str], bool]) -> bool:
    """Say whether a header names the quantity and then, after a slash or in brackets, a unit that is not known."""
    name = re.split(r"\s*[/(\[]", column.name)[0]
    return column.unit is None and name != column.name and named(name)


def unit_of_cell(text: str, header: str) -> ColumnUnit | None:
    """Return the unit that a cell under a header names, brackets or not, as in a row of units."""
    name = _split_header(_without_typesetting(header))[0]
    return _unit_of(_unbracketed(_without_typesetting(text)), name)


def _unbracketed(text: str) -> str:
    text = text.strip()
    pairs = {"(": ")", "[": "]"}
    while len(text) > 1 and text[-1] == pairs.get(text[0]):
        depth, inner = 0, text[1:-1]
        for sign in inner:  # "(mol K)/(g K)" is not one pair of brackets
            depth += (sign in "([") - (sign in ")]")
            if depth < 0:
                return text
        text = inner.strip()
    return text


def _unit_of(text: str, name: str) -> ColumnUnit | None:
    if text.casefold() in _PERCENT:
        return "percent"
    temperature = find_temperature_unit(text)
    if temperature is not None:
        bare_c = text.casefold() == "c"  # "T_C" is in degC, "sample_C" is a heat capacity
        return None if bare_c and not names_temperature(name) else temperature
    return find_heat_capacity_unit(text)


def normal_name(name: str) -> str:
    """Return a name in one spelling: lower case, underscores, points and degree signs as blanks."""
    return re.sub(r"[\s_.°]+", " ", unicodedata.normalize("NFKC", name).casefold()).strip()


def names_temperature(name: str) -> bool:
    """Say whether a name is one of the temperature."""
    return _TEMPERATURE_NAME.fullmatch(normal_name(name)) is not None


def names_heat_capacity(name: str) -> bool:
    """Say whether a name is one of the heat capacity."""
    normal = normal_name(name)
    return _HEAT_CAPACITY_NAME.fullmatch(normal) is not None or "heat capacity" in normal or "specific heat" in normal


def names_uncertainty(column: Column) -> bool:
    """Say whether a header names an uncertainty of something other than the temperature."""
    stated = column.coverage_factor is not None or _UNCERTAINTY_NAME.search(column.name) is not None
    return stated and _OF_TEMPERATURE.search(column.name) is None


def uncertainty_columns(columns: Sequence[Column], taken: Sequence[Column]) -> list[Column]:
    """Return the columns whose header names an uncertainty and does not give it a unit of something else."""
    usable = [column for column in columns if column not in taken and not isinstance(column.unit, TemperatureUnit)]
    return [column for column in usable if names_uncertainty(column)]


def quantity_of(column: Column) -> Quantity:
    """Return "Cv" for a header that says so, else "Cp"."""
    normal = normal_name(column.name)
    says_cv = re.search(r"(?<![a-z])c[ ,]?v(?![a-z])|constant volume|isochoric", normal)
    return "Cv" if says_cv else "Cp"


def is_uncertainty_of_anything(column: Column) -> bool:
    """Say whether a header names an uncertainty, be it of the temperature."""
    return column.coverage_factor is not None or _UNCERTAINTY_NAME.search(column.name) is not None

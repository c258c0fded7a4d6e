"""How much of a known heat capacity is in the data: all of a file in J/K, a mass, or a part of the sample's mass."""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import Final

from ..errors import InputError
from ..records import AddendaSettings, Basis, Measurement, Sample
from ..sample import WrittenNumber, parse_mass, written_number
from .wording import quoted, shown_name

__all__ = ["Amount", "amount_of"]

_NUMBER: Final = re.compile(r"\s*((?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d{1,3})?)(?![\d.,])(.*)", re.ASCII | re.DOTALL)
_PERCENT: Final = ("%", "percent", "per cent")


@dataclass(frozen=True)
class Amount:
    """How much there is: `value` times the heat capacity of the file, with its standard uncertainty `u`.

    Of a file in J/K there is 1; of one per gram, a mass in g, or (`of_sample`) a part of the sample's mass.
    """

    value: float
    u: float
    of_sample: bool
    words: str

    def refuse_lacking(self, measurement: Measurement, shown: str, run: str) -> None:
        """Raise InputError where a part of the sample's mass cannot be brought to the basis of the data."""
        sample = measurement.sample
        if not self.of_sample:
            return
        if measurement.basis == "mol" and sample.molar_mass is None:
            raise InputError(f"{shown} is per gram and run {run} per mole: a fraction needs --formula or --molar-mass")
        if measurement.basis == "sample" and sample.mass is None:
            raise InputError(f"{shown} is a fraction of the sample and run {run} is in J/K: give --mass")

    def factor(self, sample: Sample, basis: Basis) -> float:
        """Return what takes the heat capacity of the file to that of the whole amount, in the basis of the data."""
        mass, molar_mass = sample.mass or 0.0, sample.molar_mass or 0.0  # known where they count, by `refuse_lacking`
        if self.of_sample:
            return self.value * {"gram": 1.0, "mol": 1e3 * molar_mass, "sample": 1e3 * mass}[basis]
        return self.value * (molar_mass / mass if basis == "mol" else 1.0)


def amount_of(entry: AddendaSettings, basis: Basis, unit: str) -> Amount:
    """Return how much of an addenda file there is.

    Parameters
    ----------
    entry : AddendaSettings
        With `mass`, with `fraction`, or with neither.
    basis, unit : str
        What the file is per, and its unit in words.

    Raises
    ------
    InputError
        If the unit does not fit what is asked, or the text cannot be read.
    """
    shown = shown_name(entry.file)
    if entry.mass is not None and entry.fraction is not None:
        raise InputError(f"the addenda {shown} have both mass and fraction; give the one that is meant")
    if basis == "mol":
        raise InputError(f"the addenda {shown} are in {unit}; they must be in J/K, or per gram with mass or fraction")
    if entry.mass is None and entry.fraction is None:
        if basis == "gram":
            raise InputError(
                f'the addenda {shown} are in {unit}: say by mass = "0.35 mg" how much of it was measured along, or by '
                'fraction = "1.2%" what part of the sample it is'
            )
        return Amount(1.0, 0.0, False, "")
    if basis == "sample":
        key = "fraction" if entry.mass is None else "mass"
        raise InputError(f"the addenda {shown} are in {unit}, all of it; leave {key} out, or give a file per gram")
    if entry.mass is not None:
        try:
            mass, u = parse_mass(entry.mass)
        except InputError as error:
            raise InputError(f"the addenda {shown}: {error}") from None
        return Amount(1e3 * mass, 1e3 * (u or 0.0), False, " ".join(entry.mass.split()))
    return _fraction(str(entry.fraction), shown)


def _fraction(text: str, shown: str) -> Amount:
    where = f"fraction {quoted(text)} of the addenda {shown}"
    match = _NUMBER.fullmatch(text)
    plain = None if match is None else WrittenNumber(float(match[1]), 0.0, match[2].strip())
    number = written_number(text) or plain
    if number is None or number.rest.casefold() not in ("", *_PERCENT):
        raise InputError(f"{where} cannot be read: write it as in '1.2(1)%' or '0.012'")
    unit = 0.01 if number.rest else 1.0
    if not 0 < number.value * unit < 1:
        hint = f"; for a percentage write '{text.strip()}%'" if not number.rest and number.value < 100 else ""
        raise InputError(f"{where} must be above 0 and below 1{hint}")
    if number is not plain and not 0 < number.uncertainty < number.value:
        raise InputError(f"{where}: its uncertainty must be above 0 and below the fraction itself")
    return Amount(number.value * unit, number.uncertainty * unit, True, " ".join(text.split()))

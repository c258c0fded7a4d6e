"""The tool's Debye functions beside a published table, for a user who wants to check the tool before trusting it."""

from __future__ import annotations

import csv
from dataclasses import dataclass
from importlib import resources

import numpy as np

from latticefit.functions.debye import debye_energy, debye_heat_capacity
from latticefit.records import FloatArray

__all__ = ["PublishedCheck", "published_check"]

_SOURCE = "R. Pässler, Adv. Condens. Matter Phys. 2017, 9321439 (2017), Table 7"


@dataclass(frozen=True)
class PublishedCheck:
    """Published and own values of the Debye functions at the same x; every array has shape (n,) and is read-only.

    Attributes
    ----------
    source : str
        The published table.
    x : ndarray
        theta_D/T.
    heat_capacity_published, heat_capacity : ndarray
        C/(3 N k_B), as printed and as computed.
    energy_published, energy : ndarray
        D_3 = U/(3 N k_B T), as printed and as computed.
    heat_capacity_deviation, energy_deviation : float
        Largest relative deviation from the printed values.
    heat_capacity_rounding, energy_rounding : float
        Largest relative deviation that the rounding of the printed values alone allows: half a unit of the last
        printed digit.
    last_digit_deviation : float
        Largest deviation of all values in units of the last printed digit; 0.5 is what rounding allows.
    beyond_rounding : int
        How many of the 2n printed values deviate by more than half a unit of their last digit.
    """

    source: str
    x: FloatArray
    heat_capacity_published: FloatArray
    heat_capacity: FloatArray
    energy_published: FloatArray
    energy: FloatArray
    heat_capacity_deviation: float
    energy_deviation: float
    heat_capacity_rounding: float
    energy_rounding: float
    last_digit_deviation: float
    beyond_rounding: int


def published_check() -> PublishedCheck:
    """Compare `debye_heat_capacity` and `debye_energy` with a published table of ten significant figures.

    Returns
    -------
    PublishedCheck

    Notes
    -----
    The table is R. Pässler, Adv. Condens. Matter Phys. 2017, 9321439 (2017), Table 7; the file beside this module
    says which of its rows are here. Three of the 70 printed values, D_3(0.3), C(0.4) and C(17), differ by 0.53 to 0.92
    of a unit of their last digit from values computed independently to 40 digits, so more than rounding explains.
    """
    text = (resources.files("latticefit.functions") / "published_table.csv").read_text(encoding="utf-8")
    rows = list(csv.DictReader(line for line in text.splitlines() if not line.startswith("#")))
    x = _column(rows, "x")
    heat_capacity = _frozen(debye_heat_capacity(x))
    energy = _frozen(debye_energy(x))
    heat_capacity_published = _column(rows, "kappa_D")
    energy_published = _column(rows, "D3")
    heat_capacity_unit = _last_digit(rows, "kappa_D")
    energy_unit = _last_digit(rows, "D3")
    units = np.concatenate(
        [(heat_capacity - heat_capacity_published) / heat_capacity_unit, (energy - energy_published) / energy_unit]
    )
    return PublishedCheck(
        source=_SOURCE,
        x=x,
        heat_capacity_published=heat_capacity_published,
        heat_capacity=heat_capacity,
        energy_published=energy_published,
        energy=energy,
        heat_capacity_deviation=_largest(heat_capacity - heat_capacity_published, heat_capacity_published),
        energy_deviation=_largest(energy - energy_published, energy_published),
        heat_capacity_rounding=_largest(heat_capacity_unit / 2, heat_capacity_published),
        energy_rounding=_largest(energy_unit / 2, energy_published),
        last_digit_deviation=float(np.max(np.abs(units))),
        beyond_rounding=int(np.sum(np.abs(units) > 0.5)),
    )


def _column(rows: list[dict[str, str]], name: str) -> FloatArray:
    return _frozen(np.array([float(row[name]) for row in rows]))


def _last_digit(rows: list[dict[str, str]], name: str) -> FloatArray:
    """Return one unit of the last printed digit of every row."""
    decimals = np.array([len(row[name].partition(".")[2]) for row in rows])
    return 10.0**-decimals


def _largest(difference: FloatArray, reference: FloatArray) -> float:
    return float(np.max(np.abs(difference) / reference))


def _frozen(array: FloatArray) -> FloatArray:
    array.flags.writeable = False
    return array

"""What preparing notices about the points, before any model: runs that overlap, features that no lattice makes."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

__all__ = ["Feature", "FeatureKind", "RunOverlap"]

FeatureKind = Literal["peak", "step", "upturn"]


@dataclass(frozen=True)
class RunOverlap:
    """How the heat capacities of two runs compare where both were measured.

    `ratio` is the mean of the first over the second, with its standard uncertainty `u`, from `temperature_low` to
    `temperature_high` in K; `points` is the number of temperatures of the sparser run that were compared.
    """

    first: str
    second: str
    ratio: float
    u: float
    temperature_low: float
    temperature_high: float
    points: int


@dataclass(frozen=True)
class Feature:
    """Something in a heat capacity that no lattice makes, from `temperature_low` to `temperature_high` in K.

    Attributes
    ----------
    kind : {"peak", "step", "upturn"}
        Several adjacent points above a smooth curve; a jump between two smooth branches; C/T that rises on cooling.
    temperature : float
        K; the highest point of a peak, the middle of a step, the lowest point of an upturn.
    size : float
        Height of a peak or step (negative where the heat capacity falls on warming) as a part of the smooth curve; for
        an upturn, the rise of C/T as a part of its mean over these points.
    significance : float
        The size in standard uncertainties.
    """

    kind: FeatureKind
    temperature_low: float
    temperature_high: float
    temperature: float
    size: float
    significance: float

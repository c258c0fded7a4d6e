"""What the rules of the named warnings look at."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..models import Model, harmonic_heat_capacity, heat_capacity
from ..records import FitRecord, FloatArray, LevelFinding, PreparedData, ResidualStatistics

__all__ = ["Case"]


@dataclass(frozen=True)
class Case:
    """What a rule looks at."""

    prepared: PreparedData
    model: Model
    fit: FitRecord
    statistics: ResidualStatistics
    level: LevelFinding

    @property
    def expected(self) -> FloatArray:
        """The model at the fitted points, J/(mol K)."""
        return heat_capacity(self.model, np.asarray(self.prepared.temperature), np.asarray(self.fit.values))

    @property
    def outside_lattice(self) -> FloatArray:
        """What is not harmonic lattice in the model at the fitted points, J/(mol K)."""
        lattice = harmonic_heat_capacity(self.model, np.asarray(self.prepared.temperature), np.asarray(self.fit.values))
        return self.expected - lattice

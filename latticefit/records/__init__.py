"""Frozen records handed from stage to stage: what was asked, read, prepared, fitted, found and derived.

A record holds facts and no logic. Temperatures are in K; heat capacity and entropy in J/(mol K), energy in
J/mol, per mole of formula unit; everything else in SI. Arrays inside a record are read-only, also in a copy or an
unpickled one; a record that holds arrays is equal to itself alone.
"""

from __future__ import annotations

from .base import (
    Basis,
    FloatArray,
    Frozen,
    Level,
    LevelVerdict,
    ParameterStatus,
    Quantity,
    ReadOnly,
    Replicates,
    SigmaKind,
    TemperatureScale,
)
from .data import AddendaShare, ExcludedRow, Measurement, PreparedData, Reading, Repair, Sample
from .derived import (
    Analysis,
    Derived,
    DerivedValue,
    EnergyDifference,
    PointwiseTheta,
    Provenance,
    SavedResult,
    ThermodynamicTable,
)
from .findings import (
    Candidate,
    Comparison,
    Diagnosis,
    FitRecord,
    HeldParameters,
    LackOfFit,
    LevelExplanation,
    LevelFinding,
    NamedWarning,
    ParameterValue,
    ResidualBand,
    ResidualStatistics,
    ValidityFact,
)
from .noticed import Feature, FeatureKind, RunOverlap
from .request import AddendaSettings, ModelSettings, ReportSettings, RunSettings, SampleSettings, Sheet

__all__ = [
    "AddendaSettings",
    "AddendaShare",
    "Analysis",
    "Basis",
    "Candidate",
    "Comparison",
    "Derived",
    "DerivedValue",
    "Diagnosis",
    "EnergyDifference",
    "ExcludedRow",
    "Feature",
    "FeatureKind",
    "FitRecord",
    "FloatArray",
    "Frozen",
    "HeldParameters",
    "LackOfFit",
    "Level",
    "LevelExplanation",
    "LevelFinding",
    "LevelVerdict",
    "Measurement",
    "ModelSettings",
    "NamedWarning",
    "ParameterStatus",
    "ParameterValue",
    "PointwiseTheta",
    "PreparedData",
    "Provenance",
    "Quantity",
    "ReadOnly",
    "Reading",
    "Repair",
    "Replicates",
    "ReportSettings",
    "ResidualBand",
    "ResidualStatistics",
    "RunOverlap",
    "RunSettings",
    "Sample",
    "SampleSettings",
    "SavedResult",
    "Sheet",
    "SigmaKind",
    "TemperatureScale",
    "ThermodynamicTable",
    "ValidityFact",
]

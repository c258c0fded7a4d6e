"""Named warnings: points, features, overlaps and repeats that preparing notices before any model."""

from __future__ import annotations

from typing import Final

import numpy as np

from ..preparing.features import suspected_features
from ..preparing.outliers import OUTLIER, outlier_words
from ..preparing.scatter import local_scatter
from ..preparing.templates import SIGNIFICANT
from ..records import Feature, FloatArray, Measurement, NamedWarning, RunOverlap
from ..rounding import format_value, percent_text
from .case import Case

__all__ = ["lack_of_fit", "outlier_at", "outliers", "replicate_spread", "run_overlap", "suspected_feature"]

_SHOWN: Final = 5  # points or pairs of runs that a message lists
_OVERLAP: Final = 0.01  # difference of two runs that matters where it is no chance (common practice, no source)
_OVERLAP_U, _CHANCE_U = 3.0, 2.0  # standard uncertainties from which any difference counts, and from which 1 % does
_SPREAD: Final = 3.0  # times the stated sigma (common practice, no source)
_LACK_P: Final = 0.01


def outliers(case: Case) -> NamedWarning | None:
    """Points lie too far from their neighbours for scatter."""
    prepared, measurement = case.prepared, case.prepared.measurement
    sizes = prepared.outlier_sizes
    if sizes is None or not sizes.any():
        return None
    several = len(measurement.readings) > 1
    flagged = np.flatnonzero(sizes).tolist()
    words = [outlier_at(measurement, i, float(sizes[i])) for i in flagged]
    more = f"; and {len(words) - _SHOWN} more (column flag of residuals.csv)" if len(words) > _SHOWN else ""
    lines = " ".join(f"--mask-lines {measurement.line[i]}" for i in flagged[:_SHOWN])
    lines = "mask_lines of its run in a sheet" if several else lines
    return NamedWarning(
        code="outliers",
        level="note",
        concerns="data",
        message=f"too far from the neighbours for scatter: {'; '.join(words[:_SHOWN])}{more}",
        found=float(np.abs(sizes).max()),
        threshold=OUTLIER,
        advice=f"nothing is left out by itself: look at these points, and leave out what is wrong by {lines}",
    )


def outlier_at(measurement: Measurement, position: int, size: float) -> str:
    """Say where a point stands, and how far it lies from its neighbours, in scatters with sign."""
    label = measurement.readings[measurement.run[position]].label
    of_run = f" of {label}" if len(measurement.readings) > 1 else ""
    where = f"line {measurement.line[position]}{of_run}, {measurement.temperature[position]:.4g} K"
    return f"{where}: {outlier_words(size)}"


def run_overlap(case: Case) -> NamedWarning | None:
    """Two runs differ where both were measured."""
    differing = [each for each in case.prepared.overlaps if _differ(each)]
    if not differing:
        return None
    worst = max(differing, key=lambda each: abs(each.ratio - 1))
    words = [
        f"{each.first} is {percent_text(100 * abs(each.ratio - 1))} {'above' if each.ratio > 1 else 'below'} "
        f"{each.second} from {each.temperature_low:.4g} to {each.temperature_high:.4g} K (ratio "
        f"{format_value(each.ratio, each.u)})"
        for each in differing[:_SHOWN]
    ]
    kept = case.prepared.overlaps
    least = "at least " if len(differing) == len(kept) < case.prepared.overlaps_compared else ""
    more = f"; and {least}{len(differing) - _SHOWN} more pairs of runs" if len(differing) > _SHOWN else ""
    return NamedWarning(
        code="run-overlap",
        level="warn",
        concerns=f"{worst.first}, {worst.second}",
        message=f"the runs differ where both were measured: {'; '.join(words)}{more}",
        found=abs(worst.ratio - 1),
        threshold=_OVERLAP,
        advice=(
            "compare mass, addenda and calibration of the runs, unless they were measured under other conditions; "
            "fitted together, the step between them goes into the model"
        ),
    )


def _differ(overlap: RunOverlap) -> bool:
    difference = abs(overlap.ratio - 1)
    return difference > _OVERLAP_U * overlap.u or (difference > _OVERLAP and difference > _CHANCE_U * overlap.u)


def suspected_feature(case: Case) -> NamedWarning | None:
    """The fitted points cross something that no lattice makes."""
    prepared = case.prepared
    labels = [reading.label for reading in prepared.measurement.readings]
    found: list[tuple[str, Feature]] = []
    for run in np.unique(prepared.run):
        own = prepared.run == run
        T, C = prepared.temperature[own], prepared.heat_capacity[own]
        where = f" in {labels[run]}" if len(labels) > 1 else ""
        found += [(where, each) for each in suspected_features(T, C, _scatter(T, C, prepared.sigma[own]))]
    if not found:
        return None
    worst = max((each for _, each in found), key=lambda each: each.significance)
    masks = " ".join(f"--mask {each.temperature_low:.4g}:{each.temperature_high:.4g}" for _, each in found)
    return NamedWarning(
        code="suspected-feature",
        level="warn",
        concerns="fit",
        message=(
            f"the fitted points cross what no lattice makes: {'; '.join(_feature(each) + run for run, each in found)}; "
            "the lattice takes it up as far as it can"
        ),
        found=worst.significance,
        threshold=SIGNIFICANT,
        advice=f"leave it out, a little wider than it was found, by {masks}, or describe it by a term",
    )


def _scatter(T: FloatArray, C: FloatArray, sigma: FloatArray) -> FloatArray:
    """Relative sigma, made smaller where the points scatter less than it says."""
    relative = np.asarray(sigma / C)
    own = local_scatter(T, C)
    return relative if own is None else relative * min(1.0, own / float(np.median(relative)))


def _feature(each: Feature) -> str:
    size, span = percent_text(100 * abs(each.size)), f"{each.temperature_low:.4g} to {each.temperature_high:.4g} K"
    if each.kind == "peak":
        return f"a peak of {size} at {each.temperature:.4g} K ({span})"
    if each.kind == "step":
        return f"a step {'up' if each.size > 0 else 'down'} of {size} at {each.temperature:.4g} K"
    return f"C/T that rises on cooling, by {size} ({span})"


def replicate_spread(case: Case) -> NamedWarning | None:
    """Repeats differ by more than the stated sigma."""
    found = case.statistics.lack_of_fit
    if found is None or case.prepared.sigma_kind != "stated":
        return None
    ratio = float((found.pure_error / found.pure_error_degrees_of_freedom) ** 0.5)
    if ratio <= _SPREAD:
        return None
    return NamedWarning(
        code="replicate-spread",
        level="warn",
        concerns="uncertainty",
        message=(
            f"repeats differ by {ratio:.1f} times the stated uncertainty ({percent_text(found.pure_error_percent)} of "
            "the heat capacity)"
        ),
        found=ratio,
        threshold=_SPREAD,
        advice=(
            "the stated uncertainty is too small, or the first points of the sets had not settled: try --replicates "
            "drop-first, or --sigma replicates"
        ),
    )


def lack_of_fit(case: Case) -> NamedWarning | None:
    """The model misses sets of repeats by more than they scatter."""
    found = case.statistics.lack_of_fit
    if found is None or found.p >= _LACK_P:
        return None
    shared = bool(found.shared_error)
    why = (
        "neighbouring sets differ from each other as well, without any model: the repeats of a set share an error"
        if shared
        else "the model lacks something, or the repeats of a set share an error"
    )
    return NamedWarning(
        code="lack-of-fit",
        level="note" if shared else "warn",
        concerns="uncertainty" if shared else "fit",
        message=(
            f"the model misses the means of the sets of repeats by more than repeats scatter (F = {found.f:.3g}, p = "
            f"{found.p:.1g}): {why}"
        ),
        found=found.p,
        threshold=_LACK_P,
        advice=(
            "average each set into one point: --replicates average"
            if shared
            else "look at the residuals: a wave means a missing term; else average the sets: --replicates average"
        ),
    )

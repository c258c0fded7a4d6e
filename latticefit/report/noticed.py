"""What was noticed about the points, as words and for result.json: repeats, overlaps of runs, averaged points."""

from __future__ import annotations

from typing import Any

from ..preparing.overlap import FEW_PAIRS
from ..records import LackOfFit, Measurement, RunOverlap
from ..rounding import format_value, percent_text
from .wording import plain_number

__all__ = [
    "averaged_words",
    "lack_of_fit_record",
    "lack_of_fit_words",
    "overlap_record",
    "overlap_words",
    "points_averaged",
    "points_read",
    "rows_left_out",
]


def points_averaged(measurement: Measurement) -> tuple[int, int]:
    """Return how many points were averaged, and into how many."""
    into = [each.averaged_into for each in measurement.excluded if each.averaged_into is not None]
    return len(into), len(set(into))


def points_read(measurement: Measurement) -> int:
    """Return how many points the files gave, before any averaging."""
    averaged, means = points_averaged(measurement)
    return int(measurement.temperature.size) - means + averaged


def rows_left_out(measurement: Measurement) -> int:
    """Return how many rows were left out at reading."""
    return len(measurement.excluded) - points_averaged(measurement)[0]


def averaged_words(measurement: Measurement) -> list[str]:
    """Say how many points were averaged; nothing where none was."""
    averaged, means = points_averaged(measurement)
    return [f"{averaged} averaged into the means of {means} sets"] if averaged else []


def lack_of_fit_words(found: LackOfFit | None) -> tuple[tuple[str, str, str], ...]:
    """Give the row of repeats: label, value and remark; none where no points stand in sets of repeats."""
    if found is None:
        return ()
    test = f"lack of fit F = {found.f:.2g} ({found.degrees_of_freedom} and {found.pure_error_degrees_of_freedom} "
    test += f"degrees of freedom), p = {plain_number(found.p, 2)}"
    return (("replicates", f"pure error {percent_text(found.pure_error_percent)}", test),)


def lack_of_fit_record(found: LackOfFit | None) -> dict[str, Any] | None:
    """Return the split of chi-square for result.json."""
    if found is None:
        return None
    return {
        "pure_error": found.pure_error,
        "pure_error_degrees_of_freedom": found.pure_error_degrees_of_freedom,
        "pure_error_percent": found.pure_error_percent,
        "lack_of_fit": found.lack_of_fit,
        "degrees_of_freedom": found.degrees_of_freedom,
        "f": found.f,
        "p": found.p,
        "shared_error": found.shared_error,
    }


def overlap_words(overlaps: tuple[RunOverlap, ...], compared: int) -> tuple[tuple[str, str, str], ...]:
    """Give one row for each pair of runs that overlap: label, ratio with u, range; of many the worst, and how many."""
    rows = tuple(
        (
            "overlap",
            f"{each.first} / {each.second} = {format_value(each.ratio, each.u)}",
            f"{plain_number(each.temperature_low)} to {plain_number(each.temperature_high)} K, {each.points} points",
        )
        for each in overlaps[:FEW_PAIRS]
    )
    more = "the pairs above differ by most standard uncertainties"
    return rows if compared <= FEW_PAIRS else (*rows, ("overlaps", f"{compared} pairs of runs compared", more))


def overlap_record(overlaps: tuple[RunOverlap, ...]) -> list[dict[str, Any]]:
    """Return the overlaps for result.json; the ratio is the first run over the second."""
    return [
        {
            "runs": [each.first, each.second],
            "ratio": each.ratio,
            "u": each.u,
            "temperature_min_K": each.temperature_low,
            "temperature_max_K": each.temperature_high,
            "points": each.points,
        }
        for each in overlaps
    ]

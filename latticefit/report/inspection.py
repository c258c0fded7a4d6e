"""What was read from a file, as text and as JSON: for `inspect`, before any fit."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Sequence
from textwrap import wrap
from typing import Any

import numpy as np

from ..constants import GAS_CONSTANT
from ..diagnosing.examination import Decade, Examination
from ..diagnosing.point_rules import outlier_at
from ..reading.unused import looks_like_uncertainty
from ..records import Feature, Measurement, Reading, RunOverlap
from ..rounding import percent_text
from ..wording import harmless
from .corrections import correction_words, mass_words
from .level import level_is_in_doubt, level_record, level_text
from .noticed import overlap_words
from .wording import plain_number, significant

__all__ = ["inspection_record", "inspection_text", "overlap_text"]

_UNITS = {"mol": ("J/(mol K)", "J_mol_K"), "gram": ("J/(g K)", "J_g_K"), "sample": ("J/K", "J_K")}
_DELIMITERS = {"comma": ",", "semicolon": ";", "tab": "\t", "blank": " "}
_DECIMALS = {"point": ".", "comma": ","}
_SHOWN_ROWS = 3
_MOST_REASONS = 3
_MOST_LINES = 12  # repairs of one kind of screen; the rest is counted
_WIDTH = 80
_LABEL = 14


def inspection_record(measurement: Measurement, found: Examination) -> dict[str, Any]:
    """Return what was read from the one file of a measurement, as in the contract of ``inspect --json``."""
    return {
        **_how(measurement),
        "points": int(measurement.temperature.size),
        "points_to_fit": found.to_fit,
        "rows_left_out": [{"line": each.line, "reason": each.reason} for each in measurement.excluded],
        "repairs": [{"file": each.file, "line": each.line, "message": each.message} for each in measurement.repairs],
        "warnings": _warnings(measurement, found),
        "decades": [
            {"low_K": each.low, "high_K": each.high, "points": each.points, "gaps_K": [list(gap) for gap in each.gaps]}
            for each in found.decades
        ],
        "repeats": {"sets": found.repeated_sets, "points": found.repeated_points},
        "scatter_percent": None if found.scatter is None else 100 * found.scatter,
        "features": [_feature_record(each) for each in found.features],
        "level": level_record(found.level),
        "measurement": _arrays(measurement, found),
    }


def _how(measurement: Measurement) -> dict[str, Any]:
    """How the file was read."""
    reading = measurement.readings[0]
    return {
        "file": reading.file,
        "encoding": reading.encoding,
        "delimiter": _DELIMITERS.get(reading.delimiter, reading.delimiter),
        "decimal": _DECIMALS.get(reading.decimal, reading.decimal),
        "columns": {
            "temperature": reading.temperature_column,
            "heat_capacity": reading.heat_capacity_column,
            "sigma": reading.sigma_column,
        },
        "unused_columns": list(reading.unused_columns),
        "temperature_unit": reading.temperature_unit,
        "heat_capacity_unit": reading.heat_capacity_unit,
        "quantity": measurement.quantity,
        "sample": {
            "formula": measurement.sample.formula,
            "atoms_per_formula_unit": measurement.sample.atoms,
            "molar_mass_g_mol": None if measurement.sample.molar_mass is None else 1e3 * measurement.sample.molar_mass,
        },
        "sigma": measurement.sigma_text,
        "runs": [each.label for each in measurement.readings],
    }


def _arrays(measurement: Measurement, found: Examination) -> dict[str, Any]:
    key = _UNITS[measurement.basis][1]
    return {
        "temperature_K": measurement.temperature.tolist(),
        f"heat_capacity_{key}": measurement.heat_capacity.tolist(),
        f"sigma_{key}": None if found.sigma is None else found.sigma.tolist(),
        "run": [measurement.readings[i].label for i in measurement.run.tolist()],
        "line": measurement.line.tolist(),
        "set_aside": list(measurement.set_aside or (None,) * measurement.run.size),
    }


def _warnings(measurement: Measurement, found: Examination) -> list[str]:
    words = [level_text(found.level)] if level_is_in_doubt(found.level) else []
    words += [f"outlier: {outlier_at(measurement, *each)}" for each in found.outliers]
    return words + [_feature_words(each) for each in found.features]


def _feature_record(feature: Feature) -> dict[str, Any]:
    return {
        "kind": feature.kind,
        "low_K": feature.temperature_low,
        "high_K": feature.temperature_high,
        "temperature_K": feature.temperature,
        "size": feature.size,
        "significance": feature.significance,
    }


def inspection_text(measurement: Measurement, found: Examination) -> str:
    """Return the same for people, within 80 columns and one screen unless there is much to mend."""
    reading = measurement.readings[0]
    unit = _UNITS[measurement.basis][0]
    converted = "" if reading.heat_capacity_unit == unit else f", converted to {unit}"
    facts: list[tuple[str, str]] = [
        ("sample", _sample(measurement)),
        ("written", _written(reading)),
        ("temperature", f"{harmless(reading.temperature_column)}, in {reading.temperature_unit}"),
        (
            measurement.quantity,
            f"{harmless(reading.heat_capacity_column)}, in {reading.heat_capacity_unit}{converted}",
        ),
        ("sigma", _sigma(measurement, found)),
        *_not_used(reading),
        ("points", _points(measurement, found)),
        *([("runs", _runs(measurement))] if len(measurement.readings) > 1 else []),
        *(
            (harmless(label), harmless(_with_remark(words, remark)))
            for label, words, remark in correction_words(measurement)
        ),
        ("spread", ", ".join(map(_decade_words, found.decades))),
        ("repeats", _repeats(found)),
        ("outliers", _listed([harmless(outlier_at(measurement, *each)) for each in found.outliers])),
        ("features", _listed([_feature_words(each) for each in found.features])),
        ("level", level_text(found.level)),
    ]
    lines = [harmless(reading.file)]
    for label, words in facts:
        lines += _entry(label, words)
    lines += ["", *_rows(measurement, found), "", *_repairs(measurement)]
    return "\n".join(lines).rstrip() + "\n"


def _sample(measurement: Measurement) -> str:
    """Formula, atoms, molar mass, 3nR and mass: what turns the file into J/(mol K)."""
    sample = measurement.sample
    words = [] if sample.formula is None else [f"{harmless(sample.formula)}"]
    if sample.atoms is not None:
        words.append(f"{plain_number(sample.atoms, 6)} atoms, 3nR = {3 * sample.atoms * GAS_CONSTANT:.5g} J/(mol K)")
    if sample.molar_mass is not None:
        words.append(f"{plain_number(1e3 * sample.molar_mass, 6)} g/mol")
    if sample.mass is not None:
        words.append(mass_words(measurement))
    return ", ".join(words) or "nothing is known: give --formula"


def _not_used(reading: Reading) -> list[tuple[str, str]]:
    doubtful = [harmless(each) for each in reading.unused_columns if looks_like_uncertainty(each)]
    return [("not used", ", ".join(doubtful))] if doubtful else []


def _entry(label: str, words: str) -> list[str]:
    first = f"  {label:<{_LABEL - 3}} "
    return wrap(words, _WIDTH, initial_indent=first, subsequent_indent=" " * _LABEL, break_on_hyphens=False)


def _with_remark(words: str, remark: str) -> str:
    return f"{words} ({remark})" if remark else words


def _written(reading: Reading) -> str:
    if reading.encoding == "spreadsheet":
        return "a spreadsheet"
    return f"{reading.encoding}, separated by {reading.delimiter}, decimal {reading.decimal}"


def _sigma(measurement: Measurement, found: Examination) -> str:
    scatter = "" if found.scatter is None else f"the points scatter by {percent_text(100 * found.scatter)}"
    if measurement.sigma is None:
        asked = measurement.readings[0].settings.sigma
        words = f"to be taken from {asked}" if asked in ("scatter", "replicates") else "none stated"
        return f"{words}; {scatter}" if scatter else words
    relative = np.asarray(found.sigma) / np.asarray(measurement.heat_capacity)
    size = f"{percent_text(100 * float(relative.min()))} to {percent_text(100 * float(relative.max()))}"
    if np.isclose(relative.min(), relative.max(), rtol=0.02):
        size = percent_text(100 * float(np.median(relative)))
    known = "" if measurement.addenda_u is None else " and the addenda"
    return f"{harmless(measurement.sigma_text)}{known}: {size}" + (f"; {scatter}" if scatter else "")


def _points(measurement: Measurement, found: Examination) -> str:
    T = measurement.temperature
    rows = sum(each.rows for each in measurement.readings)
    words = f"{T.size} of {rows} rows, {T.min():.4g} to {T.max():.4g} K"
    if not found.left_out and not found.averaged:
        return words
    counts = Counter(_without_numbers(harmless(each)) for each in found.left_out).most_common()
    named = [f"{count} {reason}" for reason, count in counts[:_MOST_REASONS]]
    more = sum(count for _, count in counts[_MOST_REASONS:])
    named += [f"{more} for other reasons"] if more else []
    named += [f"{found.averaged} averaged into the means of {found.means} sets"] if found.averaged else []
    return f"{words}; {found.to_fit or 'none'} to be fitted ({'; '.join(named)})"


def _without_numbers(reason: str) -> str:
    """A reason of one line in the words for all of its kind: ``line 12 masked`` is one of the masked lines."""
    if re.fullmatch(r"first of a set of \d+, dropped as asked", reason):
        return "first of their sets, dropped as asked"
    return "by --mask-lines" if re.fullmatch(r"line \d+ masked", reason) else reason


def _runs(measurement: Measurement) -> str:
    counts = np.bincount(measurement.run, minlength=len(measurement.readings))
    return ", ".join(
        f"{harmless(each.label)} ({count})" for each, count in zip(measurement.readings, counts, strict=True)
    )


def _decade_words(decade: Decade) -> str:
    words = f"{decade.points} in {decade.low:g}-{decade.high:g} K"
    gaps = " and ".join(f"{low:.4g}-{high:.4g}" for low, high in decade.gaps)
    return f"{words} (none from {gaps} K)" if gaps else words


def _repeats(found: Examination) -> str:
    if not found.repeated_sets:
        return "none"
    words = f"{found.repeated_points} points in {found.repeated_sets} sets (--replicates says what is done with them)"
    if found.unsettled is None:
        return words
    side = "above" if found.unsettled > 0 else "below"
    return f"{words}; the first of each lies {percent_text(100 * abs(found.unsettled))} {side} the others"


def _feature_words(feature: Feature) -> str:
    span = f"{feature.temperature_low:.4g}-{feature.temperature_high:.4g} K"
    if feature.kind == "upturn":
        return f"upturn of C/T on cooling, {span}: {percent_text(100 * abs(feature.size))}"
    return f"{feature.kind} at {feature.temperature:.4g} K ({span}): {percent_text(100 * abs(feature.size))}"


def _listed(words: Sequence[str]) -> str:
    if not words:
        return "none"
    shown = "; ".join(words[:3])
    return shown if len(words) <= 3 else f"{shown}; and {len(words) - 3} more"


def _rows(measurement: Measurement, found: Examination) -> list[str]:
    """The first and last points by temperature."""
    T, C = np.asarray(measurement.temperature), np.asarray(measurement.heat_capacity)
    order = np.argsort(T, kind="stable")
    unit = _UNITS[measurement.basis][0]
    lines = [f"  {'T / K':>12} {measurement.quantity + ' / ' + unit:>18} {'sigma':>12}".rstrip()]
    shown = [*order[:_SHOWN_ROWS], *order[max(_SHOWN_ROWS, T.size - _SHOWN_ROWS) :]]
    for place, i in enumerate(shown):
        if place == _SHOWN_ROWS and T.size > 2 * _SHOWN_ROWS:
            lines.append(f"  {'...':>12}")
        sigma = "" if found.sigma is None else significant(float(found.sigma[i]), 2)
        lines.append(f"  {float(T[i]):>12.6g} {float(C[i]):>18.6g} {sigma:>12}".rstrip())
    return lines


def _repairs(measurement: Measurement) -> list[str]:
    if not measurement.repairs:
        return ["  repairs     none"]
    known = {each.file for each in measurement.addenda_readings}
    lines = ["  repairs"]
    for each in measurement.repairs[:_MOST_LINES]:
        where = "whole file" if each.line is None else f"line {each.line}"
        where = f"{harmless(each.file)}, {where}" if each.file in known else where
        words = f"{where}: {harmless(each.message)}"
        lines += wrap(words, _WIDTH, initial_indent="    ", subsequent_indent="      ", break_on_hyphens=False)
    more = len(measurement.repairs) - _MOST_LINES
    return [*lines, *([f"    and {more} more (--json lists all)"] if more > 0 else [])]


def overlap_text(overlaps: tuple[RunOverlap, ...], compared: int) -> str:
    """Return how runs compare where they overlap, a line each."""
    lines = []
    for label, words, remark in overlap_words(overlaps, compared):
        lines += _entry(label, harmless(_with_remark(words, remark)))
    return "\n".join(lines) + ("\n" if lines else "")

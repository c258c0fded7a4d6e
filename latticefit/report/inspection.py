"""What was read from a file, as text and as JSON: for `inspect`, before any fit."""

from __future__ import annotations

from math import floor, log10
from textwrap import wrap
from typing import Any

import numpy as np

from ..diagnosing import examine_level
from ..records import Measurement, Reading
from ..wording import harmless
from .level import level_is_in_doubt, level_text
from .wording import significant

__all__ = ["inspection_record", "inspection_text"]

_UNITS = {"mol": ("J/(mol K)", "J_mol_K"), "gram": ("J/(g K)", "J_g_K"), "sample": ("J/K", "J_K")}
_DELIMITERS = {"comma": ",", "semicolon": ";", "tab": "\t", "blank": " "}
_DECIMALS = {"point": ".", "comma": ","}
_SHOWN_ROWS = 3


def inspection_record(measurement: Measurement) -> dict[str, Any]:
    """Return what was read from the one file of a measurement, as in the contract of ``inspect --json``."""
    reading = measurement.readings[0]
    key = _UNITS[measurement.basis][1]
    sigma = None if measurement.sigma is None else measurement.sigma.tolist()
    level = examine_level(measurement)
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
        "temperature_unit": reading.temperature_unit,
        "heat_capacity_unit": reading.heat_capacity_unit,
        "quantity": measurement.quantity,
        "sigma": measurement.sigma_text,
        "points": int(measurement.temperature.size),
        "repairs": [{"line": each.line, "message": each.message} for each in measurement.repairs],
        "warnings": [level_text(level)] if level_is_in_doubt(level) else [],
        "measurement": {
            "temperature_K": measurement.temperature.tolist(),
            f"heat_capacity_{key}": measurement.heat_capacity.tolist(),
            f"sigma_{key}": sigma,
        },
    }


def inspection_text(measurement: Measurement) -> str:
    """Return the same for people, within 80 columns."""
    reading = measurement.readings[0]
    unit = _UNITS[measurement.basis][0]
    T, C = np.asarray(measurement.temperature), np.asarray(measurement.heat_capacity)
    order = np.argsort(T, kind="stable")
    rows = sum(each.rows for each in measurement.readings)  # of all runs of one file
    lines = [
        harmless(reading.file),
        f"  written     {_written(reading)}",
        f"  temperature {harmless(reading.temperature_column)}, in {reading.temperature_unit}",
        f"  {measurement.quantity}          {harmless(reading.heat_capacity_column)}, in {reading.heat_capacity_unit}"
        + ("" if reading.heat_capacity_unit == unit else f", converted to {unit}"),
        f"  sigma       {harmless(measurement.sigma_text) or 'none stated; fit estimates it from the local scatter'}",
        f"  points      {T.size} of {rows} rows, {T.min():.4g} to {T.max():.4g} K",
        f"  spread      {_per_decade(T)}",
        f"  repeats     {_repeats(T)}",
        *wrap(level_text(examine_level(measurement)), 80, initial_indent="  level       ", subsequent_indent=" " * 14),
        "",
        f"  {'T / K':>12} {measurement.quantity + ' / ' + unit:>18} {'sigma':>12}",
    ]
    shown = [*order[:_SHOWN_ROWS], *order[max(_SHOWN_ROWS, T.size - _SHOWN_ROWS) :]]
    for position, i in enumerate(shown):
        if position == _SHOWN_ROWS and T.size > 2 * _SHOWN_ROWS:
            lines.append(f"  {'...':>12}")
        sigma = "" if measurement.sigma is None else significant(float(measurement.sigma[i]), 2)
        lines.append(f"  {float(T[i]):>12.6g} {float(C[i]):>18.6g} {sigma:>12}")
    lines += ["", "  repairs     " + ("none" if not measurement.repairs else "")]
    known = {each.file for each in measurement.addenda_readings}
    for each in measurement.repairs:
        where = "whole file" if each.line is None else f"line {each.line}"
        where = f"{harmless(each.file)}, {where}" if each.file in known else where
        lines.append(f"    {where}: {harmless(each.message)}")
    return "\n".join(lines).rstrip() + "\n"


def _written(reading: Reading) -> str:
    if reading.encoding == "spreadsheet":
        return "a spreadsheet"
    return f"{reading.encoding}, separated by {reading.delimiter}, decimal {reading.decimal}"


def _per_decade(T: np.ndarray) -> str:
    powers = range(floor(log10(T.min())), floor(log10(T.max())) + 1)
    counts = [
        (f"{10.0**p:g}-{10.0 ** (p + 1):g} K", int(((10.0**p <= T) & (10.0 ** (p + 1) > T)).sum())) for p in powers
    ]
    return ", ".join(f"{count} in {band}" for band, count in counts)


def _repeats(T: np.ndarray) -> str:
    repeated = T.size - np.unique(T).size
    return "none" if repeated == 0 else f"{repeated} points at a temperature that stands already"

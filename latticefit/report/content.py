"""What a report says, as rows of words and rounded numbers: text and HTML show these same strings."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass
from pathlib import PurePath

import numpy as np
from numpy.typing import NDArray

from ..constants import STANDARD_TEMPERATURE
from ..models import build_model
from ..records import Analysis, DerivedValue, ParameterValue, ThermodynamicTable
from ..rounding import percent_text
from ..wording import harmless
from .corrections import correction_words, mass_words
from .level import level_text
from .noticed import averaged_words, lack_of_fit_words, overlap_words, points_read, rows_left_out
from .wording import concise, plain_number, plus_minus, shown_unit, significant

__all__ = [
    "Grid",
    "Row",
    "band_grid",
    "fit_rows",
    "function_grid",
    "headline",
    "key_rows",
    "measured_rows",
    "model_rows",
    "parameter_rows",
    "provenance_rows",
    "quantity_symbols",
    "repair_rows",
    "round_rows",
    "standard_rows",
    "temperature_rows",
    "validity_rows",
    "warning_rows",
    "withheld_notes",
]


@dataclass(frozen=True)
class Row:
    """One labelled statement: what, its value in words, and a remark. Harmless text, as shown."""

    label: str
    value: str
    note: str = ""

    def __post_init__(self) -> None:
        for name in ("label", "value", "note"):
            object.__setattr__(self, name, harmless(getattr(self, name)))


@dataclass(frozen=True)
class Grid:
    """A table as shown: column heads, rows of the same length, and what is to be said below it."""

    heads: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    notes: tuple[str, ...] = ()


def quantity_symbols(quantity: str) -> tuple[str, str, str, str]:
    """Return the symbols of heat capacity, energy, entropy and free-energy function for quantity Cp or Cv."""
    if quantity == "Cv":
        return "Cv", "U(T)-U(0)", "S", "-(F(T)-U(0))/T"
    return "Cp", "H(T)-H(0)", "S", "-(G(T)-H(0))/T"


def headline(analysis: Analysis) -> str:
    """Return the name of the sample with its formula where that says more."""
    sample = analysis.measurement.sample
    return harmless(sample.name if sample.formula in (None, sample.name) else f"{sample.name} ({sample.formula})")


def _range(low: float, high: float) -> str:
    return f"{plain_number(low)} to {plain_number(high)} K"


def measured_rows(analysis: Analysis) -> tuple[Row, ...]:
    """Say what was measured: sample, files, quantity, points and sigma."""
    measurement, prepared = analysis.measurement, analysis.prepared
    sample = measurement.sample
    atoms = "atom" if sample.atoms == 1 else "atoms"
    about = [] if sample.atoms is None else [f"{plain_number(sample.atoms, 6)} {atoms} per formula unit"]
    about += [] if sample.molar_mass is None else [f"molar mass {plain_number(1e3 * sample.molar_mass, 6)} g/mol"]
    files = [
        each.file if each.label == PurePath(each.file).stem else f"{each.file} ({each.label})"
        for each in measurement.readings
    ]
    kind = "constant volume (Cv)" if measurement.quantity == "Cv" else "constant pressure (Cp)"
    set_aside = measurement.set_aside or (None,) * len(prepared.reasons)
    aside = sum(each is not None for each in set_aside)
    reasons = Counter(
        each for each, why in zip(prepared.reasons, set_aside, strict=True) if each is not None and why is None
    )
    points = f"{prepared.temperature.size} fitted of {points_read(measurement)} read"
    how = [
        f"T from {harmless(each.temperature_column)!r} in {each.temperature_unit}, heat capacity from "
        f"{harmless(each.heat_capacity_column)!r} in {each.heat_capacity_unit}"
        for each in measurement.readings
    ]
    about += [] if sample.mass is None else [mass_words(measurement)]
    about += [] if sample.melting_point is None else [f"melting point {plain_number(sample.melting_point, 6)} K"]
    left_out = [f"{count} not fitted ({reason})" for reason, count in reasons.items()]
    left_out += [f"{aside} set aside by line or by condition, as the repairs say"] if aside else []
    left_out += averaged_words(measurement)
    left_out += [f"{rows} rows left out at reading"] if (rows := rows_left_out(measurement)) else []
    return (
        Row("sample", headline(analysis), ", ".join(about)),
        Row("files", ", ".join(files), "; ".join(dict.fromkeys(how))),
        Row("quantity", f"heat capacity at {kind}, per mole of formula unit"),
        Row("points", points, "; ".join(left_out)),
        Row("range fitted", _range(prepared.temperature[0], prepared.temperature[-1])),
        Row("sigma", prepared.sigma_text, f"the covariance is {analysis.fit.covariance_kind}"),
        *(Row(*each) for each in correction_words(measurement)),
        *(() if analysis.level is None else (Row("level", level_text(analysis.level)),)),
        *(Row(*each) for each in overlap_words(prepared.overlaps, prepared.overlaps_compared)),
    )


def model_rows(analysis: Analysis) -> tuple[Row, ...]:
    """Say which model was fitted and why."""
    fit = analysis.fit
    modes = "the modes are free"
    if fit.mode_sum == "fixed":
        modes = "the modes are held at 3 per atom"
    if fit.mode_sum == "fixed" and fit.atoms is not None:
        modes += f": {plain_number(3 * fit.atoms, 6)} per formula unit"
    return (
        Row("model", fit.terms, modes),
        Row("Cp-Cv", fit.cp_cv),
        Row("why this model", analysis.comparison.because),
    )


def parameter_rows(analysis: Analysis) -> tuple[Row, ...]:
    """Give each parameter with u, modes also in atoms; the remark says fitted, fixed, ... and what it is."""
    return tuple(_parameter_row(each) for each in analysis.fit.parameters)


def _parameter_row(parameter: ParameterValue) -> Row:
    value = plus_minus(parameter.value, parameter.u, parameter.unit)
    if parameter.name.endswith("_modes"):
        atoms = plus_minus(parameter.value / 3, None if parameter.u is None else parameter.u / 3)
        value = f"{value} modes = {atoms} {'atom' if atoms == '1' else 'atoms'}"
    if parameter.u is None:
        value += " (u not determined)"
    return Row(parameter.name, value, f"{parameter.status.replace('_', ' ')}: {parameter.meaning}")


def _derived_row(value: DerivedValue) -> Row:
    if value.value is None:
        return Row(value.symbol, value.status, value.reason or value.definition)
    shown = plus_minus(value.value, value.u, value.unit) + ("" if value.u is not None else " (u withheld)")
    if value.status == "interval" and value.low is not None and value.high is not None:
        shown += f", {plain_number(value.low)} to {plain_number(value.high)} {shown_unit(value.unit)} (k = 2)"
    note = value.definition if value.reason is None else f"{value.definition}; {value.reason}"
    return Row(value.symbol, shown, note)


def temperature_rows(analysis: Analysis) -> tuple[Row, ...]:
    """Give the characteristic temperatures, each with definition, or the reason why it is withheld."""
    return tuple(_derived_row(each) for each in analysis.derived.characteristic_temperatures)


def _beyond(analysis: Analysis) -> str:
    low, high = analysis.prepared.temperature[0], analysis.prepared.temperature[-1]
    above = high < STANDARD_TEMPERATURE
    return f"extrapolated: the data {'end' if above else 'begin'} at {plain_number(high if above else low)} K"


def standard_rows(analysis: Analysis) -> tuple[Row, ...]:
    """Give the thermodynamic functions at 298.15 K and the zero-point energy."""
    table = analysis.derived.table
    i = int(np.flatnonzero(table.temperature == STANDARD_TEMPERATURE)[0])
    symbols = quantity_symbols(table.quantity)
    names = ("heat_capacity", "energy", "entropy", "free_energy_function")
    units = ("J/(mol K)", "J/mol", "J/(mol K)", "J/(mol K)")
    words = ("heat capacity", "internal energy" if table.quantity == "Cv" else "enthalpy", "entropy", "")
    words = (*words[:3], "Helmholtz energy function" if table.quantity == "Cv" else "Gibbs energy function")
    rows = []
    for symbol, name, unit, word in zip(symbols, names, units, words, strict=True):
        value = plus_minus(getattr(table, name)[i], getattr(table, f"{name}_u")[i], unit)
        value += "" if table.u_reasons[i] is None else " (u withheld)"
        value += "" if table.origin[i] == "measured" else f" ({_beyond(analysis)})"
        rows.append(Row(symbol, value, word))
    reason = table.u_reasons[i]
    share = f"{percent_text(100 * table.entropy_fraction_below_data[i])} of S"
    rows.append(Row("below the data", share, "comes from the model below the lowest point fitted"))
    if reason is not None:
        rows.append(Row("u withheld", reason))
    return (*rows, _derived_row(analysis.derived.zero_point_energy))


_LONG_TABLE, _SHORT_TABLE = 30, 10  # rows
_ORIGIN_MARKS = {"measured": "", "extrapolated_below": "below", "extrapolated_above": "above"}


def round_rows(table: ThermodynamicTable) -> NDArray[np.bool_]:
    """Choose the rows of a long table that a page of text has room for: round temperatures, ends and 298.15 K.

    All rows where the table is short, or where hardly any temperature is round.
    """
    T = table.temperature
    everything = np.ones(T.size, dtype=bool)
    leading = [f"{each:.6e}".partition("e")[0].rstrip("0") for each in T]
    chosen = np.array([digit in {"1.", "2.", "3.", "5.", "7."} for digit in leading])
    chosen |= (T % 50 == 0) | (T == STANDARD_TEMPERATURE)
    chosen[[0, -1]] = True
    return chosen if T.size > _LONG_TABLE and np.sum(chosen) >= _SHORT_TABLE else everything


def function_grid(table: ThermodynamicTable, rows: NDArray[np.bool_] | None = None) -> Grid:
    """Give the thermodynamic functions as a compact table, u in brackets; only some `rows` where a choice is given."""
    symbols = quantity_symbols(table.quantity)
    units = ("J/(mol K)", "J/mol", "J/(mol K)", "J/(mol K)")
    heads = ("T / K", *(f"{symbol} / {unit}" for symbol, unit in zip(symbols, units, strict=True)), "origin")
    names = ("heat_capacity", "energy", "entropy", "free_energy_function")
    columns = [
        [concise(value, u) for value, u in zip(getattr(table, name), getattr(table, f"{name}_u"), strict=True)]
        for name in names
    ]
    temperatures = [plain_number(each, 6) for each in table.temperature]
    marks = [_ORIGIN_MARKS[each] for each in table.origin]
    notes = ["Brackets: standard uncertainty u (k = 1) of the last digits. Below, above: outside the points fitted."]
    withheld = dict.fromkeys(each for each in table.u_reasons if each is not None)
    notes += [f"(?): u withheld, {harmless(each)}." for each in withheld]
    listed = list(zip(temperatures, *columns, marks, strict=True))
    if rows is not None and not rows.all():
        listed = [row for row, chosen in zip(listed, rows, strict=True) if chosen]
        notes.append(f"{len(listed)} of {rows.size} rows; the others stand in table.csv.")
    return Grid(heads, tuple(listed), tuple(notes))


def band_grid(analysis: Analysis) -> Grid:
    """Give the residuals by temperature decade."""
    rows = tuple(
        (
            _range(each.temperature_low, each.temperature_high),
            str(each.points),
            percent_text(each.rms_percent),
            percent_text(each.max_abs_percent),
        )
        for each in analysis.diagnosis.statistics.bands
    )
    return Grid(("range", "points", "rms", "largest"), rows)


def fit_rows(analysis: Analysis) -> tuple[Row, ...]:
    """Give the numbers that say how well the model fits."""
    fit, statistics = analysis.fit, analysis.diagnosis.statistics
    largest = f"{percent_text(statistics.max_abs_percent)} at {plain_number(statistics.max_abs_percent_temperature)} K"
    return (
        Row(
            "reduced chi-square",
            significant(statistics.reduced_chi_square, 3),
            f"{fit.degrees_of_freedom} degrees of freedom, p = {plain_number(statistics.chi_square_p, 2)}",
        ),
        Row("residuals", f"rms {percent_text(statistics.rms_percent)}", f"largest {largest}"),
        Row("Durbin-Watson", significant(statistics.durbin_watson, 3), "2 for independent residuals"),
        Row(
            "runs test",
            f"p = {plain_number(statistics.runs_test_p, 2)}",
            f"longest run of one sign: {statistics.longest_run} points",
        ),
        Row("AICc, BIC", f"{plain_number(statistics.aicc, 5)}, {plain_number(statistics.bic, 5)}"),
        *(Row(*each) for each in lack_of_fit_words(statistics.lack_of_fit)),
    )


def key_rows(analysis: Analysis) -> tuple[Row, ...]:
    """Give the numbers of the first screen: what most readers came for."""
    heat_capacity, energy, entropy = standard_rows(analysis)[:3]
    chi_square, residuals = fit_rows(analysis)[:2]
    wanted = ("theta_debye_low_temperature", "theta_debye_moment_0")
    temperatures = [_derived_row(each) for each in analysis.derived.characteristic_temperatures if each.key in wanted]
    placed = build_model(analysis.fit.terms, analysis.fit.cp_cv).placed
    outside = [each for term in placed if not term.term.lattice for each in analysis.fit.parameters[term.slice]]
    at_standard = [Row(f"{each.label} at 298.15 K", each.value) for each in (heat_capacity, energy, entropy)]
    found = (*temperatures, *map(_parameter_row, outside), *at_standard, chi_square, residuals)
    return tuple(Row(each.label, each.value) for each in found)


def validity_rows(analysis: Analysis) -> tuple[Row, ...]:
    """Give the yes-or-no facts on the fit."""
    return tuple(Row(each.name, "yes" if each.holds else "NO", each.detail) for each in analysis.diagnosis.validity)


def warning_rows(analysis: Analysis) -> tuple[Row, ...]:
    """Give the warnings: code, message and what to do next."""
    return tuple(
        Row(f"{each.level}: {each.code}", each.message, f"What to do: {each.advice}" if each.advice else "")
        for each in analysis.warnings
    )


def withheld_notes(analysis: Analysis) -> tuple[str, ...]:
    """Say in words which quantities are withheld."""
    return tuple(harmless(each.message) for each in analysis.warnings if each.level == "stop")


def repair_rows(analysis: Analysis) -> tuple[Row, ...]:
    """Give everything that was mended or left out at reading, with its place."""
    return tuple(
        Row(each.file if each.line is None else f"{each.file}, line {each.line}", each.message)
        for each in analysis.measurement.repairs
    )


def provenance_rows(analysis: Analysis) -> tuple[Row, ...]:
    """Say which version made the result, when, from which bytes, with what."""
    provenance = analysis.provenance
    packages = ", ".join(f"{name} {version}" for name, version in provenance.packages.items())
    measurement = analysis.measurement
    every = (*measurement.readings, *measurement.addenda_readings)
    read = dict.fromkeys((each.sha256, each.file) for each in every)
    files = tuple(Row("sha256", sha256, file) for sha256, file in read)
    return (
        Row("latticefit", provenance.version, packages),
        Row("made", provenance.created, f"random seed {provenance.random_seed}"),
        Row("command", provenance.command),
        *files,
    )

"""From one file to the arrays of one run: columns, units, sigma, and every row accounted for."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from ..errors import InputError
from ..records import Basis, ExcludedRow, FloatArray, Quantity, Reading, Repair, RunSettings, Sample
from ..units import KELVIN_ASSUMED, HeatCapacityUnit, TemperatureUnit, heat_capacity_unit, temperature_unit
from .columns import choose_columns
from .conditions import reasons_to_leave_out, set_aside
from .division import Division, divide_rows, order_notes
from .headers import Column, describe_columns, names_temperature, power_of_ten, quantity_of, unit_unread
from .rows import Cells, read_cells, reasons_against, refuse_bad_sigma, refuse_too_few
from .sigma_source import SigmaSource, find_sigma_source
from .table import Table, find_table
from .text import TextFile, load_text
from .unused import unused_columns
from .wording import quoted, shown_name

__all__ = ["RunData", "read_run"]

_Values = tuple[FloatArray, FloatArray, FloatArray | None]


@dataclass(frozen=True)
class RunData:
    """What one file gave: arrays of the usable rows in file order, and the facts about the rest.

    `set_aside` says why a usable row is not to be fitted, None for the others; `division` says which rows are which
    run, `run` which run of the measurement each usable row belongs to.
    """

    reading: Reading
    temperature: FloatArray
    heat_capacity: FloatArray
    sigma: FloatArray | None
    line: NDArray[np.intp]
    quantity: Quantity
    basis: Basis
    sigma_text: str
    repairs: tuple[Repair, ...]
    excluded: tuple[ExcludedRow, ...]
    set_aside: tuple[str | None, ...]
    division: Division
    run: NDArray[np.intp]


@dataclass(frozen=True)
class _Choice:
    """The chosen columns with the units in force."""

    temperature: Column
    heat_capacity: Column
    temperature_unit: TemperatureUnit
    heat_capacity_unit: HeatCapacityUnit
    sigma: SigmaSource
    quantity: Quantity
    notes: tuple[str, ...]

    @property
    def columns(self) -> tuple[Column, ...]:
        """Those whose cells are read."""
        first_two = (self.temperature, self.heat_capacity)
        return first_two if self.sigma.column is None else (*first_two, self.sigma.column)


def read_run(sample: Sample, run: RunSettings, path: Path, index: int) -> RunData:
    """Read one file.

    Parameters
    ----------
    sample : Sample
        Molar mass, mass and atoms, where known, convert the heat capacity to J/(mol K).
    run : RunSettings
        How it is to be read; what is None is recognised.
    path : Path
        Where the file is; `run.file` is what messages call it.
    index : int
        Position of the run, or of the first of its runs, in the measurement.

    Raises
    ------
    InputError
        If the file or a choice is wrong, with line, column and value where there is one.
    """
    source = load_text(path, run.file, run.worksheet)
    shown = shown_name(run.file)
    table = find_table(source, run.mask_lines)
    columns = describe_columns(table.headers or [None] * table.width)
    choice = _choose(columns, run, shown)
    aside, aside_notes = set_aside(table, columns, choice.columns, run, source.last_line, shown)
    cells = read_cells(table, choice.columns, shown, aside)
    values = _converted(choice, cells, sample, shown)
    temperature, heat_capacity, sigma = values
    reasons = _reasons(values, cells, choice, table, aside, shown)
    keep = np.array([reason is None for reason in reasons])
    lines = np.array([row.line for row in table.rows], dtype=np.intp)
    division = divide_rows(table, columns, choice.columns, run.split_by, (keep, aside), shown)
    order = order_notes(temperature[keep], lines[keep], division.of_row[keep], division.names)
    notes = (*table.notes, *choice.notes, *choice.sigma.notes, *_written_notes(choice, cells), *order)
    notes = (*notes, *division.notes, *aside_notes)
    left_out = [(i, reason) for i, reason in enumerate(reasons) if reason is not None]
    of_row = index + division.of_row
    return RunData(
        reading=_reading(source, table, columns, choice, cells, run),
        temperature=temperature[keep],
        heat_capacity=heat_capacity[keep],
        sigma=None if sigma is None else sigma[keep],
        line=lines[keep],
        quantity=choice.quantity,
        basis=_to_basis(choice.heat_capacity_unit, sample, shown)[1],
        sigma_text="" if sigma is None else choice.sigma.text,
        repairs=(
            *(Repair(run.file, None, note) for note in notes),
            *(Repair(run.file, line, note) for line, note in _by_line(table.repairs, cells.repairs)),
            *(Repair(run.file, int(lines[i]), f"row left out: {reason}") for i, reason in left_out),
        ),
        excluded=tuple(ExcludedRow(int(of_row[i]), int(lines[i]), *_row(values, i), reason) for i, reason in left_out),
        set_aside=tuple(why for why, kept in zip(aside, keep, strict=True) if kept),
        division=division,
        run=of_row[keep],
    )


def _converted(choice: _Choice, cells: Cells, sample: Sample, shown: str) -> _Values:
    """Return temperature, heat capacity and sigma of every row in the units of the measurement."""
    temperature = (cells.temperature + choice.temperature_unit.offset) * choice.temperature_unit.factor
    heat_capacity = cells.heat_capacity * _to_basis(choice.heat_capacity_unit, sample, shown)[0]
    return temperature, heat_capacity, _sigma(choice, cells, (temperature, heat_capacity), sample, shown)


def _reasons(
    values: _Values, cells: Cells, choice: _Choice, table: Table, aside: list[str | None], shown: str
) -> list[str | None]:
    """Say for each row why it is left out of the arrays, None where it is not; refuse what cannot be."""
    sigma = values[2]
    reasons = reasons_against(*values, cells.heat_capacity, choice.heat_capacity_unit.text)
    refuse_too_few(reasons, table, shown, aside)
    reasons = reasons_to_leave_out(reasons, aside, sigma)
    if sigma is not None:
        usable = np.array([reason is None for reason in reasons])
        refuse_bad_sigma(sigma, usable, table, choice.columns[-1], shown)
    return reasons


def _row(values: _Values, i: int) -> tuple[float, float, float]:
    temperature, heat_capacity, sigma = values
    return float(temperature[i]), float(heat_capacity[i]), math.nan if sigma is None else float(sigma[i])


def _by_line(*repairs: tuple[tuple[int | None, str], ...]) -> list[tuple[int | None, str]]:
    """Return the repairs in the order of the file, those of the whole file first."""
    return sorted((each for part in repairs for each in part), key=lambda repair: repair[0] or 0)


# ------------------------------------------------------------------------------------------------ columns and units


def _choose(described: tuple[Column, ...], run: RunSettings, shown: str) -> _Choice:
    t_column, c_column = choose_columns(described, run.temperature, run.heat_capacity, shown)
    t_unit, t_notes = _temperature_unit(t_column, run.temperature_unit, shown)
    c_unit, c_notes = _heat_capacity_unit(c_column, run.heat_capacity_unit, shown)
    says = quantity_of(c_column)
    quantity_notes: tuple[str, ...] = ()
    if run.quantity == "Cp" and says == "Cv":
        quantity_notes = (f"taken as Cp as asked, although the header {quoted(c_column.label)} says Cv",)
    return _Choice(
        temperature=t_column,
        heat_capacity=c_column,
        temperature_unit=t_unit,
        heat_capacity_unit=c_unit,
        sigma=find_sigma_source(described, (t_column, c_column), c_unit, run, shown),
        quantity=run.quantity or says,
        notes=(*t_notes, *c_notes, *quantity_notes),
    )


def _temperature_unit(column: Column, asked: str | None, shown: str) -> tuple[TemperatureUnit, tuple[str, ...]]:
    if asked is not None:
        unit = temperature_unit(asked)
        return unit, _against_header(column, unit)
    _refuse_power(column, "--temperature-unit", shown)
    if isinstance(column.unit, TemperatureUnit):
        return column.unit, ()
    _refuse_other_unit(column, "temperature", "--temperature-unit", shown)
    if unit_unread(column, names_temperature):
        raise InputError(f"{shown}: the unit in {quoted(column.label)} cannot be read; give it by --temperature-unit")
    return temperature_unit("K"), (f"the unit of {quoted(column.label)} {KELVIN_ASSUMED}",)


def _heat_capacity_unit(column: Column, asked: str | None, shown: str) -> tuple[HeatCapacityUnit, tuple[str, ...]]:
    if asked is not None:
        unit = heat_capacity_unit(asked)
        return unit, _against_header(column, unit)
    if isinstance(column.unit, HeatCapacityUnit):
        _refuse_power(column, "--heat-capacity-unit", shown)
        return column.unit, ()
    _refuse_other_unit(column, "heat capacity", "--heat-capacity-unit", shown)
    _refuse_power(column, "--heat-capacity-unit", shown)
    raise InputError(
        f"{shown}: the unit of {quoted(column.label)} is not stated; write it into the header, as in "
        "'Cp (J/(mol K))', or give --heat-capacity-unit 'J/(mol K)'"
    )


def _against_header(column: Column, unit: TemperatureUnit | HeatCapacityUnit) -> tuple[str, ...]:
    against = column.unit is not None and column.unit != unit
    return (f"{quoted(column.label)} read in {unit.text} as asked, against its header",) if against else ()


def _refuse_power(column: Column, option: str, shown: str) -> None:
    if power_of_ten(column):
        raise InputError(
            f"{shown}: {quoted(column.label)} holds a power of ten, and whether the numbers were multiplied by it or "
            f"are to be is not clear; give the unit of the numbers as they stand by {option}"
        )


def _refuse_other_unit(column: Column, what: str, option: str, shown: str) -> None:
    if column.unit is not None:
        unit = "%" if column.unit == "percent" else column.unit.text
        raise InputError(
            f"{shown}: {quoted(column.label)} is in {unit}, which is no unit of {what}; choose another column, or "
            f"give {option}"
        )


def _to_basis(unit: HeatCapacityUnit, sample: Sample, shown: str) -> tuple[float, Basis]:
    """Return the factor from a unit to J/(mol K) where the sample allows it, else to J/(g K) or J/K."""
    if unit.basis == "mol":
        return unit.factor, "mol"
    if unit.basis == "mol_atoms":
        if sample.atoms is None:
            raise InputError(f"{shown}: {unit.text} is per mole of atoms; give --formula or --atoms")
        return unit.factor * sample.atoms, "mol"
    if unit.basis == "gram":
        return (unit.factor, "gram") if sample.molar_mass is None else (unit.factor * sample.molar_mass * 1000, "mol")
    if sample.molar_mass is None or sample.mass is None:
        return unit.factor, "sample"
    return unit.factor * sample.molar_mass / sample.mass, "mol"


# ------------------------------------------------------------------------------------------------------------ sigma


def _sigma(
    choice: _Choice, cells: Cells, converted: tuple[FloatArray, FloatArray], sample: Sample, shown: str
) -> FloatArray | None:
    """Return the standard uncertainty of every row, unit as the converted heat capacity; None where none is stated."""
    source = choice.sigma
    temperature, heat_capacity = converted

    def factor_of(unit: HeatCapacityUnit) -> float:
        factor, basis = _to_basis(unit, sample, shown)
        if basis != _to_basis(choice.heat_capacity_unit, sample, shown)[1]:
            raise InputError(
                f"{shown}: sigma is in {unit.text} and the heat capacity in {choice.heat_capacity_unit.text}; give "
                "--formula or --molar-mass (and --mass for a whole sample)"
            )
        return factor

    if source.estimate is not None:
        return None
    if source.model is not None:
        usable = np.isfinite(temperature) & (temperature > 0) & np.isfinite(heat_capacity) & (heat_capacity > 0)
        sigma = np.full(temperature.shape, math.nan)
        sigma[usable] = source.model.evaluate(temperature[usable], heat_capacity[usable], factor_of, shown)
    elif cells.sigma is not None:
        sigma = cells.sigma * (heat_capacity / 100 if source.unit is None else factor_of(source.unit))
    elif np.isfinite(cells.written_sigma).any():
        _refuse_gaps(choice, cells, shown)
        sigma = cells.written_sigma * factor_of(choice.heat_capacity_unit)
    elif source.coverage_factor is not None:
        raise InputError(f"{shown}: a coverage factor is given, but no uncertainty is stated; give --sigma as well")
    else:
        return None
    return sigma / (source.coverage_factor or 1.0)


def _refuse_gaps(choice: _Choice, cells: Cells, shown: str) -> None:
    """Refuse a file in which some heat capacities are written with an uncertainty and some without."""
    without = np.flatnonzero(np.isnan(cells.written_sigma) & np.isfinite(cells.heat_capacity))
    if without.size:
        share = f"{without.size} of {cells.heat_capacity.size}"
        raise InputError(
            f"{shown}: {share} values of {quoted(choice.heat_capacity.label)} are written without an uncertainty, the "
            "others with one; give --sigma, or write it with all of them"
        )


def _written_notes(choice: _Choice, cells: Cells) -> list[str]:
    """Say what became of uncertainties that are written with the numbers, as in ``12.34(5)``."""
    notes = []
    if cells.temperature_has_sigma:
        notes.append(f"uncertainties written in {quoted(choice.temperature.label)} are not used")
    if np.isfinite(cells.written_sigma).any():
        name = quoted(choice.heat_capacity.label)
        if choice.sigma.model is not None or choice.sigma.column is not None or choice.sigma.estimate is not None:
            notes.append(f"uncertainties written in {name} are not used: sigma is {choice.sigma.text}")
        else:
            k = choice.sigma.coverage_factor or 1
            notes.append(f"sigma is the uncertainty written with the values of {name}, read as k = {k:g}")
    return notes


# ------------------------------------------------------------------------------------------------------- the record


def _reading(
    source: TextFile, table: Table, columns: tuple[Column, ...], choice: _Choice, cells: Cells, run: RunSettings
) -> Reading:
    def name(column: Column) -> str | int:
        alone = (table.headers or ()).count(column.header or "") == 1
        return column.header if column.header and alone else column.index + 1

    sigma = choice.sigma.column
    settings = replace(
        run,
        quantity=choice.quantity,
        temperature=name(choice.temperature),
        heat_capacity=name(choice.heat_capacity),
        sigma=choice.sigma.estimate or (run.sigma if sigma is None else name(sigma)),
        coverage_factor=choice.sigma.coverage_factor,
        temperature_unit=choice.temperature_unit.text,
        heat_capacity_unit=choice.heat_capacity_unit.text,
        worksheet=source.worksheet,
    )
    return Reading(
        path=source.path,
        file=source.name,
        sha256=source.sha256,
        label=run.label or Path(run.file).stem,
        encoding=source.encoding,
        delimiter=table.delimiter,
        decimal=cells.decimal,
        temperature_column=choice.temperature.label,
        heat_capacity_column=choice.heat_capacity.label,
        sigma_column=None if sigma is None else sigma.label,
        temperature_unit=choice.temperature_unit.text,
        heat_capacity_unit=choice.heat_capacity_unit.text,
        rows=len(table.rows),
        settings=settings,
        unused_columns=unused_columns(columns, choice.columns, run, shown_name(run.file)),
    )

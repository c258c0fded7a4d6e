"""A file of a known heat capacity: read like a run, drawn as a smooth curve, with how much of it there was."""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING

from ..errors import InputError
from ..records import AddendaSettings, Measurement, RunSettings
from .addenda_amount import Amount, amount_of
from .headers import Column, describe_columns, is_uncertainty_of_anything, normal_name
from .table import find_table
from .text import load_text
from .wording import listed, quoted, shown_name

if TYPE_CHECKING:
    from .addenda_curve import AddendaCurve

__all__ = ["Known", "read_known"]


@dataclass(frozen=True)
class Known:
    """One entry of addenda that has been read: settings with every choice made, file, curve, how much there was."""

    settings: AddendaSettings
    file: Measurement
    curve: AddendaCurve
    amount: Amount

    @property
    def shown(self) -> str:
        """What messages call it."""
        return shown_name(self.settings.file)


def read_known(entry: AddendaSettings, folder: Path, read: Callable[[RunSettings], Measurement]) -> Known:
    """Read one entry of addenda.

    Parameters
    ----------
    entry : AddendaSettings
    folder : Path
        Where a relative file name starts from.
    read : callable
        Reads one file as a run of a sample of which nothing is known.

    Raises
    ------
    InputError
        If the file cannot be read, is in a unit that does not fit the entry, or holds too few temperatures.
    """
    from .addenda_curve import smooth_curve  # scipy's splines take a while to load

    shown = shown_name(entry.file)
    run = RunSettings(
        file=entry.file,
        quantity="Cp",
        temperature=entry.temperature,
        heat_capacity=entry.heat_capacity,
        sigma=entry.sigma,
        coverage_factor=entry.coverage_factor,
        temperature_unit=entry.temperature_unit,
        heat_capacity_unit=entry.heat_capacity_unit,
        worksheet=entry.worksheet,
        temperature_scale=entry.temperature_scale,
    )
    file = _read(run, folder, read)
    amount = amount_of(entry, file.basis, file.readings[0].heat_capacity_unit)
    try:
        curve = smooth_curve(file.temperature, file.heat_capacity, file.sigma)
    except InputError as error:
        raise InputError(f"the addenda file {shown} {error}") from None
    resolved = file.readings[0].settings
    settings = replace(
        entry,
        temperature=resolved.temperature,
        heat_capacity=resolved.heat_capacity,
        sigma=resolved.sigma,
        coverage_factor=resolved.coverage_factor,
        temperature_unit=resolved.temperature_unit,
        heat_capacity_unit=resolved.heat_capacity_unit,
        worksheet=resolved.worksheet,
    )
    return Known(settings, file, curve, amount)


def _read(run: RunSettings, folder: Path, read: Callable[[RunSettings], Measurement]) -> Measurement:
    """Read the file; a column named addenda, which in no other file is the heat capacity, has a claim to be it here."""
    named = [] if run.heat_capacity is not None else _addenda_columns(run, folder)
    try:
        file = read(run)
    except InputError as error:
        if len(named) != 1:
            raise InputError(_by_key(str(error))) from None
        return _read(replace(run, heat_capacity=named[0].index + 1), folder, read)
    labels = [column.label for column in named]
    chosen = file.readings[0].heat_capacity_column
    if labels and chosen not in labels:
        raise InputError(
            f"{shown_name(run.file)}: columns {listed([chosen, *labels])} may each be the addenda; choose one by "
            f"heat_capacity = {quoted(labels[0])} in its [[addenda]] in a run sheet"
        )
    return file


def _addenda_columns(run: RunSettings, folder: Path) -> list[Column]:
    try:
        table = find_table(load_text(folder / run.file, run.file, run.worksheet))
    except InputError:  # reading it says so
        return []
    columns = describe_columns(table.headers or [None] * table.width)
    free = [column for column in columns if not is_uncertainty_of_anything(column)]
    return [column for column in free if "addenda" in normal_name(column.name)]


def _by_key(message: str) -> str:
    """Say which keys of a run sheet do what a message advises by options, which concern the runs."""
    keys = "temperature|heat-capacity|temperature-unit|heat-capacity-unit|sigma|coverage-factor|worksheet"
    message = re.sub(r", or leave the line out by --mask-lines \d+$", "", message)  # addenda have no such key
    plain = re.sub(rf"--({keys})(?![-\w])", lambda option: option[1].replace("-", "_"), message)
    return message if plain == message else f"{plain} (keys of its [[addenda]] in a run sheet)"

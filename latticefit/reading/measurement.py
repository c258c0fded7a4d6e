"""From settings to a Measurement: the files of one sample, read one by one and joined in order."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path

import numpy as np

from ..errors import InputError
from ..records import AddendaSettings, Measurement, Reading, Repair, RunSettings, SampleSettings
from ..sample import build_sample, converted_by_mass, sample_notes
from ..units import heat_capacity_unit
from .addenda import take_off
from .run import RunData, read_run
from .temperature_scale import on_its90
from .wording import quoted

__all__ = ["labelled", "read_measurement"]


def read_measurement(
    sample: SampleSettings,
    runs: Sequence[RunSettings],
    base: Path | None = None,
    addenda: Sequence[AddendaSettings] = (),
) -> Measurement:
    """Read the files of one sample.

    Parameters
    ----------
    sample : SampleSettings
        Formula, masses: what converts the heat capacity to J/(mol K). Without them it stays per gram or per sample.
    runs : sequence of RunSettings
        The files and how each is to be read, joined in this order.
    base : Path, optional
        Folder that relative file names start from; the current one by default.
    addenda : sequence of AddendaSettings
        Known heat capacities that are in the data and are taken off.

    Returns
    -------
    Measurement
        With every repair and every row left out listed; ``readings[i].settings`` reads file i the same way again.

    Raises
    ------
    InputError
        If a file, a choice or the sample is wrong: one sentence with file, line, column and value where they exist.
    """
    if not runs:
        raise InputError("no file is given; name at least one")
    named = labelled(runs)
    built = build_sample(sample, Path(runs[0].file).stem)
    folder = Path() if base is None else base
    parts: list[RunData] = []
    for run in named:
        parts.append(read_run(built, run, folder / run.file, sum(len(part.division.names) for part in parts)))
    _refuse_unlike(parts)
    aside = tuple(why for part in parts for why in part.set_aside)
    stated = [part.sigma for part in parts if part.sigma is not None]
    measurement = Measurement(
        sample=built,
        temperature=np.concatenate([part.temperature for part in parts]),
        heat_capacity=np.concatenate([part.heat_capacity for part in parts]),
        sigma=np.concatenate(stated) if stated else None,
        run=np.concatenate([part.run for part in parts]),
        line=np.concatenate([part.line for part in parts]),
        quantity=parts[0].quantity,
        basis=parts[0].basis,
        sigma_text=_sigma_text(parts),
        readings=_readings(parts),
        repairs=(
            *(Repair("sample", None, note) for note in sample_notes(sample)),
            *_same_content(parts),
            *(repair for part in parts for repair in part.repairs),
        ),
        excluded=tuple(row for part in parts for row in part.excluded),
        sample_settings=sample,
        set_aside=aside if any(why is not None for why in aside) else (),
    )
    return take_off(
        on_its90(_with_mass_note(measurement, bool(addenda))),
        addenda,
        folder,
        lambda run: read_measurement(SampleSettings(atoms=1), (run,), folder),
    )


def _with_mass_note(measurement: Measurement, with_addenda: bool) -> Measurement:
    """Say so where a mass converts nothing: its uncertainty is stated, or every run is per mole."""
    sample = measurement.sample
    if sample.mass is None or measurement.basis == "sample" or converted_by_mass(measurement):
        return measurement
    bases = {heat_capacity_unit(each.heat_capacity_unit).basis for each in measurement.readings}
    if sample.mass_u is not None:
        words = "the mass and its uncertainty are not used: no run is in J/K"
    elif bases <= {"mol", "mol_atoms"} and not with_addenda:  # addenda in J/K need the mass
        words = "the mass is not used: every run is per mole"
    else:
        return measurement
    note = Repair("sample", None, words)
    return replace(measurement, repairs=(note, *measurement.repairs))


def labelled(runs: Sequence[RunSettings]) -> list[RunSettings]:
    """Give every run a label of its own; one that is made up gets a number where it would repeat another."""
    given = Counter(run.label for run in runs if run.label)
    repeated = next((label for label, count in given.items() if count > 1), None)
    if repeated is not None:
        raise InputError(f"two runs carry the label {quoted(repeated)}; give each its own")
    used = set(given)
    labelled = []
    for run in runs:
        label, number = run.label or Path(run.file).stem, 2
        while not run.label and label in used:
            label, number = f"{Path(run.file).stem} {number}", number + 1
        used.add(label)
        labelled.append(replace(run, label=label))
    return labelled


def _readings(parts: Sequence[RunData]) -> tuple[Reading, ...]:
    """Return how each run was read; those of one file, divided by a column, differ in label and rows alone."""
    readings = []
    for part in parts:
        labels = part.division.labels(part.reading.label, len(parts) == 1)
        rows = np.bincount(part.division.of_row, minlength=len(labels)).tolist()
        readings += [replace(part.reading, label=label, rows=n) for label, n in zip(labels, rows, strict=True)]
    label, count = Counter(each.label for each in readings).most_common(1)[0]
    if count > 1:
        raise InputError(f"two runs would carry the label {quoted(label)}; give their files labels of their own")
    return tuple(readings)


def _refuse_unlike(parts: Sequence[RunData]) -> None:
    first = parts[0]
    for part in parts[1:]:
        pair = f"runs {quoted(first.reading.label)} and {quoted(part.reading.label)}"
        if part.quantity != first.quantity:
            raise InputError(f"{pair} are {first.quantity} and {part.quantity}; they cannot be fitted as one")
        if part.basis != first.basis:
            units = f"{first.reading.heat_capacity_unit} and {part.reading.heat_capacity_unit}"
            raise InputError(f"{pair} are in {units}; give --formula or --molar-mass (and --mass) to join them")
        if (part.sigma is None) != (first.sigma is None):
            silent = part if part.sigma is None else first
            word = silent.reading.settings.sigma
            if word is not None:
                raise InputError(
                    f"{pair}: one states an uncertainty and that of the other is to be estimated from {word}; state "
                    f"one for {quoted(silent.reading.label)} too, or give both --sigma {word}"
                )
            raise InputError(
                f"{pair}: only one states an uncertainty; give {quoted(silent.reading.label)} one in a run sheet, as "
                "sigma = '1%' in its [[run]], or estimate both by --sigma scatter"
            )


def _sigma_text(parts: Sequence[RunData]) -> str:
    texts = [part.sigma_text for part in parts]
    if len(set(texts)) == 1:
        return texts[0]
    return "; ".join(f"{part.reading.label}: {part.sigma_text}" for part in parts)


def _same_content(parts: Sequence[RunData]) -> list[Repair]:
    seen: dict[str, str] = {}
    repairs = []
    for part in parts:
        other = seen.setdefault(part.reading.sha256, part.reading.label)
        if other != part.reading.label:
            note = (
                f"the file of run {quoted(part.reading.label)} is the same, byte for byte, as that of {quoted(other)}"
            )
            repairs.append(Repair(part.reading.file, None, note))
    return repairs

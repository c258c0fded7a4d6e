"""An invented sample, its files on disk, and the records of reading and preparing, for tests of the report."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from invented_solid import Truth

from latticefit.records import (
    ExcludedRow,
    FloatArray,
    Measurement,
    PreparedData,
    Reading,
    Repair,
    RunSettings,
    Sample,
    SampleSettings,
)


@dataclass(frozen=True)
class Case:
    """One invented sample and how it was measured."""

    name: str
    formula: str
    truth: Truth
    T: FloatArray
    quantity: str = "Cp"
    mask: tuple[tuple[float, float], ...] = ()
    runs: int = 1
    excluded: bool = False
    withheld: bool = False
    misfit: float = 0.0
    stated: bool = True


def _write_files(case: Case, folder: Path, run: np.ndarray, C: FloatArray) -> list[Path]:
    paths = []
    for number in range(case.runs):
        place = folder / (f"run{number}" if case.runs > 1 else ".")
        place.mkdir(parents=True, exist_ok=True)
        path = place / "halden.csv"  # two runs have one basename: a report must keep them apart
        rows = [f"{t!r},{c!r}" for t, c in zip(case.T[run == number].tolist(), C[run == number].tolist(), strict=True)]
        path.write_text("# invented data\nT_K,Cp_J_molK\n" + "\n".join(rows) + "\n", encoding="utf-8")
        paths.append(path)
    return paths


def measurement_of(case: Case, folder: Path, C: FloatArray, sigma: FloatArray) -> Measurement:
    """The measurement of a case, its files written under `folder`."""
    run = np.arange(case.T.size) % case.runs
    paths = _write_files(case, folder, run, C)
    readings = tuple(
        Reading(
            path=str(path),
            file=path.name,
            sha256=hashlib.sha256(path.read_bytes()).hexdigest(),
            label=f"run {number + 1}",
            encoding="utf-8",
            delimiter=",",
            decimal=".",
            temperature_column="T_K",
            heat_capacity_column="Cp_J_molK",
            sigma_column=None,
            temperature_unit="K",
            heat_capacity_unit="J/(mol K)",
            rows=int(np.sum(run == number)),
            settings=RunSettings(file=path.name, mask=case.mask),
        )
        for number, path in enumerate(paths)
    )
    excluded, repairs = (), ()
    if case.excluded:
        excluded = (
            ExcludedRow(0, 11, 12.0, float("nan"), float("nan"), "the heat capacity is not a number"),
            ExcludedRow(0, 12, 14.0, -0.2, float("nan"), "the heat capacity is not above 0"),
        )
        repairs = tuple(Repair(readings[0].file, each.line, f"row left out: {each.reason}") for each in excluded)
    settings = SampleSettings(name=case.name, formula=case.formula)
    return Measurement(
        sample=Sample(case.name, case.formula, case.truth.atoms, 0.0635 * case.truth.atoms),
        temperature=case.T,
        heat_capacity=C,
        sigma=sigma if case.stated else None,
        run=run,
        line=np.arange(case.T.size) // case.runs + 3,
        quantity=case.quantity,
        basis="mol",
        sigma_text="1 % of the heat capacity, as stated",
        readings=readings,
        repairs=repairs,
        excluded=excluded,
        sample_settings=settings,
    )


def prepared_of(case: Case, measurement: Measurement, sigma: FloatArray) -> PreparedData:
    """The points of a case that are fitted: all but the masked ones."""
    masked = np.zeros(case.T.size, dtype=bool)
    for low, high in case.mask:
        masked |= (low <= case.T) & (low <= high) & (high >= case.T)
    index = np.flatnonzero(~masked)
    index = index[np.argsort(case.T[index], kind="stable")]
    return PreparedData(
        measurement=measurement,
        temperature=case.T[index],
        heat_capacity=measurement.heat_capacity[index],
        sigma=sigma[index],
        run=measurement.run[index],
        index=index,
        reasons=tuple("masked: 28:33 K" if each else None for each in masked),
        sigma_kind="stated" if case.stated else "estimated",
        sigma_text="1 % of the heat capacity, as stated"
        if case.stated
        else "0.98 % of the heat capacity, estimated from the local scatter of the points",
    )

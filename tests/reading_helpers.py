"""Helpers of the reading tests: write a text to a file and read it (invented data throughout)."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from latticefit.reading import read_measurement
from latticefit.records import Measurement, RunSettings, SampleSettings

MASS_NOT_USED = "the mass is not used: every run is per mole"
SAMPLE = SampleSettings(formula="Cu", mass="10 mg")


def read_text(folder: Path, text: str | bytes, sample: SampleSettings = SAMPLE, **choices: Any) -> Measurement:
    """Read a text as the file ``run.csv`` of a sample of copper, 10 mg, with the choices given."""
    (folder / "run.csv").write_bytes(text if isinstance(text, bytes) else text.encode("utf-8"))
    return read_measurement(sample, (RunSettings("run.csv", **choices),), base=folder)


def messages(measurement: Measurement) -> list[str]:
    """What the reader noted on the file, without its name."""
    return [repair.message for repair in measurement.repairs if repair.message != MASS_NOT_USED]

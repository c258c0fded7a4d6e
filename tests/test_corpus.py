"""The corpus: one small file per way of writing and per defect, each with its arrays or its sentence."""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

import pytest
from helpers import ROOT
from numpy.testing import assert_allclose
from reading_helpers import MASS_NOT_USED, SAMPLE

from latticefit.errors import InputError
from latticefit.reading import read_measurement
from latticefit.reading.settings import ADDENDA, RUN, checked
from latticefit.records import AddendaSettings, Measurement, RunSettings

CORPUS = ROOT / "tests" / "corpus"
CASES = tomllib.loads((CORPUS / "expected.toml").read_text(encoding="utf-8"))["case"]


@pytest.mark.parametrize("case", CASES, ids=[case["file"] for case in CASES])
def test_file_of_the_corpus(case: dict[str, Any]) -> None:
    """The file gives its arrays and every repair with its line, or is refused in its sentence."""
    if "refused" in case:
        with pytest.raises(InputError) as caught:
            _read(case)
        assert str(caught.value) == case["refused"]
        return
    measurement = _read(case)
    assert_allclose(measurement.temperature, case["temperature_K"], rtol=1e-12)
    assert_allclose(measurement.heat_capacity, case["heat_capacity_J_molK"], rtol=1e-6)
    assert (measurement.sigma is None) == ("sigma_J_molK" not in case)
    if measurement.sigma is not None:
        assert_allclose(measurement.sigma, case["sigma_J_molK"], rtol=1e-12)
    assert [each.label for each in measurement.readings] == case.get("labels", [Path(case["file"]).stem])
    assert measurement.run.tolist() == case.get("run", [0] * measurement.run.size)
    assert [why or "" for why in measurement.set_aside] == case.get("set_aside", [])
    noted = [repair for repair in measurement.repairs if repair.message != MASS_NOT_USED]
    assert [_line(repair.line) + repair.message for repair in noted] == case["repairs"]


def _read(case: dict[str, Any]) -> Measurement:
    run = RunSettings(case["file"], **checked(case.get("options", {}), RUN))
    addenda = [AddendaSettings(**checked(each, ADDENDA)) for each in case.get("addenda", [])]
    return read_measurement(SAMPLE, (run,), CORPUS, addenda)


def _line(number: int | None) -> str:
    return "" if number is None else f"line {number}: "


def test_every_file_is_expected_and_says_that_it_is_invented() -> None:
    """No file lies in the corpus untested; the text files say "invented data"."""
    files = {path.name for path in CORPUS.iterdir()} - {"expected.toml"}
    assert files == {case["file"] for case in CASES}
    assert len(files) >= 60
    for name in files:
        data = (CORPUS / name).read_bytes().replace(b"\x00", b"")
        assert b"invented data" in data or name.endswith((".xlsx", ".ods")), name


@pytest.mark.parametrize("case", [case for case in CASES if "refused" not in case], ids=lambda case: case["file"])
def test_reading_is_repeated_by_its_settings(case: dict[str, Any]) -> None:
    """The settings of a reading read the file again in the same way, to the last bit."""
    first = _read(case)
    again = read_measurement(SAMPLE, (first.readings[0].settings,), CORPUS, first.addenda_settings)
    for name in ("temperature", "heat_capacity", "line", "run", "set_aside", "readings", "addenda", "addenda_readings"):
        assert repr(getattr(again, name)) == repr(getattr(first, name))

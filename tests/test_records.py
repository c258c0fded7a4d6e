"""Records are read-only, also in copies, and can be compared, hashed, copied and pickled."""

from __future__ import annotations

import copy
import dataclasses
import pickle
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
from analysis_factory import METAL, build
from helpers import prepared_data

from latticefit import Fit, records
from latticefit.records import Analysis, ModelSettings, Provenance, ReadOnly, RunSettings, SampleSettings, Sheet

COPIES: dict[str, Callable[[Any], Any]] = {
    "pickle": lambda held: pickle.loads(pickle.dumps(held)),
    "deepcopy": copy.deepcopy,
    "copy": copy.copy,
}


@pytest.fixture(scope="module")
def analysis(tmp_path_factory: pytest.TempPathFactory) -> Analysis:
    """An invented analysis with every kind of record."""
    return build(METAL, tmp_path_factory.mktemp("records"))


def arrays(held: Any) -> list[np.ndarray[Any, Any]]:
    """Every array inside a record, however deep."""
    if isinstance(held, np.ndarray):
        return [held]
    if isinstance(held, ReadOnly):
        return [array for value in held.values() for array in arrays(value)]
    if isinstance(held, tuple):
        return [array for value in held for array in arrays(value)]
    if dataclasses.is_dataclass(held):
        return [array for entry in dataclasses.fields(held) for array in arrays(getattr(held, entry.name))]
    return []


@pytest.mark.parametrize("way", COPIES)
def test_a_copy_holds_the_same_and_stays_read_only(way: str, analysis: Analysis) -> None:
    """A pickled or copied Fit has every array of the original, read-only, and no mapping that can be changed."""
    again = COPIES[way](Fit(analysis)).analysis
    for old, new in zip(arrays(analysis), arrays(again), strict=True):
        np.testing.assert_array_equal(old, new)
        assert not new.flags.writeable
    assert len(arrays(again)) > 40
    assert again.sheet == analysis.sheet
    with pytest.raises(TypeError):
        again.derived.table.components["debye"] = 0


def test_arrays_inside_a_mapping_are_read_only(analysis: Analysis) -> None:
    """Heat capacities of the terms cannot be overwritten."""
    with pytest.raises(ValueError, match="read-only"):
        analysis.derived.table.components["debye"][0] = 1.0


def test_asdict_of_the_whole_analysis(analysis: Analysis) -> None:
    """`dataclasses.asdict` gives plain dicts of everything."""
    found = dataclasses.asdict(Fit(analysis))
    assert found["analysis"]["fit"]["terms"] == analysis.fit.terms
    assert dict(found["analysis"]["provenance"]["packages"]) == dict(analysis.provenance.packages)


@pytest.mark.parametrize("name", [each for each in records.__all__ if dataclasses.is_dataclass(getattr(records, each))])
def test_records_with_arrays_are_equal_to_themselves_alone(name: str) -> None:
    """No record compares its arrays: the truth of an array is undefined."""
    kind = getattr(records, name)
    if any("FloatArray" in str(entry.type) or "NDArray" in str(entry.type) for entry in dataclasses.fields(kind)):
        assert kind.__eq__ is object.__eq__
        assert kind.__hash__ is object.__hash__


def test_measurements_and_settings_can_be_compared_and_hashed(analysis: Analysis) -> None:
    """Equality never raises; settings with equal content are equal and have one hash."""
    T = np.array([1.0, 2.0])
    first, second = (prepared_data(T, T, T).measurement for _ in range(2))
    assert first == first
    assert first != second
    assert len({first, second, analysis, Fit(analysis)}) == 4
    for make in (
        lambda: Sheet(SampleSettings(), (RunSettings("a"),), ModelSettings("debye", start={"debye_theta": 3.0})),
        lambda: Provenance("1", "now", 0, {"numpy": "2"}, ""),
        lambda: ModelSettings(bounds={"debye_theta": (1.0, 2.0)}),
    ):
        assert make() == make()
        assert hash(make()) == hash(make())


def test_a_measurement_shows_itself_in_short() -> None:
    """`repr` is one line with name, points and range; names from files cannot act in a terminal or a page."""
    T = np.array([2.0, 300.0])
    measurement = prepared_data(T, T, T).measurement
    assert repr(measurement) == "<Measurement 'invented': 2 points, 2 to 300 K, Cp in J/(mol K)>"
    named = dataclasses.replace(measurement, sample=records.Sample("<b>\x1b\u202e", formula="Cu"))
    assert repr(named).startswith(r"<Measurement '<b>\x1b\u202e' ('Cu'): 2 points")
    page = named._repr_html_()
    assert "<b>" not in page
    assert "\x1b" not in page
    for word in ("sample", "invented.csv", "points", "2 to 300 K", "Cp in J/(mol K)", "as stated"):
        assert word in page
    assert len(page) < 1000

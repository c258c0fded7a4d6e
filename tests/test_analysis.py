"""The Python contract: what `read`, `fit` and `Fit` accept, what they refuse, and how they show themselves."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
from analysis_factory import METAL, build
from helpers import DEMO

import latticefit as lf
from latticefit.records import Measurement
from latticefit.report import summary_text, text_report

FILE = DEMO / "norrium.csv"


@pytest.fixture(scope="module")
def measurement() -> Measurement:
    """A demo file."""
    return lf.read(FILE, atoms=1)


@pytest.fixture(scope="module")
def fit(tmp_path_factory: pytest.TempPathFactory) -> lf.Fit:
    """An invented result in the shape of a finished fit."""
    return lf.Fit(build(METAL, tmp_path_factory.mktemp("fit")))


def said(sentence: str) -> str:
    assert "\n" not in sentence
    return sentence


@pytest.mark.parametrize(
    ("given", "sentence"),
    [
        ({"molar_mass": 63.5}, 'molar_mass must be a text with its unit, such as "101.96 g/mol", not 63.5'),
        ({"mass": 12}, 'mass must be a text with its unit, such as "12.3 mg", not 12'),
        ({"melting_point": 1358}, 'melting_point must be a text with its unit, such as "1358 K", not 1358'),
        ({"atoms": "2"}, "atoms must be a number without quotes, not '2'"),
        ({"atoms": True}, "atoms must be a number, not true or false"),
        ({"atoms": 10**400}, "atoms must be a number, not a huge number"),
        ({"atoms": float("nan")}, "atoms must be a number, not nan"),
        ({"atoms": 0}, "atoms must be above 0, not 0"),
        ({"coverage_factor": "2"}, "coverage_factor must be a number without quotes, not '2'"),
        ({"quantity": "cp"}, "quantity cannot be 'cp': known are Cp and Cv"),
        ({"quantity": ["Cp"]}, "quantity cannot be a list: known are Cp and Cv"),
        ({"formula": 29}, "formula must be a text in quotes, not 29"),
        ({"name": " "}, "name is empty; leave it out or fill it in"),
        ({"temperature": 0}, "temperature must be a header in quotes or a column number from 1 on, not 0"),
        ({"heat_capacity": True},
         "heat_capacity must be a header in quotes or a column number from 1 on, not true or false"),
        ({"sigma": 0.5}, 'sigma must be a column or a text such as "0.5%", not 0.5'),
        ({"temperature_unit": 3}, "temperature_unit must be a text in quotes, not 3"),
        ({"heat_capacity_unit": b"J"}, "heat_capacity_unit must be a text in quotes, not a value of type bytes"),
    ],
)  # fmt: skip
def test_wrong_arguments_of_read(given: dict[str, Any], sentence: str) -> None:
    """A wrong argument of `read` is refused in one sentence that names it."""
    with pytest.raises(lf.InputError) as caught:
        lf.read(FILE, **given)
    assert said(str(caught.value)) == sentence


@pytest.mark.parametrize(
    ("files", "sentence"),
    [
        (3, "files must be a path or several, not 3"),
        (None, "files must be a path or several, not None"),
        ([3], "files must be a path or several, not 3"),
        (b"a.csv", "files must be a path or several, not a value of type bytes"),
        ("", "files must be a path or several, not ''"),
        ([], "files names no file; give at least one"),
    ],
)
def test_wrong_files(files: Any, sentence: str) -> None:
    """What is no file name is refused."""
    with pytest.raises(lf.InputError) as caught:
        lf.read(files)
    assert str(caught.value) == sentence


@pytest.mark.parametrize(
    ("given", "sentence"),
    [
        ({"terms": 3}, "terms must be a text in quotes, not 3"),
        ({"mode_sum": "fred"}, "mode_sum cannot be 'fred': did you mean 'free'?"),
        ({"cp_cv": 3}, "cp_cv must be a text in quotes, not 3"),
        ({"cp_cv": "fred"}, "'fred' is not a form of Cp-Cv; known are anharmonic, nernst-lindemann and none"),
        ({"bounds": {"debye_theta": (5,)}},
         "bounds debye_theta must be [low, high], where a side may be -inf or inf, not a tuple"),
        ({"bounds": {"debye_theta": (5, float("nan"))}},
         "bounds debye_theta must be [low, high], where a side may be -inf or inf, not a tuple"),
        ({"bounds": {"debye_theta": (9, 5)}},
         "bounds debye_theta: the lower bound must be below the upper one, not [9, 5]"),
        ({"bounds": {"debye_theta": "x"}}, "bounds debye_theta must be [low, high], not 'x'"),
        ({"start": {"debye_theta": "300"}}, "start debye_theta must be a number without quotes, not '300'"),
        ({"start": {3: 300}}, "a parameter name in start must be a text in quotes, not 3"),
        ({"start": 300}, "start must be a table of parameter names, not 300"),
        ({"fix": {"debye_thteta": 300}},
         "fix names 'debye_thteta', which the model 'debye' does not have; did you mean 'debye_theta'?"),
        ({"window": 5}, 'window must be a text such as "2:300" or a list of them, not 5'),
        ({"window": (2,)}, 'window must be a text such as "2:300" or a list of them, not a tuple'),
        ({"window": (2, 3, 4)}, 'window must be a text such as "2:300" or a list of them, not a tuple'),
        ({"window": [2, 300]}, 'window must be a text such as "2:300" or a list of them, not a list'),
        ({"window": (300, 2)}, "window: interval '300:2' ends below its start; write it low:high"),
        ({"mask": [(-1, 2)]}, "mask: interval '-1:2' starts below 0 K"),
        ({"mask": (float("nan"), 2)}, "mask: interval 'nan:2' must be low:high in K, as in '2:300', '2:' or ':300'"),
        ({"grid": [0, 1]}, "grid must be above 0 K and finite, not 0"),
        ({"grid": []}, "grid must hold 1 to 100000 temperatures, not none"),
        ({"grid": "1:2"}, "grid: grid '1:2': '1:2' is neither a temperature nor low:high:step; write it as in "
         "'0.5:5:0.5, 10:300:10, 298.15'"),
        ({"random_seed": -1}, "random_seed must be a whole number from 0 on, not -1"),
        ({"random_seed": 1.5}, "random_seed must be a whole number from 0 on, not 1.5"),
    ],
)  # fmt: skip
def test_wrong_arguments_of_fit(given: dict[str, Any], sentence: str, measurement: Measurement) -> None:
    """A wrong argument of `fit` is refused before anything is fitted, in one sentence that names it."""
    with pytest.raises(lf.InputError) as caught:
        lf.fit(measurement, **{"terms": "debye", **given})
    assert said(str(caught.value)) == sentence


def test_fit_wants_a_measurement() -> None:
    """A file name is no measurement."""
    with pytest.raises(
        lf.InputError, match=r"^measurement must be a Measurement from latticefit\.read, not 'run\.csv'"
    ):
        lf.fit("run.csv", "debye")  # type: ignore[arg-type]


def test_friendly_forms_mean_the_same(measurement: Measurement) -> None:
    """Pairs are intervals and bounds, numbers are a grid, as their texts are."""
    plain: dict[str, Any] = {
        "window": "20:300",
        "mask": ["40:60", "70:80"],
        "bounds": {"debye_theta": "100:900"},
        "grid": "10, 20.5",
    }
    friendly: dict[str, Any] = {
        "window": (20, np.float64(300)),
        "mask": [(40, 60), "70:80"],
        "bounds": {"debye_theta": [100, np.int64(900)]},
        "grid": np.array([10, 20.5]),
    }
    first, second = (lf.fit(measurement, "debye", **each).analysis for each in (plain, friendly))
    assert first.prepared.reasons == second.prepared.reasons
    assert first.sheet.runs == second.sheet.runs
    assert first.sheet.model == second.sheet.model
    assert first.derived.table.temperature.tolist() == second.derived.table.temperature.tolist()
    command = (
        "latticefit.fit(measurement, 'debye', bounds={'debye_theta': (100.0, 900.0)}, window=((20.0, 300.0),), "
        "mask=((40.0, 60.0), (70.0, 80.0)), grid='10.0, 20.5')"
    )
    assert second.provenance.command == command


def test_provenance_of_a_long_call_is_short(measurement: Measurement) -> None:
    """The command of a Python fit is the call with what is not at its default, long values cut."""
    found = lf.fit(measurement, "debye", grid=range(1, 300), random_seed=7).analysis.provenance.command
    assert found.startswith("latticefit.fit(measurement, 'debye', grid='1.0, 2.0, ")
    assert found.endswith("..., random_seed=7)")
    assert len(found) < 140


@pytest.mark.parametrize("given", [298.15, [298.15], (298.15,), np.array([298.15]), "298.15", iter([298.15])])
def test_table_takes_a_number_numbers_or_a_text(given: Any, fit: lf.Fit) -> None:
    """One temperature in any form gives its one row."""
    assert fit.table(given)["temperature_K"].tolist() == [298.15]


@pytest.mark.parametrize(
    ("given", "sentence"),
    [
        ([-1], "temperature must be above 0 K and finite, not -1"),
        ([0], "temperature must be above 0 K and finite, not 0"),
        (float("nan"), "temperature must be above 0 K and finite, not nan"),
        ([1, float("inf")], "temperature must be above 0 K and finite, not inf"),
        (["1"], "temperature must be above 0 K and finite, not '1'"),
        (np.ones((2, 2)), "temperature must be above 0 K and finite, not a value of type ndarray"),
        (np.array(5.0), 'temperature must be numbers in K or a text such as "10:300:10", not a value of type ndarray'),
        (True, 'temperature must be numbers in K or a text such as "10:300:10", not true or false'),
        ({300: 1}, 'temperature must be numbers in K or a text such as "10:300:10", not a table'),
        ([], "temperature must hold 1 to 100000 temperatures, not none"),
        (range(1, 100_002), "temperature must hold 1 to 100000 temperatures, not 100001"),
    ],
)
def test_wrong_temperatures_of_a_table(given: Any, sentence: str, fit: lf.Fit) -> None:
    """What is no temperature gets no row but a sentence."""
    with pytest.raises(lf.InputError) as caught:
        fit.table(given)
    assert str(caught.value) == sentence


def test_wrong_names_of_figures_and_folders(fit: lf.Fit, tmp_path: Path) -> None:
    """`figure` and `save` refuse what they cannot use."""
    with pytest.raises(lf.InputError, match="name must be the name of a figure, not 3"):
        fit.figure(3)  # type: ignore[arg-type]
    with pytest.raises(lf.InputError, match="did you mean 'residuals'"):
        fit.figure("residual")
    with pytest.raises(lf.InputError, match="out must be a folder to write to, not 3"):
        fit.save(3)  # type: ignore[arg-type]
    with pytest.raises(lf.InputError, match="figures cannot be 'pdf'"):
        fit.save(tmp_path / "a", figures="pdf")


def test_a_fit_shows_its_summary(fit: lf.Fit) -> None:
    """`repr` is the summary that the command prints, `str` the text report."""
    assert repr(fit) == summary_text(fit.analysis, None).rstrip()
    assert str(fit) == text_report(fit.analysis)
    assert len(repr(fit)) < 2000
    assert "<" in fit._repr_html_()

"""table.csv, residuals.csv and the DataFrames."""

from __future__ import annotations

import csv
import io
from dataclasses import replace
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from analysis_factory import CASES, build, renamed

from latticefit.records import Analysis
from latticefit.report import (
    characteristic_temperatures_frame,
    functions_frame,
    parameters_frame,
    residuals_csv,
    residuals_frame,
    result_record,
    table_csv,
    warnings_frame,
)


@pytest.fixture(scope="module")
def metal(tmp_path_factory: pytest.TempPathFactory) -> Analysis:
    """Two runs, masked points, rows left out at reading."""
    return build(CASES["metal"], tmp_path_factory.mktemp("metal"))


@pytest.mark.parametrize("name", CASES)
def test_table_csv_repeats_result_json(name: str, tmp_path: Path) -> None:
    """Columns are the keys of thermodynamic_functions, and every cell the same number to the last digit."""
    found = build(CASES[name], tmp_path)
    rows = result_record(found)["thermodynamic_functions"]
    read = list(csv.DictReader(io.StringIO(table_csv(found))))
    assert list(read[0]) == list(rows[0])
    for cells, row in zip(read, rows, strict=True):
        for key, value in row.items():
            assert cells[key] == "" if value is None else cells[key] in (str(value), repr(value))


def test_residuals_csv_holds_every_row_of_the_files(metal: Analysis) -> None:
    """Fitted, masked and excluded rows are all there, in the order of the files, each used or with its reason."""
    read = pd.read_csv(io.StringIO(residuals_csv(metal)))
    measured, excluded = metal.measurement.temperature.size, len(metal.measurement.excluded)
    assert len(read) == measured + excluded
    assert (read["used"] == "yes").sum() == metal.prepared.temperature.size
    assert read.loc[read["used"] == "no", "reason"].notna().all()
    assert read.loc[read["used"] == "yes", "reason"].isna().all()
    for _, run in read.groupby("run", sort=False):
        assert run["line"].is_monotonic_increasing
    assert read["run"].unique().tolist() == ["run 1", "run 2"]


def test_residuals_csv_gives_the_diagnosed_residuals(metal: Analysis) -> None:
    """For fitted points the four residual columns are those of the diagnosis, digit by digit."""
    read = pd.read_csv(io.StringIO(residuals_csv(metal)), dtype=str)
    columns = [name for name in read.columns if name.endswith(("_K", "_percent", "_normalised"))]
    fitted = read.loc[read["used"] == "yes", columns].map(float).sort_values("temperature_K")
    diagnosis = metal.diagnosis
    np.testing.assert_array_equal(fitted["model_J_mol_K"], diagnosis.model)
    np.testing.assert_array_equal(fitted["residual_J_mol_K"], diagnosis.residual)
    np.testing.assert_array_equal(fitted["residual_percent"], diagnosis.residual_percent)
    np.testing.assert_array_equal(fitted["residual_normalised"], diagnosis.residual_normalised)
    np.testing.assert_array_equal(fitted["sigma_J_mol_K"], metal.prepared.sigma)


def test_masked_points_have_a_residual_and_excluded_rows_have_none(metal: Analysis) -> None:
    """A masked point shows how far it lies from the model; a row that was not read shows why."""
    read = pd.read_csv(io.StringIO(residuals_csv(metal)))
    masked = read[read["reason"].fillna("").str.startswith("masked")]
    excluded = read[read["line"].isin([11, 12]) & (read["run"] == "run 1") & read["model_J_mol_K"].isna()]
    np.testing.assert_allclose(
        masked["residual_J_mol_K"], masked["heat_capacity_J_mol_K"] - masked["model_J_mol_K"], rtol=1e-12
    )
    assert (masked["residual_percent"] > 20).all()
    assert len(excluded) == 2
    assert excluded["residual_percent"].isna().all()


def test_masked_points_have_no_sigma_where_sigma_was_estimated(tmp_path: Path) -> None:
    """An estimated sigma belongs to the fitted points only: the cell is empty elsewhere, never a made-up number."""
    found = build(replace(CASES["metal"], stated=False), tmp_path)
    frame = residuals_frame(found)
    masked = frame["reason"].fillna("").str.startswith("masked")
    assert frame.loc[masked, "sigma_J_mol_K"].isna().all()
    assert frame.loc[frame["used"], "sigma_J_mol_K"].notna().all()


@pytest.mark.parametrize("name", ["=1+1", "+1", "-1", "@SUM(A1)", "\t=1", " =1"])
def test_no_cell_is_a_formula(metal: Analysis, name: str) -> None:
    """A label that a spreadsheet would run is written as text; negative numbers stay numbers."""
    read = list(csv.DictReader(io.StringIO(residuals_csv(renamed(metal, name)))))
    assert not read[0]["run"].lstrip().startswith(("=", "+", "-", "@"))
    assert any(row["residual_percent"].startswith("-") for row in read)
    assert all(float(row["residual_percent"] or 0) < 100 for row in read)


def test_control_characters_do_not_reach_a_csv(metal: Analysis) -> None:
    """Line breaks and escape sequences in a label are written as escapes: one line per point."""
    text = residuals_csv(renamed(metal, "a\nb\x1b[2J\r"))
    assert len(text.splitlines()) == 93
    assert "\x1b" not in text


def test_frames_name_their_units(metal: Analysis) -> None:
    """Columns of DataFrames carry the unit, or a unit column says it."""
    assert {"value", "u", "u_fit", "unit", "status"} <= set(parameters_frame(metal).columns)
    temperatures = characteristic_temperatures_frame(metal)
    assert {"value_K", "u_K", "u_fit_K", "definition", "status"} <= set(temperatures.columns)
    assert temperatures.loc["theta_debye_low_temperature", "value_K"] == pytest.approx(326.61, abs=0.01)
    functions = functions_frame(metal.derived.table)
    assert list(functions.columns) == list(result_record(metal)["thermodynamic_functions"][0])
    assert list(residuals_frame(metal).columns) == residuals_csv(metal).splitlines()[0].split(",")
    assert residuals_frame(metal)["used"].dtype == bool


def test_withheld_numbers_are_nan_in_frames(tmp_path: Path) -> None:
    """Columns of numbers stay numeric where values are withheld."""
    found = build(CASES["coldstop"], tmp_path)
    frame = characteristic_temperatures_frame(found)
    assert np.isnan(frame.loc["theta_debye_low_temperature", "value_K"])
    assert frame["value_K"].dtype == float
    functions = functions_frame(found.derived.table)
    assert functions["entropy_u_J_mol_K"].dtype == float
    assert functions["entropy_u_J_mol_K"].isna().sum() == np.sum(found.derived.table.temperature < 50)


def test_warnings_frame_has_its_columns_when_empty(metal: Analysis) -> None:
    """No warning is an empty table, not a missing one."""
    frame = warnings_frame(metal)
    assert frame.empty
    assert list(frame.columns) == ["code", "level", "concerns", "message", "found", "threshold", "advice"]

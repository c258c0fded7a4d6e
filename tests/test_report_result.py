"""result.json: the contract, plain numbers, nothing lost."""

from __future__ import annotations

import json
import math
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from analysis_factory import CASES, build, renamed, undetermined

from latticefit.models import build_model, heat_capacity
from latticefit.records import Analysis
from latticefit.report import json_text, result_record

# Keys of the schema latticefit-result/1 as the project's contract lists them.
CONTRACT: dict[str, set[str]] = {
    "sample": {"name", "formula", "atoms_per_formula_unit", "molar_mass_g_mol"},
    "data": {
        "sources", "quantity", "points_read", "points_fitted", "temperature_min_K", "temperature_max_K", "sigma_kind",
        "repairs",
    },
    "model": {"terms", "mode_sum", "cp_cv", "chosen_because"},
    "covariance": {"names", "matrix", "kind", "scale_factor", "inflation_autocorrelation"},
    "fit": {
        "converged", "chi_square", "chi_square_p", "degrees_of_freedom", "reduced_chi_square", "aicc", "bic",
        "evaluations",
    },
    "residuals": {"rms_percent", "max_abs_percent", "durbin_watson", "runs_test_p"},
    "characteristic_temperatures": {
        "theta_debye_low_temperature", "theta_debye_moment_minus_2", "theta_debye_moment_minus_1",
        "theta_debye_moment_0", "theta_debye_moment_1", "theta_debye_moment_2",
    },
    "zero_point_energy": {"value", "u", "u_fit", "unit"},
    "provenance": {"version", "created", "random_seed", "packages", "command"},
}  # fmt: skip
ROW_KEYS = {
    "temperature_K", "heat_capacity_J_mol_K", "heat_capacity_u_J_mol_K", "enthalpy_J_mol", "enthalpy_u_J_mol",
    "entropy_J_mol_K", "entropy_u_J_mol_K", "gibbs_energy_function_J_mol_K", "gibbs_energy_function_u_J_mol_K",
    "entropy_fraction_below_data", "origin",
}  # fmt: skip
CV_KEYS = {
    "internal_energy_J_mol", "internal_energy_u_J_mol", "helmholtz_energy_function_J_mol_K",
    "helmholtz_energy_function_u_J_mol_K",
}  # fmt: skip


@pytest.fixture(scope="module", params=[*CASES, "undetermined"])
def analysis(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> Analysis:
    """Every invented case, and one fit that determined nothing."""
    folder = tmp_path_factory.mktemp("case")
    return undetermined(folder) if request.param == "undetermined" else build(CASES[request.param], folder)


def _leaves(value: Any) -> list[Any]:
    if isinstance(value, dict):
        return [leaf for each in value.values() for leaf in _leaves(each)]
    if isinstance(value, list):
        return [leaf for each in value for leaf in _leaves(each)]
    return [value]


def test_every_key_of_the_contract_is_there(analysis: Analysis) -> None:
    """The record has each key of latticefit-result/1, in every case."""
    record = result_record(analysis)
    assert record["schema"] == "latticefit-result/1"
    for block, keys in CONTRACT.items():
        assert keys <= record[block].keys(), block
    for parameter in record["parameters"].values():
        assert {"value", "u", "u_fit", "unit", "status"} <= parameter.keys()
    for value in record["characteristic_temperatures"].values():
        assert {"value", "u", "u_fit", "low", "high", "unit", "definition", "status"} <= value.keys()
    for row in record["thermodynamic_functions"]:
        assert row.keys() >= ROW_KEYS
    for warning in record["warnings"]:
        assert warning.keys() == {"code", "level", "concerns", "message", "found", "threshold", "advice"}
    assert {source.keys() >= {"file", "sha256", "label"} for source in record["data"]["sources"]} == {True}


def test_numbers_are_plain_and_finite(analysis: Analysis) -> None:
    """No NaN, no infinity, no numpy type: what is unknown is null."""
    for leaf in _leaves(result_record(analysis)):
        assert leaf is None or type(leaf) in (str, bool, int, float)
        assert not isinstance(leaf, float) or math.isfinite(leaf)


def test_json_round_trips(analysis: Analysis) -> None:
    """The text reads back as the very same record, key order included."""
    record = result_record(analysis)
    back = json.loads(json_text(record))
    assert back == record
    assert list(back) == list(record)
    assert json_text(back) == json_text(record)


def test_cv_gives_internal_energy_instead_of_enthalpy(tmp_path: Path) -> None:
    """With quantity Cv enthalpy and Gibbs function are null and U(T)-U(0), -(F-U(0))/T stand beside them with u."""
    found = build(CASES["volume"], tmp_path)
    for i, row in enumerate(result_record(found)["thermodynamic_functions"]):
        assert row.keys() >= CV_KEYS
        assert {row[key] for key in ROW_KEYS if key.startswith(("enthalpy", "gibbs"))} == {None}
        assert row["internal_energy_J_mol"] == found.derived.table.energy[i]
        assert row["helmholtz_energy_function_u_J_mol_K"] == found.derived.table.free_energy_function_u[i]


def test_cp_rows_hold_no_internal_energy(tmp_path: Path) -> None:
    """With quantity Cp only the enthalpy columns exist: the tool does not guess U from H."""
    rows = result_record(build(CASES["metal"], tmp_path))["thermodynamic_functions"]
    assert not CV_KEYS & rows[0].keys()
    assert rows[-1]["enthalpy_J_mol"] > 0


def test_withheld_values_are_null_with_a_reason(tmp_path: Path) -> None:
    """Data from 50 K: theta_D(T->0) is null and undetermined, u below the data null, each with its reason."""
    record = result_record(build(CASES["coldstop"], tmp_path))
    low = record["characteristic_temperatures"]["theta_debye_low_temperature"]
    assert (low["value"], low["u"], low["status"]) == (None, None, "undetermined")
    assert "theta/30" in low["reason"]
    for row in record["thermodynamic_functions"]:
        assert (row["entropy_u_J_mol_K"] is None) is (row["temperature_K"] < 50)
        assert (row["u_reason"] is None) is (row["temperature_K"] >= 50)
        assert (row["origin"] == "extrapolated_below") is (row["temperature_K"] < 50)


def test_record_is_enough_to_evaluate_the_model_again(tmp_path: Path) -> None:
    """Terms, Cp-Cv, names and values of the JSON give back the heat capacities of its own table."""
    record = json.loads(json_text(result_record(build(CASES["metal"], tmp_path))))
    model = build_model(record["model"]["terms"], record["model"]["cp_cv"])
    assert list(model.names) == record["covariance"]["names"] == list(record["parameters"])
    values = np.array([each["value"] for each in record["parameters"].values()])
    T = np.array([row["temperature_K"] for row in record["thermodynamic_functions"]])
    C = np.array([row["heat_capacity_J_mol_K"] for row in record["thermodynamic_functions"]])
    np.testing.assert_allclose(heat_capacity(model, T, values), C, rtol=1e-6)
    assert np.shape(record["covariance"]["matrix"]) == (values.size, values.size)


def test_parameters_stand_in_si_units(tmp_path: Path) -> None:
    """Gamma in the record is J/(mol K^2), whatever people read elsewhere."""
    gamma = result_record(build(CASES["metal"], tmp_path))["parameters"]["electronic_gamma"]
    assert (gamma["value"], gamma["unit"]) == (7.2e-4, "J/(mol K^2)")


def test_correlated_residuals_inflate(tmp_path: Path) -> None:
    """Rho = 0.8 gives sqrt(1.8/0.2) = 3; no positive correlation gives 1."""
    found = build(CASES["misfit"], tmp_path)
    assert result_record(found)["covariance"]["inflation_autocorrelation"] == pytest.approx(3.0)
    statistics = replace(found.diagnosis.statistics, lag1_correlation=-0.4)
    calm = replace(found, diagnosis=replace(found.diagnosis, statistics=statistics))
    assert result_record(calm)["covariance"]["inflation_autocorrelation"] == 1.0


def test_names_that_are_no_valid_text_stay_valid_json(tmp_path: Path) -> None:
    """A file label with a lone surrogate (an undecodable byte of a file name) still gives UTF-8 JSON."""
    record = result_record(renamed(build(CASES["metal"], tmp_path), "µ \udce4 \x1b[31m"))
    back = json.loads(json_text(record).encode("utf-8"))
    assert back["sample"]["name"] == "µ \udce4 \x1b[31m"

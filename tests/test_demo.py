"""The demo data: repeatable, marked as invented, and recovered by a fit."""

from __future__ import annotations

import importlib.util
import tomllib
from types import ModuleType

import pytest
from helpers import DEMO, ROOT

import latticefit as lf

TRUTH = tomllib.loads((DEMO / "truth.toml").read_text(encoding="utf-8"))


def generator() -> ModuleType:
    spec = importlib.util.spec_from_file_location("make_demo_data", ROOT / "scripts" / "make_demo_data.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    import sys

    sys.modules["make_demo_data"] = module
    spec.loader.exec_module(module)
    return module


def test_every_demo_file_is_made_by_its_script_and_says_invented_data() -> None:
    """The files are what the seeded script makes, and each header says that the data are invented."""
    made = generator().files()
    assert sorted(made) == sorted(each.name for each in DEMO.iterdir())
    for name, content in made.items():
        lines = decoded(content)
        assert "invented data" in lines[0]
        if name.endswith(".csv"):  # values may differ in the last printed digit on another processor
            ours = decoded((DEMO / name).read_bytes())
            assert len(ours) == len(lines)
            assert sum(a != b for a, b in zip(ours, lines, strict=True)) <= 2


def decoded(content: bytes) -> list[str]:
    return content.decode("utf-8-sig").splitlines()


@pytest.mark.parametrize("name", [name for name, facts in TRUTH.items() if "terms" in facts])
def test_fits_of_demo_files_recover_their_truth(name: str) -> None:
    """Parameters, S, H and theta_D(T->0) of a demo lie within 3.5 u of the stated truth."""
    facts = TRUTH[name]
    data = lf.read(DEMO / f"{name}.csv", formula=facts["formula"])
    fit = lf.fit(data, terms=facts["terms"], cp_cv=facts["cp_cv"])
    assert fit.analysis.diagnosis.describes
    for parameter in fit.analysis.fit.parameters:
        assert abs(parameter.value - facts["parameters"][parameter.name]) < 3.5 * (parameter.u or 0)
    row = fit.table([298.15]).iloc[0]
    assert abs(row["entropy_J_mol_K"] - facts["entropy_298_J_mol_K"]) < 3.5 * row["entropy_u_J_mol_K"]
    assert abs(row["enthalpy_J_mol"] - facts["enthalpy_298_J_mol"]) < 3.5 * row["enthalpy_u_J_mol"]
    theta = fit.characteristic_temperatures.loc["theta_debye_low_temperature"]
    assert abs(theta["value_K"] - facts["theta_debye_low_temperature_K"]) < 3.5 * theta["u_K"]


def test_the_sample_that_starts_at_50_k_refuses_its_low_temperature_theta() -> None:
    """Drommenite: a perfect-looking fit, theta_D(T->0) null with the reason, S still given."""
    data = lf.read(DEMO / "drommenite.csv", formula="ArXe")
    fit = lf.fit(data, terms="debye + einstein", cp_cv="nernst-lindemann")
    assert fit.analysis.diagnosis.statistics.reduced_chi_square < 1.2
    theta = fit.characteristic_temperatures.loc["theta_debye_low_temperature"]
    assert theta["status"] == "undetermined"
    assert theta["value_K"] != theta["value_K"]  # NaN
    assert "low-temperature-reach" in fit.warnings["code"].tolist()


def test_the_hydrate_is_read_as_it_comes_and_its_water_is_missed_where_it_is_left_out() -> None:
    """Sjelite: byte order mark, semicolons, decimal commas, a row of units; right as it is, found out without water."""
    formula = TRUTH["sjelite"]["formula"]
    right = lf.read(DEMO / "sjelite.csv", formula=formula)
    reading = right.readings[0]
    assert (reading.encoding, reading.delimiter, reading.decimal) == ("UTF-8 with BOM", "semicolon", "comma")
    assert reading.heat_capacity_unit == "J/(g K)"
    fit = lf.fit(right, terms="debye + einstein", cp_cv="nernst-lindemann")
    assert not {"mode-sum", "implausible-level", "above-classical-limit"} & set(fit.warnings["code"])
    dry = formula.split("*")[0]
    without = lf.fit(lf.read(DEMO / "sjelite.csv", formula=dry), terms="debye + einstein", cp_cv="nernst-lindemann")
    said = " ".join(str(without).split())
    assert "a formula without its 2 H2O (factor 1.28), or 3 to 12 H2O whose stiff" in (
        said := " ".join(str(without).split())
    )
    assert f"give --formula with its water, '{formula}' to" in said


def test_two_platforms_show_their_step_once_the_unsettled_points_are_dropped() -> None:
    """Grannese: the overlap gives the stated scale of the cold platform, and the first of each set is found high."""
    facts = TRUTH["grannese"]
    files = [DEMO / "grannese_warm.csv", DEMO / "grannese_cold.csv"]
    data = lf.read(files, formula=facts["formula"], mass=f"{facts['mass_mg']} mg")
    fit = lf.fit(data, "debye + einstein", replicates="drop-first")
    (overlap,) = fit.analysis.prepared.overlaps
    assert abs(1 / overlap.ratio - facts["step_cold_over_warm"]) < 2.5 * overlap.u
    assert "run-overlap" in fit.warnings["code"].tolist()
    dropped = fit.residuals["reason"].fillna("").str.startswith("first of a set of 3")
    assert dropped.sum() == 84
    from latticefit.report import text_report

    kept = text_report(lf.fit(data, "debye + einstein").analysis)
    assert "the first" in " ".join(kept.split())


def test_a_forgotten_blank_is_named_and_its_file_mends_it() -> None:
    """Quellite: refused with the addenda as the reason; with their file S and theta_D(T->0) of the stated solid."""
    facts = TRUTH["quellite"]
    sample = {"formula": facts["formula"], "mass": f"{facts['mass_mg']} mg"}
    with pytest.raises(lf.InputError, match="the heat capacity of the addenda, still in the data"):
        lf.fit(lf.read(DEMO / "quellite_total.csv", **sample), "debye + einstein")
    data = lf.read(DEMO / "quellite_total.csv", addenda=DEMO / "quellite_addenda.csv", **sample)
    fit = lf.fit(data, "debye + einstein")
    row = fit.table([298.15]).iloc[0]
    assert abs(row["entropy_J_mol_K"] - facts["solid"]["entropy_298_J_mol_K"]) < 3.5 * row["entropy_u_J_mol_K"]
    theta = fit.characteristic_temperatures.loc["theta_debye_low_temperature"]
    assert abs(theta["value_K"] - facts["solid"]["theta_debye_low_temperature_K"]) < 3.5 * theta["u_K"]

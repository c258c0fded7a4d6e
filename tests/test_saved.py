"""Saved results: read back, evaluated anywhere, without the data and without a refit."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest
from helpers import DEMO, REFERENCE

import latticefit as lf
from latticefit.cli import main
from latticefit.errors import InputError


@pytest.fixture(scope="module")
def copper() -> lf.Fit:
    data = lf.read(REFERENCE / "copper_white_collocott_1984.csv", formula="Cu", sigma="1% below 100 K, 0.3% above")
    return lf.fit(data, "debye + einstein + electronic", cp_cv="nernst-lindemann")


@pytest.fixture(scope="module")
def folder(copper: lf.Fit, tmp_path_factory: pytest.TempPathFactory) -> Path:
    return copper.save(tmp_path_factory.mktemp("saved") / "cu", figures="none")


def test_a_saved_result_gives_the_table_of_the_fit(copper: lf.Fit, folder: Path) -> None:
    """Values, u, origin and reasons of a saved result are those of the fit itself, on a grid that is not its own."""
    grid = [0.3, 1.0, 4.2, 77.0, 298.15, 350.0, 500.0]
    ours, saved = copper.table(grid), lf.load(folder).table(grid)
    assert list(ours.columns) == list(saved.columns)
    for column in ours.columns:
        if ours[column].dtype == float:
            np.testing.assert_allclose(saved[column], ours[column], rtol=1e-12, equal_nan=True)
        else:
            assert saved[column].astype(str).tolist() == ours[column].astype(str).tolist()
    assert lf.load(folder / "result.json").parameters.equals(copper.parameters)


def test_values_per_mass_are_molar_values_over_the_molar_mass(folder: Path) -> None:
    """Per kilogram and per gram: molar values over the molar mass of copper, names of columns with the unit."""
    saved = lf.load(folder)
    molar, kilo, gram = (saved.table([10.0, 298.15], per=per) for per in ("mol", "kg", "g"))
    mass = saved.result.sample.molar_mass or 0
    np.testing.assert_allclose(kilo["heat_capacity_J_kg_K"], molar["heat_capacity_J_mol_K"] / mass, rtol=1e-13)
    np.testing.assert_allclose(kilo["enthalpy_u_J_kg"], molar["enthalpy_u_J_mol"] / mass, rtol=1e-13)
    np.testing.assert_allclose(1000 * gram["entropy_J_g_K"], kilo["entropy_J_kg_K"], rtol=1e-13)


def test_differences_between_temperatures(folder: Path) -> None:
    """H(77)-H(4) is the difference of the table; its u is that of the difference, and adds up by covariance."""
    saved = lf.load(folder)
    table = saved.table([4.0, 77.0])
    row = saved.between(4.0, 77.0).iloc[0]
    step = table["enthalpy_J_mol"][1] - table["enthalpy_J_mol"][0]
    assert row["enthalpy_difference_J_mol"] == pytest.approx(step, rel=1e-12)
    assert 0 < row["enthalpy_difference_u_J_mol"] < 1.01 * table["enthalpy_u_J_mol"][1]
    assert saved.between(0.1, 77.0).iloc[0]["u_reason"]
    assert np.isnan(float(saved.between(0.1, 77.0)["enthalpy_difference_u_J_mol"].astype(float).iloc[0]))


def test_enthalpy_from_298_drops_what_lies_below_the_data() -> None:
    """For a sample measured from 50 K, H(T)-H(298.15) has a far smaller u than H(T)-H(0) (its lower part drops out)."""
    data = lf.read(DEMO / "drommenite.csv", formula="ArXe")
    table = lf.fit(data, "debye + einstein", cp_cv="nernst-lindemann").table([100.0, 290.0])
    assert table["enthalpy_from_298_u_J_mol"][1] < 0.1 * table["enthalpy_u_J_mol"][1]
    assert np.isnan(table["enthalpy_u_J_mol"][0])  # more than a tenth of S(100 K) lies below 50 K
    assert 0 < table["enthalpy_from_298_u_J_mol"][0] < 10
    assert table["enthalpy_from_298_J_mol"][0] < 0


def test_the_table_command_prints_text_csv_and_json(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """The three forms hold the same numbers; text is aligned, CSV and JSON have every digit."""
    words = ["table", str(folder), "--grid", "4, 77, 298.15", "--between", "4:77", "--per", "kg"]
    assert main([*words, "--json"]) == 0
    record = json.loads(capsys.readouterr().out)
    assert [each["temperature_K"] for each in record["thermodynamic_functions"]] == [4.0, 77.0, 298.15]
    assert main([*words, "--csv"]) == 0
    csv_text = capsys.readouterr().out
    assert repr(record["thermodynamic_functions"][1]["heat_capacity_J_kg_K"]) in csv_text
    assert repr(record["differences"][0]["enthalpy_difference_J_kg"]) in csv_text
    assert main(words) == 0
    text = capsys.readouterr().out
    assert "H(77 K)-H(4 K) = " in text
    assert "J/kg" in text


@pytest.mark.parametrize(
    ("change", "words"),
    [
        (lambda record: {"schema": "other/1"}, "no latticefit result"),
        (lambda record: [], "no latticefit result"),
        (lambda record: {k: v for k, v in record.items() if k != "covariance"}, "not a complete latticefit result"),
        (lambda record: {**record, "model": {**record["model"], "terms": "debye"}}, "not a complete"),
        (lambda record: {**record, "model": {**record["model"], "terms": "deybe"}}, "deybe"),
        (lambda record: {**record, "data": {**record["data"], "temperature_min_K": None}}, "not a complete"),
    ],
)
def test_a_damaged_result_is_refused_in_words(change, words: str, folder: Path, tmp_path: Path) -> None:  # type: ignore[no-untyped-def]
    """A result that is incomplete, inconsistent or something else is refused with one sentence."""
    record = json.loads((folder / "result.json").read_text(encoding="utf-8"))
    path = tmp_path / "result.json"
    path.write_text(json.dumps(change(record)), encoding="utf-8")
    with pytest.raises(InputError, match=words):
        lf.load(path)


def test_per_mass_needs_a_molar_mass(tmp_path: Path) -> None:
    """A result without a molar mass is refused per gram, in words."""
    data = lf.read(DEMO / "halvite.csv", atoms=2)
    folder = lf.fit(data, "debye").save(tmp_path / "x", figures="none")
    with pytest.raises(InputError, match="need the molar mass"):
        lf.load(folder).table([10.0], per="g")
    with pytest.raises(InputError, match="'mol', 'g' or 'kg'"):
        lf.load(folder).table([10.0], per="lb")


def test_rank_gives_the_candidates_and_the_reason() -> None:
    """lf.rank: one row a candidate, the chosen one marked, the reason in attrs."""
    data = lf.read(DEMO / "halvite.csv", atoms=2, insulator=True)
    frame = lf.rank(data)
    assert frame["chosen"].sum() == 1
    assert frame.loc[frame["chosen"], "terms"].item() == "debye + einstein"
    assert not frame["terms"].str.contains("electronic").any()
    assert frame["plausible"].is_monotonic_decreasing
    assert frame.attrs["because"]


def leaves(record: object, path: tuple[object, ...] = ()) -> list[tuple[object, ...]]:
    """Paths of every value in a record that `load` may look at."""
    if isinstance(record, dict):
        return [leaf for key, each in record.items() for leaf in leaves(each, (*path, key))]
    if isinstance(record, list) and path and path[-1] in ("names", "matrix"):
        return [path]
    return [path]


ODD = [None, True, "x", -1, 0, 1e308, [], {}, [[1.0]]]
READ = ("schema", "sample", "data", "model", "parameters", "covariance", "fit", "verdict")


@pytest.mark.slow
def test_no_damage_to_a_result_gives_a_traceback(folder: Path, tmp_path: Path) -> None:
    """Nine odd values at every leaf: the result is refused in words, or evaluates without a warning."""
    import warnings

    original = json.loads((folder / "result.json").read_text(encoding="utf-8"))
    path = tmp_path / "result.json"
    for leaf in leaves({key: original[key] for key in READ}):
        for odd in ODD:
            record = json.loads(json.dumps(original))
            at = record
            for key in leaf[:-1]:
                at = at[key]
            at[leaf[-1]] = odd
            path.write_text(json.dumps(record), encoding="utf-8")
            with warnings.catch_warnings():
                warnings.simplefilter("error")
                try:
                    saved = lf.load(path)
                    saved.table([4.0, 77.0, 298.15])
                    if saved.result.sample.molar_mass is not None:
                        saved.between(4.0, 77.0, per="kg")
                except InputError:
                    continue


def test_between_and_table_agree_where_there_is_no_value(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Where Cp-Cv has no solution neither the table nor a difference gives a value, and both say why."""
    assert main(["table", str(folder), "--grid", "5000", "--between", "300:5000", "--json"]) == 0
    record = json.loads(capsys.readouterr().out)
    row = next(each for each in record["thermodynamic_functions"] if each["temperature_K"] == 5000)
    assert row["enthalpy_J_mol"] is None
    assert row["enthalpy_from_298_J_mol"] is None
    assert record["differences"][0]["enthalpy_difference_J_mol"] is None
    assert record["differences"][0]["u_reason"] == row["u_reason"]
    assert main(["table", str(folder), "--between", "1e300:1e301"]) == 2


@pytest.mark.parametrize("per", ["g", "kg"])
def test_every_molar_column_is_scaled(per: str, folder: Path) -> None:
    """Every column per mole, u and u_fit included, is its molar value over the mass; the others are unchanged."""
    saved = lf.load(folder)
    molar, massic = saved.table([10.0, 298.15]), saved.table([10.0, 298.15], per=per)
    mass = (saved.result.sample.molar_mass or 0) * (1 if per == "kg" else 1000)
    for name in molar.columns:
        other = name.replace("_J_mol", f"_J_{per}")
        if molar[name].dtype == float:
            expected = molar[name] / mass if other != name else molar[name]
            np.testing.assert_allclose(massic[other], expected, rtol=1e-12, equal_nan=True)

"""Known parts held with their uncertainty: fixed parameters with u, and the lattice of a saved result."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from helpers import invented_solid, prepared_data

import latticefit as lf
from latticefit.fitting import fit_model
from latticefit.records import HeldParameters, ModelSettings

T = np.geomspace(2.0, 300.0, 120)
METAL = ("debye + einstein + electronic", [330.0, 2.5, 120.0, 0.5, 7e-4])


def test_u_of_a_held_parameter_is_carried_on() -> None:
    """A gamma held with u moves the others by what refits with gamma up and down move them."""
    data = invented_solid(*METAL, T, atoms=1)
    u = 2e-5
    held = HeldParameters(("electronic_gamma",), np.array([[u * u]]))
    settings = ModelSettings(METAL[0], fix={"electronic_gamma": 7e-4})
    exact, carried = fit_model(data, settings), fit_model(data, settings, held=held)
    up, down = (
        fit_model(data, ModelSettings(METAL[0], fix={"electronic_gamma": 7e-4 + s * u})).values for s in (1, -1)
    )
    extra = np.diag(carried.covariance) - np.diag(exact.covariance)
    np.testing.assert_allclose(np.sqrt(np.maximum(extra, 0)), np.abs(up - down) / 2, rtol=2e-2, atol=1e-9)
    gamma = carried.parameters[carried.names.index("electronic_gamma")]
    assert gamma.status == "fixed"
    assert gamma.u == pytest.approx(u)


def test_u_of_a_held_mode_count_passes_through_the_mode_sum() -> None:
    """With the sum fixed, a mode count held with u gives the tied one the same u, with the opposite sign."""
    data = invented_solid("debye + einstein", [220.0, 3.5, 610.0, 2.5], T, atoms=2)
    held = HeldParameters(("einstein_modes",), np.array([[0.01]]))
    fit = fit_model(data, ModelSettings("debye + einstein", fix={"einstein_modes": 2.5}), held=held)
    one, other = fit.names.index("debye_modes"), fit.names.index("einstein_modes")
    assert fit.covariance[one, one] == pytest.approx(0.01, rel=1e-9)
    assert fit.covariance[one, other] == pytest.approx(-0.01, rel=1e-9)


@pytest.fixture
def files(tmp_path: Path) -> tuple[Path, Path]:
    """Two invented files: an insulator, and the same lattice with electrons on top."""
    for name, terms, values in (
        ("lattice.csv", "debye + einstein", METAL[1][:4]),
        ("metal.csv", METAL[0], [*METAL[1][:4], 3e-3]),
    ):
        data = invented_solid(terms, values, T, atoms=1, seed=len(name))
        rows = "\n".join(
            f"{float(t)!r},{float(c)!r},{float(s)!r}" for t, c, s in zip(T, data.heat_capacity, data.sigma, strict=True)
        )
        (tmp_path / name).write_text(f"# invented data\nT_K,Cv_J_molK,sigma_J_molK\n{rows}\n")
    return tmp_path / "lattice.csv", tmp_path / "metal.csv"


def test_a_whole_lattice_is_held_from_a_saved_result(files: tuple[Path, Path], tmp_path: Path) -> None:
    """The lattice of one sample is held under another: gamma comes out, and its u knows the lattice's covariance."""
    lattice = lf.fit(lf.read(files[0], atoms=1), "debye + einstein")
    saved = lattice.save(tmp_path / "lattice", figures="none")
    fit = lf.fit(lf.read(files[1], atoms=1), METAL[0], fix_from=saved / "result.json")
    by_name = fit.parameters
    assert by_name.loc["debye_theta", "value"] == lattice.parameters.loc["debye_theta", "value"]
    assert by_name.loc["debye_theta", "u"] == pytest.approx(lattice.parameters.loc["debye_theta", "u_fit"], rel=0.2)
    assert by_name.loc["electronic_gamma", "value"] == pytest.approx(3e-3, abs=4 * by_name.loc["electronic_gamma", "u"])
    alone = lf.fit(
        lf.read(files[1], atoms=1),
        METAL[0],
        fix={name: float(by_name.loc[name, "value"]) for name in by_name.index if name != "electronic_gamma"},
    )
    assert by_name.loc["electronic_gamma", "u_fit"] > alone.parameters.loc["electronic_gamma", "u_fit"]


def test_a_report_with_a_held_lattice_repeats_itself(files: tuple[Path, Path], tmp_path: Path) -> None:
    """The saved result is copied into inputs/, and the moved folder's sheet gives the same numbers."""
    from latticefit.cli import main

    saved = lf.fit(lf.read(files[0], atoms=1), "debye + einstein").save(tmp_path / "lattice", figures="none")
    first = lf.fit(lf.read(files[1], atoms=1), METAL[0], fix_from=saved, fix_u=None)
    folder = first.save(tmp_path / "metal", figures="none")
    (saved / "result.json").unlink()
    moved = folder.rename(tmp_path / "moved")
    assert (moved / "inputs" / "held_result.json").is_file()
    assert main(["fit", str(moved / "run_sheet.toml"), "--out", str(tmp_path / "again"), "--quiet"]) == 0
    assert lf.load(tmp_path / "again").parameters.equals(first.parameters)


def test_contradictions_are_refused_in_words(files: tuple[Path, Path], tmp_path: Path) -> None:
    """A u without a value, a parameter named twice, and a missing result are refused."""
    data = lf.read(files[1], atoms=1)
    with pytest.raises(lf.InputError, match="not fixed"):
        lf.fit(data, METAL[0], fix_u={"electronic_gamma": 1e-5})
    with pytest.raises(lf.InputError, match="no such file"):
        lf.fit(data, METAL[0], fix_from=tmp_path / "nothing.json")
    saved = lf.fit(lf.read(files[0], atoms=1), "debye + einstein").save(tmp_path / "lattice", figures="none")
    with pytest.raises(lf.InputError, match="held by the saved result"):
        lf.fit(data, METAL[0], fix_from=saved, start={"debye_theta": 300.0})


def test_misfit_does_not_enlarge_what_the_user_stated() -> None:
    """A held u stays as stated whatever the reduced chi-square is; the free parameters' u grows with it."""
    data = invented_solid(*METAL, T, atoms=1)
    C = np.array(data.heat_capacity)
    understated = prepared_data(T, C, 0.0005 * C, atoms=1)
    held = HeldParameters(("electronic_gamma",), np.array([[1e-8**2]]))
    fit = fit_model(understated, ModelSettings(METAL[0], fix={"electronic_gamma": 7e-4}), held=held)
    assert fit.scale_factor > 50
    assert fit.parameters[fit.names.index("electronic_gamma")].u == pytest.approx(1e-8, rel=1e-9)
    theta = fit.parameters[fit.names.index("debye_theta")]
    assert (theta.u or 0) > 5 * (theta.u_fit or 1)


def test_a_held_lattice_brings_the_u_that_latticefit_stands_behind(tmp_path: Path) -> None:
    """With understated sigmas the saved u, not the smaller u_fit, is carried on."""
    data = invented_solid("debye + einstein", METAL[1][:4], T, atoms=1, quantity="Cv")
    columns = np.column_stack([T, data.heat_capacity, np.array(data.sigma) / 5]).tolist()
    rows = "\n".join(",".join(map(repr, row)) for row in columns)
    (tmp_path / "a.csv").write_text(f"# invented data\nT_K,Cv_J_molK,sigma_J_molK\n{rows}\n")
    lattice = lf.fit(lf.read(tmp_path / "a.csv", atoms=1), "debye + einstein")
    saved = lattice.save(tmp_path / "lattice", figures="none")
    again = lf.fit(lf.read(tmp_path / "a.csv", atoms=1), "debye + einstein", fix_from=saved)
    for name in ("debye_theta", "einstein_theta", "einstein_modes"):
        assert again.parameters.loc[name, "u"] == pytest.approx(lattice.parameters.loc[name, "u"], rel=1e-6)


def test_a_lattice_that_misses_its_own_data_is_not_held(files: tuple[Path, Path], tmp_path: Path) -> None:
    """A saved model that does not describe its data cannot be held as known."""
    poor = lf.fit(lf.read(files[0], atoms=1), "debye").save(tmp_path / "poor", figures="none")
    with pytest.raises(lf.InputError, match="does not describe its own data"):
        lf.fit(lf.read(files[1], atoms=1), METAL[0], fix_from=poor)

"""Derived quantities: moments, T^3 limit, thermodynamic functions, pointwise theta, propagation, honesty rules."""

from __future__ import annotations

import itertools
from dataclasses import replace

import numpy as np
import pytest
from helpers import invented_solid
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose
from scipy.integrate import quad

from latticefit.constants import GAS_CONSTANT
from latticefit.deriving import (
    QUANTITIES,
    default_grid,
    derive,
    functions_table,
    uncertainties,
)
from latticefit.fitting import fit_model
from latticefit.functions import debye_heat_capacity, invert_debye
from latticefit.models import (
    build_model,
    energy,
    entropy,
    heat_capacity,
    theta_debye_moment,
    zero_point_energy,
)
from latticefit.records import Derived, DerivedValue, FitRecord, FloatArray, ModelSettings, PreparedData

T = np.geomspace(2.0, 300.0, 120)
MIXED = build_model("debye + einstein")
VALUES = np.array([220.0, 3.5, 610.0, 2.5])
METAL = ("debye + einstein + electronic", [330.0, 2.5, 120.0, 0.5, 7e-4])


def fitted(data: PreparedData, terms: str, cp_cv: str = "none") -> tuple[FitRecord, Derived]:
    fit = fit_model(data, ModelSettings(terms, cp_cv=cp_cv))
    return fit, derive(data, fit)


def value(derived: Derived, key: str) -> DerivedValue:
    return next(each for each in derived.characteristic_temperatures if each.key == key)


@given(st.floats(30, 2000), st.sampled_from([-2, -1, 0, 1, 2]))
def test_every_moment_of_a_debye_solid_is_its_theta(theta: float, m: int) -> None:
    """For a pure Debye spectrum all theta_D[m] equal theta (Barron, Berg and Morrison 1957)."""
    assert theta_debye_moment(m, build_model("debye"), np.array([theta, 3.0]), 1) == pytest.approx(theta, rel=1e-12)


def test_moments_of_the_published_example_of_a_mixed_spectrum() -> None:
    """Debye 200 K and Einstein 160 K in equal parts: 229, 218, 211, 207, 203 K for m = -2..2 (computed, 20 digits)."""
    values = np.array([200.0, 1.5, 160.0, 1.5])
    found = [theta_debye_moment(m, MIXED, values, 1) for m in (-2, -1, 0, 1, 2)]
    assert [round(each or 0) for each in found] == [229, 218, 211, 207, 203]


def test_moments_agree_with_what_they_are_for() -> None:
    """m = 1 gives the zero-point energy, m = 0 the entropy and m = 2 the heat capacity at high temperature."""
    theta1, theta0, theta2 = (theta_debye_moment(m, MIXED, VALUES, 2) or 0 for m in (1, 0, 2))
    assert zero_point_energy(MIXED, VALUES) == pytest.approx(9 / 8 * 2 * GAS_CONSTANT * theta1, rel=1e-13)
    hot = np.array([2.0e4])
    assert entropy(MIXED, hot, VALUES)[0] == pytest.approx(
        6 * GAS_CONSTANT * (4 / 3 + np.log(hot[0] / theta0)), rel=1e-5
    )
    missing = 1 - heat_capacity(MIXED, np.array([5e3]), VALUES)[0] / (6 * GAS_CONSTANT)
    assert missing == pytest.approx((theta2 / 5e3) ** 2 / 20, rel=1e-2)


def test_equivalent_einstein_temperatures_are_fixed_fractions_of_the_moments() -> None:
    """e^(-1/3) theta_D[0], sqrt(3/5) theta_D[2] and (3/4) theta_D[1] (Domb and Salter 1952)."""
    by_key = {each.key: each.function(MIXED, VALUES, 2) for each in QUANTITIES}
    assert by_key["theta_einstein_entropy"] == pytest.approx(np.exp(-1 / 3) * by_key["theta_debye_moment_0"], rel=1e-13)
    assert by_key["theta_einstein_high_temperature"] == pytest.approx(
        np.sqrt(0.6) * by_key["theta_debye_moment_2"], rel=1e-13
    )
    assert by_key["theta_einstein_zero_point"] == pytest.approx(0.75 * by_key["theta_debye_moment_1"], rel=1e-13)


@given(st.floats(1e-3, 300.0))
def test_pointwise_theta_inverts_the_debye_function(x: float) -> None:
    """theta/T comes back from the heat capacity as far as the function still carries it."""
    ratio = np.array([debye_heat_capacity(x)])
    slack = 1e-15 / (x * x / 10) if x < 1 else 1e-12  # 1 - c = x^2/20 loses x near 1
    assert invert_debye(ratio)[0] == pytest.approx(x, rel=max(slack, 1e-12))


def test_pointwise_theta_is_blank_with_a_reason_at_and_above_three_n_r() -> None:
    """No Debye temperature where C >= 3nR; the reason says so, and the others have bars."""
    data = invented_solid("debye", [120.0, 3.0], np.geomspace(2, 400, 150), atoms=1, noise=0.01)
    _, derived = fitted(data, "debye")
    blank = np.isnan(derived.pointwise_theta.theta)
    above = np.asarray(data.heat_capacity) >= 3 * GAS_CONSTANT
    assert above.any()
    assert_allclose(blank, above)
    assert {r for r, b in zip(derived.pointwise_theta.reasons, blank, strict=True) if b} == {
        "lattice part at or above 3nR"
    }
    assert np.all(np.asarray(derived.pointwise_theta.u)[~blank] > 0)
    pulls = (np.asarray(derived.pointwise_theta.theta) - 120.0)[~blank] / np.asarray(derived.pointwise_theta.u)[~blank]
    assert np.std(pulls[:80]) == pytest.approx(1.0, abs=0.3)


def test_pointwise_theta_takes_electrons_and_cp_cv_out() -> None:
    """With exact metal data the pointwise theta is that of the harmonic lattice alone."""
    terms = METAL[0]
    data = invented_solid(terms, [*METAL[1], 4e-6], T, noise=0.0, cp_cv="nernst-lindemann", atoms=1)
    _, derived = fitted(data, terms, "nernst-lindemann")
    lattice = heat_capacity(MIXED, T, np.array(METAL[1][:4]))
    assert_allclose(derived.pointwise_theta.theta, invert_debye(lattice / (3 * GAS_CONSTANT)) * T, rtol=1e-6)


def test_table_is_consistent_and_in_closed_form() -> None:
    """H and S are integrals of Cp and Cp/T from 0, the Gibbs function is S - H/T, 298.15 K is a row."""
    data = invented_solid(*METAL, T, atoms=1)
    fit, derived = fitted(data, METAL[0])
    table = derived.table
    assert 298.15 in table.temperature
    model = build_model(fit.terms)
    for k in (0, 10, 30, len(table.temperature) - 1):
        upper = float(table.temperature[k])
        edges = [0.0, *np.geomspace(upper / 100, upper, 6)]
        H = sum(
            quad(lambda t: float(heat_capacity(model, np.array([t]), fit.values)[0]), a, b, epsrel=1e-11)[0]
            for a, b in itertools.pairwise(edges)
        )
        assert table.energy[k] == pytest.approx(H, rel=1e-8)
    assert_allclose(table.free_energy_function, table.entropy - table.energy / table.temperature, rtol=1e-12)


def test_rows_below_the_data_have_a_value_but_no_uncertainty() -> None:
    """Below Tmin: origin extrapolated_below, u withheld with the reason, value kept; share of S below is 1 there."""
    data = invented_solid(*METAL, np.geomspace(5.0, 280.0, 100), atoms=1)
    fit, _ = fitted(data, METAL[0])
    table = functions_table(fit, np.array([1.0, 4.9, 5.0, 100.0, 298.15, 500.0]), 5.0, 280.0, "Cp")
    assert table.origin == (
        "extrapolated_below",
        "extrapolated_below",
        "measured",
        "measured",
        "extrapolated_above",
        "extrapolated_above",
    )
    assert np.isnan(table.entropy_u[:2]).all()
    assert all(reason for reason in table.u_reasons[:2])
    assert np.isfinite(table.entropy_u[2:5]).all()
    assert np.isnan(table.heat_capacity_u[5])
    assert np.isfinite(table.heat_capacity).all()
    assert_allclose(table.entropy_fraction_below_data[:3], 1.0)
    assert table.entropy_fraction_below_data[4] == pytest.approx(
        float(entropy(build_model(fit.terms), np.array([5.0]), fit.values)[0]) / table.entropy[4]
    )


@pytest.mark.parametrize(("lowest", "status"), [(3.0, "determined"), (9.0, "determined"), (13.0, "undetermined")])
def test_low_temperature_theta_is_withheld_when_the_data_start_too_high(lowest: float, status: str) -> None:
    """theta_D(T->0) (351 K) is null from Tmin > theta/30 = 11.7 K on, with the reason in words."""
    data = invented_solid(*METAL, np.geomspace(lowest, 300.0, 100), atoms=1)
    _, derived = fitted(data, METAL[0])
    theta = value(derived, "theta_debye_low_temperature")
    assert theta.status == status
    assert theta.reason
    assert (theta.value is None) == (status == "undetermined")
    assert (theta.u is None) == (status == "undetermined")


def test_einstein_model_has_no_low_temperature_theta() -> None:
    """theta_D(T->0) is undefined without a Debye term; the moments stand."""
    data = invented_solid("einstein", [180.0, 3.0], np.geomspace(20, 300, 60), atoms=1)
    _, derived = fitted(data, "einstein")
    theta = value(derived, "theta_debye_low_temperature")
    assert (theta.status, theta.value) == ("undefined", None)
    assert value(derived, "theta_debye_moment_2").value == pytest.approx(180 * (5 / 3) ** 0.5, rel=0.01)


@pytest.mark.slow
def test_uncertainties_of_derived_values_are_their_scatter() -> None:
    """u of S, H, theta moments and zero-point energy is the scatter over fresh noise (60 seeds, to 35 %)."""
    rows = []
    for seed in range(60):
        _, derived = fitted(invented_solid(*METAL, T[::2], atoms=1, seed=seed), METAL[0])
        at = list(derived.table.temperature).index(298.15)
        chosen = [value(derived, k) for k in ("theta_debye_low_temperature", "theta_debye_moment_0")]
        chosen.append(derived.zero_point_energy)
        rows.append(
            [(derived.table.entropy[at], derived.table.entropy_u_fit[at])]
            + [(derived.table.energy[at], derived.table.energy_u_fit[at])]
            + [(each.value, each.u_fit) for each in chosen]
        )
    found = np.array(rows, dtype=float)
    assert_allclose(found[:, :, 0].std(axis=0, ddof=1), found[:, :, 1].mean(axis=0), rtol=0.35)


def test_propagation_is_linear_algebra_for_a_linear_function() -> None:
    """For f = A x the propagated variance is A C A' (JCGM 100:2008, 5.2)."""
    rng = np.random.default_rng(4)
    A, root = rng.normal(size=(5, 3)), rng.normal(size=(3, 3))
    C = root @ root.T

    def linear(x: FloatArray) -> FloatArray:
        return np.asarray(A @ x)

    carried = 0.3 * C
    fit = fit_model(invented_solid("debye", [280.0, 3.0], T, atoms=1), ModelSettings("debye"))
    fit = replace(fit, values=np.array([1.0, -2.0, 0.0]), covariance=C, carried=carried, scale_factor=9.0)
    u_fit, u = uncertainties(linear, fit)
    assert_allclose(u_fit, np.sqrt(np.diag(A @ C @ A.T)), rtol=1e-7)
    stated = 9 * (C - carried) + carried  # a misfit enlarges what comes from the data only
    assert_allclose(u, np.sqrt(np.diag(A @ stated @ A.T)), rtol=1e-7)


def test_allowance_below_the_data_covers_a_dispersive_solid() -> None:
    """S(298.15) of a sine-dispersion solid measured from theta/7.5 lies within 2u, though the model is wrong there."""
    import tomllib

    from helpers import DEMO

    import latticefit as lf

    truth = tomllib.loads((DEMO / "truth.toml").read_text(encoding="utf-8"))["drommenite"]
    data = lf.read(DEMO / "drommenite.csv", formula="ArXe")
    fit = lf.fit(data, terms="debye + einstein", cp_cv="nernst-lindemann")
    row = fit.table([298.15]).iloc[0]
    assert abs(row["entropy_J_mol_K"] - truth["entropy_298_J_mol_K"]) < 2 * row["entropy_u_J_mol_K"]
    assert abs(row["enthalpy_J_mol"] - truth["enthalpy_298_J_mol"]) < 2 * row["enthalpy_u_J_mol"]


def test_default_grid_is_round_and_reaches_below_the_data() -> None:
    """The standard grid has round temperatures from a fifth of the lowest point to the highest."""
    grid = default_grid(5.0, 300.0)
    assert grid[0] == 1.0
    assert grid[-1] == 300.0
    assert np.all(np.diff(grid) > 0)
    assert energy(MIXED, grid, VALUES).shape == grid.shape


def test_a_model_that_misses_the_data_gives_no_u_at_all() -> None:
    """Where the model does not describe the data, values stand with the reason and without u, everywhere."""
    data = invented_solid(*METAL, T, atoms=1)
    fit = fit_model(data, ModelSettings("debye + electronic"))
    derived = derive(data, fit, describes=False)
    for each in (*derived.characteristic_temperatures, derived.zero_point_energy):
        assert each.value is not None
        assert (each.u, each.low, each.high) == (None, None, None)
        assert "best wrong model" in (each.reason or "")
    assert np.isnan(derived.table.entropy_u).all()

"""Residual statistics, validity facts, the verdict, and each named warning with a clean case beside it."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from helpers import invented_solid, prepared_data
from hypothesis import given
from hypothesis import strategies as st

from latticefit.diagnosing import (
    RULES,
    akaike,
    bayes,
    diagnose,
    durbin_watson,
    lag1_correlation,
    runs_test,
)
from latticefit.fitting import fit_model
from latticefit.preparing import prepare
from latticefit.records import Diagnosis, ModelSettings, PreparedData

T = np.geomspace(2.0, 300.0, 120)
METAL = ("debye + einstein + electronic", [330.0, 2.5, 120.0, 0.5, 7e-4])


def diagnosed(data: PreparedData, terms: str, mode_sum: str | None = None, **settings: object) -> Diagnosis:
    return diagnose(data, fit_model(data, ModelSettings(terms, mode_sum, **settings)))  # type: ignore[arg-type]


def unsettled_and_averaged() -> PreparedData:
    """Triplicates, the first of each set 2 % high, averaged before the fit."""
    data = invented_solid(*METAL, np.repeat(np.geomspace(2.0, 300.0, 50), 3), atoms=1).measurement
    C = np.array(data.heat_capacity)
    C[::3] *= 1.02
    (reading,) = data.readings
    asking = replace(reading, settings=replace(reading.settings, replicates="average"))
    return prepare(replace(data, heat_capacity=C, readings=(asking,)))


def one_run(n: int) -> np.ndarray:
    return np.zeros(n, dtype=np.intp)


def test_durbin_watson_of_white_and_alternating_and_drifting_residuals() -> None:
    """Near 2 for white noise, near 4 for alternation, near 0 for a drift (Durbin and Watson 1950)."""
    x = np.arange(1.0, 401.0)
    white = np.random.default_rng(1).standard_normal(400)
    assert durbin_watson(x, white, one_run(400)) == pytest.approx(2.0, abs=0.35)
    assert durbin_watson(x, (-1.0) ** x, one_run(400)) == pytest.approx(4.0, abs=0.02)
    assert durbin_watson(x, np.sin(x / 60), one_run(400)) < 0.01  # type: ignore[operator]


def test_neighbours_in_different_runs_and_repeats_do_not_count_as_correlation() -> None:
    """Two runs with opposite offsets are judged within each; repeats at one temperature are averaged first."""
    x = np.repeat(np.arange(1.0, 51.0), 2)
    run = np.tile([0, 1], 50)
    white = np.random.default_rng(2).standard_normal(100)
    assert durbin_watson(x, white, run) == pytest.approx(2.0, abs=0.5)
    triplicates = np.repeat(np.random.default_rng(3).standard_normal(60), 3)
    at = np.repeat(np.arange(1.0, 61.0), 3)
    assert durbin_watson(at, triplicates, one_run(180)) == pytest.approx(2.0, abs=0.6)
    assert abs(lag1_correlation(at, triplicates, one_run(180)) or 1.0) < 0.3


def test_runs_test_tells_chance_from_order() -> None:
    """Alternation and a half-and-half order are improbable, white noise is not (Wald and Wolfowitz 1940)."""
    x = np.arange(1.0, 61.0)
    white = np.random.default_rng(5).standard_normal(60)
    assert (runs_test(x, white, one_run(60))[0] or 0) > 0.05
    assert (runs_test(x, (-1.0) ** x, one_run(60))[0] or 1) < 1e-10
    p, longest = runs_test(x, np.where(x <= 30, 1.0, -1.0), one_run(60))
    assert (p or 1) < 1e-10
    assert longest == 30


def test_runs_test_against_the_exact_probability() -> None:
    """For 10 + 10 signs in 20 runs of one, the z-value is (20 - 11)/sqrt(180*190... )): worked by hand."""
    x = np.arange(1.0, 21.0)
    p, longest = runs_test(x, (-1.0) ** x, one_run(20))
    z = (20 - 11) / np.sqrt(200 * 180 / (400 * 19))
    from scipy.stats import norm

    assert p == pytest.approx(2 * norm.sf(z))
    assert longest == 1


@given(st.integers(1, 8), st.integers(3, 500), st.floats(0, 1e4))
def test_information_criteria_are_those_for_known_sigma(k: int, n: int, chi_square: float) -> None:
    """AICc and BIC stand on chi2 itself; AICc is undefined for n <= k + 1 and exceeds chi2 + 2k otherwise."""
    value = akaike(chi_square, k, n)
    if n <= k + 1:
        assert value is None
    else:
        assert value == pytest.approx(chi_square + 2 * k + 2 * k * (k + 1) / (n - k - 1))
    assert bayes(chi_square, k, n) == pytest.approx(chi_square + k * np.log(n))


def test_residuals_have_the_sign_and_scale_of_the_contract() -> None:
    """Residual = measured - model, percent of the model, normalised by sigma; chi2 is the sum of squares."""
    data = invented_solid(*METAL, T, atoms=1)
    fit = fit_model(data, ModelSettings(METAL[0]))
    found = diagnose(data, fit)
    assert np.allclose(found.residual, data.heat_capacity - found.model, rtol=0, atol=0)
    assert np.allclose(found.residual_percent, 100 * found.residual / found.model)
    assert float((found.residual_normalised**2).sum()) == pytest.approx(fit.chi_square, rel=1e-12)
    assert found.statistics.rms_percent == pytest.approx(np.sqrt(np.mean(found.residual_percent**2)))
    assert sum(band.points for band in found.statistics.bands) == T.size
    assert [band.temperature_low for band in found.statistics.bands] == [1.0, 10.0, 100.0]


def test_clean_case_is_silent_and_described() -> None:
    """A right model on good Cv data from theta/150 triggers no warning, and every validity fact holds."""
    data = invented_solid(*METAL, T, atoms=1, quantity="Cv", seed=3)
    found = diagnosed(data, METAL[0])
    assert found.describes
    assert "describes the data" in found.verdict
    assert [each.code for each in found.warnings] == []
    assert all(fact.holds for fact in found.validity)


def colder(lowest: float) -> np.ndarray:
    return np.geomspace(lowest, 300.0, 120)


def triggers() -> dict[str, Diagnosis]:
    """One diagnosis that must raise each warning."""
    insulator = ("debye + einstein", [220.0, 3.5, 610.0, 2.5])
    metal = invented_solid(*METAL, T, atoms=1)
    C = np.array(metal.heat_capacity)
    wavy = prepared_data(T, C * (1 + 0.02 * np.sin(8 * np.log(T))), 0.005 * C, atoms=1)
    two = invented_solid("debye + 2 einstein", [200.0, 4.0, 330.0, 2.0, 400.0, 3.0], T, atoms=3)
    return {
        "low-temperature-reach": diagnosed(invented_solid(*METAL, colder(8.0), atoms=1), METAL[0]),
        "model-misfit": diagnosed(metal, "debye + electronic"),
        "correlated-residuals": diagnosed(wavy, METAL[0]),
        "parameter-at-bound": diagnosed(metal, METAL[0], bounds={"debye_theta": (350.0, 400.0)}),
        "undetermined-parameters": diagnosed(
            invented_solid("einstein", [200.0, 6.0], np.geomspace(20, 300, 80), atoms=2),
            "debye + 2 einstein",
            "free",
            fix={"einstein1_theta": 200.0, "einstein2_theta": 200.0},
        ),
        "strong-correlation": diagnosed(two, "debye + 2 einstein"),
        "cp-cv-missing": diagnosed(metal, METAL[0]),
        "mode-sum": diagnosed(replace_atoms(invented_solid(*insulator, T), 3.0), "debye + einstein", "free"),
        "run-overlap": diagnosed(prepare(two_runs().measurement), METAL[0]),
        "outliers": diagnosed(with_factor(np.where(np.arange(T.size) == 70, 1.06, 1.0)), METAL[0]),
        "suspected-feature": diagnosed(with_factor(1 + 0.1 * np.exp(-(((T - 40) / 4) ** 2))), METAL[0]),
        "replicate-spread": diagnosed(triplicates(0.02, 0.005), METAL[0]),
        "lack-of-fit": diagnosed(triplicates(0.005, 0.005), "debye + electronic"),
        "sigma-overstated": diagnosed(prepared_data(T, C, 0.05 * C, atoms=1), METAL[0]),
        "sigma-assumed": diagnosed(
            replace(metal, sigma_kind="estimated", sigma_text="assumed: 1 %", sigma_assumed=True), METAL[0]
        ),
        "few-points": diagnosed(invented_solid(*METAL, T[::7], atoms=1), METAL[0]),
        "not-unique": not_unique(),
        "high-temperature-reach": diagnosed(invented_solid(*METAL, np.geomspace(1.8, 30.0, 60), atoms=1), METAL[0]),
        "gamma-reach": diagnosed(invented_solid(*METAL, np.geomspace(9.0, 300.0, 90), atoms=1), METAL[0]),
        "implausible-level": diagnosed(scaled(3.0), METAL[0]),
        "above-classical-limit": diagnosed(scaled(1.12), METAL[0]),
        "sigma-understated": diagnosed(prepared_data(T, C, 0.001 * C, atoms=1), METAL[0]),
        "cp-cv-from-melting-point": diagnosed(
            prepared_data(T, C, 0.005 * C, atoms=1, melting_point=1300.0), METAL[0], cp_cv="nernst-lindemann"
        ),
        "repeats-fitted-singly": diagnosed(
            invented_solid(*METAL, np.repeat(np.geomspace(2.0, 300.0, 50), 3), atoms=1), METAL[0]
        ),
        "first-points-averaged": diagnosed(unsettled_and_averaged(), METAL[0]),
        "runs-differ": diagnosed(two_runs(), METAL[0]),
        "addenda-share": diagnosed(with_addenda(metal, 3.0, 0.0), METAL[0]),
        "addenda-uncertainty": diagnosed(with_addenda(metal, 0.5, 0.003), METAL[0]),
        "mass-uncertainty": diagnosed(weighed(metal, 0.02), METAL[0]),
    }


def with_addenda(data: PreparedData, times: float, u: float) -> PreparedData:
    """The points with addenda taken off, so many times what is left, with a relative u of what is left."""
    C = np.array(data.measurement.heat_capacity)
    return replace(data, measurement=replace(data.measurement, addenda=times * C, addenda_u=u * C))


def weighed(data: PreparedData, part: float) -> PreparedData:
    """The points as if made per mole by a mass that is uncertain by a part."""
    measurement = data.measurement
    sample = replace(measurement.sample, mass=1e-5, mass_u=part * 1e-5)
    readings = (replace(measurement.readings[0], heat_capacity_unit="uJ/K"),)
    return replace(data, measurement=replace(measurement, sample=sample, readings=readings))


def scaled(factor: float) -> PreparedData:
    """The metal with a common scale error, on a range where its heat capacity is close to 3nR."""
    points = np.geomspace(2.0, 320.0, 120)
    data = invented_solid("debye + einstein + electronic", [150.0, 2.5, 120.0, 0.5, 7e-4], points, atoms=1)
    C = factor * np.array(data.heat_capacity)
    return prepared_data(points, C, 0.005 * C, atoms=1)


def two_runs() -> PreparedData:
    """Two runs, point by point in turn, one of them 2 % too high."""
    data = invented_solid(*METAL, T, atoms=1)
    run = np.arange(T.size) % 2
    C = np.array(data.heat_capacity) * np.where(run == 1, 1.02, 1.0)
    first = data.measurement.readings[0]
    readings = (first, replace(first, label="run 2"))
    measurement = replace(data.measurement, readings=readings, run=run, heat_capacity=C)
    return replace(data, measurement=measurement, run=run, heat_capacity=C)


def with_factor(factor: np.ndarray) -> PreparedData:
    """The metal, prepared from a measurement, with a factor on each heat capacity."""
    data = invented_solid(*METAL, T, atoms=1).measurement
    return prepare(replace(data, heat_capacity=np.array(data.heat_capacity) * factor))


def triplicates(noise: float, stated: float) -> PreparedData:
    """The metal measured three times at each temperature, with noise and stated relative sigma."""
    data = invented_solid(*METAL, np.repeat(np.geomspace(2.0, 300.0, 50), 3), noise, atoms=1).measurement
    return prepare(replace(data, sigma=stated * np.array(data.heat_capacity)))


def replace_atoms(data: PreparedData, atoms: float) -> PreparedData:
    sample = replace(data.measurement.sample, atoms=atoms)
    return replace(data, measurement=replace(data.measurement, sample=sample))


def not_unique() -> Diagnosis:
    data = invented_solid(*METAL, T, atoms=1)
    fit = replace(fit_model(data, ModelSettings(METAL[0])), distinct_minima=2)
    return diagnose(data, fit)


TRIGGERS = triggers()


def test_every_rule_has_a_case_that_triggers_it() -> None:
    """Every code has its triggering case: a new rule without one fails here."""
    assert set(TRIGGERS) == set(RULES)


@pytest.mark.parametrize("code", TRIGGERS)
def test_warning_is_raised_with_number_threshold_and_advice(code: str) -> None:
    """Each case raises its warning, with what was found, and what to do next."""
    found = {each.code: each for each in TRIGGERS[code].warnings}
    assert code in found
    assert found[code].advice
    assert found[code].message
    assert found[code].level in ("note", "warn", "stop")


@pytest.mark.parametrize(("lowest", "level"), [(8.0, "warn"), (14.0, "stop")])
def test_low_temperature_reach_has_two_levels(lowest: float, level: str) -> None:
    """Warn from theta/50, stop from theta/30 (theta = 351 K here)."""
    found = diagnosed(invented_solid(*METAL, colder(lowest), atoms=1), METAL[0])
    assert {each.code: each.level for each in found.warnings}["low-temperature-reach"] == level


INSULATOR = ("debye + einstein", [220.0, 3.5, 410.0, 2.5])


def mode_sum_of(factor: float, noise: float = 0.002, quantity: str = "Cv", terms: str = INSULATOR[0], **more: object):  # type: ignore[no-untyped-def]
    """The mode-sum warning on a solid of two atoms whose level is off by a factor, its modes held at six."""
    data = invented_solid(*INSULATOR, T, noise, seed=2, atoms=2, quantity=quantity)  # type: ignore[arg-type]
    C = factor * np.array(data.heat_capacity)
    data = prepared_data(T, C, noise * C, atoms=2, quantity=quantity)  # type: ignore[arg-type]
    found = diagnosed(data, terms, **more)  # type: ignore[arg-type]
    return next((each for each in found.warnings if each.code == "mode-sum"), None)


@pytest.mark.parametrize(("factor", "level"), [(1.0, None), (1.018, "note"), (1.05, "warn"), (0.94, "warn")])
def test_held_modes_are_freed_to_see_whether_they_are_three_per_atom(factor: float, level: str | None) -> None:
    """A level 5 or 6 % off is warned of although the modes are held, 2 % is noted, and one that is right is not."""
    found = mode_sum_of(factor)
    assert (found and found.level) == level
    if found is not None:
        assert found.found == pytest.approx(factor - 1, abs=0.01)
        assert "with its modes freed the model wants" in found.message


def test_the_mode_sum_names_the_slip() -> None:
    """Half the modes: the message says which slips give that; at 5 % none is invented."""
    assert "values per mole of half the formula unit (factor 0.5)" in mode_sum_of(0.5).message
    assert "explained by" not in mode_sum_of(1.05).message


def test_a_small_excess_of_a_model_without_cp_cv_is_not_called_a_slip() -> None:
    """Cp data 4 % above the harmonic level, fitted without Cp - Cv: the message names that first, and no slip."""
    found = mode_sum_of(1.04, quantity="Cp")
    assert "so much can be the Cp-Cv that the model does not have" in found.message
    assert "explained by" not in found.message


def test_a_model_that_misses_the_data_leaves_the_mode_sum_to_the_level() -> None:
    """A single Debye term on two bands says nothing of the modes; the level does, and only where it is off."""
    assert mode_sum_of(1.0, terms="debye") is None
    assert mode_sum_of(0.5, terms="debye").message.startswith("the modes add up to 0.5")


def test_modes_that_the_user_holds_are_not_freed() -> None:
    """With both mode counts fixed by the user nothing is left to free, and the level alone is asked."""
    assert mode_sum_of(1.0, fix={"debye_modes": 3.5, "einstein_modes": 2.5}) is None


def level_of(data: PreparedData, code: str) -> str | None:
    return {each.code: each.level for each in diagnosed(data, METAL[0]).warnings}.get(code)


@pytest.mark.parametrize(("times", "level"), [(2.0, None), (2.6, "warn"), (18.0, "warn")])
def test_share_of_addenda_has_two_levels(times: float, level: str | None) -> None:
    """Warn above 70 % of the total."""
    assert level_of(with_addenda(invented_solid(*METAL, T, atoms=1), times, 0.0), "addenda-share") == level


@pytest.mark.parametrize(("u", "level"), [(0.0005, None), (0.005, "note"), (0.02, "warn")])
def test_u_of_addenda_that_entropy_carries(u: float, level: str | None) -> None:
    """The u that all points share comes into S in full: a part u of every C is a part u of S."""
    data = with_addenda(invented_solid(*METAL, T, atoms=1), 0.5, u)
    assert level_of(data, "addenda-uncertainty") == level
    found = [each for each in diagnosed(data, METAL[0]).warnings if each.code == "addenda-uncertainty"]
    assert not found or found[0].found == pytest.approx(u, rel=1e-9)


def test_mass_is_a_scale_error_only_of_what_it_converts() -> None:
    """Above 1 % a warning, below a note; none for a run that is per mole already, or a mass without u."""
    data = invented_solid(*METAL, T, atoms=1)
    assert level_of(weighed(data, 0.02), "mass-uncertainty") == "warn"
    assert level_of(weighed(data, 0.004), "mass-uncertainty") == "note"
    per_mole = weighed(data, 0.02)
    per_mole = replace(per_mole, measurement=replace(per_mole.measurement, readings=data.measurement.readings))
    assert level_of(per_mole, "mass-uncertainty") is None
    assert level_of(data, "mass-uncertainty") is None


def test_more_parameters_than_the_data_can_test_is_not_called_a_description() -> None:
    """With as many points as parameters nothing tests the model, and the verdict says so."""
    data = invented_solid("debye", [280.0, 6.0], np.array([20.0, 100.0]))
    found = diagnosed(data, "debye", "free")
    assert not found.describes
    assert "nothing tests it" in found.verdict
    assert found.statistics.reduced_chi_square is None


def test_an_assumed_sigma_is_no_measure_of_the_model() -> None:
    """Where 1 % is only assumed, scatter of 4 % speaks against nothing; a pattern in the residuals does."""
    points = np.geomspace(4.0, 300.0, 14)
    data = invented_solid("debye", [240.0, 6.0], points, noise=0.04, atoms=2, quantity="Cv", seed=2)
    assumed = replace(data, sigma=0.01 * np.array(data.heat_capacity), sigma_kind="estimated", sigma_assumed=True)
    found = diagnosed(assumed, "debye")
    assert found.describes
    assert "cannot be told" in found.verdict
    wrong = invented_solid("debye + einstein", [200.0, 3.0, 700.0, 3.0], T, atoms=2, quantity="Cv")
    poor = diagnosed(replace(wrong, sigma_kind="estimated", sigma_assumed=True), "debye")
    assert not poor.describes


def test_aicc_with_unknown_sigma_does_not_depend_on_its_scale() -> None:
    """With only relative sigmas known, differences of AICc do not depend on their scale (Hurvich and Tsai 1989)."""
    first = (akaike(30.0, 3, 20, False) or 0) - (akaike(50.0, 2, 20, False) or 0)
    second = (akaike(3000.0, 3, 20, False) or 0) - (akaike(5000.0, 2, 20, False) or 0)
    assert first == pytest.approx(second)
    assert akaike(30.0, 3, 5, False) is None

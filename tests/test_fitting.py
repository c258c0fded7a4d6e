"""Fits: start values without a guess, lmfit result, bounds, ties, covariance."""

from __future__ import annotations

import numpy as np
import pytest
from helpers import invented_solid, prepared_data
from numpy.testing import assert_allclose

from latticefit.errors import InputError
from latticefit.fitting import fit_model, minimise, parametrise, search
from latticefit.models import build_model, heat_capacity
from latticefit.records import FitRecord, ModelSettings, ParameterValue, Sample

T = np.geomspace(2.0, 300.0, 150)


def parameter(fit: FitRecord, name: str) -> ParameterValue:
    return fit.parameters[fit.names.index(name)]


RECOVERED = {
    "debye": ("debye", "none", [280.0, 6.0], 2.0),
    "einstein": ("einstein", "none", [180.0, 3.0], 1.0),
    "mixed insulator": ("debye + einstein", "none", [220.0, 3.5, 610.0, 2.5], 2.0),
    "mixed metal": ("debye + einstein + electronic", "none", [330.0, 2.5, 120.0, 0.5, 7e-4], 1.0),
    "Cp": ("debye + einstein + electronic", "nernst-lindemann", [330.0, 2.5, 150.0, 0.5, 7e-4, 4e-6], 1.0),
    "anharmonic": ("debye + einstein", "anharmonic", [220.0, 3.5, 610.0, 2.5, 8e-5], 2.0),
    "two Einstein": ("debye + 2 einstein", "none", [200.0, 4.0, 330.0, 2.0, 700.0, 3.0], 3.0),
    "two Debye": ("2 debye", "none", [150.0, 3.0, 600.0, 3.0], 2.0),
}


@pytest.mark.parametrize("mode_sum", ["fixed", "free"])
@pytest.mark.parametrize("case", RECOVERED)
def test_truth_is_recovered_without_a_guess(case: str, mode_sum: str) -> None:
    """Each kind of model is found from the data alone, within its uncertainties (noise 0.5 %, seeded)."""
    terms, form, truth, atoms = RECOVERED[case]
    data = invented_solid(terms, truth, T, seed=11, cp_cv=form, atoms=atoms)
    fit = fit_model(data, ModelSettings(terms, mode_sum, form))  # type: ignore[arg-type]
    assert fit.converged
    assert 0.6 < fit.scale_factor < 1.5
    for name, value in zip(fit.names, truth, strict=True):
        found = parameter(fit, name)
        assert abs(found.value - value) <= 4.5 * (found.u or 0) + 1e-9


def test_noise_free_data_return_the_truth_to_rounding() -> None:
    """Without noise the fit returns the parameters to 8 digits."""
    terms, form, truth, atoms = RECOVERED["Cp"]
    data = invented_solid(terms, truth, T, noise=0.0, cp_cv=form, atoms=atoms)
    assert_allclose(fit_model(data, ModelSettings(terms, cp_cv=form)).values, truth, rtol=1e-8)


@pytest.mark.slow
def test_right_minimum_from_no_guess_on_random_truths() -> None:
    """One Einstein beside one Debye term, sum free: the right minimum in at least 39 of 40 random solids.

    Right: within a chi-square of 0.1 of the best found from the truth and from six random starts.
    """
    model = build_model("debye + einstein + electronic")
    settings, points = ModelSettings(model.expression, "free"), np.geomspace(2.0, 300.0, 300)
    right = 0
    for seed in range(40):
        rng = np.random.default_rng(1000 + seed)
        truth = random_truth(rng)
        exact = heat_capacity(model, points, truth)
        C = exact * (1 + 0.005 * rng.standard_normal(points.size))
        par = parametrise(model, settings, Sample("x"), points, C)
        found = search(par, points, C, 0.005 * C, {}).best.chi_square
        others = [truth] + [random_truth(rng) for _ in range(6)]
        right += found <= min(minimise(par, each, points, C, 0.005 * C).chi_square for each in others) + 0.1
    assert right >= 39


def random_truth(rng: np.random.Generator) -> np.ndarray:
    while True:
        debye, einstein = np.exp(rng.uniform(np.log(60), np.log(1000), 2))
        if max(debye, einstein) / min(debye, einstein) >= 1.4:
            return np.array([debye, rng.uniform(0.9, 4.5), einstein, rng.uniform(0.3, 2), rng.uniform(0.3e-3, 3e-3)])


def test_equal_terms_are_sorted_by_theta() -> None:
    """Equal terms come in order of theta, with their covariance, when the user names none of their parameters."""
    terms, _, truth, atoms = RECOVERED["two Einstein"]
    data = invented_solid(terms, truth, T, seed=5, atoms=atoms)
    fit = fit_model(data, ModelSettings(terms))
    assert fit.values[fit.names.index("einstein1_theta")] < fit.values[fit.names.index("einstein2_theta")]
    swapped = fit_model(data, ModelSettings(terms, start={"einstein1_theta": 700.0, "einstein2_theta": 330.0}))
    assert swapped.values[swapped.names.index("einstein1_theta")] > 500
    order = [fit.names.index(n) for n in ("einstein2_theta", "einstein2_modes", "einstein1_theta", "einstein1_modes")]
    assert_allclose(swapped.values[2:6], fit.values[order], rtol=1e-6)
    assert_allclose(np.diag(swapped.covariance)[2:6], np.diag(fit.covariance)[order], rtol=1e-4)


def test_fixed_and_bounded_parameters_are_held() -> None:
    """A fixed value stays with u = 0; a bound that bites is reported as such, without a symmetric error."""
    terms, _, truth, atoms = RECOVERED["mixed insulator"]
    data = invented_solid(terms, truth, T, atoms=atoms)
    fixed = fit_model(data, ModelSettings(terms, fix={"debye_theta": 220.0}))
    held = parameter(fixed, "debye_theta")
    assert (held.value, held.u, held.status) == (220.0, 0.0, "fixed")
    bounded = fit_model(data, ModelSettings(terms, bounds={"einstein_theta": (300.0, 550.0)}))
    stuck = parameter(bounded, "einstein_theta")
    assert stuck.status == "at_bound"
    assert stuck.value == pytest.approx(550.0, rel=1e-4)
    assert stuck.u is None


def test_superfluous_term_ends_at_its_bound_not_below() -> None:
    """An electronic term on an insulator ends at gamma = 0 or within its error; modes never turn negative."""
    terms, _, truth, atoms = RECOVERED["mixed insulator"]
    data = invented_solid(terms, truth, T, atoms=atoms, seed=4)
    fit = fit_model(data, ModelSettings("debye + 2 einstein + electronic"))
    assert np.all(fit.values >= 0)
    gamma = parameter(fit, "electronic_gamma")
    assert gamma.status == "at_bound" or abs(gamma.value) < 4 * (gamma.u or 0)


def test_tied_modes_that_would_turn_negative_are_held_at_zero() -> None:
    """A mode count that would be negative by the sum rule is held at its bound and another one follows from the sum."""
    C = heat_capacity(build_model("einstein"), T, np.array([200.0, 6.0]))
    data = prepared_data(T, C, 0.01 * C + 0.01, atoms=2)
    fit = fit_model(data, ModelSettings("debye + einstein", bounds={"debye_theta": (700.0, 900.0)}))
    assert np.all(fit.values >= 0)
    assert fit.values[fit.names.index("debye_modes")] + fit.values[fit.names.index("einstein_modes")] == pytest.approx(
        6
    )


def test_covariance_agrees_with_the_scatter_of_refits() -> None:
    """u_fit is the standard deviation of the parameters over fresh noise (60 seeds, so to about 25 %)."""
    terms, _, truth, atoms = RECOVERED["mixed insulator"]
    fits = [
        fit_model(invented_solid(terms, truth, T[::2], seed=s, atoms=atoms), ModelSettings(terms)) for s in range(60)
    ]
    scatter = np.std([each.values for each in fits], axis=0, ddof=1)
    stated = np.mean([np.sqrt(np.diag(each.covariance)) for each in fits], axis=0)
    assert_allclose(scatter, stated, rtol=0.35)


def test_tied_mode_count_carries_the_uncertainty_of_the_sum_rule() -> None:
    """With two terms the tied mode count has the uncertainty of the free one, fully anticorrelated."""
    terms, _, truth, atoms = RECOVERED["mixed insulator"]
    fit = fit_model(invented_solid(terms, truth, T, atoms=atoms), ModelSettings(terms))
    tied, free = fit.names.index("debye_modes"), fit.names.index("einstein_modes")
    assert fit.parameters[tied].status == "tied"
    assert fit.covariance[tied, tied] == pytest.approx(fit.covariance[free, free], rel=1e-10)
    assert fit.covariance[tied, free] == pytest.approx(-fit.covariance[free, free], rel=1e-10)


def test_estimated_sigma_scales_the_covariance_and_stated_sigma_does_not() -> None:
    """Stated sigmas twice too small double sqrt(chi2_nu): u follows it, u_fit does not; estimated ones are scaled."""
    terms, _, truth, atoms = RECOVERED["mixed insulator"]
    good = invented_solid(terms, truth, T, atoms=atoms)
    C, half = np.array(good.heat_capacity), np.array(good.sigma) / 2
    stated = fit_model(prepared_data(T, C, half, atoms), ModelSettings(terms))
    estimated = fit_model(prepared_data(T, C, half, atoms, sigma_kind="estimated"), ModelSettings(terms))
    assert (stated.covariance_kind, estimated.covariance_kind) == ("absolute", "scaled")
    assert_allclose(estimated.covariance, stated.covariance * stated.scale_factor, rtol=1e-6)
    one = parameter(stated, "debye_theta")
    assert one.u == pytest.approx((one.u_fit or 0) * stated.scale_factor**0.5)
    assert parameter(estimated, "debye_theta").u == pytest.approx(one.u, rel=1e-6)


def test_indistinguishable_terms_are_called_undetermined() -> None:
    """Two Einstein terms held at one temperature cannot share out their modes: both are undetermined."""
    hot = np.geomspace(20.0, 300.0, 150)
    data = invented_solid("einstein", [200.0, 6.0], hot, atoms=2)
    held = {"einstein1_theta": 200.0, "einstein2_theta": 200.0}
    fit = fit_model(data, ModelSettings("debye + 2 einstein", "free", fix=held))
    assert parameter(fit, "einstein1_modes").status == "undetermined"
    assert parameter(fit, "einstein1_modes").u is None
    assert fit.condition == np.inf


def test_wrong_requests_are_refused_in_words() -> None:
    """Too few points, no terms, and Cp-Cv for Cv data are refused with one sentence."""
    data = invented_solid("debye", [280.0, 6.0], T[::50], atoms=2)
    with pytest.raises(InputError, match="too few for the 4 free parameters"):
        fit_model(data, ModelSettings("debye + einstein + electronic"))
    with pytest.raises(InputError, match="no model is named"):
        fit_model(data, ModelSettings(None))
    with pytest.raises(InputError, match="the data are Cv"):
        fit_model(
            invented_solid("debye", [280.0, 6.0], T, atoms=2, quantity="Cv"),
            ModelSettings("debye", cp_cv="nernst-lindemann"),
        )


def test_a_fit_is_repeatable() -> None:
    """The same data and seed give the same numbers, bit for bit."""
    terms, _, truth, atoms = RECOVERED["mixed metal"]
    data = invented_solid(terms, truth, T, atoms=atoms)
    first, second = (fit_model(data, ModelSettings(terms), seed=3) for _ in range(2))
    assert first.values.tolist() == second.values.tolist()

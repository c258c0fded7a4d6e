"""Models: expressions, sums, mode sum, Cp-Cv, Jacobian through every option, thermodynamic functions."""

from __future__ import annotations

import itertools
from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.integrate import quad

from latticefit.constants import GAS_CONSTANT, NERNST_LINDEMANN_A0
from latticefit.errors import InputError
from latticefit.fitting import parametrise
from latticefit.models import (
    CP_CV_FORMS,
    build_model,
    components,
    energy,
    entropy,
    heat_capacity,
    jacobian,
    low_temperature_theta,
    parse_expression,
    residual,
    total_modes,
)
from latticefit.records import FloatArray, ModelSettings, Sample

T = np.geomspace(2.0, 320.0, 40)
MIXED = [310.0, 4.1, 120.0, 0.7, 520.0, 1.2, 2.2e-3]


def coefficient(form: str) -> list[float]:
    """The example of the coefficient of a form of Cp-Cv, or nothing."""
    parameter = CP_CV_FORMS[form].parameter
    return [] if parameter is None else [parameter.example]


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("debye", (("debye", 1),)),
        ("debye+einstein", (("debye", 1), ("einstein", 1))),
        (" debye + 2 einstein + electronic ", (("debye", 1), ("einstein", 2), ("electronic", 1))),
        ("einstein + 2einstein", (("einstein", 3),)),
        ("Debye", (("debye", 1),)),
    ],
)
def test_expressions_are_read(text: str, expected: tuple[tuple[str, int], ...]) -> None:
    """Terms joined by + with an optional count are read in any spacing."""
    assert parse_expression(text) == expected


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("", "cannot read"),
        ("debye +", "cannot read"),
        ("debye + einstien", "did you mean 'einstein'"),
        ("debye * 2", "cannot read"),
        ("0 debye", "1 to 9"),
        ("12 debye", "1 to 9"),
        ("electronic", "no lattice term"),
        ("debye + 2 electronic", "one electronic term is enough"),
    ],
)
def test_bad_expressions_are_refused_in_words(text: str, words: str) -> None:
    """A wrong expression is refused with what to write instead."""
    with pytest.raises(InputError, match=words):
        parse_expression(text)


def test_parameter_names_are_numbered_when_a_kind_repeats() -> None:
    """Names are term + quantity, numbered only when a kind repeats, the Cp-Cv coefficient last."""
    model = build_model("debye + 2 einstein + electronic", "nernst-lindemann")
    assert model.names == (
        "debye_theta",
        "debye_modes",
        "einstein1_theta",
        "einstein1_modes",
        "einstein2_theta",
        "einstein2_modes",
        "electronic_gamma",
        "nernst_lindemann_coefficient",
    )


@pytest.mark.parametrize("form", CP_CV_FORMS)
def test_components_add_up(form: str) -> None:
    """The heat capacities of the terms and of Cp-Cv add up to the model."""
    model = build_model("debye + 2 einstein + electronic", form)
    values = np.array(MIXED + coefficient(form))
    assert_allclose(sum(components(model, T, values).values()), heat_capacity(model, T, values), rtol=1e-13)


def test_nernst_lindemann_solves_its_equation_for_the_lattice_part() -> None:
    """Cp - Cv = A Cp^2 T holds for the lattice part, and the electronic part stands outside."""
    plain, dilated = build_model("debye + electronic"), build_model("debye + electronic", "nernst-lindemann")
    values = np.array([300.0, 6.0, 3e-3])
    cv = heat_capacity(plain, T, values) - 3e-3 * T
    cp = heat_capacity(dilated, T, np.append(values, 5e-6)) - 3e-3 * T
    assert_allclose(cp - cv, 5e-6 * cp**2 * T, rtol=1e-9, atol=1e-14)


@pytest.mark.parametrize("form", [each for each in CP_CV_FORMS.values() if each.parameter], ids=lambda e: e.name)
def test_cp_cv_inverts_and_its_slopes_are_right(form) -> None:  # type: ignore[no-untyped-def]
    """The harmonic heat capacity comes back from the measured one; slopes agree with central differences."""
    C = 50 * T**2 / (T**2 + 60**2)
    a = coefficient(form.name)[0]
    measured = form.apply(T, C, a)
    assert_allclose(form.invert(T, measured, a), C, rtol=1e-12)
    by_c, by_a = form.slopes(T, C, a)
    assert_allclose(by_c, (form.apply(T, C * 1.0001, a) - form.apply(T, C * 0.9999, a)) / (2e-4 * C), rtol=1e-7)
    h = 1e-3 * abs(a)
    assert_allclose(by_a, (form.apply(T, C, a + h) - form.apply(T, C, a - h)) / (2 * h), rtol=1e-6)
    tiny = 1e-6 * a
    assert_allclose(
        (form.apply(T, C, tiny) - C) / tiny, form.start_basis(T, C), rtol=1e-4, atol=1e-13 * C.max() / abs(tiny)
    )
    if form.largest_coefficient is not None:
        largest = form.largest_coefficient(float(T.max()), float(C.max()))
        assert form.parameter.low < a < largest <= form.parameter.high
        if form.solvable is not None:
            assert form.solvable(T, C, largest).all()


@pytest.mark.parametrize("form", CP_CV_FORMS.values(), ids=lambda e: e.name)
def test_forms_state_what_they_are(form) -> None:  # type: ignore[no-untyped-def]
    """A form stands under its own name, says what it means, and where it was published unless it does nothing."""
    assert CP_CV_FORMS[form.name] is form
    assert form.name.replace("-", "_").isidentifier()
    assert form.meaning
    if form.parameter is not None:
        assert any(character.isdigit() for character in form.source)
        assert form.parameter.low < form.parameter.example < form.parameter.high


def test_only_nernst_lindemann_ends_where_it_has_no_solution() -> None:
    """Cp = C (1 + A Cp T) has a solution while 4 A T C < 1; the table says so by NaN beyond."""
    form = CP_CV_FORMS["nernst-lindemann"]
    assert form.solvable is not None
    assert form.solvable(np.array([499.0, 501.0]), np.array([50.0, 50.0]), 1e-5).tolist() == [True, False]
    assert CP_CV_FORMS["anharmonic"].solvable is None


CASES = {
    "free sum": ModelSettings("debye + 2 einstein + electronic", "free"),
    "fixed sum": ModelSettings("debye + 2 einstein + electronic", "fixed"),
    "one fixed": ModelSettings("debye + 2 einstein + electronic", "fixed", fix={"einstein1_modes": 0.7}),
    "theta fixed": ModelSettings("debye + 2 einstein + electronic", "free", fix={"debye_theta": 310.0}),
    "tied moved": ModelSettings("debye + 2 einstein + electronic", "fixed", start={"debye_modes": 4.0}),
    "bounded": ModelSettings("debye + 2 einstein + electronic", "fixed", bounds={"einstein1_theta": (50.0, 200.0)}),
    "two debye": ModelSettings("2 debye", "fixed"),
    "all modes fixed": ModelSettings("debye + einstein", "fixed", fix={"debye_modes": 4.0, "einstein_modes": 2.0}),
}


@pytest.mark.parametrize("form", CP_CV_FORMS)
@pytest.mark.parametrize("case", CASES)
def test_jacobian_agrees_with_central_differences_of_the_weighted_residual(case: str, form: str) -> None:
    """The analytic Jacobian follows every option: sum fixed or free, fixed, bounded, tied elsewhere, Cp-Cv."""
    settings = replace(CASES[case], cp_cv=form)
    model = build_model(settings.terms or "", form)
    rng = np.random.default_rng(7)
    measured = 45 * T**2 / (T**2 + 70**2) * (1 + 0.01 * rng.standard_normal(T.size))
    sigma = 0.01 * measured
    par = parametrise(model, settings, Sample("x", atoms=2), T, measured)
    wanted = dict(
        zip(model.names, MIXED + coefficient(form), strict=True)
        if "2 einstein" in (settings.terms or "")
        else zip(model.names, [310.0, 4.0, 420.0, 2.0, *coefficient(form)], strict=True)
    )
    x = np.array([wanted[model.names[i]] for i in par.free])
    found = jacobian(par, x, T, measured, sigma)
    assert found.shape == (T.size, par.free.size)
    for k in range(x.size):
        h = 1e-5 * abs(x[k])
        up, down = x.copy(), x.copy()
        up[k] += h
        down[k] -= h
        slope = (residual(par, up, T, measured, sigma) - residual(par, down, T, measured, sigma)) / (2 * h)
        assert_allclose(found[:, k], slope, rtol=2e-6, atol=1e-7 * np.abs(slope).max())


@pytest.mark.parametrize("case", ["fixed sum", "one fixed", "tied moved", "two debye", "all modes fixed"])
def test_mode_sum_is_held_at_three_per_atom(case: str) -> None:
    """With the sum fixed, any free values give 3 modes per atom."""
    settings = CASES[case]
    model = build_model(settings.terms or "")
    par = parametrise(model, settings, Sample("x", atoms=2), T, T)
    values = par.expand(np.linspace(0.5, 0.9, par.free.size))
    assert total_modes(model, values) == pytest.approx(6.0, abs=1e-12)


def test_melting_point_fixes_the_nernst_lindemann_coefficient() -> None:
    """With a melting point the coefficient is A0/(n Tm) per mole of formula, unless the user names it."""
    model = build_model("debye", "nernst-lindemann")
    sample = Sample("x", atoms=2, melting_point=1000.0)
    C = np.full_like(T, 20.0)
    held = parametrise(model, ModelSettings("debye", cp_cv="nernst-lindemann"), sample, T, C)
    assert held.base[-1] == NERNST_LINDEMANN_A0 / 2000
    named = ModelSettings("debye", cp_cv="nernst-lindemann", bounds={"nernst_lindemann_coefficient": (0, 1e-5)})
    assert len(model.names) - 1 in parametrise(model, named, sample, T, C).free


@pytest.mark.parametrize(
    ("settings", "atoms", "words"),
    [
        (ModelSettings("debye", fix={"debye_theat": 3}), 1, "did you mean 'debye_theta'"),
        (ModelSettings("debye", start={"einstein_theta": 3}), 1, "does not have"),
        (ModelSettings("debye", bounds={"debye_theta": (300, 200)}), 1, "must be below"),
        (ModelSettings("debye", bounds={"debye_theta": (-5, 0)}), 1, "outside the range"),
        (ModelSettings("debye", fix={"debye_theta": -3}), 1, "lies outside"),
        (ModelSettings("debye", start={"debye_theta": 90}, bounds={"debye_theta": (100, 200)}), 1, "lies outside"),
        (ModelSettings("debye", start={"debye_theta": 90}, fix={"debye_theta": 90}), 1, "one or the other"),
        (ModelSettings("debye", "fixed"), None, "needs the atoms"),
        (ModelSettings("debye", fix={"debye_modes": 2}), 1, "add up to 2"),
        (ModelSettings("debye + einstein", fix={"debye_modes": 3}), 1, "leave none"),
        (ModelSettings("debye + einstein", fix={"debye_modes": 4}), 1, "leave none"),
    ],
)
def test_wrong_holds_are_refused_in_words(settings: ModelSettings, atoms: float | None, words: str) -> None:
    """Unknown names, impossible values and contradictions are refused with one sentence."""
    with pytest.raises(InputError, match=words):
        parametrise(build_model(settings.terms or ""), settings, Sample("x", atoms=atoms), T, T)


@pytest.mark.parametrize("form", CP_CV_FORMS)
@pytest.mark.parametrize("upper", [3.0, 40.0, 298.15, 900.0])
def test_energy_and_entropy_are_integrals_to_1e_8(form: str, upper: float) -> None:
    """H and S of the whole model, Cp-Cv included, are the integrals of C and C/T to 1e-8."""
    model = build_model("debye + 2 einstein + electronic", form)
    values = np.array(MIXED + coefficient(form))

    def capacity(t: float) -> float:
        return float(heat_capacity(model, np.array([t]), values)[0])

    edges = [0.0, *np.geomspace(upper / 300, upper, 10)]
    pairs = list(itertools.pairwise(edges))
    H = sum(quad(capacity, a, b, epsabs=0, epsrel=1e-11)[0] for a, b in pairs)
    S = sum(quad(lambda t: capacity(t) / t, a, b, epsabs=0, epsrel=1e-11)[0] for a, b in pairs)
    at = np.array([upper])
    assert_allclose(energy(model, at, values)[0], H, rtol=1e-8)
    assert_allclose(entropy(model, at, values)[0], S, rtol=1e-8)


def test_oscillators_add() -> None:
    """N oscillators of one frequency have N times the heat capacity of one (common practice, no source)."""
    one, many = build_model("einstein"), build_model("3 einstein")
    values = np.array([200.0, 1.0] * 3)
    assert_allclose(heat_capacity(many, T, values), 3 * heat_capacity(one, T, values[:2]), rtol=1e-14)


def test_low_temperature_theta_is_per_atom() -> None:
    """Moving modes from the Debye term to an Einstein term raises theta_D(T->0) by (n/w)^(1/3)."""
    model = build_model("debye + einstein")
    values = np.array([200.0, 3.0, 400.0, 3.0])
    assert low_temperature_theta(model, values, 2) == pytest.approx(200 * 2 ** (1 / 3), rel=1e-13)
    assert low_temperature_theta(model, values, None) == pytest.approx(200 * 2 ** (1 / 3), rel=1e-13)
    assert low_temperature_theta(build_model("einstein"), np.array([200.0, 3.0]), 1) is None


def test_total_heat_capacity_tends_to_three_n_r(  # the sum rule of the whole model
) -> None:
    """A mode sum of 3n gives Dulong and Petit's 3nR at high temperature (common practice, no source)."""
    model = build_model("debye + einstein")
    hot: FloatArray = np.array([1e5])
    assert heat_capacity(model, hot, np.array([300.0, 4.0, 500.0, 2.0]))[0] == pytest.approx(6 * GAS_CONSTANT, rel=1e-5)

"""The lmfit Model classes: alone, added, guessed; and the two classic mistakes with a supplied Jacobian."""

from __future__ import annotations

import pickle
import subprocess
import sys
from dataclasses import replace

import lmfit
import numpy as np
import pytest
from numpy.testing import assert_allclose

import latticefit as lf
from latticefit.errors import InputError
from latticefit.models import build_model, heat_capacity
from latticefit.models.lmfit_models import weighted_jacobian
from latticefit.records import FloatArray
from latticefit.terms import TERMS

T = np.geomspace(3.0, 300.0, 120)
TRUTH = {
    "debye_theta": 310.0,
    "debye_modes": 4.0,
    "einstein_theta": 150.0,
    "einstein_modes": 2.0,
    "electronic_gamma": 2e-3,
}


def noisy(seed: int = 3) -> tuple[FloatArray, FloatArray]:
    exact = heat_capacity(build_model("debye + einstein + electronic"), T, np.array(list(TRUTH.values())))
    sigma = 0.005 * exact
    return exact + sigma * np.random.default_rng(seed).standard_normal(T.size), sigma


def composite() -> lmfit.Model:
    return (
        lf.models.DebyeModel(prefix="debye_")
        + lf.models.EinsteinModel(prefix="einstein_")
        + lf.models.ElectronicModel(prefix="electronic_")
    )


def starts(model: lmfit.Model) -> lmfit.Parameters:
    return model.make_params(
        debye_theta=280.0, debye_modes=3.5, einstein_theta=130.0, einstein_modes=2.5, electronic_gamma=1e-3
    )


@pytest.mark.parametrize("name", TERMS)
def test_every_term_has_an_lmfit_model_that_evaluates_it(name: str) -> None:
    """Each registered term is an lmfit Model with its parameters, and both give one heat capacity."""
    term = TERMS[name]
    model = getattr(lf.models, term.model_class_name)(prefix="one_")
    own = term.heat_capacity(T, *(spec.example for spec in term.parameters))
    assert_allclose(model.eval(model.make_params(), T=T), own, rtol=1e-15)
    assert type(model) is getattr(lf.models, term.model_class_name)
    assert term.name in (type(model).__doc__ or "")
    for spec in term.parameters:
        start = model.make_params()[f"one_{spec.quantity}"]
        assert (start.min, start.max) == (spec.low, spec.high)
        assert start.min < start.value < start.max, "lmfit never leaves a bound that it starts on"


@pytest.mark.parametrize("name", TERMS)
def test_models_can_be_pickled(name: str) -> None:
    """A model goes to another process and back: class, prefix and heat capacity stay."""
    model = getattr(lf.models, TERMS[name].model_class_name)(prefix="one_")
    again = pickle.loads(pickle.dumps(model))
    assert type(again) is type(model)
    parameters = model.make_params()
    assert_allclose(again.eval(parameters, T=T), model.eval(parameters, T=T), rtol=0)


def test_model_classes_are_listed_without_importing_lmfit() -> None:
    """dir() of the models names every class and the Jacobian, at no price; an unknown name is an AttributeError."""
    code = (
        "import sys, latticefit; names = dir(latticefit.models);"
        "wrong = hasattr(latticefit.models, 'DebeyModel') or 'lmfit' in sys.modules; print(*names); sys.exit(wrong)"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
    assert {"weighted_jacobian", "build_model", *(t.model_class_name for t in TERMS.values())} <= {*done.stdout.split()}


def test_models_add_and_fit_as_latticefit_does() -> None:
    """A person's own composite with the analytic Jacobian reaches the optimum of lf's plain-array fit."""
    C, sigma = noisy()
    model = composite()
    jac = weighted_jacobian(model)
    found = model.fit(C, starts(model), T=T, weights=1 / sigma, scale_covar=False, fit_kws={"Dfun": jac})
    plain = model.fit(C, starts(model), T=T, weights=1 / sigma, scale_covar=False)
    for name, value in TRUTH.items():
        assert abs(found.params[name].value - value) < 4 * found.params[name].stderr
        assert found.params[name].value == pytest.approx(plain.params[name].value, rel=2e-5)
        assert found.params[name].stderr == pytest.approx(plain.params[name].stderr, rel=1e-3)


def differences(model: lmfit.Model, parameters: lmfit.Parameters, C: FloatArray, weights: FloatArray) -> FloatArray:
    """Central differences of lmfit's own weighted residual, (data - model) weights."""
    columns = []
    for name in [each for each, p in parameters.items() if p.vary]:
        at = []
        h = 1e-5 * parameters[name].value
        for sign in (1, -1):
            moved = parameters.copy()
            moved[name].set(value=parameters[name].value + sign * h)
            at.append(model._residual(moved, C, weights, T=T))
        columns.append((at[0] - at[1]) / (2 * h))
    return np.stack(columns, axis=1)


@pytest.mark.parametrize("fixed", [(), ("debye_modes",), ("einstein_theta", "electronic_gamma")])
def test_jacobian_is_that_of_the_weighted_residual(fixed: tuple[str, ...]) -> None:
    """Sign and weights are those of lmfit's residual, for any set of varying parameters.

    The wrong sign leaves a fit at its start with success=True; forgotten weights move the optimum: both would fail
    here.
    """
    C, sigma = noisy()
    model = composite()
    parameters = starts(model)
    for name in fixed:
        parameters[name].vary = False
    expected = differences(model, parameters, C, 1 / sigma)
    found = weighted_jacobian(model)(parameters, C, 1 / sigma, T=T)
    assert_allclose(found, expected, rtol=1e-6, atol=1e-6 * np.abs(expected).max())
    # the two mistakes are large against the tolerance: the check above can fail
    assert np.abs(-found - expected).max() > np.abs(expected).max()
    assert np.abs(found * sigma[:, None] - expected).max() > 0.5 * np.abs(expected).max()


def test_wrong_sign_and_forgotten_weights_do_harm_in_silence() -> None:
    """What the guard above protects from: both mistakes end with success=True, away from the optimum."""
    C, sigma = noisy()
    model = composite()
    right = weighted_jacobian(model)
    options = {"T": T, "weights": 1 / sigma, "scale_covar": False}
    good = model.fit(C, starts(model), fit_kws={"Dfun": right}, **options)
    flipped = model.fit(C, starts(model), fit_kws={"Dfun": lambda *a, **k: -right(*a, **k)}, **options)
    unweighted = model.fit(C, starts(model), fit_kws={"Dfun": lambda p, d, w, T: right(p, d, None, T)}, **options)
    assert good.chisqr < 1.5 * T.size
    assert flipped.chisqr > 10 * good.chisqr
    assert unweighted.chisqr > good.chisqr + 1


def test_jacobian_returns_a_fresh_array_each_call() -> None:
    """lmfit scales the returned array in place, so it must not be kept."""
    C, sigma = noisy()
    model = composite()
    jac = weighted_jacobian(model)
    first = jac(starts(model), C, 1 / sigma, T=T)
    copy = first.copy()
    first *= 0
    assert_allclose(jac(starts(model), C, 1 / sigma, T=T), copy, rtol=0)


def test_expressions_and_foreign_models_are_refused() -> None:
    """A tied parameter (no chain rule in lmfit) and a foreign component are refused in words."""
    C, _ = noisy()
    model = composite()
    parameters = starts(model)
    parameters["einstein_modes"].expr = "6 - debye_modes"
    with pytest.raises(InputError, match="has an expression"):
        weighted_jacobian(model)(parameters, C, None, T=T)
    foreign = lmfit.Model(lambda T, slope: slope * T, prefix="line_", independent_vars=["T"])
    with pytest.raises(InputError, match="latticefit's term models"):
        weighted_jacobian(foreign)(foreign.make_params(slope=1.0), C, None, T=T)


@pytest.mark.parametrize("name", TERMS)
@pytest.mark.parametrize("own", [True, False])
def test_guess_leads_to_the_truth(name: str, own: bool) -> None:
    """`guess` needs nothing but the data, and a fit from it recovers one term; so does the default from the examples.

    The truth has other values than the examples: 0.8 of the scales, twice the amplitudes.
    """
    term = TERMS[name]
    kind = getattr(lf.models, term.model_class_name)
    if not own:
        kind = type("Plain", (kind,), {"term": replace(term, guess=None)})
    model = kind(prefix="one_")
    truth = {spec.quantity: spec.example * (0.8 if spec.role == "scale" else 2.0) for spec in term.parameters}
    exact = model.eval(model.make_params(**truth), T=T)
    found = model.fit(exact, model.guess(exact, T=T), T=T, weights=1 / exact)
    for quantity, value in truth.items():
        assert found.params[f"one_{quantity}"].value == pytest.approx(value, rel=1e-6)

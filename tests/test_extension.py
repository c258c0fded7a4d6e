"""What DEVELOPERS.md promises: a term, a form of Cp-Cv, a warning or a figure is registered in one place, no more.

Each toy here is put into its registry and nowhere else, and then goes all the way to the report folder.
"""

from __future__ import annotations

import inspect
import json
import pickle
from dataclasses import dataclass
from math import inf
from pathlib import Path

import numpy as np
import pytest
import test_models
import test_report_figures
import test_terms
from analysis_factory import CASES, build
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from numpy.testing import assert_allclose

import latticefit as lf
from latticefit.constants import GAS_CONSTANT
from latticefit.diagnosing import rules
from latticefit.diagnosing.case import Case
from latticefit.fitting import parametrise, start
from latticefit.models import build_model, cp_cv, heat_capacity, jacobian, residual
from latticefit.models.cp_cv import CpCvForm
from latticefit.records import Analysis, FloatArray, ModelSettings, NamedWarning, Sample
from latticefit.report.figures import ReportFigure
from latticefit.report.figures import registry as figure_registry
from latticefit.terms import ParameterSpec, Term, registry

T = np.geomspace(1.5, 300.0, 140)


# two levels a gap apart, equally degenerate, with `amount` per formula unit: W. Schottky, Phys. Z. 23, 448 (1922)
def _two_level(T: FloatArray, gap: float, amount: float) -> FloatArray:
    x = gap / T
    return np.asarray(amount * GAS_CONSTANT * x**2 * np.exp(-x) / (1 + np.exp(-x)) ** 2)


def _two_level_partials(T: FloatArray, gap: float, amount: float) -> FloatArray:
    x, c = gap / T, _two_level(T, gap, 1.0)
    return np.stack([amount * c * (2 - x * np.tanh(x / 2)) / gap, c])


def _two_level_energy(T: FloatArray, gap: float, amount: float) -> FloatArray:
    return np.asarray(amount * GAS_CONSTANT * gap * np.exp(-gap / T) / (1 + np.exp(-gap / T)))


def _two_level_entropy(T: FloatArray, gap: float, amount: float) -> FloatArray:
    return np.asarray(amount * GAS_CONSTANT * np.log1p(np.exp(-gap / T)) + _two_level_energy(T, gap, amount) / T)


def _nothing(*parameters: float) -> float:
    return 0.0


TWO_LEVEL = Term(
    name="two_level",
    parameters=(
        ParameterSpec("gap", "K", 0.1, 1e4, "scale", "distance of the two levels", 12.0),
        ParameterSpec("amount", "1", 0.0, inf, "amplitude", "two-level systems per formula unit", 0.2),
    ),
    lattice=False,
    heat_capacity=_two_level,
    partials=_two_level_partials,
    energy=_two_level_energy,
    entropy=_two_level_entropy,
    zero_point_energy=_nothing,
    cubic_coefficient=_nothing,
    theta_mean=None,
    low_limit="exponentially small",
    high_limit="amount R (gap/2T)^2",
    source="W. Schottky, Phys. Z. 23, 448 (1922)",
)

# two amplitudes and no scale
POLYNOMIAL = Term(
    name="polynomial",
    parameters=(
        ParameterSpec("linear", "J/(mol K^2)", 0.0, inf, "amplitude", "coefficient of T", 2e-3),
        ParameterSpec("square", "J/(mol K^3)", 0.0, inf, "amplitude", "coefficient of T^2", 1e-4),
    ),
    lattice=False,
    heat_capacity=lambda T, g, h: g * T + h * T**2,
    partials=lambda T, g, h: np.stack([T, T**2]),
    energy=lambda T, g, h: g * T**2 / 2 + h * T**3 / 3,
    entropy=lambda T, g, h: g * T + h * T**2 / 2,
    zero_point_energy=_nothing,
    cubic_coefficient=_nothing,
    theta_mean=None,
    low_limit="linear T",
    high_limit="square T^2",
    source="invented, 2026",
)

TOYS = {each.name: each for each in (TWO_LEVEL, POLYNOMIAL)}
CHECKS = {
    name: check
    for name, check in inspect.getmembers(test_terms, inspect.isfunction)
    if name.startswith("test_") and list(inspect.signature(check).parameters) == ["each"]
}


@pytest.fixture
def toys(monkeypatch: pytest.MonkeyPatch) -> None:
    """Register both terms, in the one place there is."""
    for name, each in TOYS.items():
        monkeypatch.setitem(registry._TERMS, name, each)


def _measurement(folder: Path, terms: str, values: list[float], form: str = "none", seed: int = 4) -> lf.Measurement:
    """A file of invented data drawn from a model, 0.5 % noise, read with that sigma."""
    exact = heat_capacity(build_model(terms, form), T, np.array(values))
    C = exact * (1 + 0.005 * np.random.default_rng(seed).standard_normal(T.size))
    rows = [f"{t:.9g},{c:.12g}" for t, c in zip(T, C, strict=True)]
    path = folder / "invented.csv"
    path.write_text("\n".join(["# invented data", "T_K,Cp_J_molK", *rows]) + "\n", encoding="utf-8")
    return lf.read(path, atoms=1, sigma="0.5%")


@pytest.mark.usefixtures("toys")
@pytest.mark.parametrize("check", CHECKS)
@pytest.mark.parametrize("name", TOYS)
def test_the_tests_of_terms_hold_for_a_new_one(name: str, check: str) -> None:
    """Every check of tests/test_terms.py serves a term with quantities that no shipped term has."""
    assert len(CHECKS) >= 10
    CHECKS[check](TOYS[name])


@pytest.mark.usefixtures("toys")
def test_a_new_term_stands_in_models() -> None:
    """Expression, numbered names, and a Jacobian that agrees with central differences beside Cp-Cv."""
    model = build_model("debye + 2 Two_Level + polynomial", "nernst-lindemann")
    assert model.expression == "debye + 2 two_level + polynomial"
    assert model.names[2:6] == ("two_level1_gap", "two_level1_amount", "two_level2_gap", "two_level2_amount")
    values = np.array([300.0, 3.0, 9.0, 0.2, 70.0, 0.1, 2e-3, 1e-5, 2e-6])
    C = heat_capacity(model, T, values)
    settings = ModelSettings(model.expression, cp_cv="nernst-lindemann")
    par = parametrise(model, settings, Sample("x", atoms=1), T, C)
    x = values[par.free]
    found = jacobian(par, x, T, C, C)
    for k in range(x.size):
        h = np.where(np.arange(x.size) == k, 1e-5 * x, 0.0)
        slope = (residual(par, x + h, T, C, C) - residual(par, x - h, T, C, C)) / (2 * h[k])
        assert_allclose(found[:, k], slope, rtol=2e-6, atol=1e-7 * np.abs(slope).max())


@pytest.mark.usefixtures("toys")
def test_amplitudes_of_one_term_are_searched_apart() -> None:
    """In the linear start search two amplitudes of one term have two columns, and the best start is the truth."""
    model = build_model("debye + polynomial")
    truth = np.array([300.0, 3.0, 2e-3, 1e-4])
    C = heat_capacity(model, T, truth)
    settings = ModelSettings(model.expression, fix={"debye_theta": 300.0})
    par = parametrise(model, settings, Sample("x", atoms=1), T, C)
    best = start._candidates(par, {}, (T, C, 0.01 * C), 0)[0]
    assert_allclose(best, truth, rtol=1e-6)


@pytest.mark.usefixtures("toys")
def test_a_new_term_is_fitted_and_reported(tmp_path: Path) -> None:
    """Read, search, fit, table and report folder: the new parameters come out with value, u and unit everywhere."""
    truth = {"two_level_gap": 9.0, "two_level_amount": 0.15}
    terms = "debye + two_level"
    fit = lf.fit(_measurement(tmp_path, terms, [310.0, 3.0, *truth.values()]), terms=terms)
    assert fit.analysis.diagnosis.describes
    out = fit.save(tmp_path / "out")
    record = json.loads((out / "result.json").read_text("utf-8"))
    for name, value in truth.items():
        found = record["parameters"][name]
        assert found["status"] == "fitted"
        assert abs(found["value"] - value) < 4 * found["u"]
    assert record["parameters"]["two_level_gap"]["unit"] == "K"
    assert "two_level" in fit.analysis.derived.table.components
    entropy = fit.table([298.15])["entropy_J_mol_K"].iloc[0]
    plain = lf.fit(_measurement(tmp_path, "debye", [310.0, 3.0]), terms="debye").table([298.15])
    assert entropy - plain["entropy_J_mol_K"].iloc[0] == pytest.approx(0.15 * GAS_CONSTANT * np.log(2), rel=0.1)
    assert "two_level_gap" in repr(fit), "what is not lattice belongs to the key numbers"
    for name in ("report.txt", "report.html", "run_sheet.toml"):
        assert "two_level" in (out / name).read_text("utf-8")


@pytest.mark.usefixtures("toys")
def test_a_new_term_has_its_lmfit_class() -> None:
    """TwoLevelModel is listed, starts inside its bounds, guesses, adds, has the Jacobian and can be pickled."""
    assert {"TwoLevelModel", "PolynomialModel"} <= set(dir(lf.models))
    alone = lf.models.TwoLevelModel(prefix="levels_")
    exact = alone.eval(alone.make_params(gap=20.0, amount=0.7), T=T)
    found = alone.fit(exact, alone.guess(exact, T=T), T=T)
    assert found.params["levels_gap"].value == pytest.approx(20.0, rel=1e-5)
    assert type(pickle.loads(pickle.dumps(alone))) is type(alone)
    both = lf.models.DebyeModel(prefix="debye_") + alone
    C = both.eval(both.make_params(levels_gap=20.0, levels_amount=0.7), T=T)
    jac = lf.models.weighted_jacobian(both)
    fitted = both.fit(C, both.make_params(), T=T, weights=1 / C, fit_kws={"Dfun": jac})
    assert fitted.params["levels_amount"].value == pytest.approx(0.7, rel=1e-5)


def test_the_toys_are_not_shipped() -> None:
    """Without registration there is no such term and no such class."""
    with pytest.raises(lf.InputError, match="is not a term"):
        build_model("debye + two_level")
    assert not hasattr(lf.models, "TwoLevelModel")


# Cp = C (1 + a T C): the first order of Nernst and Lindemann's equation, invented as a form of its own
FORM = CpCvForm(
    name="first-order",
    meaning="Cp - Cv = a C^2 T of the lattice part",
    source="invented, 2026",
    apply=lambda T, C, a: C * (1 + a * T * C),
    slopes=lambda T, C, a: (1 + 2 * a * T * C, T * C * C),
    invert=lambda T, measured, a: 2 * measured / (1 + np.sqrt(1 + 4 * a * T * measured)),
    start_basis=lambda T, measured: measured * measured * T,
    parameter=ParameterSpec("coefficient", "mol/J", 0.0, inf, "amplitude", "a in Cp - Cv = a C^2 T", 3e-6),
    from_melting_point=lambda atoms, melting_point: 4e-3 / (atoms * melting_point),
)


@pytest.fixture
def form(monkeypatch: pytest.MonkeyPatch) -> str:
    """Register the form, in the one place there is."""
    monkeypatch.setitem(cp_cv._FORMS, FORM.name, FORM)
    return FORM.name


def test_a_new_form_of_cp_cv_passes_the_tests_of_models(form: str) -> None:
    """Inversion, slopes, components, Jacobian, energy and entropy: the tests that loop over the forms serve it."""
    test_models.test_cp_cv_inverts_and_its_slopes_are_right(FORM)
    test_models.test_forms_state_what_they_are(FORM)
    test_models.test_components_add_up(form)
    test_models.test_jacobian_agrees_with_central_differences_of_the_weighted_residual("fixed sum", form)
    test_models.test_energy_and_entropy_are_integrals_to_1e_8(form, 298.15)


def test_a_new_form_of_cp_cv_is_fitted_and_reported(form: str, tmp_path: Path) -> None:
    """Its coefficient is fitted, or held by its own rule from the melting point with the warning that goes with it."""
    measurement = _measurement(tmp_path, "debye", [310.0, 3.0, 8e-6], form)
    fit = lf.fit(measurement, terms="debye", cp_cv=form)
    found = json.loads((fit.save(tmp_path / "out") / "result.json").read_text("utf-8"))
    coefficient = found["parameters"]["first_order_coefficient"]
    assert abs(coefficient["value"] - 8e-6) < 4 * coefficient["u"]
    assert found["model"]["cp_cv"] == form
    melting = lf.read(tmp_path / "invented.csv", atoms=1, sigma="0.5%", melting_point="500 K")
    held = lf.fit(melting, terms="debye", cp_cv=form)
    assert held.parameters.loc["first_order_coefficient", "value"] == pytest.approx(8e-6)
    assert "cp-cv-from-melting-point" in [each.code for each in held.analysis.warnings]
    own = lf.fit(melting, terms="debye", cp_cv=form, fix={"first_order_coefficient": 7e-6})
    assert "cp-cv-from-melting-point" not in [each.code for each in own.analysis.warnings]


def test_a_new_warning_reaches_the_report(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A rule that is registered is asked, and its warning stands in text, page and record."""

    def many_points(case: Case) -> NamedWarning | None:
        n = case.prepared.temperature.size
        return NamedWarning("many-points", "note", "data", f"there are {n} points", float(n), 100.0, "rejoice")

    monkeypatch.setitem(rules._RULES, "many-points", many_points)
    out = lf.fit(_measurement(tmp_path, "debye", [310.0, 3.0]), terms="debye").save(tmp_path / "out", figures="none")
    for name in ("report.txt", "report.html", "result.json"):
        text = (out / name).read_text("utf-8")
        assert "many-points" in text
        assert "there are 140 points" in text


@dataclass(frozen=True)
class _Artists:
    axes: Axes


def _draw(figure: Figure, analysis: Analysis) -> _Artists:
    axes = figure.add_subplot()
    axes.plot(analysis.prepared.temperature**2, analysis.prepared.heat_capacity / analysis.prepared.heat_capacity.max())
    axes.set_xlabel("$T^2$ / K$^2$")
    axes.set_ylabel("share of the largest value")
    return _Artists(axes)


def _alt(analysis: Analysis) -> str:
    return f"Shares of {analysis.prepared.temperature.size} points over the square of the temperature."


FIGURE = ReportFigure("share", "Share of the largest value", 60.0, _draw, _alt, ("share of the largest value",))


def test_a_new_figure_is_drawn_and_reported(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A figure over T^2, without legend, passes the tests that loop over figures, and stands in folder and page."""
    monkeypatch.setitem(figure_registry._FIGURES, FIGURE.name, FIGURE)
    metal = build(CASES["metal"], tmp_path)
    test_report_figures.test_every_figure_draws_good_and_poor_cases(FIGURE.name, "coldstop", tmp_path)
    test_report_figures.test_axes_are_labelled_in_quantity_calculus(FIGURE.name, metal)
    test_report_figures.test_the_same_analysis_gives_the_same_bytes(FIGURE.name, metal)
    test_report_figures.test_legend_covers_no_axes_and_stays_in_the_figure(metal)
    out = lf.fit(_measurement(tmp_path, "debye", [310.0, 3.0]), terms="debye").save(tmp_path / "out")
    assert (out / "figures" / "share.svg").is_file()
    assert FIGURE.title in (out / "report.html").read_text("utf-8")
    assert "Shares of 140 points" in (out / "report.html").read_text("utf-8")

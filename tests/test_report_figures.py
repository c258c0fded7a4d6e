"""The figures: what is drawn, labels and units, nothing lost outside the frame, no global state."""

from __future__ import annotations

import re
from dataclasses import FrozenInstanceError, fields, replace
from pathlib import Path
from typing import Any

import matplotlib as mpl
import numpy as np
import pytest
from analysis_factory import CASES, build, renamed, undetermined
from matplotlib.figure import Figure

from latticefit.constants import GAS_CONSTANT
from latticefit.errors import InputError
from latticefit.records import Analysis
from latticefit.report import FIGURES, draw_figure, render
from latticefit.report.figures.style import component_looks


@pytest.fixture(scope="module")
def metal(tmp_path_factory: pytest.TempPathFactory) -> Analysis:
    """Two runs, masked points, an electronic term."""
    return build(CASES["metal"], tmp_path_factory.mktemp("metal"))


@pytest.fixture(scope="module")
def coldstop(tmp_path_factory: pytest.TempPathFactory) -> Analysis:
    """Data from 50 K, theta_D(T->0) withheld."""
    return build(CASES["coldstop"], tmp_path_factory.mktemp("coldstop"))


def _artists(name: str, analysis: Analysis) -> Any:
    return FIGURES[name].draw(Figure(), analysis)


def _points(container: Any) -> np.ndarray:
    return np.column_stack(container.lines[0].get_data())


@pytest.mark.parametrize("name", FIGURES)
@pytest.mark.parametrize("case", ["metal", "coldstop", "undetermined"])
def test_every_figure_draws_good_and_poor_cases(name: str, case: str, tmp_path: Path) -> None:
    """Each registered figure can be rendered, whatever was determined, returns frozen artists and states a finding."""
    found = undetermined(tmp_path) if case == "undetermined" else build(CASES[case], tmp_path)
    assert render(draw_figure(name, found), "svg").lstrip().startswith(b"<?xml")
    artists = _artists(name, found)
    with pytest.raises(FrozenInstanceError):
        setattr(artists, fields(artists)[0].name, None)
    alt = FIGURES[name].alt(found)
    assert re.search(r"\d", alt)
    assert re.search(r"\b(nan|inf|None)\b", alt) is None


@pytest.mark.parametrize("name", FIGURES)
def test_axes_are_labelled_in_quantity_calculus(name: str, metal: Analysis) -> None:
    """Every figure labels both directions, each label with quantity / unit unless the figure calls it a number."""
    axes = draw_figure(name, metal).axes
    across = [label for each in axes if (label := each.get_xlabel())]
    upwards = [label for each in axes if (label := each.get_ylabel())]
    assert across
    assert upwards
    assert set(FIGURES[name].numbers) <= {*across, *upwards}
    assert all(" / " in label for label in {*across, *upwards} - set(FIGURES[name].numbers))


@pytest.mark.parametrize("name", ["heat_capacity", "residuals", "heat_capacity_over_cubed_temperature", "theta_debye"])
def test_views_against_temperature_are_in_kelvin(name: str, metal: Analysis) -> None:
    """Heat capacity, residuals, C/T^3 and theta_D stand over T / K."""
    assert any(each.get_xlabel() == "$T$ / K" for each in draw_figure(name, metal).axes)


def test_components_differ_in_their_lines() -> None:
    """Known terms keep their look; any others of one model, numbered or new, differ from them and from each other."""
    names = ("debye", "einstein1", "einstein2", "einstein3", "electronic", "two_level", "cp_minus_cv")
    looks = component_looks(names)
    assert looks["einstein1"] == component_looks(("einstein",))["einstein"]
    assert len({str(dashes) for _, dashes in looks.values()}) == len(names)
    assert len({colour for colour, _ in looks.values()}) == len(names)


def test_heat_capacity_shows_data_fit_components_and_limit(metal: Analysis) -> None:
    """Bars of sigma, every fitted point, the fit over the data only, one line style per component, 3nR."""
    artists = _artists("heat_capacity", metal)
    drawn = np.concatenate([_points(each) for each in artists.points.fitted])
    order = np.argsort(drawn[:, 0])
    np.testing.assert_array_equal(drawn[order, 0], metal.prepared.temperature)
    np.testing.assert_array_equal(drawn[order, 1], metal.prepared.heat_capacity)
    assert len(artists.points.fitted) == 2
    assert all(each.has_yerr for each in artists.points.fitted)
    T = artists.curves.fit.get_xdata()
    low, high = metal.prepared.temperature[[0, -1]]
    assert low <= T[0] < 1.02 * low
    assert 0.98 * high < T[-1] <= high
    assert all(each.get_linestyle() == "--" for each in artists.curves.extrapolated)
    assert artists.curves.components.keys() == {"debye", "einstein", "electronic"}
    looks = {(each.get_color(), str(each._dash_pattern)) for each in artists.curves.components.values()}
    assert len(looks) == 3
    assert len({look for _, look in looks}) == 3, "the lines must differ without their colours"
    np.testing.assert_allclose(artists.classical_limit.get_ydata(), 3 * GAS_CONSTANT)
    assert artists.axes.get_ylabel() == "$C_p$ / (J mol$^{-1}$ K$^{-1}$)"


def test_components_add_up_to_the_fit(metal: Analysis) -> None:
    """The drawn components sum to the drawn heat capacity."""
    curves = _artists("heat_capacity", metal).curves
    T = curves.fit.get_xdata()
    total = sum(np.interp(T, *each.get_data()) for each in curves.components.values())
    np.testing.assert_allclose(total, curves.fit.get_ydata(), rtol=1e-9)


def test_masked_points_are_hollow_and_their_region_hatched(metal: Analysis) -> None:
    """Points that are not fitted are seen, and seen to be not fitted."""
    artists = _artists("heat_capacity", metal)
    assert artists.points.not_fitted.get_markerfacecolor() == "white"
    assert artists.points.not_fitted.get_xdata().size == 3
    assert artists.masks[0].get_hatch()
    x = artists.masks[0].get_extents().transformed(artists.axes.transData.inverted())
    assert (x.x0, x.x1) == pytest.approx((28, 33))


def test_cv_is_called_cv(tmp_path: Path) -> None:
    """With quantity Cv every label says C_V."""
    found = build(CASES["volume"], tmp_path)
    assert _artists("heat_capacity", found).axes.get_ylabel().startswith("$C_V$")
    assert _artists("heat_capacity_over_cubed_temperature", found).axes.get_ylabel().startswith("$C_V")


def test_residuals_are_the_diagnosed_ones_by_run(metal: Analysis) -> None:
    """Percent residuals of each run with its own symbol, on a logarithmic axis, sigma as the band."""
    artists = _artists("residuals", metal)
    drawn = np.concatenate([_points(each) for each in artists.points.fitted])
    np.testing.assert_array_equal(drawn[np.argsort(drawn[:, 0]), 1], metal.diagnosis.residual_percent)
    markers = [each.lines[0].get_marker() for each in artists.points.fitted]
    assert len(set(markers)) == len(markers) == 2
    assert artists.axes.get_xscale() == "log"
    band = artists.band.get_paths()[0].vertices[:, 1]
    widths = 100 * metal.prepared.sigma / metal.diagnosis.model
    assert (band.min(), band.max()) == pytest.approx((-widths.max(), widths.max()))


def test_points_outside_the_frame_are_marked(metal: Analysis) -> None:
    """Masked points 30 % off do not squeeze the residuals, and do not vanish: marks at the edge say where they are."""
    artists = _artists("residuals", metal)
    assert artists.axes.get_ylim()[1] < 5
    np.testing.assert_array_equal(artists.beyond.get_xdata(), artists.points.not_fitted.get_xdata())
    low, high = artists.axes.get_ylim()
    assert np.all((artists.beyond.get_ydata() > low) & (artists.beyond.get_ydata() < high))


def test_fitted_points_stay_in_the_frame_of_residuals(tmp_path: Path) -> None:
    """However bad the fit, its residuals are shown, not cut away."""
    artists = _artists("residuals", build(CASES["misfit"], tmp_path))
    assert artists.beyond is None


def test_a_vanishing_model_does_not_blow_up_the_residuals(tmp_path: Path) -> None:
    """An Einstein model underflows at low T: percent residuals without end are marked at a frame of 200 %."""
    found = build(CASES["metal"], tmp_path)
    model = np.where(found.prepared.temperature < 5, 1e-200, found.diagnosis.model)
    percent = np.where(found.prepared.temperature < 5, 1e200, found.diagnosis.residual_percent)
    bad = replace(found, diagnosis=replace(found.diagnosis, model=model, residual_percent=percent))
    artists = _artists("residuals", bad)
    assert artists.axes.get_ylim() == (-200, 200)
    assert np.sum(artists.beyond.get_xdata() < 5) == np.sum(found.prepared.temperature < 5)


def test_cubed_view_is_in_millijoule_and_keeps_the_lattice_large(metal: Analysis) -> None:
    """C/T^3 in mJ/(mol K^4); the electronic upturn is cut at three times the lattice and marked, not hidden."""
    artists = _artists("heat_capacity_over_cubed_temperature", metal)
    assert "mJ mol$^{-1}$ K$^{-4}$" in artists.axes.get_ylabel()
    run = np.concatenate([_points(each) for each in artists.points.fitted])
    expected = 1e3 * metal.prepared.heat_capacity / metal.prepared.temperature**3
    np.testing.assert_allclose(run[np.argsort(run[:, 0]), 1], expected)
    curve = metal.derived.curve
    lattice = 1e3 * (curve.components["debye"] + curve.components["einstein"]) / curve.temperature**3
    top = artists.axes.get_ylim()[1]
    assert top == pytest.approx(1.08 * 3 * lattice.max())
    np.testing.assert_array_equal(np.sort(artists.beyond.get_xdata()), metal.prepared.temperature[expected > top])


def test_theta_debye_has_margin_values_with_bars(metal: Analysis) -> None:
    """theta_D(T->0) and the five moments stand in the margin at their values, on the scale of the points."""
    artists = _artists("theta_debye", metal)
    values = [float(each.lines[0].get_ydata()[0]) for each in artists.characteristic]
    assert values == [each.value for each in metal.derived.characteristic_temperatures[:6]]
    assert all(each.has_yerr for each in artists.characteristic)
    assert artists.margin.get_ylim() == artists.axes.get_ylim()
    assert artists.withheld == ()
    assert artists.axes.get_ylabel() == r"$\theta_{\mathrm{D}}$ / K"


def test_withheld_theta_is_a_word_in_the_margin(coldstop: Analysis) -> None:
    """Where theta_D(T->0) is withheld the margin says so and shows no point for it."""
    artists = _artists("theta_debye", coldstop)
    assert [each.get_text() for each in artists.withheld] == ["undetermined"]
    assert len(artists.characteristic) == 5
    assert "undetermined" in FIGURES["theta_debye"].alt(coldstop)


def test_extrapolation_is_dashed_and_shaded(coldstop: Analysis) -> None:
    """Below 50 K the model is a dashed line on grey, in every view with a curve."""
    for name in ("heat_capacity", "heat_capacity_over_cubed_temperature", "theta_debye"):
        artists = _artists(name, coldstop)
        curve = artists if name == "theta_debye" else artists.curves
        assert min(line.get_xdata().min() for line in curve.extrapolated) < 20
        spans = [each.get_extents().transformed(artists.axes.transData.inverted()) for each in artists.axes.patches]
        assert any(span.x1 == pytest.approx(50) for span in spans)


@pytest.mark.parametrize("name", FIGURES)
def test_the_same_analysis_gives_the_same_bytes(name: str, metal: Analysis) -> None:
    """No date, no random identifier: two runs write identical files."""
    first, second = draw_figure(name, metal), draw_figure(name, metal)
    assert render(first, "svg") == render(second, "svg")
    assert render(first, "png") == render(second, "png")
    assert render(first, "png").startswith(b"\x89PNG")


def test_no_global_state_is_touched(metal: Analysis) -> None:
    """The user's matplotlib settings are neither used nor changed, and pyplot is not needed."""
    plain = render(draw_figure("residuals", metal), "svg")
    with mpl.rc_context({"font.size": 30.0, "axes.labelsize": 40.0, "svg.fonttype": "none"}):
        assert render(draw_figure("residuals", metal), "svg") == plain
        assert mpl.rcParams["font.size"] == 30.0


@pytest.mark.parametrize("label", ["_hidden", "$x^{", "试样", "a\x1b[31m", "x" * 200, "=1"])
def test_any_label_can_be_drawn(metal: Analysis, label: str) -> None:
    """A run label that matplotlib would hide, read as mathematics or lack glyphs for still stands in the legend."""
    picture = draw_figure("residuals", renamed(metal, label))
    render(picture, "png")
    texts = [each.get_text() for each in picture.legends[0].get_texts()]
    assert len(texts) == 5
    assert all(len(each) <= 26 for each in texts)


def test_legend_covers_no_axes_and_stays_in_the_figure(metal: Analysis) -> None:
    """The legend stands above the axes, inside the picture, in every figure."""
    for name in FIGURES:
        picture = draw_figure(name, metal)
        render(picture, "png")
        for legend in picture.legends:
            box = legend.get_window_extent()
            assert all(box.y0 >= axes.bbox.y1 - 1 for axes in picture.axes)
            assert picture.bbox.x0 - 1 <= box.x0
            assert box.x1 <= picture.bbox.x1 + 1
            assert box.y1 <= picture.bbox.y1 + 1


def test_unknown_figure_is_refused_with_the_nearest() -> None:
    """A misspelt figure name gets a hint."""
    with pytest.raises(InputError, match="did you mean 'residuals'"):
        draw_figure("residual", None)  # type: ignore[arg-type]

"""The smooth curve of a known heat capacity: what it reproduces, and that its u covers its error (invented data)."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.interpolate import make_smoothing_spline

from latticefit.errors import InputError
from latticefit.functions import debye_heat_capacity
from latticefit.reading.addenda_curve import MARGIN, smooth_curve
from latticefit.records import FloatArray


def blank(T: FloatArray) -> FloatArray:
    """An invented platform with grease: a Debye solid and a linear term, J/K."""
    return np.asarray(1.2e-3 * debye_heat_capacity(250.0 / T) + 2e-8 * T)


def coverage(points: int, noise: float, stated: float | None, seeds: int = 120, sets: int = 1) -> tuple[float, float]:
    """Shares of places, over many invented blanks, at which the curve is within u and within 2u of the truth."""
    rng = np.random.default_rng(11)
    places = np.geomspace(2.1, 290.0, 150)
    within = np.zeros(2)
    for _ in range(seeds):
        T = np.repeat(np.geomspace(2.0, 300.0, points), sets) * (1 + 5e-4 * rng.standard_normal(points * sets))
        C = blank(T) * (1 + noise * rng.standard_normal(T.size))
        value, u = smooth_curve(T, C, None if stated is None else stated * blank(T)).evaluate(places)
        error = np.abs(value - blank(places)) / u
        within += (error < 1).mean(), (error < 2).mean()
    return float(within[0] / seeds), float(within[1] / seeds)


@pytest.mark.parametrize(
    ("points", "noise", "stated", "sets"),
    [(40, 0.01, 0.01, 1), (40, 0.01, None, 1), (15, 0.02, 0.02, 1), (20, 0.02, None, 1), (30, 0.01, None, 3)],
)
def test_u_of_the_curve_covers_its_error(points: int, noise: float, stated: float | None, sets: int) -> None:
    """68 % of the errors lie within u and 95 % within 2u, for stated and for estimated scatter, with repeats too."""
    one, two = coverage(points, noise, stated, sets=sets)
    assert one == pytest.approx(0.70, abs=0.07)
    assert two == pytest.approx(0.955, abs=0.035)


def test_understated_sigma_is_found_out() -> None:
    """Points that scatter four times more than they state get the u of their scatter, and the factor is told."""
    rng = np.random.default_rng(2)
    T = np.geomspace(2.0, 300.0, 60)
    C = blank(T) * (1 + 0.02 * rng.standard_normal(T.size))
    curve = smooth_curve(T, C, 0.005 * C)
    assert curve.excess == pytest.approx(4.0, rel=0.3)
    assert curve.evaluate(T)[1].mean() == pytest.approx(smooth_curve(T, C, None).evaluate(T)[1].mean(), rel=0.05)
    assert smooth_curve(T, C, 0.02 * C).excess is None


def test_overstated_sigma_is_kept() -> None:
    """A cautious sigma is not made smaller by points that scatter less."""
    rng = np.random.default_rng(3)
    T = np.geomspace(2.0, 300.0, 40)
    C = blank(T) * (1 + 0.002 * rng.standard_normal(T.size))
    assert smooth_curve(T, C, 0.02 * C).evaluate(T)[1].mean() > 2 * smooth_curve(T, C, None).evaluate(T)[1].mean()


def test_parabola_is_reproduced() -> None:
    """Where ln C is a parabola of ln T, as a power law is, the curve is it, from four points on."""
    T = np.geomspace(3.0, 280.0, 5)
    between = np.geomspace(3.0, 280.0, 77)
    for law in (lambda t: 2e-6 * t**1.7, lambda t: np.exp(-14 + 2.9 * np.log(t) - 0.2 * np.log(t) ** 2)):
        value, u = smooth_curve(T, law(T), None).evaluate(between)
        np.testing.assert_allclose(value, law(between), rtol=1e-8)
        assert (u / value < 1e-6).all()


def test_agrees_with_a_smoothing_spline_of_a_library() -> None:
    """The curve is that of scipy's cubic smoothing spline (cross-validated) within the u that it states."""
    rng = np.random.default_rng(5)
    T = np.geomspace(2.0, 300.0, 120)
    C = blank(T) * (1 + 0.01 * rng.standard_normal(T.size))
    value, u = smooth_curve(T, C, None).evaluate(T)
    other = np.exp(make_smoothing_spline(np.log(T), np.log(C))(np.log(T)))
    assert (np.abs(value - other) < 3 * u).all()


def test_scales_and_order_do_not_matter() -> None:
    """Other units of C and T, and shuffled points, give the same curve."""
    rng = np.random.default_rng(6)
    T = np.geomspace(2.0, 300.0, 30)
    C = blank(T) * (1 + 0.01 * rng.standard_normal(T.size))
    shuffled = rng.permutation(T.size)
    value, u = smooth_curve(T, C, None).evaluate(np.array([7.0, 80.0]))
    scaled, scaled_u = smooth_curve(5 * T[shuffled], 1e6 * C[shuffled], None).evaluate(np.array([35.0, 400.0]))
    np.testing.assert_allclose(scaled, 1e6 * value, rtol=1e-9)
    np.testing.assert_allclose(scaled_u, 1e6 * u, rtol=1e-6)


def test_u_grows_in_a_gap() -> None:
    """Where a decade holds no point, u is larger than among the points."""
    T = np.concatenate([np.geomspace(2, 12, 20), np.geomspace(90, 300, 20)])
    C = blank(T) * (1 + 0.01 * np.random.default_rng(7).standard_normal(T.size))
    value, u = smooth_curve(T, C, None).evaluate(np.array([6.0, 33.0, 150.0]))
    assert u[1] / value[1] > 3 * max(u[0] / value[0], u[2] / value[2])


def test_repeats_are_one_temperature() -> None:
    """Twelve points at four temperatures make a curve on four points; at three they make none."""
    T = np.repeat([10.0, 20.0, 40.0, 80.0], 3) * np.tile([0.9995, 1.0, 1.0005], 4)
    assert smooth_curve(T, blank(T), None).points == 4
    with pytest.raises(InputError, match="holds 3 different temperatures; a smooth curve needs 4 or more"):
        smooth_curve(T[:9], blank(T[:9]), None)


def test_dense_points_are_averaged_and_quick() -> None:
    """Twenty thousand points are averaged to a few hundred without moving the curve."""
    T = np.geomspace(2.0, 300.0, 20_000)
    C = blank(T) * (1 + 0.01 * np.random.default_rng(8).standard_normal(T.size))
    curve = smooth_curve(T, C, None)
    assert curve.points <= 250
    places = np.geomspace(2.0, 300.0, 300)
    value, u = curve.evaluate(places)
    assert (np.abs(value - blank(places)) < 5 * u).all()
    assert (u / value).max() < 3e-3


def test_range_of_the_curve_has_the_margin_of_repeats() -> None:
    """Half a percent beyond the points is covered, since set points are met no better; more is not."""
    T = np.geomspace(2.0, 300.0, 20)
    curve = smooth_curve(T, blank(T), None)
    edge = np.array([2.0 * (1 - 0.9 * MARGIN), 300.0 * (1 + 0.9 * MARGIN), 2.0 * (1 - 1.1 * MARGIN), 303.0])
    assert curve.covers(edge).tolist() == [True, True, False, False]
    value, u = curve.evaluate(edge[:2])
    np.testing.assert_allclose(value, blank(edge[:2]), rtol=2e-3)
    assert (u > 0).all()

"""Every registered term: thermodynamic identities, partial derivatives, limits, published source."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.integrate import quad

from latticefit.constants import GAS_CONSTANT
from latticefit.errors import InputError
from latticefit.terms import TERMS, Term, term

EXAMPLE = {"theta": 250.0, "modes": 3.7, "gamma": 2.1e-3}
T = np.geomspace(2.0, 3000.0, 61)
every_term = pytest.mark.parametrize("each", TERMS.values(), ids=TERMS.keys())


def parameters(each: Term) -> list[float]:
    return [EXAMPLE[spec.quantity] for spec in each.parameters]


@every_term
def test_heat_capacity_is_slope_of_energy(each: Term) -> None:
    """C = dU/dT over the whole range."""
    p, h = parameters(each), 1e-5 * T
    slope = (each.energy(T + h, *p) - each.energy(T - h, *p)) / (2 * h)
    # the difference of two energies loses digits where U is large beside C h
    assert_allclose(slope, each.heat_capacity(T, *p), rtol=1e-6, atol=0)


@every_term
def test_entropy_is_integral_of_heat_capacity_over_temperature(each: Term) -> None:
    """S(T) = integral of C/T from 0 to T."""
    p = parameters(each)
    for upper in (2.0, 30.0, 400.0, 2500.0):
        edges = [0.0, *np.geomspace(min(2.0, upper) / 50, upper, 8)]
        total = sum(
            quad(lambda t: float(each.heat_capacity(np.array(t), *p)) / t, a, b, epsabs=0, epsrel=1e-11)[0]
            for a, b in itertools.pairwise(edges)
            if float(each.heat_capacity(np.array(b), *p)) > 1e-250
        )
        assert_allclose(float(each.entropy(np.array(upper), *p)), total, rtol=1e-9, atol=1e-30)


@every_term
def test_partials_agree_with_central_differences(each: Term) -> None:
    """Every partial derivative agrees with central differences over the whole range."""
    p = parameters(each)
    found = each.partials(T, *p)
    assert found.shape == (len(p), T.size)
    for i, value in enumerate(p):
        up, down = list(p), list(p)
        up[i], down[i] = value * (1 + 1e-5), value * (1 - 1e-5)
        slope = (each.heat_capacity(T, *up) - each.heat_capacity(T, *down)) / (2e-5 * value)
        scale = np.abs(each.heat_capacity(T, *p)) / value
        assert np.all(np.abs(found[i] - slope) <= 1e-7 * scale + 1e-6 * np.abs(slope) + 1e-300)


@every_term
def test_amplitudes_enter_linearly(each: Term) -> None:
    """A parameter declared an amplitude scales the heat capacity; one declared a scale does not."""
    p = parameters(each)
    before = each.heat_capacity(T, *p)
    for i, spec in enumerate(each.parameters):
        doubled = [2 * v if k == i else v for k, v in enumerate(p)]
        linear = np.allclose(each.heat_capacity(T, *doubled), 2 * before, rtol=1e-12, atol=0)
        assert linear == (spec.role == "amplitude")


@every_term
def test_high_temperature_limit_of_lattice_terms_is_dulong_petit(each: Term) -> None:
    """A lattice term tends to modes R (equipartition; common practice, no source)."""
    if each.lattice:
        hot = float(each.heat_capacity(np.array(1e6), *parameters(each)))
        assert hot == pytest.approx(EXAMPLE["modes"] * GAS_CONSTANT, rel=1e-7)


@every_term
def test_cubic_coefficient_is_the_low_temperature_limit(each: Term) -> None:
    """The T^3 coefficient is the limit of the lattice part's C/T^3."""
    p = parameters(each)
    if each.lattice:
        cold = 0.5
        assert float(each.heat_capacity(np.array(cold), *p)) / cold**3 == pytest.approx(
            each.cubic_coefficient(*p), rel=1e-12, abs=1e-100
        )
    else:
        assert each.cubic_coefficient(*p) == 0


@every_term
def test_zero_point_energy_is_half_a_quantum_a_mode(each: Term) -> None:
    """The zero-point energy is R/2 times the mean theta of the modes (half a quantum each)."""
    p = parameters(each)
    expected = 0.0
    if each.theta_mean is not None:
        expected = 0.5 * GAS_CONSTANT * EXAMPLE["modes"] * each.theta_mean(1, *p)
    assert each.zero_point_energy(*p) == pytest.approx(expected, rel=1e-14)


@every_term
def test_theta_means_follow_from_the_high_temperature_entropy_and_heat_capacity(each: Term) -> None:
    """<ln theta> and <theta^2> are those of the high-temperature series of S and C (Barron, Berg & Morrison 1957)."""
    if each.theta_mean is None:
        pytest.skip(f"{each.name} has no modes")
    p, hot = parameters(each), np.array(5.0e4)
    per_mode = float(each.entropy(hot, *p)) / (EXAMPLE["modes"] * GAS_CONSTANT)
    assert 1 + np.log(5.0e4) - per_mode == pytest.approx(each.theta_mean(0, *p), abs=1e-5)
    missing = 1 - float(each.heat_capacity(np.array(5.0e3), *p)) / (EXAMPLE["modes"] * GAS_CONSTANT)
    assert 12 * 5.0e3**2 * missing == pytest.approx(each.theta_mean(2, *p), rel=1e-3)


@every_term
def test_term_has_units_bounds_meaning_and_source(each: Term) -> None:
    """A term states the unit, range and meaning of its parameters and where it was published."""
    assert any(character.isdigit() for character in each.source)
    assert each.low_limit
    assert each.high_limit
    for spec in each.parameters:
        assert spec.unit
        assert spec.meaning
        assert spec.low < spec.high


def test_unknown_term_offers_the_nearest() -> None:
    """A misspelt term gets the nearest name."""
    with pytest.raises(InputError, match="did you mean 'einstein'"):
        term("einstien")

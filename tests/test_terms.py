"""Every registered term: thermodynamic identities, partial derivatives, limits, published source."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.integrate import quad

from latticefit.constants import GAS_CONSTANT
from latticefit.errors import InputError
from latticefit.models import parse_expression
from latticefit.terms import TERMS, Term, term

T = np.geomspace(2.0, 3000.0, 61)
every_term = pytest.mark.parametrize("each", TERMS.values(), ids=TERMS.keys())


def parameters(each: Term) -> list[float]:
    return [spec.example for spec in each.parameters]


def modes(each: Term) -> float:
    return sum(spec.example for spec in each.parameters if spec.quantity == "modes")


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
    """C is linear in each amplitude, in no scale, and the amplitudes times their partials add up to it."""
    p = parameters(each)
    before, columns = each.heat_capacity(T, *p), each.partials(T, *p)
    for i, spec in enumerate(each.parameters):
        doubled = [2 * v if k == i else v for k, v in enumerate(p)]
        linear = np.allclose(each.heat_capacity(T, *doubled), before + p[i] * columns[i], rtol=1e-12, atol=0)
        assert linear == (spec.role == "amplitude")
    own = [v * c for v, c, spec in zip(p, columns, each.parameters, strict=True) if spec.role == "amplitude"]
    assert_allclose(sum(own), before, rtol=1e-12)


@every_term
def test_high_temperature_limit_of_lattice_terms_is_dulong_petit(each: Term) -> None:
    """A lattice term tends to modes R (equipartition; common practice, no source)."""
    if modes(each):
        hot = float(each.heat_capacity(np.array(1e6), *parameters(each)))
        assert hot == pytest.approx(modes(each) * GAS_CONSTANT, rel=1e-7)


@every_term
def test_cubic_coefficient_is_the_low_temperature_limit(each: Term) -> None:
    """The T^3 coefficient is the limit of a lattice term's C/T^3; where C/T^3 has no limit, and outside, it is 0."""
    p, cold = parameters(each), np.array([0.05, 0.1])
    ratio = each.heat_capacity(cold, *p) / cold**3
    diverges = ratio[0] > 1.5 * ratio[1]
    expected = 0.0 if diverges or not each.lattice else ratio[0]
    assert each.cubic_coefficient(*p) == pytest.approx(expected, rel=1e-12, abs=1e-100)


@every_term
def test_zero_point_energy_is_half_a_quantum_a_mode(each: Term) -> None:
    """The zero-point energy is R/2 times the mean theta of the modes (half a quantum each)."""
    p = parameters(each)
    expected = 0.0
    if each.theta_mean is not None:
        expected = 0.5 * GAS_CONSTANT * modes(each) * each.theta_mean(1, *p)
    assert each.zero_point_energy(*p) == pytest.approx(expected, rel=1e-14)


@every_term
def test_theta_means_follow_from_the_high_temperature_entropy_and_heat_capacity(each: Term) -> None:
    """<ln theta> and <theta^2> are those of the high-temperature series of S and C (Barron, Berg & Morrison 1957)."""
    if each.theta_mean is None:
        pytest.skip(f"{each.name} has no modes")
    p, hot = parameters(each), np.array(5.0e4)
    per_mode = float(each.entropy(hot, *p)) / (modes(each) * GAS_CONSTANT)
    assert 1 + np.log(5.0e4) - per_mode == pytest.approx(each.theta_mean(0, *p), abs=1e-5)
    missing = 1 - float(each.heat_capacity(np.array(5.0e3), *p)) / (modes(each) * GAS_CONSTANT)
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
        assert spec.low < spec.example < spec.high, "lmfit never leaves a bound that it starts on"


@every_term
def test_names_can_stand_in_expressions_in_lmfit_and_in_numbered_parameters(each: Term) -> None:
    """Names are lower-case identifiers; none ends in a digit, because repeated terms are numbered."""
    for name in (each.name, *(spec.quantity for spec in each.parameters)):
        assert name.isidentifier()
        assert name == name.lower()
        assert not name[-1].isdigit()
    assert parse_expression(f"debye + {each.name}")[-1][0] == each.name


def test_names_are_unique() -> None:
    """The registry has each term under its own name, and no two terms share the name of their lmfit class."""
    assert all(name == each.name for name, each in TERMS.items())
    assert len({each.model_class_name for each in TERMS.values()}) == len(TERMS)


def test_zero_point_energies_are_the_published_ones() -> None:
    """9/8 R theta for the three modes of a Debye atom (Debye 1912), R theta/2 for an Einstein mode (from memory)."""
    assert TERMS["debye"].zero_point_energy(400.0, 3.0) == pytest.approx(9 / 8 * GAS_CONSTANT * 400, rel=1e-14)
    assert TERMS["einstein"].zero_point_energy(400.0, 1.0) == pytest.approx(GAS_CONSTANT * 200, rel=1e-14)


def test_unknown_term_offers_the_nearest() -> None:
    """A misspelt term gets the nearest name."""
    with pytest.raises(InputError, match="did you mean 'einstein'"):
        term("einstien")

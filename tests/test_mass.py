"""The mass of the sample with its uncertainty, as people write it."""

from __future__ import annotations

import pytest

from latticefit.errors import InputError
from latticefit.records import SampleSettings
from latticefit.sample import build_sample, parse_mass


@pytest.mark.parametrize(
    "text",
    [
        "12.3(2) mg",
        "12.3(0.2) mg",
        "12.3 ± 0.2 mg",
        "(12.3 ± 0.2) mg",
        "12.3 mg ± 0.2 mg",
        "12.3+/-0.2mg",
        "1.23(2)e1 mg",
        "(1.23 ± 0.02)e-2 g",
        "12300(200) ug",
    ],
)
def test_mass_with_uncertainty_in_the_usual_spellings(text: str) -> None:
    """Brackets count from the last decimal; plus-minus stands before or after the unit."""
    assert parse_mass(text) == (pytest.approx(12.3e-6, rel=1e-12), pytest.approx(0.2e-6, rel=1e-12))


def test_relative_uncertainty_of_a_mass() -> None:
    """A percentage is one of the mass."""
    assert parse_mass("12.5 mg ± 2 %") == (pytest.approx(12.5e-6), pytest.approx(0.25e-6))


def test_mass_without_uncertainty() -> None:
    """A plain mass has none, and the sample keeps both."""
    assert parse_mass("12.3 mg") == (pytest.approx(12.3e-6), None)
    sample = build_sample(SampleSettings(mass="12.3(2) mg"), "x")
    assert (sample.mass, sample.mass_u) == (pytest.approx(12.3e-6), pytest.approx(0.2e-6))
    assert build_sample(SampleSettings(mass="12.3 mg"), "x").mass_u is None


@pytest.mark.parametrize(
    ("text", "sentence"),
    [
        ("12.3(0) mg", "mass '12.3(0) mg': its uncertainty must be above 0 and below the mass itself"),
        ("12.3(200) mg", "mass '12.3(200) mg': its uncertainty must be above 0 and below the mass itself"),
        ("12,3(2) mg", "mass '12,3(2) mg' cannot be read: write a number and a unit, as in '12.3 mg'"),
        ("12.3 ± 0.2 mK", "mass '12.3 mK': 'mK' is not a unit of mass; write it as in '12.3 mg'"),
        ("12.3 mg ± 0.2 g", "mass '12.3 mg ± 0.2 g': 'mg ± 0.2 g' is not a unit of mass; write it as in '12.3 mg'"),
        ("0 mg", "mass '0 mg' must be above 0"),
    ],
)
def test_wrong_uncertainty_of_a_mass_is_refused(text: str, sentence: str) -> None:
    """What no mass has is refused with the text."""
    with pytest.raises(InputError) as caught:
        parse_mass(text)
    assert str(caught.value) == sentence


def test_molar_mass_takes_no_uncertainty() -> None:
    """A molar mass is a plain quantity; an uncertainty beside it is refused rather than dropped."""
    with pytest.raises(InputError, match="is not a unit of molar mass"):
        build_sample(SampleSettings(molar_mass="101.96(2) g/mol"), "x")

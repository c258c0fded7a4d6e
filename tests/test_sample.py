"""From formula and quantities to atoms, molar mass and mass."""

from __future__ import annotations

import pytest

from latticefit.errors import InputError
from latticefit.records import SampleSettings
from latticefit.sample import build_sample, parse_formula, sample_notes

# Molar masses in g/mol: sums of the IUPAC standard atomic weights (abridged; from memory): H 1.008, Li 6.94, C 12.011,
# O 15.999, F 18.998, Na 22.990, Mg 24.305, Al 26.982, S 32.06, K 39.098, Ca 40.078, Mn 54.938, Fe 55.845, Cu 63.546.
MASSES = [
    ("Cu", 1, 63.546),
    ("Al2O3", 5, 2 * 26.982 + 3 * 15.999),
    ("Al₂O₃", 5, 2 * 26.982 + 3 * 15.999),
    ("Ca(OH)2", 5, 40.078 + 2 * 17.007),
    ("Mg0.9Fe0.1O", 2, 0.9 * 24.305 + 0.1 * 55.845 + 15.999),
    ("Fe2(SO4)3.9H2O", 44, 2 * 55.845 + 3 * 96.056 + 9 * 18.015),
    ("KAl(SO4)2·12H2O", 48, 39.098 + 26.982 + 2 * 96.056 + 12 * 18.015),
    ("Na2CO3.10H2O", 36, 2 * 22.990 + 12.011 + 3 * 15.999 + 10 * 18.015),
    ("CuSO4.H2O", 9, 63.546 + 96.056 + 18.015),
    ("Mg0.9H2O", 3.9, 0.9 * 24.305 + 18.015),
    *[(f"CaSO4{sign}2H2O", 12, 40.078 + 96.056 + 2 * 18.015) for sign in ("·", "*", ".", "+", " · ", "⋅", "•")],
    *[(f"CaSO4{half}H2O", 7.5, 40.078 + 96.056 + 18.015 / 2) for half in ("·0.5", ".0.5", "·1/2", "·½", "+0.5 ")],
]


@pytest.mark.parametrize(("text", "atoms", "molar_mass"), MASSES)
def test_formula(text: str, atoms: float, molar_mass: float) -> None:
    """Atoms are counted exactly; molar masses agree with the sum of standard atomic weights to 0.01 %."""
    formula = parse_formula(text)
    assert formula.atoms == atoms
    assert formula.molar_mass * 1000 == pytest.approx(molar_mass, rel=1e-4)


def test_aluminium_agrees_with_the_handbook_table() -> None:
    """The molar mass is the 26.9815 g/mol by which NBS Monograph 21 data are converted (header of the data file)."""
    assert parse_formula("Al").molar_mass * 1000 == pytest.approx(26.9815, abs=1e-4)


def test_isotope() -> None:
    """An enriched sample is written with the mass number: 7Li has 7.016 u (AME 2020, from memory)."""
    assert parse_formula("Li[7]").molar_mass * 1000 == pytest.approx(7.016, abs=1e-3)


@pytest.mark.parametrize(
    ("text", "sentence"),
    [
        ("Xx2", "formula 'Xx2': 'Xx' is not a chemical element"),
        ("al2o3", "formula 'al2o3': 'al' is not a chemical element; did you mean 'Al'?"),
        ("CuSO4·xH2O", "formula 'CuSO4·xH2O': 'x' is not a chemical element"),
        ("n", "formula 'n': 'n' is not a chemical element; did you mean 'N'?"),
        ("", "the formula is empty: write it as in 'Al2O3'"),
        ("Cu0", "formula 'Cu0' has no atoms with a known atomic weight: write it as in 'Al2O3'"),
        ("((((", "formula '((((' cannot be read: write it as in 'Al2O3' or 'CaSO4·2H2O'"),
        ("Fe+3", "formula 'Fe+3' cannot be read: write it as in 'Al2O3' or 'CaSO4·2H2O'"),
        ("50%wt Cu", "formula '50%wt Cu' holds '%', which latticefit cannot read: write it as in 'Al2O3'"),
        ("Cu\x1b[31m", "formula 'Cu\\x1b[31m' holds '\\x1b', which latticefit cannot read: write it as in 'Al2O3'"),
    ],
)
def test_wrong_formula_is_refused_in_one_sentence(text: str, sentence: str) -> None:
    """The sentence names the formula and what in it is wrong; control characters are escaped."""
    with pytest.raises(InputError) as caught:
        parse_formula(text)
    assert str(caught.value) == sentence


def test_long_formula_is_refused() -> None:
    """A formula that would burden the parser is refused before it gets there."""
    with pytest.raises(InputError, match="longer than 200 characters"):
        parse_formula("(" * 5000)


def test_sample_from_formula() -> None:
    """Everything comes out in SI, the name falls back on what is given."""
    sample = build_sample(SampleSettings(formula="Cu", mass="12.3 mg", melting_point="1358 K"), "run7")
    assert (sample.name, sample.formula, sample.atoms) == ("run7", "Cu", 1.0)
    assert sample.molar_mass == pytest.approx(0.063546, rel=1e-6)
    assert sample.mass == pytest.approx(12.3e-6, rel=1e-14)
    assert sample.melting_point == 1358.0


def test_unknown_stays_none() -> None:
    """Nothing is made up: without a formula there are neither atoms nor molar mass."""
    sample = build_sample(SampleSettings(name="HVT-1"), "run7")
    assert (sample.name, sample.formula, sample.atoms, sample.molar_mass, sample.mass) == (
        "HVT-1",
        None,
        None,
        None,
        None,
    )


def test_stated_values_stand_above_the_formula_and_are_noted() -> None:
    """Explicit atoms and molar mass override the formula, and each difference is put into words."""
    settings = SampleSettings(formula="CaSO4·2H2O", atoms=6, molar_mass="136.14 g/mol")
    sample = build_sample(settings, "x")
    assert (sample.atoms, sample.molar_mass) == (6.0, pytest.approx(0.13614))
    assert sample_notes(settings) == (
        "6 atoms as stated, although 'CaSO4·2H2O' has 12",
        "molar mass 136.14 g/mol as stated, although 'CaSO4·2H2O' has 172.164 g/mol",
    )


def test_rounded_molar_mass_is_no_contradiction() -> None:
    """A molar mass that differs by rounding only is not worth a note."""
    assert sample_notes(SampleSettings(formula="Al2O3", atoms=5, molar_mass="101.96 g/mol")) == ()


def test_hydrate_point_is_noted() -> None:
    """Where a point is read as a hydrate point, the reading is shown with its molar mass."""
    assert sample_notes(SampleSettings(formula="CaSO4.2H2O")) == (
        "formula 'CaSO4.2H2O' read as 'CaSO4+2H2O' (172.164 g/mol, 12 atoms)",
    )
    assert sample_notes(SampleSettings(formula="CaSO4·2H2O")) == ()
    assert sample_notes(SampleSettings(formula="Mg0.9Fe0.1O")) == ()


@pytest.mark.parametrize(
    ("settings", "sentence"),
    [
        (SampleSettings(atoms=0), "the number of atoms per formula unit must be above 0, not 0"),
        (SampleSettings(atoms=float("nan")), "the number of atoms per formula unit must be above 0, not nan"),
        (SampleSettings(mass="-3 mg"), "mass '-3 mg' must be above 0"),
        (SampleSettings(molar_mass="12"), "molar mass '12' has no unit: write it with one, as in '101.96 g/mol'"),
        (SampleSettings(melting_point="-300 degC"), "melting point '-300 degC' must be above 0 K"),
    ],
)
def test_wrong_sample_is_refused_in_one_sentence(settings: SampleSettings, sentence: str) -> None:
    """Values that no sample has are refused with the value."""
    with pytest.raises(InputError) as caught:
        build_sample(settings, "x")
    assert str(caught.value) == sentence


@pytest.mark.parametrize("text", ["Li[7]F", "⁷LiF", "^7LiF", "^{7}LiF"])
def test_isotope_in_any_spelling(text: str) -> None:
    """An isotope has its own mass: 7.016003 + 18.998403 g/mol (AME atomic mass and IUPAC weight, from memory)."""
    formula = parse_formula(text)
    assert formula.atoms == 2
    assert formula.molar_mass == pytest.approx((7.016003 + 18.998403) / 1000, rel=1e-6)


@pytest.mark.parametrize(
    ("text", "isotope"), [("13CH4", "C[13]H4"), ("7Li2O", "Li[7]2O"), ("7Li2O*H2O", "Li[7]2O+H2O"), ("2NaCl", None)]
)
def test_leading_number_is_refused(text: str, isotope: str | None) -> None:
    """An isotope or a coefficient at the beginning is refused; where it may be an isotope, its spelling is offered."""
    with pytest.raises(InputError, match="leave the number out") as caught:
        parse_formula(text)
    assert (f"an isotope is written {isotope!r}" in str(caught.value)) == (isotope is not None)
    if isotope is not None:
        assert parse_formula(isotope).atoms > 0


def test_leading_number_of_several_parts_is_noted() -> None:
    """``3Al2O3*2SiO2`` has 21 atoms, and a note says what its first number multiplies."""
    assert parse_formula("3Al2O3*2SiO2").atoms == 21
    assert "multiplies its first part only" in sample_notes(SampleSettings(formula="3Al2O3*2SiO2"))[0]

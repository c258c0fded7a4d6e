"""Units at the edge: spellings, factors against published definitions, and refusals."""

from __future__ import annotations

import subprocess
import sys

import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import constants

from latticefit.errors import InputError
from latticefit.units import (
    HEAT_CAPACITY_EXAMPLES,
    find_heat_capacity_unit,
    find_temperature_unit,
    heat_capacity_unit,
    parse_quantity,
    temperature_unit,
)

# Exact definitions as in NIST Special Publication 811 (2008), appendix B (from memory): the thermochemical calorie is
# 4.184 J, the International Table Btu per pound and degree Fahrenheit is 4.1868 J/(g K). The rest are SI prefixes.
FACTORS = [
    ("J/(mol K)", 1.0, "mol"),
    ("mJ/(mol K)", 1e-3, "mol"),
    ("kJ/(mol K)", 1e3, "mol"),
    ("J/(g K)", 1.0, "gram"),
    ("mJ/(g K)", 1e-3, "gram"),
    ("J/(kg K)", 1e-3, "gram"),
    ("kJ/(kg K)", 1.0, "gram"),
    ("cal/(mol K)", 4.184, "mol"),
    ("cal/(g K)", 4.184, "gram"),
    ("cal_th/(mol K)", 4.184, "mol"),
    ("Btu/(lb F)", 4.1868, "gram"),
    ("J/K", 1.0, "sample"),
    ("mJ/K", 1e-3, "sample"),
    ("uJ/K", 1e-6, "sample"),
    ("nJ/K", 1e-9, "sample"),
    ("J/(mol-atom K)", 1.0, "mol_atoms"),
    ("cal/(g-atom K)", 4.184, "mol_atoms"),
    ("cal_IT/(g K)", 4.1868, "gram"),
    ("kcal_IT/(kg K)", 4.1868, "gram"),
    ("kcal/(kg K)", 4.184, "gram"),
]

SPELLINGS = {
    "J/(mol K)": [
        "J/mol/K",
        "Joule/mole/Kelvin",
        "JK−1mol−1",
        "JK^{-1}mol^{-1}",
        "J/K/mol",
        "J mol^-1 K^-1",
        "J mol**-1 K**-1",
        "J K-1 mol-1",
        "J K^{-1} mol^{-1}",
        "J K⁻¹ mol⁻¹",
        "J·mol⁻¹·K⁻¹",
        "J mol−1 K−1",
        "J.mol-1.K-1",
        "J/mol-K",
        "J/mol K",
        "J/mol*K",
        "J/(mol·K)",
        "J/(K mol)",
        "J per mol per K",
        "J_molK",
        "J_mol_K",
        "J_K_mol",
        "J_K-1_mol-1",
        " J / ( mol K ) ",
        "J/(mol °C)",
    ],
    "J/(g K)": ["J_gK", "J_g_K", "J/g/K", "J g-1 K-1", "J/g-K", "J/gK", "J/(g °C)", "J/(g degC)", "J/(g·C)"],
    "J/(kg K)": ["J_kgK", "J/kg/K", "J kg^-1 K^-1", "J/kg-K"],
    "uJ/K": ["µJ/K", "μJ/K", "uJ_K", "µJ K⁻¹", "uJ K-1"],
    "cal/(mol K)": ["cal_molK", "cal mol-1 K-1", "cal/mol-K", "cal/mol/K"],
    "Btu/(lb degF)": ["BTU/lb-F", "Btu/(lb °F)", "Btu/lb/degF"],
    "J/(mol-atom K)": ["J/(g-atom K)", "J/(gatom K)", "J/(mol atoms K)", "J/(mol of atoms K)", "J mol-at^-1 K^-1"],
    "calIT/(g K)": ["cal_IT/(g K)", "cal_{IT} g^-1 K^-1", "cal(IT)/(g °C)", "IT cal/(g K)"],
    "kB/atom": ["k_B/atom", "k_B per atom", "kB atom^-1", "k_{B}/atom"],
    "kB/fu": ["k_B/f.u.", "k_B per formula unit", "k_B/molecule"],
    "eV/(atom K)": ["eV/K/atom", "eV atom^-1 K^-1", "eV per atom per K"],
    "R": [" R ", "(R)"],
}


@pytest.mark.parametrize(("text", "factor", "basis"), FACTORS)
def test_factor_is_the_published_definition(text: str, factor: float, basis: str) -> None:
    """Each unit has the factor of its definition, to the last bit, and the right basis."""
    unit = heat_capacity_unit(text)
    assert (unit.factor, unit.basis) == (factor, basis)


# NIST Special Publication 811 (2008), appendix B.8, "Heat capacity and entropy" and "Specific heat capacity and
# specific entropy", in J/K and J/(kg K), seven digits as printed there (from memory). Its Btu and calories without
# index are not used: a bare Btu is the International Table one here, a bare calorie the thermochemical one.
PRINTED = [
    ("Btu/degF", 1.899101e3, 1.0),
    ("Btu/degR", 1.899101e3, 1.0),
    ("Btu/(lb degF)", 4.1868e3, 1e-3),
    ("Btu/(lb degR)", 4.1868e3, 1e-3),
    ("cal_IT/(g degC)", 4.1868e3, 1e-3),
    ("cal_IT/(g K)", 4.1868e3, 1e-3),
    ("cal_th/(g degC)", 4.184e3, 1e-3),
    ("cal_th/(g K)", 4.184e3, 1e-3),
]


@pytest.mark.parametrize(("text", "printed", "per_gram"), PRINTED)
def test_factor_is_the_one_that_is_printed(text: str, printed: float, per_gram: float) -> None:
    """Conversion factors agree with a published table to all its digits."""
    assert heat_capacity_unit(text).factor == pytest.approx(printed * per_gram, rel=5e-7)


def test_definitions_agree_with_a_general_library() -> None:
    """The calorie, Btu, pound and degrees agree with scipy.constants (CODATA and legal definitions)."""
    assert heat_capacity_unit("cal/K").factor == constants.calorie_th
    expected = constants.Btu_IT / (constants.lb * 1000 * constants.degree_Fahrenheit)
    assert heat_capacity_unit("Btu/(lb F)").factor == pytest.approx(expected, rel=1e-12)
    assert temperature_unit("degC").offset == constants.zero_Celsius


def test_units_of_single_atoms_are_the_molar_gas_constant() -> None:
    """k_B per atom is R per mole of atoms, eV/(atom K) is the Faraday constant's number (CODATA, scipy.constants)."""
    per_atom, electronvolts = heat_capacity_unit("k_B/atom"), heat_capacity_unit("eV/(atom K)")
    assert (per_atom.basis, electronvolts.basis) == ("mol_atoms", "mol_atoms")
    assert per_atom.factor == pytest.approx(constants.R, rel=1e-14)
    assert electronvolts.factor == pytest.approx(constants.physical_constants["Faraday constant"][0], rel=1e-9)
    assert heat_capacity_unit("R").factor == heat_capacity_unit("k_B/f.u.").factor == pytest.approx(constants.R, 1e-14)


@pytest.mark.parametrize(("standard", "text"), [(key, text) for key, texts in SPELLINGS.items() for text in texts])
def test_spelling_is_read(standard: str, text: str) -> None:
    """Every usual way to write a unit means the same unit and gives its standard spelling."""
    assert heat_capacity_unit(text) == heat_capacity_unit(standard)
    assert heat_capacity_unit(text).text == standard


@pytest.mark.parametrize("text", HEAT_CAPACITY_EXAMPLES)
def test_offered_spelling_is_standard(text: str) -> None:
    """What messages offer is read and is its own standard spelling."""
    assert heat_capacity_unit(text).text == text


@pytest.mark.parametrize(
    "text",
    [
        *("", "K", "J", "J/mol", "J/mol/K/K", "mJ mol-1 K-2", "J//K", "J/(mol K", "2 J/K", "J/(2 mol K)", "J**K"),
        *(
            "k_B",
            "nR",
            "3R",
            "J/(natom K)",
            "mol",
            "R/K",
            "k_B/g/K",
            "C",
            "()",
            "J/K**0",
            "e" * 5000,
            "__import__('os')",
            "J K mol",
        ),
    ],
)
def test_what_is_no_heat_capacity_is_refused(text: str) -> None:
    """A unit of another dimension, or no unit at all, is refused in one sentence."""
    assert find_heat_capacity_unit(text) is None
    with pytest.raises(InputError, match="is not a unit of heat capacity"):
        heat_capacity_unit(text)


def test_near_miss_is_offered() -> None:
    """A misspelt unit gets the nearest known one, a strange one the list."""
    with pytest.raises(InputError, match=r"did you mean 'J/\(mol K\)'\?"):
        heat_capacity_unit("J/(mol k)")
    with pytest.raises(InputError, match=r"known are K, degC, degF, degR and mK"):
        temperature_unit("furlong")


@pytest.mark.parametrize(
    ("text", "value", "kelvin"),
    [
        ("K", 300.0, 300.0),
        ("Kelvin", 1.5, 1.5),
        ("mK", 350.0, 0.35),
        ("°C", 25.0, 298.15),
        ("degC", -273.15, 0.0),
        ("deg C", 0.0, 273.15),
        ("℃", 100.0, 373.15),
        ("C", 1.0, 274.15),
        ("°F", 32.0, 273.15),
        ("degF", 212.0, 373.15),
        ("Fahrenheit", -459.67, 0.0),
        ("°R", 491.67, 273.15),
    ],
)
def test_temperature_units(text: str, value: float, kelvin: float) -> None:
    """Each converts by its definition: t/degC = T/K - 273.15 (SI brochure), 32 degF = 0 degC, 1 degR = 5/9 K."""
    unit = temperature_unit(text)
    assert (value + unit.offset) * unit.factor == pytest.approx(kelvin, rel=1e-15, abs=1e-15)


def test_case_counts_in_temperature_units() -> None:
    """MK is not mK: a millikelvin is never read from a capital M."""
    assert find_temperature_unit("MK") is None
    assert find_temperature_unit("k") is None


@pytest.mark.parametrize(
    ("text", "unit", "expected"),
    [
        ("12.3 mg", "kg", 12.3e-6),
        ("5g", "kg", 5e-3),
        ("12.3 µg", "kg", 12.3e-9),
        ("0.002 kg", "kg", 2e-3),
        ("101.96 g/mol", "kg/mol", 0.10196),
        ("63.546 g mol⁻¹", "kg/mol", 0.063546),
        ("0.0635 kg/mol", "kg/mol", 0.0635),
        ("1358 K", "K", 1358.0),
        ("1084.62 degC", "K", 1357.77),
        ("1e3 K", "K", 1000.0),
    ],
)
def test_quantity(text: str, unit: str, expected: float) -> None:
    """A number with a unit comes out in SI."""
    assert parse_quantity(text, unit) == pytest.approx(expected, rel=1e-14)  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("text", "sentence"),
    [
        ("12.3", "mass '12.3' has no unit: write it with one, as in '12.3 mg'"),
        ("12.3 K", "mass '12.3 K': 'K' is not a unit of mass; write it as in '12.3 mg'"),
        ("12 furlong", "mass '12 furlong': 'furlong' is not a unit of mass; write it as in '12.3 mg'"),
        ("12,3 mg", "mass '12,3 mg' cannot be read: write a number and a unit, as in '12.3 mg'"),
        ("some", "mass 'some' cannot be read: write a number and a unit, as in '12.3 mg'"),
        ("nan mg", "mass 'nan mg' cannot be read: write a number and a unit, as in '12.3 mg'"),
        ("1e999 kg", "mass '1e999 kg' is too large a number"),
    ],
)
def test_wrong_quantity_is_refused_in_one_sentence(text: str, sentence: str) -> None:
    """A missing or wrong unit, or no number, is named together with the way to write it."""
    with pytest.raises(InputError) as caught:
        parse_quantity(text, "kg", "mass")
    assert str(caught.value) == sentence


@given(st.text(alphabet="Jmolgk K/()*-^123_.µ°CFcalu·⁻¹ −per", max_size=16))
def test_any_text_is_a_unit_or_none(text: str) -> None:
    """No text makes the reader of units fail in any other way than by refusing."""
    unit = find_heat_capacity_unit(text)
    assert unit is None or find_heat_capacity_unit(unit.text) == unit


def test_units_library_is_loaded_only_when_a_unit_is_read() -> None:
    """Importing the module costs no import of the units library."""
    code = "import sys, latticefit.sample; sys.exit(bool({'pint', 'periodictable'} & set(sys.modules)))"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0


def test_mole_in_capitals() -> None:
    """``J/MOL.K`` is J/(mol K): nothing else is a heat capacity."""
    for text in ("J/MOL.K", "J/(Mol K)", "J/MOL-K", "J MOL-1 K-1"):
        assert heat_capacity_unit(text).text == "J/(mol K)"

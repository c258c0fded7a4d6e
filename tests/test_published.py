"""The whole chain held against published values; every check names its source."""

from __future__ import annotations

import csv

import pytest
from helpers import REFERENCE

import latticefit as lf

COPPER = REFERENCE / "copper_white_collocott_1984.csv"
SIGMA = "1% below 100 K, 0.3% above"  # stated by White and Collocott 1984 (file header)


def copper(terms: str) -> lf.Fit:
    return lf.fit(lf.read(COPPER, formula="Cu", sigma=SIGMA), terms=terms, cp_cv="nernst-lindemann")


def codata(substance: str) -> tuple[float, float, float, float]:
    """S(298.15) and H(298.15)-H(0) with their uncertainties from the CODATA key values, J/(mol K) and J/mol."""
    with (REFERENCE / "codata_key_values_1989.csv").open(encoding="utf-8") as stream:
        rows = csv.DictReader(line for line in stream if not line.startswith("#"))
        row = next(each for each in rows if each["substance"] == substance)
    return (
        float(row["S298_J_molK"]),
        float(row["u_S"]),
        1000 * float(row["H298_minus_H0_kJ_mol"]),
        1000 * float(row["u_H"]),
    )


def standard(fit: lf.Fit) -> tuple[float, float]:
    row = fit.table([298.15]).iloc[0]
    return float(row["entropy_J_mol_K"]), float(row["enthalpy_J_mol"])


def test_copper_entropy_and_enthalpy() -> None:
    """S(298.15) and H(298.15)-H(0) of copper agree with CODATA 1989 (Cox, Wagman and Medvedev)."""
    S, H = standard(copper("debye + einstein + electronic"))
    published_S, _, published_H, u_H = codata("Cu")
    assert published_S == 33.15
    assert S == pytest.approx(33.15, abs=0.05)
    assert H == pytest.approx(published_H, abs=u_H)


def test_copper_theta_and_gamma() -> None:
    """theta_D(T->0) within 1 % of 344.3 K and gamma within 1.5 % of 0.691 mJ/(mol K2): Martin, Phys. Rev. B 8, 5357."""
    fit = copper("debye + einstein + electronic")
    theta = fit.characteristic_temperatures.loc["theta_debye_low_temperature", "value_K"]
    gamma = fit.analysis.fit.values[fit.analysis.fit.names.index("electronic_gamma")]
    assert theta == pytest.approx(344.3, rel=0.01)
    assert 1000 * gamma == pytest.approx(0.691, rel=0.015)
    assert fit.analysis.diagnosis.statistics.reduced_chi_square < 1
    assert fit.analysis.diagnosis.describes


def test_copper_with_a_single_debye_term_is_said_not_to_be_described() -> None:
    """Debye + gamma gives theta 327.95 K and reduced chi2 54.64 (independent least squares, header of the file)."""
    fit = copper("debye + electronic")
    theta = fit.analysis.fit.values[fit.analysis.fit.names.index("debye_theta")]
    assert theta == pytest.approx(327.945, abs=0.05)
    assert fit.analysis.diagnosis.statistics.reduced_chi_square == pytest.approx(54.64, abs=0.1)
    assert not fit.analysis.diagnosis.describes
    assert "does not describe the data" in fit.analysis.diagnosis.verdict
    assert "model-misfit" in {each.code for each in fit.analysis.warnings}


@pytest.mark.parametrize(
    ("terms", "theta", "gamma"),
    [("einstein", 283.3, None), ("debye", 384.6, None), ("debye + electronic", 393.4, 1.635)],
)
def test_aluminium_cv_of_giauque_and_meads(terms: str, theta: float, gamma: float | None) -> None:
    """Cv of aluminium in cal/(mol K), equal weights: Giauque and Meads 1941; least squares of the file's header."""
    data = lf.read(
        REFERENCE / "aluminium_cv_giauque_meads_1941.csv",
        formula="Al",
        heat_capacity="Cv_cal_molK",
        sigma="1 J/(mol K)",
    )
    assert data.quantity == "Cv"
    fit = lf.fit(data, terms=terms).analysis.fit
    found = dict(zip(fit.names, fit.values, strict=True))
    assert found[f"{terms.split()[0]}_theta"] == pytest.approx(theta, abs=0.06)
    if gamma is not None:
        assert 1000 * found["electronic_gamma"] == pytest.approx(gamma, abs=0.002)


def test_aluminium_cv_needs_a_choice_of_column() -> None:
    """With two heat capacity columns the file is refused and both are named."""
    with pytest.raises(lf.InputError, match=r"Cv_cal_molK.*Cv_J_molK"):
        lf.read(REFERENCE / "aluminium_cv_giauque_meads_1941.csv", formula="Al")


@pytest.mark.parametrize(("terms", "theta", "within"), [("einstein", 1296.0, 0.06), ("debye", 1789.0, 0.6)])
def test_diamond_of_weber_and_einstein(terms: str, theta: float, within: float) -> None:
    """Weber's diamond as used by Einstein, Ann. Phys. 22 (1907) 180: least squares of the file's header."""
    data = lf.read(
        REFERENCE / "diamond_weber_einstein_1907.csv",
        formula="C",
        heat_capacity="C_J_molK",
        quantity="Cv",
        sigma="1 J/(mol K)",
    )
    assert lf.fit(data, terms=terms).analysis.fit.values[0] == pytest.approx(theta, abs=within)


def test_aluminium_cp_in_joules_per_gram() -> None:
    """Aluminium of NBS Monograph 21 in J/(g K): S and H(298.15)-H(0) agree with CODATA 1989 to 0.5 %."""
    data = lf.read(
        REFERENCE / "aluminium_nbs_monograph_21.csv",
        formula="Al",
        heat_capacity="cp_J_gK",
        sigma="1% below 100 K, 0.5% above",
    )
    S, H = standard(lf.fit(data, terms="debye + einstein + electronic", cp_cv="nernst-lindemann"))
    published_S, _, published_H, _ = codata("Al")
    assert S == pytest.approx(published_S, rel=0.005)
    assert H == pytest.approx(published_H, rel=0.005)

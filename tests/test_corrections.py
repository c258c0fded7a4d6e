"""Addenda, additions and impurities taken off a run: physics, refusals, and what the record holds (invented data)."""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from numpy.testing import assert_allclose
from reading_helpers import messages

import latticefit as lf
from latticefit.analysis import analyse
from latticefit.cli import main
from latticefit.errors import InputError
from latticefit.functions import debye_heat_capacity, einstein_heat_capacity
from latticefit.preparing import prepare
from latticefit.reading import read_measurement
from latticefit.reading.sheets import read_sheet
from latticefit.records import AddendaSettings, FloatArray, Measurement, RunSettings, SampleSettings, Sheet
from latticefit.report import write_report
from latticefit.rounding import percent_range
from latticefit.sample import parse_formula

SAMPLE = SampleSettings(formula="Al2O3", mass="10 mg")
MOLAR_MASS = parse_formula("Al2O3").molar_mass  # kg/mol
AMOUNT = 10e-6 / MOLAR_MASS  # mol
T = np.geomspace(2.0, 300.0, 60)


def molar(t: FloatArray) -> FloatArray:
    """The invented sample, J/(mol K)."""
    return np.asarray(24.94 * (2 * debye_heat_capacity(400 / t) + 3 * einstein_heat_capacity(650 / t)))


def blank(t: FloatArray) -> FloatArray:
    """Platform and grease, J/K."""
    return np.asarray(1.2e-3 * debye_heat_capacity(250.0 / t) + 2e-8 * t)


def power(t: FloatArray) -> FloatArray:
    """A heat capacity per gram that a curve follows exactly, J/(g K)."""
    return np.asarray(1e-4 * t**1.5)


def table(header: str, *columns: FloatArray) -> str:
    rows = "\n".join(",".join(f"{value:.12g}" for value in row) for row in zip(*columns, strict=True))
    return f"# invented data\n{header}\n{rows}\n"


def write(folder: Path, **files: str) -> None:
    for name, text in files.items():
        (folder / f"{name}.csv").write_text(text, encoding="utf-8")


def read(folder: Path, *addenda: AddendaSettings, sample: SampleSettings = SAMPLE, **choices: object) -> Measurement:
    return read_measurement(sample, (RunSettings("run.csv", **choices),), folder, addenda)  # type: ignore[arg-type]


BLANK = AddendaSettings("blank.csv")
IN_J_K = "T (K),C (J/K)"


def run_text(t: FloatArray = T, noise: float = 0.0, seed: int = 0) -> str:
    total = AMOUNT * molar(t) + blank(t)
    return table(IN_J_K, t, total * (1 + noise * np.random.default_rng(seed).standard_normal(t.size)))


def blank_text(t: FloatArray = T, noise: float = 0.0, seed: int = 0) -> str:
    return table(IN_J_K, t, blank(t) * (1 + noise * np.random.default_rng(seed).standard_normal(t.size)))


# ---------------------------------------------------------------------------------------------------- the physics


def test_what_was_added_is_taken_off_within_u(tmp_path: Path) -> None:
    """Over many invented blanks the sample is met within u at 68 % of the points and within 2u at 95 %."""
    write(tmp_path, run=run_text())
    within = np.zeros(2)
    seeds = 60
    for seed in range(seeds):
        write(tmp_path, blank=blank_text(np.geomspace(1.9, 310, 40), 0.01, seed))
        found = read(tmp_path, BLANK)
        assert found.addenda_u is not None
        error = np.abs(found.heat_capacity - molar(found.temperature)) / found.addenda_u
        within += (error < 1).mean(), (error < 2).mean()
    assert within[0] / seeds == pytest.approx(0.69, abs=0.08)
    assert within[1] / seeds == pytest.approx(0.95, abs=0.04)


def test_total_is_the_sample_and_the_addenda(tmp_path: Path) -> None:
    """What is left and what was taken off add up to what was measured, per mole; per sample without a formula."""
    write(tmp_path, run=run_text(), blank=blank_text())
    found = read(tmp_path, BLANK)
    plain = read(tmp_path)
    assert found.addenda is not None
    assert_allclose(found.heat_capacity + found.addenda, plain.heat_capacity, rtol=1e-12)
    assert_allclose(found.heat_capacity, molar(T), rtol=2e-3)
    bare = read(tmp_path, BLANK, sample=SampleSettings())
    assert bare.basis == "sample"
    assert_allclose(bare.heat_capacity / AMOUNT, found.heat_capacity, rtol=1e-8)


def test_grease_by_mass(tmp_path: Path) -> None:
    """A file per gram and a mass take off mass times c, and the u of the mass comes in full."""
    grease = 0.35e-3 * power(T)  # 0.35 mg
    write(tmp_path, run=table(IN_J_K, T, AMOUNT * molar(T) + grease), grease=table("T (K),C (J/(g K))", T, power(T)))
    found = read(tmp_path, AddendaSettings("grease.csv", mass="0.35(7) mg"))
    assert_allclose(found.heat_capacity, molar(T), rtol=1e-8)
    assert_allclose(found.addenda_u, 0.2 * grease / AMOUNT, rtol=1e-6)


BASES: dict[str, tuple[str, Callable[[FloatArray], FloatArray], SampleSettings]] = {
    "per gram": ("T (K),C (J/(g K))", lambda c: c / MOLAR_MASS / 1e3, SampleSettings()),
    "per gram, molar mass": ("T (K),C (J/(g K))", lambda c: c / MOLAR_MASS / 1e3, SampleSettings(formula="Al2O3")),
    "per mole": ("T (K),C (J/(mol K))", lambda c: c, SampleSettings(formula="Al2O3")),
    "per sample": (IN_J_K, lambda c: c * AMOUNT, SampleSettings(mass="10 mg")),
    "per sample, molar mass": (IN_J_K, lambda c: c * AMOUNT, SAMPLE),
}


@pytest.mark.parametrize("basis", BASES)
def test_impurity_round_trip(basis: str, tmp_path: Path) -> None:
    """A mixture by mass gives its main part back, exactly, on every basis; sigma is that of the total, scaled."""
    header, convert, sample = BASES[basis]
    per_mole = 1e3 * MOLAR_MASS * power(T)  # of the impurity, by the molar mass of the sample as its user divides
    total = 0.95 * molar(T) + 0.05 * per_mole
    write(tmp_path, run=table(header, T, convert(total)), other=table("T (K),C (J/(g K))", T, power(T)))
    found = read(tmp_path, AddendaSettings("other.csv", fraction="5%"), sample=sample, sigma="2%")
    truth = molar(T) if found.basis == "mol" else convert(molar(T))
    whole = total if found.basis == "mol" else convert(total)
    assert_allclose(found.heat_capacity, truth, rtol=1e-7)
    assert_allclose(found.sigma, 0.02 * whole / 0.95, rtol=1e-7)
    assert found.addenda is not None
    assert_allclose(found.heat_capacity + found.addenda, whole / 0.95, rtol=1e-7)


@pytest.mark.parametrize("text", ["5(1)%", "0.05(1)", "5 ± 1 %", "5 % ± 1 %", "0.05 ± 0.01"])
def test_u_of_a_fraction_is_what_its_change_does(text: str, tmp_path: Path) -> None:
    """The u that comes from u(f) is half the difference between f + u and f - u."""
    write(tmp_path, run=table("T (K),C (J/(g K))", T, molar(T) / 102), other=table("T (K),C (J/(g K))", T, power(T)))
    found = read(tmp_path, AddendaSettings("other.csv", fraction=text), sample=SampleSettings())
    low, high = (
        read(tmp_path, AddendaSettings("other.csv", fraction=each), sample=SampleSettings()).heat_capacity
        for each in ("0.0499", "0.0501")
    )
    assert_allclose(found.addenda_u, np.abs(high - low) * 50, rtol=1e-4, atol=1e-9)


def test_blank_and_impurity_together_in_either_order(tmp_path: Path) -> None:
    """The blank comes off the total and the impurity off what is left, in whatever order they are named."""
    per_mole = 1e3 * MOLAR_MASS * power(T)
    total = AMOUNT * (0.95 * molar(T) + 0.05 * per_mole) + 1e-6 * T**1.2
    write(
        tmp_path,
        run=table(IN_J_K, T, total),
        blank=table(IN_J_K, T, 1e-6 * T**1.2),
        other=table("T (K),C (J/(g K))", T, power(T)),
    )
    impurity = AddendaSettings("other.csv", fraction="0.05")
    found, turned = read(tmp_path, BLANK, impurity), read(tmp_path, impurity, BLANK)
    assert_allclose(found.heat_capacity, molar(T), rtol=1e-7)
    assert_allclose(turned.heat_capacity, found.heat_capacity, rtol=1e-12)
    assert [each.file for each in found.addenda_readings] == ["blank.csv", "other.csv"]
    assert len(found.addenda_shares) == 2


def test_only_the_runs_that_are_named(tmp_path: Path) -> None:
    """Of two runs in J/K the blank comes off the one it names; the other keeps its values and gets no u."""
    write(tmp_path, a=run_text(), b=table(IN_J_K, T, AMOUNT * molar(T)), blank=blank_text())
    entry = replace(BLANK, runs=("a",))
    found = read_measurement(SAMPLE, (RunSettings("a.csv"), RunSettings("b.csv")), tmp_path, (entry,))
    assert found.addenda is not None
    assert found.addenda_u is not None
    assert (found.addenda[found.run == 1] == 0).all()
    assert (found.addenda_u[found.run == 1] == 0).all()
    assert_allclose(found.heat_capacity[found.run == 1], molar(T), rtol=1e-10)
    assert_allclose(found.heat_capacity[found.run == 0], molar(T), rtol=2e-3)
    assert found.addenda_shares[0].points == T.size


def test_a_percentage_is_one_of_the_measured_total(tmp_path: Path) -> None:
    """A stated 1 % is that of the value in the file, so that it is more of what is left."""
    write(tmp_path, run=run_text(), blank=blank_text())
    found, plain = read(tmp_path, BLANK, sigma="1%"), read(tmp_path, sigma="1%")
    assert_allclose(found.sigma, 0.01 * plain.heat_capacity, rtol=1e-12)


def test_addenda_on_the_old_scale_are_converted(tmp_path: Path) -> None:
    """An addenda file declared to be on IPTS-68 is converted like a run; one that is not declared is told of."""
    write(tmp_path, run=run_text(), blank=blank_text(np.geomspace(1.9, 310, 60)))
    new, old = read(tmp_path, BLANK), read(tmp_path, replace(BLANK, temperature_scale="IPTS-68"))
    assert new.addenda is not None
    assert old.addenda is not None
    warm = T > 14
    assert np.abs(old.addenda / new.addenda - 1)[warm].max() > 1e-4
    assert any("converted from IPTS-68" in message for message in messages(old))
    both = read(tmp_path, BLANK, temperature_scale="IPTS-68")
    assert messages(both)[-1] == (
        "the temperature scale of the addenda is not declared, that of the run is IPTS-68; taken as ITS-90"
    )


# ------------------------------------------------------------------------------------------------- points and words


def test_what_was_done_is_said_with_its_size(tmp_path: Path) -> None:
    """One line says which column of which file was taken off, its share of the total and its u."""
    write(tmp_path, run=run_text(), blank=blank_text(noise=0.01, seed=2))
    found = read(tmp_path, BLANK)
    share = found.addenda_shares[0]
    total = AMOUNT * molar(T) + blank(T)
    assert share.lowest == pytest.approx((blank(T) / total).min(), rel=0.03)
    assert share.highest == pytest.approx((blank(T) / total).max(), rel=0.03)
    assert found.repairs[0].file == "blank.csv"
    part, u = percent_range(share.lowest, share.highest), percent_range(share.u_lowest, share.u_highest)
    assert messages(found) == [
        f"addenda blank.csv, column 'C (J/K)', taken off: {part} of the measured heat capacity, u {u} of the sample's"
    ]
    assert percent_range(0.1234, 0.714) == "12 to 71 %"


def test_points_beyond_the_addenda_are_refused(tmp_path: Path) -> None:
    """A point that may be fitted and that the file does not reach is named with its line."""
    write(tmp_path, run=run_text(), blank=blank_text(np.geomspace(2.5, 310, 50)))
    with pytest.raises(InputError) as caught:
        read(tmp_path, BLANK)
    assert str(caught.value) == (
        "run.csv: 2 K in line 3 (and 2 more) lies outside the addenda file blank.csv, 2.5-310 K; measure the addenda "
        "there, or leave such points out by --window, --mask or --mask-lines"
    )


@pytest.mark.parametrize("choice", [{"window": ((3.0, 400.0),)}, {"mask": ((0.0, 3.0),)}])
def test_points_that_are_not_fitted_need_no_addenda(choice: dict[str, object], tmp_path: Path) -> None:
    """Outside the window or in a mask a point is left out with the reason, and the rest is read."""
    write(tmp_path, run=run_text(), blank=blank_text(np.geomspace(2.5, 310, 50)))
    found = read(tmp_path, BLANK, **choice)
    assert found.temperature.size == T.size - 3
    assert [row.line for row in found.excluded] == [3, 4, 5]
    assert found.excluded[0].reason == "outside the addenda file blank.csv, 2.5-310 K"
    assert np.isnan(found.excluded[0].heat_capacity)
    assert "row left out: outside the addenda file blank.csv, 2.5-310 K" in messages(found)


def test_a_set_point_met_twice_is_not_beyond(tmp_path: Path) -> None:
    """Up to half a percent beyond its range the curve is continued, and that is told."""
    write(tmp_path, run=run_text(), blank=blank_text(np.geomspace(2.006, 299.5, 50)))
    found = read(tmp_path, BLANK)
    assert found.temperature.size == T.size
    assert messages(found)[-1] == "2 points up to 0.3 % beyond the addenda, taken off by their continued curve"


def test_points_that_are_nothing_but_addenda_are_left_out(tmp_path: Path) -> None:
    """Where the blank is more than the total the row is left out with both values, what is left beside it."""
    total = AMOUNT * molar(T) + blank(T)
    total[3] = 0.9 * blank(T)[3]
    write(tmp_path, run=table(IN_J_K, T, total), blank=blank_text())
    found = read(tmp_path, BLANK)
    (row,) = found.excluded
    assert row.line == 6
    assert row.heat_capacity == pytest.approx(-0.1 * blank(T)[3] / AMOUNT, rel=0.05)
    assert row.reason.endswith("J/(mol K) of addenda is not above 0")
    assert found.temperature.size == T.size - 1
    assert found.addenda_shares[0].points == T.size - 1


def test_column_named_addenda_is_found(tmp_path: Path) -> None:
    """In an addenda file the column of that name is the heat capacity, which it is in no run."""
    write(tmp_path, run=run_text(), blank=blank_text().replace("C (J/K)", "Addenda HC (J/K)"))
    assert read(tmp_path, BLANK).addenda_readings[0].heat_capacity_column == "Addenda HC (J/K)"
    with pytest.raises(InputError, match="no column is named like a heat capacity"):
        read_measurement(SAMPLE, (RunSettings("blank.csv"),), tmp_path)


def test_two_claims_to_be_the_addenda_are_refused(tmp_path: Path) -> None:
    """A blank with a column of the sample and one of the addenda says which of them is meant by its sheet only."""
    both = table("T (K),Sample HC (J/K),Addenda HC (J/K)", T, 0.1 * blank(T), blank(T))
    write(tmp_path, run=run_text(), blank=both)
    with pytest.raises(InputError) as caught:
        read(tmp_path, BLANK)
    assert str(caught.value) == (
        "blank.csv: columns 'Sample HC (J/K)' and 'Addenda HC (J/K)' may each be the addenda; choose one by "
        "heat_capacity = 'Addenda HC (J/K)' in its [[addenda]] in a run sheet"
    )
    assert_allclose(read(tmp_path, replace(BLANK, heat_capacity=3)).heat_capacity, molar(T), rtol=2e-3)


def test_addenda_beside_the_total_in_one_file(tmp_path: Path) -> None:
    """The file of a run may hold its addenda in another column; the very column of the run is refused."""
    write(tmp_path, run=table("T (K),Total HC (J/K),Addenda (J/K)", T, AMOUNT * molar(T) + blank(T), blank(T)))
    own = AddendaSettings("run.csv", heat_capacity="Addenda (J/K)")
    assert_allclose(read(tmp_path, own).heat_capacity, molar(T), rtol=2e-3)
    with pytest.raises(InputError, match="the addenda are the heat capacity of run 'run' itself; name another file"):
        read(tmp_path, replace(own, heat_capacity="Total HC (J/K)"))


def test_settings_of_the_record_read_the_same_again(tmp_path: Path) -> None:
    """The entry with every choice made gives the same numbers to the last bit."""
    write(tmp_path, run=run_text(), blank=blank_text(noise=0.01).replace("C (J/K)", "Addenda (J/K)"))
    first = read(tmp_path, BLANK)
    again = read(tmp_path, *first.addenda_settings)
    assert first.addenda_settings[0].heat_capacity == 2 or first.addenda_settings[0].heat_capacity == "Addenda (J/K)"
    assert again.addenda_settings == first.addenda_settings
    assert again.heat_capacity.tolist() == first.heat_capacity.tolist()
    assert again.addenda_u is not None
    assert first.addenda_u is not None
    assert again.addenda_u.tolist() == first.addenda_u.tolist()


# ------------------------------------------------------------------------------------------------------ the refusals

MOLAR = table("T (K),Cp (J/(mol K))", T, molar(T))
GRAM = table("T (K),c (J/(g K))", T, power(T))
REFUSED: dict[str, tuple[dict[str, str], AddendaSettings, SampleSettings, str]] = {
    "off already": (
        {"run": MOLAR},
        BLANK,
        SAMPLE,
        "blank.csv cannot be taken off run 'run', which is in J/(mol K): a heat capacity per mole or per mass has its "
        "addenda off already; leave it out, or name by runs = [...] in its [[addenda]] the runs that it concerns",
    ),
    "unknown run": (
        {},
        replace(BLANK, runs=("rum",)),
        SAMPLE,
        "the addenda blank.csv name a run 'rum' that there is not; did you mean 'run'?",
    ),
    "per mole": (
        {"blank": MOLAR},
        BLANK,
        SAMPLE,
        "the addenda blank.csv are in J/(mol K); they must be in J/K, or per gram with mass or fraction",
    ),
    "per gram alone": (
        {"blank": GRAM},
        BLANK,
        SAMPLE,
        'the addenda blank.csv are in J/(g K): say by mass = "0.35 mg" how much of it was measured along, or by '
        'fraction = "1.2%" what part of the sample it is',
    ),
    "mass of all of it": (
        {},
        replace(BLANK, mass="1 mg"),
        SAMPLE,
        "the addenda blank.csv are in J/K, all of it; leave mass out, or give a file per gram",
    ),
    "mass and fraction": (
        {"blank": GRAM},
        replace(BLANK, mass="1 mg", fraction="1%"),
        SAMPLE,
        "the addenda blank.csv have both mass and fraction; give the one that is meant",
    ),
    "mass unread": (
        {"blank": GRAM},
        replace(BLANK, mass="1 K"),
        SAMPLE,
        "the addenda blank.csv: mass '1 K': 'K' is not a unit of mass; write it as in '12.3 mg'",
    ),
    "fraction unread": (
        {"blank": GRAM},
        replace(BLANK, fraction="some"),
        SAMPLE,
        "fraction 'some' of the addenda blank.csv cannot be read: write it as in '1.2(1)%' or '0.012'",
    ),
    "fraction uncertain": (
        {"blank": GRAM},
        replace(BLANK, fraction="1(2)%"),
        SAMPLE,
        "fraction '1(2)%' of the addenda blank.csv: its uncertainty must be above 0 and below the fraction itself",
    ),
    "fraction too large": (
        {"blank": GRAM},
        replace(BLANK, fraction="5"),
        SAMPLE,
        "fraction '5' of the addenda blank.csv must be above 0 and below 1; for a percentage write '5%'",
    ),
    "fraction of no molar mass": (
        {"run": MOLAR, "blank": GRAM},
        replace(BLANK, fraction="5%"),
        SampleSettings(atoms=5),
        "blank.csv is per gram and run 'run' per mole: a fraction needs --formula or --molar-mass",
    ),
    "fraction of no mass": (
        {"blank": GRAM},
        replace(BLANK, fraction="5%"),
        SampleSettings(),
        "blank.csv is a fraction of the sample and run 'run' is in J/K: give --mass",
    ),
    "too few points": (
        {"blank": blank_text(T[::30])},
        BLANK,
        SAMPLE,
        "the addenda file blank.csv holds 2 different temperatures; a smooth curve needs 4 or more",
    ),
    "no unit": (
        {"blank": blank_text().replace("C (J/K)", "C")},
        BLANK,
        SAMPLE,
        "blank.csv: the unit of 'C' is not stated; write it into the header, as in 'Cp (J/(mol K))', or give "
        "heat_capacity_unit 'J/(mol K)' (keys of its [[addenda]] in a run sheet)",
    ),
    "all spent": (
        {"run": table(IN_J_K, T, 0.5 * blank(T))},
        BLANK,
        SAMPLE,
        "the addenda leave 0 of 60 points above 0 (line 3: ",
    ),
}


@pytest.mark.parametrize("case", REFUSED)
def test_refusal(case: str, tmp_path: Path) -> None:
    """What cannot be taken off is refused in a sentence that says how to mend it."""
    files, entry, sample, sentence = REFUSED[case]
    write(tmp_path, **({"run": run_text(), "blank": blank_text()} | files))
    with pytest.raises(InputError) as caught:
        read(tmp_path, entry, sample=sample)
    assert str(caught.value).startswith(sentence)
    assert case == "all spent" or str(caught.value) == sentence


def test_fractions_that_are_more_than_the_sample(tmp_path: Path) -> None:
    """Two parts that make up all of the mass leave no sample."""
    write(tmp_path, run=run_text(), blank=GRAM, other=GRAM + "\n")
    half = replace(BLANK, fraction="0.5")
    with pytest.raises(InputError, match=r"the addenda are 100 % of the sample's mass together; correct fraction"):
        read(tmp_path, half, replace(half, file="other.csv"))


def test_one_file_is_not_taken_off_twice(tmp_path: Path) -> None:
    """The same column of the same file in two entries is refused; for two runs, one entry each, it is not."""
    write(tmp_path, run=run_text(), blank=blank_text())
    with pytest.raises(InputError, match="would be taken off twice; name each addenda file once"):
        read(tmp_path, BLANK, BLANK)


def test_points_that_are_nearly_all_addenda_are_set_aside(tmp_path: Path) -> None:
    """Above 95 % of the measured total a point is not fitted, with the reason and a count among the repairs."""
    write(tmp_path, run=run_text(), blank=blank_text())
    whole = read(tmp_path, BLANK)
    share = np.asarray(whole.addenda) / (np.asarray(whole.addenda) + whole.heat_capacity)
    assert whole.set_aside == ()
    assert share.max() < 0.95
    total = np.asarray(whole.addenda) + whole.heat_capacity
    factor = 0.97 * float((total / np.asarray(whole.addenda)).min())  # the blank at 97 % of one total
    lines = blank_text().splitlines()
    heavy = [line if not line[:1].isdigit() else _times(line, factor) for line in lines]
    write(tmp_path, run=run_text(), blank="\n".join(heavy) + "\n")
    found = read(tmp_path, BLANK)
    heavy_share = np.asarray(found.addenda) / (np.asarray(found.addenda) + found.heat_capacity)
    expected = heavy_share > 0.95
    assert expected.any()
    assert [bool(reason) for reason in found.set_aside] == expected.tolist()
    assert any("set aside: addenda are above 95 %" in each.message for each in found.repairs)


def _times(line: str, factor: float) -> str:
    """A row of the blank with its heat capacity multiplied."""
    cells = line.split(",")
    return ",".join([cells[0], repr(float(cells[1]) * factor), *cells[2:]])


# ------------------------------------------------------------------------------------------------- fits and reports


@pytest.mark.parametrize("sigma", ["0.5%", None])
def test_sigma_of_a_fitted_point_holds_that_of_the_addenda(sigma: str | None, tmp_path: Path) -> None:
    """Stated or estimated, sigma is that of the measured total and the u of the addenda in quadrature."""
    write(tmp_path, run=run_text(noise=0.005, seed=1), blank=blank_text(noise=0.01, seed=2))
    found = read(tmp_path, BLANK, sigma=sigma)
    prepared = prepare(found)
    assert found.addenda is not None
    assert found.addenda_u is not None
    own = np.sqrt(prepared.sigma**2 - found.addenda_u**2)
    part = own / (found.heat_capacity + found.addenda)
    assert_allclose(part, part[0], rtol=1e-6)
    assert part[0] == pytest.approx(0.005, rel=1e-6 if sigma else 0.4)
    assert prepared.sigma_text.endswith(", addenda included; and the uncertainty of the addenda")


def test_the_sheet_of_a_report_with_addenda_gives_the_same_record(tmp_path: Path) -> None:
    """The report keeps the addenda file beside the run, and its sheet repeats the result to the last digit."""
    write(tmp_path, run=run_text(noise=0.005, seed=1), blank=blank_text(noise=0.01, seed=2))
    sample = replace(SAMPLE, mass="10.0(2) mg")
    found = read(tmp_path, BLANK, sample=sample)
    sheet = Sheet(sample, (RunSettings("run.csv"),), lf.fit(found, "debye + einstein").analysis.sheet.model)
    out = write_report(analyse(sheet, found), tmp_path / "out", figures="none")
    assert {path.name for path in (out / "inputs").iterdir()} == {"run.csv", "blank.csv"}
    repeated = read_sheet(out / "run_sheet.toml")
    assert repeated.addenda[0].file == "inputs/blank.csv"
    again = read_measurement(repeated.sample, repeated.runs, out, repeated.addenda)
    twin = write_report(analyse(repeated, again), tmp_path / "twin", figures="none")
    first, second = (json.loads((each / "result.json").read_text("utf-8")) for each in (out, twin))
    for key in ("parameters", "covariance", "fit", "thermodynamic_functions", "warnings"):
        assert first[key] == second[key]
    assert first["sample"]["mass_mg"] == 10.0
    assert first["sample"]["mass_u_mg"] == 0.2
    (entry,) = first["data"]["addenda"]
    assert entry["file"] == "blank.csv"
    assert entry["sha256"] == found.addenda_readings[0].sha256
    assert entry["runs"] == ["run"]
    assert 0 < entry["share_min"] < entry["share_max"] < 1
    rows = (out / "residuals.csv").read_text("utf-8").splitlines()
    assert "addenda_J_mol_K" in rows[0].split(",")
    assert "addenda_J_mol_K" not in _header_without_addenda(tmp_path)
    text = " ".join((out / "report.txt").read_text("utf-8").split())
    assert "the mass is uncertain by 2.0 %: every Cp, H and S carries this scale error on top of its u" in text
    assert "mass 10.00 ± 0.20 mg" in text
    assert "of the measured heat capacity taken off" in text


def _header_without_addenda(folder: Path) -> list[str]:
    plain = write_report(lf.fit(read(folder), "debye + einstein").analysis, folder / "plain", figures="none")
    return (plain / "residuals.csv").read_text("utf-8").splitlines()[0].split(",")


def test_python_and_the_command_line_take_addenda(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A path or a mapping from Python, and --addenda of inspect and fit, take the same off."""
    write(tmp_path, run=run_text(noise=0.005, seed=1), blank=blank_text(noise=0.01, seed=2))
    run, file = tmp_path / "run.csv", tmp_path / "blank.csv"
    expected = read(tmp_path, BLANK).heat_capacity
    for given in (file, {"file": file}, [str(file)]):
        found = lf.read(run, formula="Al2O3", mass="10 mg", addenda=given)
        assert_allclose(found.heat_capacity, expected, rtol=1e-12)
    assert "addenda" in repr(found._facts())
    options = [str(run), "--addenda", str(file), "--formula", "Al2O3", "--mass", "10 mg", "--json"]
    assert main(["inspect", *options]) == 0
    shown = json.loads(capsys.readouterr().out)["files"][0]["measurement"]["heat_capacity_J_mol_K"]
    assert_allclose(shown, expected, rtol=1e-12)
    assert main(["fit", *options, "--terms", "debye + einstein", "--quiet"]) == 0
    assert len(json.loads(capsys.readouterr().out)["data"]["addenda"]) == 1


def test_inspect_of_a_sheet_takes_off_what_concerns_each_file(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """Files of a sheet are shown one by one, each with its own addenda, although an entry may name runs of others."""
    write(tmp_path, a=run_text(), b=run_text(), c=table(IN_J_K, T, AMOUNT * molar(T)), blank=blank_text())
    runs = "".join(f'[[run]]\nfile = "{name}.csv"\n' for name in "abc")
    sheet = '[sample]\nformula = "Al2O3"\nmass = "10 mg"\n' + runs
    sheet += '[[addenda]]\nfile = "blank.csv"\nruns = ["a", "b"]\n'
    (tmp_path / "sheet.toml").write_text(sheet, encoding="utf-8")
    assert main(["inspect", str(tmp_path / "sheet.toml"), "--json"]) == 0
    for shown in json.loads(capsys.readouterr().out)["files"]:
        assert_allclose(shown["measurement"]["heat_capacity_J_mol_K"], molar(T), rtol=2e-3)


def test_points_set_aside_need_no_addenda(tmp_path: Path) -> None:
    """Masked lines may lie beyond the addenda: they are left out with the reason, as outside a window."""
    write(tmp_path, run=run_text(), blank=blank_text(np.geomspace(2.5, 310, 50)))
    found = read(tmp_path, BLANK, mask_lines=((3, 5), (10, 10)))
    assert [row.line for row in found.excluded] == [3, 4, 5]
    assert [line for line, why in zip(found.line, found.set_aside, strict=True) if why is not None] == [10]


def test_addenda_of_some_runs_of_a_divided_file(tmp_path: Path) -> None:
    """Runs that a column divides a file into are named by their labels."""
    total = AMOUNT * molar(T)
    both = np.concatenate([total + blank(T), total])
    text = table("T (K),C (J/K),field (T)", np.tile(T, 2), both, np.repeat([0.0, 5.0], T.size))
    write(tmp_path, run=text, blank=blank_text())
    labels = [each.label for each in read(tmp_path, split_by="field (T)").readings]
    assert len(labels) == 2
    found = read(tmp_path, replace(BLANK, runs=(labels[0],)), split_by="field (T)")
    assert_allclose(found.heat_capacity, np.tile(molar(T), 2), rtol=2e-3)


def test_a_mass_that_converts_nothing_is_told(tmp_path: Path) -> None:
    """Beside data per mole the mass is not used: its uncertainty is no scale error, and one line says so."""
    write(tmp_path, run=MOLAR)
    found = read(tmp_path, sample=replace(SAMPLE, mass="10.0(2) mg"))
    assert messages(found) == ["the mass and its uncertainty are not used: no run is in J/K"]
    bare = read(tmp_path, sample=replace(SAMPLE, mass="10 mg"))
    assert [each.message for each in bare.repairs] == ["the mass is not used: every run is per mole"]
    codes = [each.code for each in lf.fit(found, "debye + einstein").analysis.warnings]
    assert "mass-uncertainty" not in codes

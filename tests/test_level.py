"""The level of a heat capacity: what is refused, suspected and left alone, and which slip is named."""

from __future__ import annotations

import csv
import importlib.util
import json
import subprocess
import sys
import tomllib
from dataclasses import replace
from pathlib import Path
from types import ModuleType

import numpy as np
import pytest
from helpers import DEMO, REFERENCE, ROOT, invented_solid, prepared_data
from reading_helpers import read_text

import latticefit as lf
from latticefit.diagnosing import examine_level, examine_prepared_level
from latticefit.diagnosing.level_words import mode_sum_text
from latticefit.diagnosing.slips import possible_slips
from latticefit.records import FloatArray, LevelFinding, Measurement, PreparedData, SampleSettings

SJELITE = "He4Ne4*2H2O"
T = np.geomspace(2.0, 300.0, 90)
ORDINARY = ("debye + einstein", [230.0, 3.5, 390.0, 2.5])  # two atoms, 0.93 of 3nR at 300 K


def script() -> ModuleType:
    spec = importlib.util.spec_from_file_location("level_cases", ROOT / "scripts" / "level_cases.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    sys.modules["level_cases"] = module
    spec.loader.exec_module(module)
    return module


CASES = script()


def scaled(factor: float, at: FloatArray = T, **sample: object) -> PreparedData:
    """An ordinary solid of two atoms with its level multiplied by a factor, data per mole."""
    data = invented_solid(*ORDINARY, at, atoms=2)
    C = factor * np.array(data.heat_capacity)
    made = prepared_data(at, C, 0.005 * C, atoms=2)
    settings = SampleSettings(atoms=2, **sample)  # type: ignore[arg-type]
    return replace(made, measurement=replace(made.measurement, sample_settings=settings))


def debye_solid(theta: float, at: FloatArray) -> PreparedData:
    return invented_solid("debye", [theta, 6.0], at, atoms=2, noise=0.002)


def slips(finding: LevelFinding) -> str:
    return "; ".join(f"{each.words}: {each.remedy}" for each in finding.explanations)


# ------------------------------------------------------------------------------------------------ what is left alone


@pytest.mark.parametrize(
    ("file", "choices"),
    [
        (DEMO / "halvite.csv", {"formula": "NeKr"}),
        (DEMO / "norrium.csv", {"formula": "At"}),
        (DEMO / "tvorrite.csv", {"formula": "NeKr2Xe2"}),
        (DEMO / "drommenite.csv", {"formula": "ArXe"}),
        (DEMO / "sjelite.csv", {"formula": SJELITE}),
        (REFERENCE / "copper_white_collocott_1984.csv", {"formula": "Cu"}),
        (REFERENCE / "aluminium_cv_giauque_meads_1941.csv", {"formula": "Al", "heat_capacity": "Cv_cal_molK"}),
        (REFERENCE / "aluminium_nbs_monograph_21.csv", {"formula": "Al", "heat_capacity": "cp_J_gK"}),
        (REFERENCE / "diamond_weber_einstein_1907.csv", {"formula": "C", "heat_capacity": "C_J_molK"}),
    ],
    ids=lambda value: value.stem if isinstance(value, Path) else "",
)
def test_right_files_are_plausible(file: Path, choices: dict[str, str]) -> None:
    """Demo files and published tables (sources in their headers) are plausible, the mode sum within 3 u of 3 per atom.

    White and Collocott 1984, Giauque and Meads 1941, NBS Monograph 21, Weber in Einstein 1907.
    """
    found = examine_level(lf.read(file, **choices))  # type: ignore[arg-type]
    assert found.verdict == "plausible"
    assert found.explanations == ()
    if "diamond" not in file.stem:  # whose modes are too stiff to be counted below 1258 K
        assert found.mode_sum_ratio is not None
        assert abs(found.mode_sum_ratio - 1) < 3 * (found.mode_sum_u or 0) < 0.2


def janaf() -> dict[str, tuple[float, FloatArray]]:
    """Atoms, T and Cp in J/(mol K) of the solids of NIST-JANAF (Chase 1998)."""
    atoms = {"Al1(ref)": 1, "Al2O3(cr)": 5, "Cl1Na1(cr)": 2, "F1Li1(cr)": 2, "Mg1O1(cr)": 2, "O2Si1(cr)": 3}
    rows: dict[str, list[tuple[float, float]]] = {}
    with (REFERENCE / "janaf_selected_solids.csv").open(encoding="utf-8") as stream:
        for row in csv.DictReader(line for line in stream if not line.startswith("#")):
            if float(row["T_K"]) > 0:
                rows.setdefault(row["formula"], []).append((float(row["T_K"]), float(row["Cp_J_molK"])))
    return {name: (float(atoms.get(name, 1)), np.array(sorted(set(points)))) for name, points in rows.items()}


@pytest.mark.parametrize("top", [300.0, 933.45])
@pytest.mark.parametrize("solid", janaf())
def test_published_solids_up_to_their_melting_points_pass(solid: str, top: float) -> None:
    """No solid of NIST-JANAF (Chase 1998) is suspected, aluminium with 1.32 times 3nR at its melting point included."""
    atoms, points = janaf()[solid]
    at, C = points[points[:, 0] <= top].T
    found = examine_prepared_level(prepared_data(at, C, 0.005 * C, atoms=atoms))
    assert found.verdict in ("plausible", "not judged"), found.sentence


@pytest.mark.parametrize("kind", ["correct, per mole", "correct, per gram"])
def test_invented_solids_are_not_suspected(kind: str, tmp_path: Path) -> None:
    """None of a few invented solids is suspected; scripts/level_cases.py runs two hundred of each kind."""
    found = [each.finding for each in CASES.cases(kind, 12, 11, tmp_path)]
    assert {each.verdict for each in found} <= {"plausible", "not judged"}


def test_runs_at_low_temperature_cannot_be_judged_and_pass() -> None:
    """A run of 1.8 to 20 K is ordinary: the level cannot be judged, and nothing is suspected even 30 % off."""
    for factor in (1.0, 0.7, 1.3):
        found = examine_prepared_level(scaled(factor, np.geomspace(1.8, 20.0, 40)))
        assert found.verdict == "not judged"
        assert found.reason == "the data end at 20 K, below theta/4"
        assert "cannot be judged" in found.sentence
        assert found.mode_sum_ratio is None


def test_a_schottky_peak_above_3nr_at_one_kelvin_passes() -> None:
    """What is far above 3nR only at low temperatures is no matter of the level (levels 3 K apart, 20 per formula)."""
    at = np.geomspace(0.4, 300.0, 120)
    lattice = np.array(invented_solid("debye", [300.0, 3.0], at, atoms=1).heat_capacity)
    x = 3.0 / at
    C = lattice + 20 * 8.314 * x**2 * np.exp(-x) / (1 + np.exp(-x)) ** 2
    assert C.max() > 1.3 * 3 * 8.314
    found = examine_prepared_level(prepared_data(at, C, 0.005 * C, atoms=1))
    assert found.verdict == "plausible"


def test_one_odd_point_at_the_top_does_not_condemn_a_file() -> None:
    """A single glitch at the highest temperature is above 1.3 times 3nR; the rest says that the level is right."""
    data = scaled(1.0)
    C = np.array(data.heat_capacity)
    C[-1] *= 1.5
    assert examine_prepared_level(prepared_data(T, C, 0.005 * C, atoms=2)).verdict == "plausible"


def test_a_transition_at_the_very_top_is_no_slip() -> None:
    """A peak that the data just reach lifts the last points above 1.3 times 3nR; the modes below are three per atom."""
    data = scaled(1.0)
    C = np.array(data.heat_capacity) * (1 + 0.6 * np.exp(-(((T - 300.0) / 12.0) ** 2)))
    found = examine_prepared_level(prepared_data(T, C, 0.005 * C, atoms=2))
    assert (found.ratio_to_classical or 0) > 1.3
    assert found.verdict == "plausible"


def test_stiff_modes_of_hydrogen_are_no_suspicion() -> None:
    """A hydrate whose O-H vibrations (3 of 9 modes of each H2O) lie at 3500 K lacks modes, and nothing is wrong."""
    terms, values = "debye + 2 einstein", [190.0, 18.0, 420.0, 18.0, 3500.0, 6.0]
    data = invented_solid(terms, values, T, atoms=14)
    water = replace(data.measurement.sample, formula=SJELITE)
    found = examine_prepared_level(replace(data, measurement=replace(data.measurement, sample=water)))
    assert found.verdict == "plausible"
    assert found.mode_sum_ratio == pytest.approx(36 / 42, abs=0.03)
    heavy = replace(data.measurement.sample, formula="Kr7Xe7")
    found = examine_prepared_level(replace(data, measurement=replace(data.measurement, sample=heavy)))
    assert found.verdict == "suspicious"


# --------------------------------------------------------------------------------------------------- what is refused


@pytest.mark.parametrize(("ratio", "verdict"), [(1.27, "suspicious"), (1.33, "impossible")])
def test_a_level_above_1_3_times_3nr_is_impossible(ratio: float, verdict: str) -> None:
    """C(Tmax) of 1.27 times 3nR is suspected, of 1.33 times refused."""
    exact = prepared_data(T, C := np.array(scaled(1.0).heat_capacity), 0.005 * C, atoms=2).heat_capacity[-1]
    found = examine_prepared_level(scaled(ratio * 6 * 8.314462618 / float(exact)))
    assert found.verdict == verdict
    assert found.ratio_to_classical == pytest.approx(ratio)


@pytest.mark.parametrize(
    ("theta", "lowest", "verdict"),
    [
        (2600.0, 52.0, "impossible"),  # every point above 50 K says so
        (2600.0, 2.0, "impossible"),  # those below do not count
        (2400.0, 52.0, "not judged"),
        (9.0, 52.0, "plausible"),  # at 3nR to 0.1 %: noise takes half of the points above it, where there is no theta
    ],
)
def test_theta_of_every_point_above_50_kelvin_must_be_possible(theta: float, lowest: float, verdict: str) -> None:
    """Debye solids of 2600 K are refused, those of 2400 K are not."""
    at = np.geomspace(lowest, 200.0, 40)
    assert examine_prepared_level(debye_solid(theta, at)).verdict == verdict


def test_one_possible_theta_is_enough() -> None:
    """A file is not refused while a single point above 50 K has a Debye temperature that a solid can have."""
    at = np.geomspace(52.0, 200.0, 40)
    C = np.array(debye_solid(2600.0, at).heat_capacity)
    C[3] *= 2
    assert examine_prepared_level(prepared_data(at, C, 0.005 * C, atoms=2)).verdict != "impossible"


def norrium(**choices: object) -> Measurement:
    return lf.read(DEMO / "norrium.csv", formula="At", heat_capacity_unit="J/(mol K)", **choices)  # type: ignore[arg-type]


@pytest.mark.parametrize("call", [lambda m: lf.fit(m, "debye"), lf.rank])
def test_fit_and_rank_refuse_an_impossible_level_with_numbers_and_remedy(call: object) -> None:
    """mJ read as J: one sentence with the level, the slip and what to do, before anything is fitted."""
    with pytest.raises(lf.InputError) as caught:
        call(norrium())  # type: ignore[operator]
    sentence = str(caught.value)
    assert sentence == (
        "the heat capacity is 1032 times 3nR at 299.9 K, which no solid reaches (theta_D of single points undefined "
        "at or above 3nR, the modes add up to 1028(36) of 3 per atom); that would be explained by values in "
        "mJ/(mol K) that are read as J/(mol K) (factor 1000): give "
        "--heat-capacity-unit 'mJ/(mol K)'; or give --accept-level to fit the data as they are"
    )


def test_an_accepted_level_is_fitted_with_a_warning() -> None:
    """accept_level takes the data as they are; the warning stays, and the report holds it."""
    analysis = lf.fit(norrium(accept_level=True), "debye + einstein + electronic").analysis
    warning = next(each for each in analysis.warnings if each.code == "implausible-level")
    assert warning.level == "warn"
    assert "1032 times 3nR" in warning.message
    assert "mJ/(mol K)" in warning.message
    assert "mode-sum" not in {each.code for each in analysis.warnings}


def run(*words: str, cwd: Path) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-m", "latticefit", *words], capture_output=True, text=True, cwd=cwd, check=False
    )


def test_the_commands_refuse_accept_and_inspect(tmp_path: Path) -> None:
    """fit exits 2 and writes nothing, 0 with --accept-level, which its sheet repeats; inspect tells it and exits 0."""
    said = (str(DEMO / "norrium.csv"), "--formula", "At", "--heat-capacity-unit", "J/(mol K)")
    fit = ("fit", *said, "--terms", "debye", "--figures", "none", "--quiet", "--out", "out")
    refused = run(*fit, cwd=tmp_path)
    assert refused.returncode == 2
    assert refused.stderr.count("\n") == 1
    assert "Traceback" not in refused.stderr
    assert not list(tmp_path.iterdir())
    assert run(*fit, "--accept-level", cwd=tmp_path).returncode == 0
    assert "accept_level = true" in (tmp_path / "out" / "run_sheet.toml").read_text(encoding="utf-8")
    record = json.loads((tmp_path / "out" / "result.json").read_text(encoding="utf-8"))
    assert record["data"]["level"]["verdict"] == "impossible"
    assert record["data"]["level"]["explanations"][0]["slip"] == "unit"
    shown = run("inspect", *said, "--json", cwd=tmp_path)
    assert shown.returncode == 0
    (warning,) = json.loads(shown.stdout)["files"][0]["warnings"]
    assert warning.startswith("impossible: the heat capacity is 1032 times 3nR")


# ------------------------------------------------------------------------------------------------- which slip is named


@pytest.mark.parametrize(
    "kind",
    [
        "J for mJ",
        "mJ for J",
        "J for uJ, per sample",
        "cal for J",
        "g for mol",
        "g for kg",
        "atom for formula",
        "mass mg for g",
    ],
)
def test_gross_slips_are_always_named(kind: str, tmp_path: Path) -> None:
    """Slips of unit and mass that make a level impossible or suspicious are named for each of a few invented solids."""
    for each in CASES.cases(kind, 5, 3, tmp_path):
        assert each.finding.verdict in ("suspicious", "impossible")
        assert each.named is not None, each.finding.sentence


@pytest.mark.parametrize("kind", ["J for cal", "molar mass of half", "molar mass without water", "J for R"])
def test_slips_that_lower_the_level_are_named_where_the_modes_can_be_counted(kind: str, tmp_path: Path) -> None:
    """Where the modes of such a file are counted at all, the right slip is among the explanations."""
    outcomes = [each for each in CASES.cases(kind, 10, 5, tmp_path) if each.finding.verdict == "suspicious"]
    assert len(outcomes) >= 4
    assert all(each.named for each in outcomes)


@pytest.mark.parametrize(
    ("choices", "sentence"),
    [
        (
            {"formula": "He4Ne4"},
            "the modes add up to 1.286(36) of 3 per atom; that could be explained by a formula without its 2 H2O "
            "(factor 1.28), or 3 to 12 H2O whose stiff vibrations are not excited: give --formula with its water, "
            "'He4Ne4*2H2O' to 'He4Ne4*12H2O'",
        ),
        (
            {"formula": SJELITE, "molar_mass": "96.733 g/mol"},
            "the modes add up to 0.735(21) of 3 per atom; that would be explained by a molar mass without its 2 H2O "
            "(factor 0.729): give --formula 'He4Ne4*2H2O' without --molar-mass",
        ),
        (
            {"formula": "He4Ne4", "molar_mass": "132.759 g/mol"},
            "the heat capacity is 1.66 times 3nR at 309.8 K, which no solid reaches (theta_D of single points 29 to "
            "188 K, the modes add up to 1.766(50) of 3 per atom); that would be explained by a formula without the 2 "
            "H2O of its molar mass (factor 1.75): give --formula 'He4Ne4*2H2O' without --molar-mass",
        ),
    ],
)
def test_the_hydrate_of_the_demo_is_named_in_one_sentence(choices: dict[str, str], sentence: str) -> None:
    """Sjelite with the water left out of formula or molar mass: its two H2O are found, with the numbers."""
    assert examine_level(lf.read(DEMO / "sjelite.csv", **choices)).sentence == sentence  # type: ignore[arg-type]


def test_the_fit_of_the_hydrate_says_it_where_it_is_read() -> None:
    """Summary, report and result of a fit with the wrong molar mass name the water."""
    fit = lf.fit(
        lf.read(DEMO / "sjelite.csv", formula=SJELITE, molar_mass="96.733 g/mol", insulator=True),
        "debye + einstein",
        cp_cv="nernst-lindemann",
    )
    words = "a molar mass without its 2 H2O"
    assert words in " ".join(repr(fit).split())
    assert words in " ".join(str(fit).split())
    assert words in fit.warnings.set_index("code").loc["mode-sum", "message"]


def test_slips_that_explain_equally_well_are_both_named() -> None:
    """Half the level is a heat capacity per mole of atoms of a solid with two, or per mole of half the formula unit."""
    found = examine_prepared_level(scaled(0.5))
    assert found.verdict == "suspicious"
    assert {each.slip for each in found.explanations} == {"unit", "formula-unit"}
    assert "that could be explained by values in J/(mol-atom K)" in found.sentence
    assert ", or by values per mole of half the formula unit (factor 0.5)" in found.sentence
    assert len(found.explanations) <= 3


def test_a_level_that_no_slip_explains_says_so() -> None:
    """A level 20 % too low is suspected, and no slip is invented for it."""
    found = examine_prepared_level(scaled(0.8))
    assert found.verdict == "suspicious"
    assert found.explanations == ()
    assert "no single slip" in found.sentence


@pytest.mark.parametrize(
    ("unit", "possible"),
    [
        ("J/(mol K)", {"unit", "formula-unit", "hydrate-water", "lost-water"}),
        ("J/(g K)", {"unit", "hydrate-water", "lost-water"}),
        ("J/K", {"unit", "mass", "hydrate-water", "lost-water"}),
        ("J/(mol-atom K)", {"unit"}),
    ],
)
def test_only_slips_that_can_have_happened_are_offered(unit: str, possible: set[str], tmp_path: Path) -> None:
    """A mass that was not used cannot be wrong, nor a molar mass that follows from the formula."""
    text = f"T (K),Cp ({unit})\n10,1\n20,2\n30,3\n"
    data = read_text(tmp_path, text, SampleSettings(formula="NaCl*2H2O", mass="10 mg"))
    assert {each.kind for each in possible_slips(data, 300.0)} == possible


def test_an_element_has_no_water() -> None:
    """Copper is not taken for a hydrate."""
    data = lf.read(REFERENCE / "copper_white_collocott_1984.csv", formula="Cu")
    assert not {each.kind for each in possible_slips(data, 300.0)} & {"hydrate-water", "lost-water"}


def test_a_stated_number_that_contradicts_the_formula_is_the_first_suspect(tmp_path: Path) -> None:
    """Where stated atoms or molar mass differ from the formula, that slip stands first; 7 % is enough to see it."""
    data = lf.read(DEMO / "halvite.csv", formula="NeKr", atoms=1)
    assert examine_level(data).explanations[0].words == "1 atom where NeKr has 2"
    per_gram = lf.read(DEMO / "sjelite.csv", formula=SJELITE, molar_mass="122.2 g/mol")
    found = examine_level(per_gram)
    assert found.verdict == "suspicious"
    assert found.explanations[0].words == "the molar mass 122.2 g/mol where He4Ne4*2H2O has 132.759"


def with_stiff_modes(
    folder: Path, formula: str, unit: str, values: list[float], atoms: float, factor: float = 1.0
) -> LevelFinding:
    """The level of invented data of a solid with stiff modes, read by a formula and in a unit."""
    C = factor * np.array(invented_solid("debye + 2 einstein", values, T, atoms=atoms).heat_capacity)
    rows = "".join(f"{t:.6g},{c:.6g}\n" for t, c in zip(T, C, strict=True))
    return examine_level(read_text(folder, f"T/K,Cp/({unit})\n{rows}", SampleSettings(formula=formula)))


def test_a_hydrate_whose_stiff_modes_are_frozen_is_given_as_a_range(tmp_path: Path) -> None:
    """Invented gypsum with 11 of 36 modes frozen, read without water: one explanation, a range that holds 2 H2O."""
    found = with_stiff_modes(tmp_path, "CaSO4", "J/(mol K)", [260.0, 10.0, 500.0, 15.0, 2800.0, 11.0], 12)
    assert found.verdict in ("suspicious", "impossible")
    (water,) = found.explanations
    assert water.words == "a formula without its 1 to 2 H2O whose stiff vibrations are not excited"
    assert water.remedy == "give --formula with its water, 'CaSO4*H2O' to 'CaSO4*2H2O'"
    assert water.expected is None
    assert "that could be explained by" in found.sentence


def test_a_unit_slip_stands_before_water(tmp_path: Path) -> None:
    """J labelled cal of a carbonate with 10 % of its modes frozen: the unit is named first although H2O fits too."""
    found = with_stiff_modes(tmp_path, "CaCO3", "cal/(mol K)", [280.0, 6.0, 420.0, 7.5, 2000.0, 1.5], 5)
    assert found.verdict == "impossible"
    assert found.explanations[0].words == "values in J/(mol K) that are read as cal/(mol K)"
    assert "theta_D of single points" in found.sentence


def test_addenda_as_an_explanation_have_no_factor(tmp_path: Path) -> None:
    """Addenda explain a level of any size: no number is given for them, which would only repeat the measured one."""
    facts = tomllib.loads((DEMO / "truth.toml").read_text(encoding="utf-8"))["quellite"]
    data = lf.read(DEMO / "quellite_total.csv", formula=facts["formula"], mass=f"{facts['mass_mg']} mg")
    found = examine_level(data)
    assert found.explanations[0].slip == "addenda"
    assert found.explanations[0].expected is None
    assert "that could be explained by the heat capacity of the addenda, still in the data: give" in found.sentence


@pytest.mark.parametrize(
    ("header", "shift", "suspected"), [("T", 0.0, True), ("T/K", 0.0, False), ("T", 273.15, False)]
)
def test_celsius_read_as_kelvin_is_offered_where_no_unit_is_stated(
    header: str, shift: float, suspected: bool, tmp_path: Path
) -> None:
    """20 to 400 degC of a Debye solid of 800 K: offered in degC without a unit, not with K stated, nor of data in K."""
    at = np.linspace(20.0, 400.0, 50)
    C = np.array(debye_solid(800.0, at + 273.15).heat_capacity)
    rows = "".join(f"{t + shift:.6g},{c:.6g}\n" for t, c in zip(at, C, strict=True))
    found = examine_level(read_text(tmp_path, f"{header},Cp/(J/(mol K))\n{rows}", SampleSettings(formula="NaCl")))
    assert ("temperature-unit" in {each.slip for each in found.explanations}) == suspected
    if suspected:
        assert found.verdict == "suspicious"
        assert "temperatures in degC that are read as K (with degC theta_D of single points varies" in found.sentence
        assert "give --temperature-unit degC" in found.sentence
    elif shift:
        assert found.verdict == "plausible"


def test_a_level_without_mode_sum_says_theta_and_why() -> None:
    """Below theta/4 the sentence holds the theta of the points, and why the modes are not counted."""
    found = examine_prepared_level(debye_solid(900.0, np.geomspace(20.0, 180.0, 40)))
    assert found.verdict == "not judged"
    assert "below theta/4" in found.sentence
    assert "theta_D of single points" in found.sentence
    assert "the modes are not counted: the data end below theta/2 of theta_D[m=2] = " in found.sentence


def test_without_atoms_or_amount_nothing_is_judged(tmp_path: Path) -> None:
    """No formula, or data per gram without one: the finding says what is missing."""
    text = "T (K),Cp (J/(g K))\n10,1\n20,2\n30,3\n"
    found = examine_level(read_text(tmp_path, text, SampleSettings()))
    assert found.verdict == "not judged"
    assert "per gram" in (found.reason or "")
    molar = examine_level(read_text(tmp_path, text.replace("g K", "mol K"), SampleSettings()))
    assert molar.sentence == (
        "the level cannot be judged: the atoms per formula unit are not known; give --formula or --atoms"
    )


@pytest.mark.parametrize(
    ("value", "u", "text"),
    [
        (0.774, 0.016, "0.774(16)"),
        (1.0, 0.0062, "1.0000(62)"),
        (216.0, 7.5, "216.0(7.5)"),
        (1028.3, 36.0, "1028(36)"),
        (0.00002, 0.000001, "2.00(10)e-05"),
    ],
)
def test_mode_sums_are_written_with_u_in_brackets(value: float, u: float, text: str) -> None:
    """u stands in units of the last digits, or with its own point from 1 on (JCGM 100:2008, 7.2.2, from memory)."""
    assert mode_sum_text(value, u) == text

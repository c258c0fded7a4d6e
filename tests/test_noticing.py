"""What preparing notices without a model: outliers, features that no lattice makes, runs that overlap.

The rates are those of scripts/noticing.py, on fewer of its seeded solids (invented data).
"""

from __future__ import annotations

import sys
import tracemalloc
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from helpers import DEMO, REFERENCE, ROOT, invented_solid, prepared_data

import latticefit as lf
from latticefit.constants import GAS_CONSTANT
from latticefit.diagnosing import diagnose
from latticefit.fitting import fit_model
from latticefit.models import build_model, heat_capacity
from latticefit.preparing import prepare
from latticefit.preparing.features import suspected_features
from latticefit.preparing.lattice_trend import lattice_trend
from latticefit.preparing.outliers import outliers
from latticefit.preparing.overlap import run_overlaps
from latticefit.preparing.scatter import local_scatter
from latticefit.reading import read_measurement
from latticefit.records import Feature, FloatArray, Measurement, ModelSettings, RunSettings, SampleSettings
from latticefit.report import draw_figure, residuals_frame, result_record, text_report
from latticefit.report.noticed import overlap_words

sys.path.insert(0, str(ROOT / "scripts"))
from noticing import Grid, anomaly, scatter_of, solid, two_runs

FILES = [
    *(DEMO / f"{name}.csv" for name in ("halvite", "norrium", "tvorrite", "drommenite")),
    *(REFERENCE / f"{name}.csv" for name in ("copper_white_collocott_1984", "aluminium_nbs_monograph_21")),
    REFERENCE / "aluminium_cv_giauque_meads_1941.csv",
]
FORMULA = {"halvite": "NeKr", "norrium": "At", "tvorrite": "NeKr2Xe2", "drommenite": "ArXe"}


def read(path: Path) -> Measurement:
    formula = FORMULA.get(path.stem, "Cu" if "copper" in path.stem else "Al")
    column = {"aluminium_cv_giauque_meads_1941": "Cv_J_molK", "aluminium_nbs_monograph_21": "Cp_J_molK"}.get(path.stem)
    return read_measurement(SampleSettings(formula=formula), (RunSettings(str(path), heat_capacity=column),))


# --------------------------------------------------------------------------------------------------- a smooth curve


def test_the_smooth_curve_follows_any_lattice() -> None:
    """Without noise the curve is that of the solid to 1e-4, from the T^3 law to above 3nR."""
    random = np.random.default_rng(1)
    for _ in range(20):
        curve, T = solid(random), np.geomspace(2.0, 300.0, 100)
        assert np.abs(lattice_trend(T, curve(T)).at(T) / curve(T) - 1).max() < 1e-4


def test_the_smooth_curve_is_not_moved_by_glitches() -> None:
    """One point in ten 20 % off moves the curve by less than 0.3 % in the mean."""
    random = np.random.default_rng(2)
    curve, T = solid(random), np.geomspace(2.0, 300.0, 150)
    C = curve(T) * (1 + 0.003 * random.standard_normal(150))
    C[5::10] *= 1.2
    assert np.abs(lattice_trend(T, C).at(T) / curve(T) - 1).mean() < 0.003


# ---------------------------------------------------------------------------------------------------------- outliers


@pytest.mark.parametrize("grid", [Grid(2, 300, 100), Grid(2, 300, 300), Grid(2, 300, 250, False)], ids=str)
def test_glitches_are_flagged_and_clean_data_are_not(grid: Grid) -> None:
    """Of 40 glitches of six sigma at least 37 are flagged, and 40 clean files have less than one flag in three."""
    false, found = 0, 0
    for seed in range(40):
        random = np.random.default_rng(seed)
        curve, T = solid(random), grid.draw(random)
        C = curve(T) * (1 + 0.005 * random.standard_normal(T.size))
        false += int((outliers(T, C) != 0).sum())
        i = int(random.integers(0, T.size))
        C[i] = curve(T)[i] * (1 + 0.03 * random.choice([-1.0, 1.0]))
        found += bool(outliers(T, C)[i])
    assert found >= 37
    assert false < 40 / 3


def test_sign_and_size_of_a_flag() -> None:
    """A point 5 % low at 0.5 % noise lies about ten scatters below its neighbours."""
    random = np.random.default_rng(3)
    T = np.geomspace(2.0, 300.0, 200)
    C = solid(random)(T) * (1 + 0.005 * random.standard_normal(200))
    C[77] *= 0.95
    found = outliers(T, C)
    assert found[77] == pytest.approx(-10, abs=3)
    assert np.flatnonzero(found).tolist() == [77]


def test_two_glitches_side_by_side_are_flagged() -> None:
    """Neither hides the other."""
    random = np.random.default_rng(4)
    T = np.geomspace(2.0, 300.0, 150)
    C = solid(random)(T) * (1 + 0.003 * random.standard_normal(150))
    C[[60, 61]] *= 1.06
    assert np.flatnonzero(outliers(T, C)).tolist() == [60, 61]


@pytest.mark.parametrize("height", [0.3, 3.0])
def test_a_peak_is_no_row_of_outliers(height: float) -> None:
    """The points of a transition that many points follow are not flagged one by one."""
    flags = 0
    for seed in range(20):
        random = np.random.default_rng(seed)
        curve, T = solid(random), np.geomspace(2.0, 300.0, 300)
        excess, _ = anomaly("peak", T, random)
        C = curve(T) * (1 + height / 0.1 * excess) * (1 + 0.005 * random.standard_normal(T.size))
        flags += int((outliers(T, C)[excess > 0.01] != 0).sum())
    assert flags <= 3


def test_points_within_a_stated_sigma_are_not_flagged() -> None:
    """A point six scatters off lies within four sigma where twice the scatter was stated, but not within 3.7 of 1.5."""
    random = np.random.default_rng(5)
    T = np.geomspace(2.0, 300.0, 120)
    C = solid(random)(T) * (1 + 0.002 * random.standard_normal(120))
    C[50] *= 1.014
    assert outliers(T, C, 0.002 * C)[50] > 3.7
    assert outliers(T, C, 0.006 * C)[50] == 0


def test_a_set_of_repeats_is_compared_with_other_sets() -> None:
    """A set that is off as a whole is flagged although its points agree with each other."""
    random = np.random.default_rng(6)
    T = np.repeat(np.geomspace(2.0, 300.0, 60), 3)
    C = solid(random)(T) * (1 + 0.003 * random.standard_normal(180))
    C[90:93] *= 1.05
    assert set(np.flatnonzero(outliers(T, C))) >= {90, 91, 92}


@pytest.mark.parametrize("path", FILES, ids=lambda path: path.stem)
def test_published_tables_and_demo_files_have_no_flags_and_no_features(path: Path) -> None:
    """Demo files; copper (White and Collocott 1984), aluminium (NBS Monograph 21; Giauque and Meads 1941)."""
    data = prepare(read(path))
    T, C = data.temperature, data.heat_capacity
    assert not np.any(data.outlier_sizes)
    assert suspected_features(T, C, local_scatter(T, C) or 0.01) == ()


def test_flags_go_to_the_report_and_nothing_is_left_out() -> None:
    """The glitch is fitted all the same, and named in the warning, in residuals.csv and by a ring in the figure."""
    data = invented_solid("debye + einstein", [220.0, 3.5, 460.0, 2.5], np.geomspace(2, 300, 120), atoms=2, seed=3)
    C = np.array(data.heat_capacity)
    C[57] *= 1.05
    fit = lf.fit(replace(data.measurement, heat_capacity=C), terms="debye + einstein")
    warning = fit.warnings.set_index("code").loc["outliers"]
    assert warning["level"] == "note"
    assert "line 59, 22.05 K: " in warning["message"]
    assert "times the scatter above its neighbours" in warning["message"]
    sizes = fit.analysis.prepared.outlier_sizes
    assert np.flatnonzero(sizes).tolist() == [57]
    assert warning["found"] == sizes[57]  # not as rounded for the words
    assert "--mask-lines 59" in warning["advice"]
    frame = residuals_frame(fit.analysis)
    assert frame["used"].all()
    assert frame.loc[frame["flag"].notna(), "line"].tolist() == [59]
    axes = draw_figure("residuals", fit.analysis).axes[0]
    (ring,) = (line for line in axes.lines if line.get_label() == "far from neighbours")
    assert np.allclose(np.asarray(ring.get_xdata()), data.temperature[57])
    assert ring.get_markerfacecolor() == "none"


# ---------------------------------------------------------------------------------------------------------- features


def kinds(T: FloatArray, C: FloatArray) -> list[Feature]:
    return list(suspected_features(T, C, scatter_of(T, C)))


def test_clean_solids_have_no_features() -> None:
    """Of 100 random solids with 0.3 to 1 % noise at most two are suspected of anything."""
    suspected = 0
    for seed in range(100):
        random = np.random.default_rng(seed)
        grid = (Grid(2, 300, 120), Grid(2, 300, 250, False), Grid(1.8, 20, 80), Grid(50, 300, 100))[seed % 4]
        curve, T = solid(random), grid.draw(random)
        noise = (0.003, 0.005, 0.01)[seed % 3]
        suspected += bool(kinds(T, curve(T) * (1 + noise * random.standard_normal(T.size))))
    assert suspected <= 2


@pytest.mark.parametrize("kind", ["peak", "step"])
def test_peaks_and_steps_are_found_where_they_are(kind: str) -> None:
    """A peak of 10 % and a step of 3 % in 200 points with 0.3 % noise: at least 19 of 20, with size and place."""
    hits = 0
    for seed in range(20):
        random = np.random.default_rng(seed)
        curve, T = solid(random), Grid(2, 300, 200).draw(random)
        excess, at = anomaly(kind, T, random)
        found = kinds(T, curve(T) * (1 + excess) * (1 + 0.003 * random.standard_normal(T.size)))
        mine = [each for each in found if each.kind == kind and abs(np.log(each.temperature / at)) < 0.06]
        low, high = (0.05, 0.11) if kind == "peak" else (0.02, 0.04)
        hits += bool(mine and low < mine[0].size < high and mine[0].significance > 4.7)
    assert hits >= 19


def test_an_upturn_is_found_and_a_metal_has_none() -> None:
    """C/T rises on cooling below 4 K: a T^-2 tail is an upturn; gamma, however large, is none."""
    random = np.random.default_rng(7)
    T = np.geomspace(1.0, 100.0, 90)
    noise = 1 + 0.01 * random.standard_normal(90)
    metal = heat_capacity(build_model("debye + electronic"), T, np.array([300.0, 6.0, 8e-3]))
    assert kinds(T, metal * noise) == []
    (found,) = kinds(T, (metal + 2e-2 * T**-2.0) * noise)
    assert found.kind == "upturn"
    assert found.temperature_low == found.temperature == T[0]
    assert found.temperature_high < 4.0
    assert found.significance > 10


def test_a_broad_hump_is_a_peak() -> None:
    """Two levels 12 K apart in a metal: the heat capacity falls from 5 K on, which no lattice does."""
    random = np.random.default_rng(10)
    T = np.geomspace(0.4, 50.0, 120)
    metal = heat_capacity(build_model("debye + electronic"), T, np.array([300.0, 6.0, 4e-3]))
    x = 12.0 / T
    levels = GAS_CONSTANT * x**2 * np.exp(-x) / (1 + np.exp(-x)) ** 2
    (found,) = kinds(T, (metal + levels) * (1 + 0.005 * random.standard_normal(120)))
    assert found.kind == "peak"
    assert found.temperature == pytest.approx(0.4168 * 12.0, rel=0.1)  # where two levels have their peak
    assert found.temperature_low < 3.0 < 15.0 < found.temperature_high


def test_glitches_and_scattered_sets_are_no_features() -> None:
    """A single point 50 % off, and sets of repeats with errors of their own, are no peak."""
    random = np.random.default_rng(8)
    curve, T = solid(random), np.geomspace(2.0, 300.0, 150)
    C = curve(T) * (1 + 0.003 * random.standard_normal(150))
    C[[40, 90]] *= [1.5, 0.6]
    assert kinds(T, C) == []
    T = np.repeat(np.geomspace(2.0, 300.0, 60), 3)
    shared = np.repeat(0.01 * random.standard_normal(60), 3)
    assert kinds(T, curve(T) * (1 + shared + 0.002 * random.standard_normal(180))) == []


def test_features_do_not_depend_on_units_or_order() -> None:
    """Per gram or per mole, ascending or shuffled: the same peak."""
    random = np.random.default_rng(9)
    curve, T = solid(random), Grid(2, 300, 150).draw(random)
    C = curve(T) * (1 + anomaly("peak", T, random)[0]) * (1 + 0.003 * random.standard_normal(150))
    (one,), order = suspected_features(T, C, 0.003), random.permutation(150)
    (other,) = suspected_features(T[order], 1e-3 * C[order], np.full(150, 0.003))
    assert (one.kind, one.temperature) == (other.kind, other.temperature)
    assert one.significance == pytest.approx(other.significance, rel=1e-6)


@pytest.mark.parametrize("kind", ["peak", "step"])
def test_a_masked_feature_is_silent(kind: str) -> None:
    """The warning names what is fitted across; with a mask over it, there is none."""
    T = np.geomspace(2.0, 300.0, 150)
    smooth = invented_solid("debye + einstein", [220.0, 3.5, 460.0, 2.5], T, noise=0.003, atoms=2, quantity="Cv")
    excess = 0.1 * np.exp(-(((T - 60) / 5) ** 2)) if kind == "peak" else np.where(T > 60, 0.03, 0.0)
    data = replace(smooth.measurement, heat_capacity=np.array(smooth.heat_capacity) * (1 + excess))
    for mask in ([], [(45.0, 80.0)]):
        prepared = prepare(data, mask=mask)
        warnings = diagnose(prepared, fit_model(prepared, ModelSettings("debye + einstein"))).warnings
        found = [each for each in warnings if each.code == "suspected-feature"]
        assert bool(found) is not bool(mask)
        assert all(f"a {kind}" in each.message and "--mask" in each.advice for each in found)


# ---------------------------------------------------------------------------------------------------------- overlaps


def pair(seed: int, offset: float, noise: tuple[float, float] = (0.005, 0.005)) -> Measurement:
    """Two runs of one invented solid, 0.4-20 K and 1.8-300 K, the first too high by `offset`."""
    random = np.random.default_rng(seed)
    grids = (Grid(0.4, 20, 60), Grid(1.8, 300, 120))
    T = np.concatenate([grid.draw(random) for grid in grids])
    run, u = np.repeat([0, 1], [60, 120]), np.repeat(noise, [60, 120])
    exact = heat_capacity(build_model("debye + einstein"), T, np.array([220.0, 3.5, 460.0, 2.5]))
    C = exact * np.where(run == 0, 1 + offset, 1.0) * (1 + u * random.standard_normal(180))
    data = prepared_data(T, C, u * exact, atoms=2, quantity="Cv").measurement
    first = data.readings[0]
    return replace(data, run=run, readings=(replace(first, label="cold"), replace(first, label="warm")))


def test_ratio_of_two_platforms_is_recovered_within_u() -> None:
    """A step of 2.5 %: over 100 seeds 1.025 lies within 2 u in about 95 % of the cases, and there is no bias."""
    found = [prepare(pair(seed, 0.025)).overlaps[0] for seed in range(100)]
    pulls = np.array([(each.ratio - 1.025) / each.u for each in found])
    assert 55 <= int((np.abs(pulls) < 1).sum()) <= 82
    assert int((np.abs(pulls) < 2).sum()) >= 90
    assert abs(np.mean(pulls)) < 0.35
    assert (found[0].first, found[0].second) == ("cold", "warm")
    assert found[0].temperature_low == pytest.approx(1.8, rel=0.05)
    assert found[0].temperature_high == pytest.approx(20.0, rel=0.05)


def test_ratio_is_the_first_run_over_the_second_whichever_is_denser() -> None:
    """With the runs exchanged the ratio is the inverse, with the same relative u."""
    data = pair(3, 0.025)
    swapped = replace(data, run=1 - data.run, readings=data.readings[::-1])
    one, other = prepare(data).overlaps[0], prepare(swapped).overlaps[0]
    assert one.ratio * other.ratio == pytest.approx(1.0, rel=1e-12)
    assert one.u / one.ratio == pytest.approx(other.u / other.ratio, rel=1e-12)


def test_u_of_the_ratio_grows_where_the_runs_disagree_by_more_than_sigma() -> None:
    """With twice the noise that was stated, u is about twice as large (Birge 1932)."""
    data = pair(4, 0.0, (0.02, 0.02))
    assert data.sigma is not None
    honest, bold = prepare(data).overlaps[0], prepare(replace(data, sigma=data.sigma / 2)).overlaps[0]
    assert bold.u == pytest.approx(honest.u, rel=0.15)


def test_runs_that_hardly_meet_are_not_compared() -> None:
    """Three points of each run in common is the least; one run alone has nothing to be compared with."""
    T = np.concatenate([np.geomspace(2, 20, 30), np.geomspace(19.5, 300, 60)])
    run = np.repeat([0, 1], [30, 60])
    C = solid(np.random.default_rng(1))(T)
    order = np.argsort(T)
    assert run_overlaps(two_runs(T), T[order], C[order], 0.01 * C[order], run[order]) == ()
    assert prepare(invented_solid("debye", [200.0, 6.0], np.geomspace(2, 300, 60), atoms=2).measurement).overlaps == ()


def interleaved(runs: int, points: int, high: int) -> Measurement:
    """Runs of one invented solid over one range of temperature, number `high` 10 % too high."""
    data = pair(1, 0.0)
    random = np.random.default_rng(2)
    T = np.exp(random.uniform(np.log(2), np.log(300), runs * points))
    run = np.repeat(np.arange(runs), points)
    exact = heat_capacity(build_model("debye + einstein"), T, np.array([220.0, 3.5, 460.0, 2.5]))
    C = exact * np.where(run == high, 1.1, 1.0) * (1 + 0.005 * random.standard_normal(T.size))
    readings = tuple(replace(data.readings[0], label=f"run {number}") for number in range(runs))
    line = np.arange(T.size) + 2
    return replace(data, temperature=T, heat_capacity=C, sigma=0.005 * C, run=run, line=line, readings=readings)


def test_long_runs_are_compared_without_a_table_of_all_pairs_of_points() -> None:
    """Two interleaved runs of 20 000 points need less than 100 MB; the full matrix would take 3.2 GB."""
    data = interleaved(2, 20_000, 1)
    order = np.argsort(data.temperature)
    T, C, run = data.temperature[order], data.heat_capacity[order], data.run[order]
    tracemalloc.start()
    (found,) = run_overlaps(data, T, C, 0.005 * C, run)
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    assert peak < 1e8
    assert found.ratio == pytest.approx(1 / 1.1, abs=4 * found.u)


def test_of_many_pairs_of_runs_the_worst_come_first_and_all_are_counted() -> None:
    """Of 300 pairs of 25 runs the 200 worst are kept, those of the run that is too high first; 12 are shown."""
    prepared = prepare(interleaved(25, 40, 7))
    assert (prepared.overlaps_compared, len(prepared.overlaps)) == (300, 200)
    assert all("run 7" in (each.first, each.second) for each in prepared.overlaps[:20])
    off = [abs(each.ratio - 1) / each.u for each in prepared.overlaps]
    assert off == sorted(off, reverse=True)
    rows = overlap_words(prepared.overlaps, prepared.overlaps_compared)
    assert [label for label, _, _ in rows] == ["overlap"] * 12 + ["overlaps"]
    assert rows[-1][1] == "300 pairs of runs compared"


def test_overlap_is_reported() -> None:
    """Text, result.json and warning name both runs, the ratio with u, and the range."""
    fit = lf.fit(pair(5, 0.025), terms="debye + einstein")
    (record,) = result_record(fit.analysis)["data"]["overlaps"]
    assert record["runs"] == ["cold", "warm"]
    assert record["ratio"] == pytest.approx(1.025, abs=4 * record["u"])
    assert "overlap cold / warm = 1.02" in " ".join(text_report(fit.analysis).split())
    warning = fit.warnings.set_index("code").loc["run-overlap"]
    assert "cold is 2." in warning["message"]
    agreeing = lf.fit(pair(5, 0.0), terms="debye + einstein")
    assert "run-overlap" not in agreeing.warnings["code"].tolist()

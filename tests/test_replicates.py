"""Sets of repeats: kept, averaged or without their first point; sigma from them; pure error and lack of fit."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from helpers import invented_solid, prepared_data
from numpy.testing import assert_allclose, assert_array_equal
from reading_helpers import messages, read_text
from scipy.stats import kstest

import latticefit as lf
from latticefit.diagnosing import diagnose
from latticefit.diagnosing.lack_of_fit import first_of_sets
from latticefit.errors import InputError
from latticefit.fitting import fit_model
from latticefit.preparing import prepare
from latticefit.preparing.replicates import with_replicates
from latticefit.preparing.scatter import repeat_sets, spread_of_sets
from latticefit.reading import read_measurement
from latticefit.records import LackOfFit, Measurement, ModelSettings, RunSettings, SampleSettings
from latticefit.report import residuals_frame, result_record, text_report

TRIPLICATES = """# invented data
T_K,Cp_J_molK
10.00,1.10
10.01,1.00
9.99,1.02
20.00,4.00
20.02,4.20
30.00,9.30
30.03,9.00
30.01,9.00
"""


def solid_in_sets(
    count: int, size: int, within: float = 0.005, between: float = 0.0, seed: int = 1, first: float = 0.0
) -> Measurement:
    """An invented solid, measured in sets whose points share an error `between`; stated sigma as `within`."""
    rng = np.random.default_rng(seed)
    T = np.repeat(np.geomspace(5.0, 300.0, count), size)
    exact = invented_solid("debye + einstein", [220.0, 3.5, 460.0, 2.5], T, noise=0.0).heat_capacity
    noise = within * rng.standard_normal(T.size) + np.repeat(between * rng.standard_normal(count), size)
    C = exact * (1 + noise + np.tile([first] + [0.0] * (size - 1), count))
    return prepared_data(T, C, within * exact, atoms=2, quantity="Cv").measurement


def asking(measurement: Measurement, **settings: Any) -> Measurement:
    """The same measurement, each of its runs read with these settings."""
    readings = tuple(replace(each, settings=replace(each.settings, **settings)) for each in measurement.readings)
    return replace(measurement, readings=readings)


def unstated(measurement: Measurement) -> Measurement:
    return replace(measurement, sigma=None, sigma_text="")


# ---------------------------------------------------------------------------------------------------- sets of repeats


def test_sets_are_found_where_most_points_stand_alone_only_when_asked() -> None:
    """Three pairs among forty points are no run of repeats; somebody who asks for sets gets them."""
    T = np.sort(np.concatenate([np.geomspace(5, 300, 40), 1.0005 * np.geomspace(5, 300, 40)[[3, 17, 30]]]))
    assert repeat_sets(T) is None
    sets = repeat_sets(T, asked=True)
    assert sets is not None
    assert_array_equal(np.flatnonzero(np.bincount(sets) > 1), [3, 17, 30])
    assert sets[-1] == 39


@pytest.mark.parametrize(
    "T",
    [
        np.linspace(2.0, 1000.0, 999),  # steps fall below 0.3 % from 333 K up: a chain, and no set
        np.geomspace(2.0, 300.0, 3000),
        np.linspace(2.0, 300.0, 60),
        np.array([10.0, 10.01]),
        np.sort(300.0 + 0.9 * np.arange(80) + 0.1 * np.random.default_rng(1).uniform(-1, 1, 80)),
    ],
)
def test_a_dense_run_is_no_set(T: np.ndarray) -> None:
    """Points that follow each other closely, or all of them, are no sets of repeats."""
    assert repeat_sets(T, asked=True) is None


def test_equal_temperatures_are_repeats_however_close_the_next_ones_lie() -> None:
    """In a run with a point every 0.1 %, each measured twice, the pairs are the sets."""
    sets = repeat_sets(np.repeat(np.geomspace(100, 110, 96), 2))
    assert sets is not None
    assert_array_equal(sets, np.repeat(np.arange(96), 2))


def test_spread_within_and_between_sets() -> None:
    """Noise of 0.5 % within sets is found whatever the sets share, and the shared error is noticed."""
    for between, shared in ((0.0, False), (0.01, True)):
        data = solid_in_sets(60, 3, 0.005, between, seed=2)
        found = spread_of_sets(data.temperature, data.heat_capacity, data.run)
        assert found is not None
        assert found.freedom == 120
        assert found.within == pytest.approx(0.005, rel=0.15)
        assert found.shared is shared


# ------------------------------------------------------------------------------------------------- averaged or dropped


def test_means_stand_for_their_sets(tmp_path: Path) -> None:
    """T and C of a mean are those of its set, in the place and line of the first; the points stay as excluded rows."""
    data = asking(read_text(tmp_path, TRIPLICATES, sigma="2%"), replicates="average")
    prepared = prepare(data)
    assert_allclose(prepared.temperature, [10.0, 20.01, (30.0 + 30.03 + 30.01) / 3])
    assert_allclose(prepared.heat_capacity, [1.04, 4.1, 9.1])
    assert_allclose(prepared.sigma, 0.02 * np.sqrt([3.2504 / 9, 33.64 / 4, 248.49 / 9]))
    assert_array_equal(prepared.measurement.line, [3, 6, 8])
    assert prepared.sigma_text == (
        "stated: 2%; that of the mean of m repeats divided by sqrt(m), which holds where the repeats of a set do not "
        "share an error"
    )
    rows = prepared.measurement.excluded
    places = [(3, 0), (4, 0), (5, 0), (6, 1), (7, 1), (8, 2), (9, 2), (10, 2)]
    assert [(each.line, each.averaged_into) for each in rows] == places
    assert rows[0].reason == "averaged with 2 others into 10 K"
    assert rows[3].reason == "averaged with 1 other into 20.01 K"
    assert messages(prepared.measurement)[-1] == (
        "8 points in 3 sets of repeats averaged as asked, the mean of each set stands for it"
    )


def test_the_first_of_each_set_is_dropped(tmp_path: Path) -> None:
    """First in file order, not the lowest in T; it stays in the measurement with its reason."""
    data = asking(read_text(tmp_path, TRIPLICATES, sigma="2%"), replicates="drop-first")
    prepared = prepare(data)
    assert_array_equal(prepared.measurement.line[prepared.index], [5, 4, 7, 10, 9])
    assert [each for each in prepared.reasons if each] == [
        "first of a set of 3, dropped as asked",
        "first of a set of 2, dropped as asked",
        "first of a set of 3, dropped as asked",
    ]
    assert messages(prepared.measurement)[-1] == "the first point of each of 3 sets of repeats dropped as asked"


def test_a_point_that_is_set_aside_enters_no_mean(tmp_path: Path) -> None:
    """The mean of a triplicate with one point set aside is that of the other two; the point keeps its reason."""
    data = asking(read_text(tmp_path, TRIPLICATES, sigma="2%"), replicates="average")
    aside = (None, "quality below 0.9", *[None] * 6)
    worked = with_replicates(replace(data, set_aside=aside)).measurement
    assert_allclose(worked.heat_capacity[:2], [1.06, 1.0])
    assert worked.set_aside == (None, "quality below 0.9", None, None)
    assert "averaged with 1 other into 9.995 K" in [each.reason for each in worked.excluded]


def test_addenda_are_averaged_with_their_common_uncertainty(tmp_path: Path) -> None:
    """What was taken off is averaged like C, and its u, common to a set, does not become smaller."""
    data = asking(read_text(tmp_path, TRIPLICATES, sigma="2%"), replicates="average")
    n = data.temperature.size
    worked = with_replicates(replace(data, addenda=np.arange(n) * 1.0, addenda_u=np.full(n, 0.1))).measurement
    assert worked.addenda is not None
    assert worked.addenda_u is not None
    assert_allclose(worked.addenda, [1.0, 3.5, 6.0])
    assert_allclose(worked.addenda_u, 0.1)


@pytest.mark.parametrize("word", ["average", "drop-first"])
def test_what_was_done_is_not_done_again(word: str, tmp_path: Path) -> None:
    """A measurement that went through once comes out of a second time as it was, repairs included."""
    once = prepare(asking(read_text(tmp_path, TRIPLICATES, sigma="2%"), replicates=word))
    twice = prepare(once.measurement)
    assert_array_equal(twice.temperature, once.temperature)
    assert_array_equal(twice.sigma, once.sigma)
    assert twice.measurement.repairs == once.measurement.repairs


def test_windows_and_masks_act_on_the_means(tmp_path: Path) -> None:
    """A mask takes the mean away, with the reason of a mask."""
    data = asking(read_text(tmp_path, TRIPLICATES, sigma="2%"), replicates="average")
    prepared = prepare(data, mask=[(20.005, 25.0)])
    assert_allclose(prepared.temperature, [10.0, 30.0133], rtol=1e-5)
    assert prepared.reasons == (None, "masked 20.005-25 K", None)


def test_shared_error_keeps_sigma_as_it_is() -> None:
    """Where sets differ by more than their points, the sigma of a mean is not divided by the root of their number."""
    kept = prepare(asking(solid_in_sets(40, 3, 0.005, 0.02, seed=4), replicates="average"))
    divided = prepare(asking(solid_in_sets(40, 3, 0.005, 0.0, seed=4), replicates="average"))
    assert_allclose(divided.sigma / kept.sigma, 3**-0.5, rtol=0.1)
    assert "not made smaller" in kept.sigma_text
    assert "divided by sqrt(m)" in divided.sigma_text


@pytest.mark.parametrize(
    ("T", "why"),
    [
        (np.geomspace(5, 300, 40), "no two of its points lie within 0.3 % in temperature"),
        (np.linspace(250, 300, 400), "its points follow each other so closely that sets cannot be told apart"),
    ],
)
@pytest.mark.parametrize("word", ["average", "drop-first"])
def test_a_run_without_sets_is_refused(T: np.ndarray, why: str, word: str) -> None:
    """Nothing to average or to drop: one sentence says why."""
    data = invented_solid("debye", [200.0, 6.0], T, atoms=2)
    with pytest.raises(InputError) as caught:
        prepare(asking(data.measurement, replicates=word))
    assert str(caught.value) == f"--replicates {word}: run 'run 1' has no sets of repeats ({why}); leave the option out"


def test_runs_are_averaged_each_for_itself(tmp_path: Path) -> None:
    """Points of two runs at one temperature are no set; a run without sets is named where another has them."""
    (tmp_path / "a.csv").write_text(TRIPLICATES, encoding="utf-8")
    single = "T_K,Cp_J_molK\n" + "".join(f"{t},{t * t / 100}\n" for t in (10.0, 20.0, 30.0, 40.0))
    (tmp_path / "b.csv").write_text(single, encoding="utf-8")
    runs = (
        RunSettings("a.csv", sigma="2%", replicates="average"),
        RunSettings("b.csv", sigma="2%", replicates="average"),
    )
    worked = prepare(read_measurement(SampleSettings(formula="Cu"), runs, base=tmp_path)).measurement
    assert_array_equal(worked.run, [0, 0, 0, 1, 1, 1, 1])
    assert "run 'b' has no sets of repeats" in messages(worked)
    assert worked.sigma_text.endswith("share an error")


def test_averaged_data_go_through_to_the_report(tmp_path: Path) -> None:
    """The analysis holds the means; counts, residuals and result tell what was read and what was averaged."""
    data = solid_in_sets(40, 3, seed=5)
    fit = lf.fit(data, terms="debye + einstein", replicates="average")
    assert fit.analysis.measurement.temperature.size == 40
    record = result_record(fit.analysis)["data"]
    assert (record["points_read"], record["points_averaged"], record["points_fitted"]) == (120, 120, 40)
    assert record["rows_excluded"] == 0
    assert "40 fitted of 120 read" in " ".join(text_report(fit.analysis).split())
    assert "120 averaged into the means of 40 sets" in " ".join(text_report(fit.analysis).split())
    frame = residuals_frame(fit.analysis)
    assert len(frame) == 160
    assert (frame["reason"].astype(str).str.startswith("averaged with 2 others into")).sum() == 120
    assert "repeats-fitted-singly" not in fit.warnings["code"].tolist()


# ------------------------------------------------------------------------------------------------- sigma from the data


@pytest.mark.parametrize("word", ["scatter", "Scatter "])
def test_scatter_is_the_estimate_over_a_column(word: str, tmp_path: Path) -> None:
    """The word takes the local scatter, as where nothing is stated, although the file has a column of sigma."""
    rng = np.random.default_rng(3)
    T = np.geomspace(5, 300, 60)
    C = 25 * T**3 / (T**3 + 60.0**3) * (1 + 0.005 * rng.standard_normal(60))
    rows = "".join(f"{t!r},{c!r},{0.1 * c!r}\n" for t, c in zip(T.tolist(), C.tolist(), strict=True))
    text = "T_K,Cp_J_molK,sigma_J_molK\n" + rows
    prepared = prepare(read_text(tmp_path, text, sigma=word))
    assert prepared.sigma_kind == "estimated"
    assert prepared.sigma_text.startswith("estimated from local scatter: 0.")
    assert prepared.measurement.readings[0].settings.sigma == "scatter"
    assert "'sigma_J_molK' is not used: sigma is estimated from scatter, as asked" in messages(prepared.measurement)


def test_sigma_from_replicates_is_what_was_put_in() -> None:
    """Over 40 seeds the pooled spread of 40 triplicates is the noise, to the accuracy of 80 degrees of freedom."""
    found = [
        prepare(asking(unstated(solid_in_sets(40, 3, 0.008, 0.03, seed)), sigma="replicates")) for seed in range(40)
    ]
    relative = [float(each.sigma[0] / each.heat_capacity[0]) for each in found]
    assert np.mean(relative) == pytest.approx(0.008, rel=0.05)
    assert np.std(relative) == pytest.approx(0.008 / np.sqrt(2 * 80), rel=0.4)
    text = found[0].sigma_text
    assert found[0].sigma_kind == "estimated"
    assert "pooled within 40 sets of repeats (80 degrees of freedom)" in text
    assert "what disturbs a whole set is not in it: the means of the sets scatter by" in text


def test_sigma_of_means_from_replicates() -> None:
    """Averaged, the estimate comes from the single points and is divided by the root of the number in each set."""
    data = asking(unstated(solid_in_sets(40, 3, 0.008, seed=6)), sigma="replicates")
    single, means = prepare(data), prepare(asking(data, replicates="average"))
    ratio = (means.sigma / means.heat_capacity) / (single.sigma / single.heat_capacity)[0]
    assert_allclose(ratio, 3**-0.5, rtol=1e-12)
    assert means.sigma_text.endswith("that of the mean of m repeats divided by sqrt(m)")


def test_unequal_spread_is_said() -> None:
    """3 % at low T and 0.5 % at high T: one value is used, and the text says how to state two."""
    data = solid_in_sets(40, 3, 0.005, seed=7)
    rng = np.random.default_rng(8)
    noisy = np.where(data.temperature < 35, 0.03, 0.0) * rng.standard_normal(data.temperature.size)
    data = asking(unstated(replace(data, heat_capacity=data.heat_capacity * (1 + noisy))), sigma="replicates")
    assert "it is not the same everywhere, better state '" in prepare(data).sigma_text
    even = asking(unstated(solid_in_sets(40, 3, 0.005, seed=7)), sigma="replicates")
    assert "better state" not in prepare(even).sigma_text


@pytest.mark.parametrize(
    ("data", "sentence"),
    [
        (solid_in_sets(2, 3), "sets of repeats give 4 degrees of freedom, and 5 are needed"),
        (solid_in_sets(30, 1), "sets of repeats give no degrees of freedom, and 5 are needed"),
        (solid_in_sets(30, 2, 1e-6), "the repeats agree to better than 0.01 %"),
    ],
)
def test_too_few_or_too_good_repeats_are_refused(data: Measurement, sentence: str) -> None:
    """Without enough repeats, or with copies of one number, no sigma comes of them."""
    with pytest.raises(InputError) as caught:
        prepare(asking(unstated(data), sigma="replicates"))
    assert sentence in str(caught.value)
    assert "--sigma scatter" in str(caught.value)


def test_one_estimate_for_all_runs(tmp_path: Path) -> None:
    """Runs that ask for different estimates are refused, and so is one that states sigma beside one that does not."""
    for name in ("a", "b"):
        (tmp_path / f"{name}.csv").write_text(TRIPLICATES, encoding="utf-8")

    def read(first: str, second: str) -> Measurement:
        runs = (RunSettings("a.csv", sigma=first), RunSettings("b.csv", sigma=second))
        return read_measurement(SampleSettings(formula="Cu"), runs, base=tmp_path)

    with pytest.raises(InputError, match="run 'a' asks for sigma from replicates and run 'b' from scatter"):
        prepare(read("replicates", "scatter"))
    with pytest.raises(InputError, match="one states an uncertainty and that of the other is to be estimated"):
        read("1%", "scatter")


# --------------------------------------------------------------------------------------- pure error and lack of fit


def split(data: Measurement, terms: str = "debye + einstein") -> LackOfFit:
    prepared = prepare(data)
    found = diagnose(prepared, fit_model(prepared, ModelSettings(terms))).statistics.lack_of_fit
    assert found is not None
    return found


def test_pure_error_is_the_sum_within_sets(tmp_path: Path) -> None:
    """Pure error and lack of fit add up to chi-square, and their degrees of freedom to those of the fit."""
    prepared = prepare(solid_in_sets(30, 3, seed=9))
    fit = fit_model(prepared, ModelSettings("debye + einstein"))
    found = diagnose(prepared, fit).statistics.lack_of_fit
    assert found is not None
    assert found.pure_error + found.lack_of_fit == pytest.approx(fit.chi_square, rel=1e-12)
    assert found.pure_error_degrees_of_freedom == 60
    assert found.pure_error_degrees_of_freedom + found.degrees_of_freedom == fit.degrees_of_freedom
    scaled = ((prepared.heat_capacity / prepared.sigma).reshape(30, 3), prepared.sigma.reshape(30, 3))
    by_hand = float(((scaled[0] - scaled[0].mean(axis=1, keepdims=True)) ** 2).sum())
    assert found.pure_error == pytest.approx(by_hand, rel=0.02)  # sigma is the same within a set
    assert found.pure_error_percent == pytest.approx(0.5, rel=0.2)


def test_f_of_lack_of_fit_has_its_distribution() -> None:
    """With the right model p is uniform over 60 seeds (Draper and Smith 1998), whatever sigma is stated."""
    found = [split(solid_in_sets(20, 3, seed=100 + seed)).p for seed in range(60)]
    assert kstest(found, "uniform").pvalue > 0.01
    data = solid_in_sets(20, 3, seed=100)
    assert data.sigma is not None
    assert split(replace(data, sigma=7 * data.sigma)).p == pytest.approx(found[0], rel=1e-6)


def test_a_wrong_model_lacks_fit() -> None:
    """A Debye term alone for a solid of two terms: p far below 0.01, and the model is blamed."""
    found = split(solid_in_sets(20, 3, seed=11), "debye")
    assert found.p < 1e-6
    assert found.shared_error is not True


def test_shared_error_of_sets_is_told_from_a_wrong_model() -> None:
    """With the right model and an error shared within sets, the sets are blamed: a note, not a warning."""
    prepared = prepare(solid_in_sets(40, 3, 0.003, 0.02, seed=12))
    diagnosis = diagnose(prepared, fit_model(prepared, ModelSettings("debye + einstein")))
    found = {each.code: each for each in diagnosis.warnings}["lack-of-fit"]
    assert (found.level, found.concerns) == ("note", "uncertainty")
    assert "the repeats of a set share an error" in found.message


def test_no_split_without_repeats() -> None:
    """Single points, and means of sets, have no pure error; nothing is printed of it."""
    fit = lf.fit(solid_in_sets(60, 1, seed=13), terms="debye + einstein")
    assert fit.analysis.diagnosis.statistics.lack_of_fit is None
    assert result_record(fit.analysis)["residuals"]["lack_of_fit"] is None
    assert "pure error" not in text_report(fit.analysis)


def test_the_split_is_reported() -> None:
    """Text and result.json give pure error, F and p."""
    fit = lf.fit(solid_in_sets(30, 3, seed=9), terms="debye + einstein")
    found = fit.analysis.diagnosis.statistics.lack_of_fit
    assert found is not None
    assert result_record(fit.analysis)["residuals"]["lack_of_fit"]["p"] == found.p
    text = " ".join(text_report(fit.analysis).split())
    assert f"pure error {found.pure_error_percent:.2f} % lack of fit F = " in text
    assert "(27 and 60 degrees of freedom), p = " in text


def test_first_points_that_had_not_settled_are_noticed() -> None:
    """Where the first of each set lies 2 % high it is said, with the option that leaves it out; else nothing is."""
    high = prepare(solid_in_sets(20, 3, 0.005, first=0.02, seed=14))
    found = first_of_sets(high)
    assert found is not None
    assert found.mean == pytest.approx(0.02, abs=3 * found.u)
    warnings = diagnose(high, fit_model(high, ModelSettings("debye + einstein"))).warnings
    repeats = {each.code: each for each in warnings}["repeats-fitted-singly"]
    assert "the first of each lies 2." in repeats.message or "the first of each lies 1." in repeats.message
    assert "--replicates drop-first" in repeats.advice
    even = prepare(solid_in_sets(20, 3, 0.005, seed=14))
    warnings = diagnose(even, fit_model(even, ModelSettings("debye + einstein"))).warnings
    assert "--replicates average" in {each.code: each for each in warnings}["repeats-fitted-singly"].advice

"""Windows, masks, order, and the sigma that is in force."""

from __future__ import annotations

import math
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from helpers import REFERENCE, prepared_data
from numpy.testing import assert_allclose, assert_array_equal
from reading_helpers import read_text

from latticefit.errors import InputError
from latticefit.preparing import prepare
from latticefit.preparing.scatter import local_scatter
from latticefit.reading import read_measurement
from latticefit.records import FloatArray, Measurement, RunSettings, SampleSettings

INF = math.inf


def table(T: FloatArray, C: FloatArray) -> str:
    """A file of temperatures and heat capacities."""
    return "T_K,Cp_J_molK\n" + "".join(f"{t!r},{c!r}\n" for t, c in zip(T.tolist(), C.tolist(), strict=True))


def lattice(T: FloatArray) -> FloatArray:
    """An invented two-atom lattice, J/(mol K): a smooth rise as T^3 at low T to about 50 at high T."""
    return 25 * T**3 / (T**3 + 60.0**3) + 25 * T**3 / (T**3 + 160.0**3)


SEVEN = table(np.array([30.0, 2.0, 20.0, 45.0, 10.0, 300.0, 10.0]), np.array([3.0, 0.2, 2.0, 4.5, 1.0, 30.0, 1.1]))


def test_order_and_index(tmp_path: Path) -> None:
    """Points come by ascending temperature, repeats in file order, each with its place in the measurement."""
    prepared = prepare(read_text(tmp_path, SEVEN, sigma="1%"))
    assert_array_equal(prepared.temperature, [2, 10, 10, 20, 30, 45, 300])
    assert_array_equal(prepared.heat_capacity, [0.2, 1.0, 1.1, 2.0, 3.0, 4.5, 30.0])
    assert_array_equal(prepared.index, [1, 4, 6, 2, 0, 3, 5])
    assert_array_equal(prepared.measurement.temperature[prepared.index], prepared.temperature)
    assert_allclose(prepared.sigma, 0.01 * prepared.heat_capacity)
    assert (prepared.sigma_kind, prepared.sigma_text) == ("stated", "stated: 1%")
    assert prepared.reasons == (None,) * 7


@pytest.mark.parametrize(
    ("run", "extra", "left", "reasons"),
    [
        ({}, {}, [2, 10, 10, 20, 30, 45, 300], set()),
        ({}, {"window": [(10, 45)]}, [10, 10, 20, 30, 45], {"outside window 10-45 K"}),
        ({}, {"window": [(2, 10), (45, INF)]}, [2, 10, 10, 45, 300], {"outside windows 2-10 K and from 45 K"}),
        ({}, {"window": [(0, 20)]}, [2, 10, 10, 20], {"outside window up to 20 K"}),
        ({}, {"mask": [(20, 45)]}, [2, 10, 10, 300], {"masked 20-45 K"}),
        ({}, {"mask": [(10, 10), (300, INF)]}, [2, 20, 30, 45], {"masked 10-10 K", "masked from 300 K"}),
        ({"window": ((2.0, 45.0),)}, {}, [2, 10, 10, 20, 30, 45], {"outside window 2-45 K"}),
        (
            {"window": ((2.0, 45.0),), "mask": ((30.0, 30.0),)},
            {"window": [(10, 300)], "mask": [(20, 20)]},
            [10, 10, 45],
            {"outside window 2-45 K", "outside window 10-300 K", "masked 30-30 K", "masked 20-20 K"},
        ),
    ],
)
def test_windows_and_masks(run: Any, extra: Any, left: list[float], reasons: set[str], tmp_path: Path) -> None:
    """Intervals are closed; windows add up, and those of the run and of the call must both hold; masks take away."""
    prepared = prepare(read_text(tmp_path, SEVEN, sigma="1%", **run), **extra)
    assert_array_equal(prepared.temperature, left)
    assert {reason for reason in prepared.reasons if reason} == reasons
    assert sum(reason is None for reason in prepared.reasons) == len(left)


def test_windows_belong_to_their_run(tmp_path: Path) -> None:
    """The window and mask of one run leave the points of another alone."""
    (tmp_path / "a.csv").write_text("T_K,Cp_J_molK\n1,2\n5,3\n")
    runs = (RunSettings("a.csv", window=((0.0, 2.0),)), RunSettings("a.csv", label="b", mask=((0.0, 2.0),)))
    prepared = prepare(read_measurement(SampleSettings(), runs, base=tmp_path))
    assert_array_equal(prepared.temperature, [1, 5])
    assert_array_equal(prepared.run, [0, 1])
    assert prepared.reasons == (None, "outside window up to 2 K", "masked up to 2 K", None)


def test_no_point_left_is_refused(tmp_path: Path) -> None:
    """A mask over everything is refused with the reason."""
    measurement = read_text(tmp_path, SEVEN)
    with pytest.raises(InputError) as caught:
        prepare(measurement, mask=[(1, 400)])
    assert str(caught.value) == "no point is left to fit: all 7 are left out (the first: masked 1-400 K)"


@pytest.mark.parametrize(
    ("unit", "sample", "sentence"),
    [
        (
            "J/(g K)",
            SampleSettings(),
            "the heat capacity is per gram: give --formula or --molar-mass to make it per mole",
        ),
        (
            "uJ/K",
            SampleSettings(),
            "the heat capacity is per sample: give --mass and --formula or --molar-mass to make it per mole",
        ),
        ("uJ/K", SampleSettings(formula="Cu"), "the heat capacity is per sample: give --mass to make it per mole"),
    ],
)
def test_other_basis_is_refused(unit: str, sample: SampleSettings, sentence: str, tmp_path: Path) -> None:
    """Data that are not per mole cannot be fitted, and the sentence says what is missing."""
    measurement = read_text(tmp_path, f"T_K;C ({unit})\n1;2\n", sample)
    with pytest.raises(InputError) as caught:
        prepare(measurement)
    assert str(caught.value) == sentence


# --------------------------------------------------------------------------------------------------- estimated sigma


def test_copper_scatter() -> None:
    """White and Collocott's copper table scatters by 0.20 % (computed once for the design of this tool)."""
    run = RunSettings("copper_white_collocott_1984.csv")
    prepared = prepare(read_measurement(SampleSettings(formula="Cu"), (run,), base=REFERENCE))
    assert prepared.sigma_kind == "estimated"
    assert prepared.sigma_text == "estimated from local scatter: 0.20 % of the heat capacity"
    relative = prepared.sigma / prepared.heat_capacity
    assert_allclose(relative, relative[0], rtol=1e-14)
    assert relative[0] == pytest.approx(0.0020, abs=5e-5)


@pytest.mark.parametrize(("points", "scatter"), [(30, 0.13), (60, 0.08), (120, 0.05)])
def test_seeded_noise_is_recovered(points: int, scatter: float) -> None:
    """0.5 % of noise is found, within the scatter that the design study found on another solid: 0.13, 0.08, 0.05 %."""
    rng = np.random.default_rng(3)
    T = np.geomspace(5, 300, points)
    found = [100 * (local_scatter(T, lattice(T) * (1 + 0.005 * rng.standard_normal(points))) or 0) for _ in range(400)]
    assert np.mean(found) == pytest.approx(0.5, abs=0.05)
    assert np.std(found) == pytest.approx(scatter, rel=0.3)


@pytest.mark.parametrize("repeats", [2, 3, 7, 8])
def test_repeats_do_not_break_the_estimate(repeats: int) -> None:
    """Replicates at one temperature, even more than a neighbourhood holds, still give the noise that was put in."""
    rng = np.random.default_rng(5)
    T = np.repeat(np.geomspace(5, 300, 24), repeats)
    found = [local_scatter(T, lattice(T) * (1 + 0.005 * rng.standard_normal(T.size))) or 0 for _ in range(60)]
    assert np.mean(found) == pytest.approx(0.005, rel=0.08)


def test_nearly_equal_temperatures_do_not_break_the_estimate() -> None:
    """Triplicates a microkelvin apart give the same estimate as exact ones."""
    rng = np.random.default_rng(6)
    T = np.repeat(np.geomspace(5, 300, 20), 3)
    C = lattice(T) * (1 + 0.005 * rng.standard_normal(T.size))
    shaken = np.sort(T + 1e-6 * np.tile([0.0, 1.0, 2.0], 20))
    assert local_scatter(shaken, C) == pytest.approx(local_scatter(T, C), rel=1e-3)


def test_one_temperature_only() -> None:
    """At a single temperature the estimate is the spread itself, normal-consistent."""
    rng = np.random.default_rng(7)
    C = 20 * (1 + 0.005 * rng.standard_normal(2001))
    assert local_scatter(np.full(2001, 50.0), C) == pytest.approx(0.005, rel=0.08)


def test_leverage_is_that_of_the_hat_matrix() -> None:
    """On seven points the estimate equals the textbook one: residuals of a quadratic over sqrt(1 - h), times 1.4826."""
    T = np.array([2.0, 3.0, 5.0, 6.0, 9.0, 11.0, 20.0])
    C = np.array([1.0, 3.1, 11.9, 20.0, 59.0, 120.0, 490.0])
    x, y = np.log(T), np.log(C)
    design = np.vander(x, 3)
    hat = design @ np.linalg.inv(design.T @ design) @ design.T
    deviation = (y - hat @ y) / np.sqrt(1 - np.diag(hat))
    assert local_scatter(T, C) == pytest.approx(1.4826 * np.median(np.abs(deviation)), rel=1e-9)


def test_estimate_does_not_depend_on_units() -> None:
    """The relative scatter is the same in any unit of temperature or heat capacity."""
    rng = np.random.default_rng(8)
    T = np.geomspace(5, 300, 40)
    C = lattice(T) * (1 + 0.005 * rng.standard_normal(40))
    assert local_scatter(1e-3 * T, 1e6 * C) == pytest.approx(local_scatter(T, C), rel=1e-9)


def test_estimate_is_of_the_points_used(tmp_path: Path) -> None:
    """A noisy region that is masked does not count."""
    rng = np.random.default_rng(9)
    T = np.geomspace(5, 300, 60)
    noise = np.where(T > 100, 0.05, 0.002) * rng.standard_normal(60)
    measurement = read_text(tmp_path, table(T, lattice(T) * (1 + noise)))
    prepared = prepare(measurement, mask=[(100, INF)])
    assert prepared.sigma[0] / prepared.heat_capacity[0] == pytest.approx(0.002, rel=0.5)


def test_few_points_have_an_assumed_sigma(tmp_path: Path) -> None:
    """Below ten points 1 % is assumed, and said to be."""
    T = np.geomspace(5, 300, 9)
    prepared = prepare(read_text(tmp_path, table(T, lattice(T))))
    assert_allclose(prepared.sigma, 0.01 * prepared.heat_capacity)
    assert prepared.sigma_kind == "estimated"
    assert prepared.sigma_text == "assumed: 1 % of the heat capacity (too few points to estimate it from)"


def test_smooth_data_have_an_assumed_sigma(tmp_path: Path) -> None:
    """Computed points without scatter (below 0.01 %) have 1 % assumed, and said to be."""
    T = np.geomspace(50, 60, 40)
    prepared = prepare(read_text(tmp_path, table(T, T**2)))
    assert prepared.sigma_text == "assumed: 1 % of the heat capacity (the local scatter is too small to be noise)"
    assert_allclose(prepared.sigma, 0.01 * prepared.heat_capacity)


@pytest.mark.parametrize(("points", "kind"), [(12, "assumed"), (16, "assumed"), (20, "estimated"), (60, "estimated")])
def test_points_too_far_apart_get_an_assumed_sigma(points: int, kind: str) -> None:
    """On 2-300 K seven neighbours of 12 or 16 points curve more than a parabola: 1 % is assumed and said to be."""
    T = np.geomspace(2.0, 300.0, points)
    C = 25 * T**3 / (T**3 + 60.0**3)
    assert prepare(sparse_measurement(T, C)).sigma_text.startswith(kind)


def sparse_measurement(T: np.ndarray, C: np.ndarray) -> Measurement:
    noisy = C * (1 + 0.005 * np.random.default_rng(8).standard_normal(T.size))
    return replace(prepared_data(T, noisy, 0.01 * noisy, atoms=1).measurement, sigma=None)

"""How the time of one search and fit, without a guess, grows with the terms of the model and with the points.

The median over seeded truths counts, drawn as in `starts`; every case is timed in turn for one seed after another, so
that a disturbance falls on all of them. The files are read before the clock starts.
"""

from __future__ import annotations

import tempfile
import time
from itertools import pairwise
from pathlib import Path

import numpy as np

import latticefit
from benchmarks.measuring import Row, progress
from benchmarks.starts import random_truth
from latticefit.fitting import fit_model
from latticefit.models import build_model, heat_capacity
from latticefit.preparing import prepare
from latticefit.records import ModelSettings, PreparedData

__all__ = ["growth_section"]

_SEEDS = 9
_EINSTEIN_TERMS, _POINTS = (1, 2, 3, 4), 300
_PER_TERM = 5.0  # own target: at most this often the time of one term fewer
_MOST = {300: 5.0, 3000: 5.0, 30_000: 30.0}  # own targets against the fewest points: the search thins its points
_FEWEST = 50
_NOISE = 0.005

Case = tuple[int, int]  # Einstein terms, points


def _terms(einstein_terms: int) -> str:
    return f"debye + {einstein_terms} einstein + electronic"


def _prepared(case: Case, seed: int, folder: Path) -> PreparedData:
    """Return points from 2 to 300 K with 0.5 % noise, as they are prepared after reading a file."""
    einstein_terms, points = case
    random = np.random.default_rng(seed)
    truth = random_truth(random, einstein_terms)
    T = np.geomspace(2, 300, points)
    C = heat_capacity(build_model(_terms(einstein_terms)), T, truth) * (1 + _NOISE * random.standard_normal(points))
    path = folder / "run.csv"
    lines = ["# invented data", "T_K,Cp_J_molK", *(f"{t:.9g},{c:.9g}" for t, c in zip(T, C, strict=True))]
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")
    return prepare(latticefit.read(path, sigma="0.5%"))


def _seconds(case: Case, seed: int, folder: Path) -> float:
    prepared = _prepared(case, seed, folder)
    settings = ModelSettings(_terms(case[0]), "free")
    begin = time.perf_counter()
    fit_model(prepared, settings, seed)
    return time.perf_counter() - begin


def _medians(cases: list[Case]) -> dict[Case, float]:
    times: dict[Case, list[float]] = {case: [] for case in cases}
    with tempfile.TemporaryDirectory() as name:
        _seconds(cases[0], 0, Path(name))  # imports lmfit and fills caches, unclocked
        for seed in range(_SEEDS):
            progress(f"growth: truth {seed + 1} of {_SEEDS}, {len(cases)} cases")
            for case in cases:
                times[case].append(_seconds(case, seed, Path(name)))
    return {case: float(np.median(each)) for case, each in times.items()}


def growth_section() -> list[Row]:
    """Time fit_model for 1 to 4 Einstein terms at 300 points, and for 50 to 30000 points at one Einstein term."""
    by_terms = [(number, _POINTS) for number in _EINSTEIN_TERMS]
    by_points = [(1, points) for points in (_FEWEST, *_MOST)]
    median = _medians(list(dict.fromkeys([*by_points, *by_terms])))
    rows = []
    for fewer, case in pairwise(by_terms):
        step, whole = median[case] / median[fewer], median[case] / median[by_terms[0]]
        rows.append(
            Row(
                f"search and fit, {_POINTS} points: {case[0]} Einstein terms against {fewer[0]}",
                f"<= {_PER_TERM:g}x, own target",
                f"{step:.2f}x; {whole:.2f}x one term  ({median[case] * 1e3:.0f} / {median[fewer] * 1e3:.0f} ms, medians"
                f" of {_SEEDS} truths)",
                step <= _PER_TERM,
            )
        )
    unit = median[1, _FEWEST]
    for points, limit in _MOST.items():
        cost = median[1, points]
        rows.append(
            Row(
                f"search and fit, 1 Einstein term: {points} points against {_FEWEST}",
                f"<= {limit:g}x, own target",
                f"{cost / unit:.2f}x  ({cost * 1e3:.0f} / {unit * 1e3:.0f} ms, medians of {_SEEDS} truths)",
                cost <= limit * unit,
            )
        )
    return rows

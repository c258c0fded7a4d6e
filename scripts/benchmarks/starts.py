"""How often the start search finds the right minimum without a guess, over random truths.

A truth has a Debye term of 0.9..4.5 modes, k Einstein terms of 0.3..2 modes each, gamma of 0.3..3 mJ/(mol K^2); its
temperatures are log-uniform in 60..1000 K and at least a factor 1.4 apart. 300 points log-spaced from 2 to 300 K carry
0.5 % noise, and the mode sum is free. A search succeeds when its chi-square is within 0.1 of the best bounded fit that
any method finds: from the truth, from random starts drawn as truths are, or the search itself.
"""

from __future__ import annotations

import time

import numpy as np
from numpy.typing import NDArray

from benchmarks.measuring import Row, progress
from latticefit.fitting import minimise, parametrise, search
from latticefit.models import Model, build_model, heat_capacity
from latticefit.records import ModelSettings, Sample

__all__ = ["starts_section"]

FloatArray = NDArray[np.float64]

_TARGETS = {1: 98.0, 2: 93.0, 3: 83.0}  # percent, by number of Einstein terms
_TRUTHS = 200
_RANDOM_STARTS = 8
_WITHIN = 0.1  # of chi-square
_POINTS, _NOISE = 300, 0.005
_APART = 1.4


def random_truth(random: np.random.Generator, einstein_terms: int) -> FloatArray:
    """Return theta and modes of the Debye and of every Einstein term, and gamma, in the order of the model."""
    while True:
        thetas = np.exp(random.uniform(np.log(60), np.log(1000), einstein_terms + 1))
        ordered = np.sort(thetas)
        if np.all(ordered[1:] >= _APART * ordered[:-1]):
            break
    modes = [random.uniform(0.9, 4.5), *random.uniform(0.3, 2, einstein_terms)]
    return np.array([*np.column_stack([thetas, modes]).ravel(), random.uniform(0.3e-3, 3e-3)])


def _attempt(model: Model, einstein_terms: int, seed: int) -> tuple[float, float]:
    """Return by how much the search misses the best chi-square, and the seconds that it took."""
    random = np.random.default_rng(seed)
    truth = random_truth(random, einstein_terms)
    T = np.geomspace(2, 300, _POINTS)
    exact = heat_capacity(model, T, truth)
    sigma = _NOISE * exact
    data = (T, exact + sigma * random.standard_normal(_POINTS), sigma)
    par = parametrise(model, ModelSettings(model.expression, "free"), Sample("random truth"), T, data[1])
    begin = time.perf_counter()
    found = search(par, *data, {}, seed).best.chi_square
    elapsed = time.perf_counter() - begin
    starts = [truth, *(random_truth(random, einstein_terms) for _ in range(_RANDOM_STARTS))]
    return found - min(found, *(minimise(par, start, *data).chi_square for start in starts)), elapsed


def _success_row(einstein_terms: int, target: float) -> Row:
    count = "einstein" if einstein_terms == 1 else f"{einstein_terms} einstein"
    model = build_model(f"debye + {count} + electronic")
    missed, times = [], []
    for seed in range(_TRUTHS):
        if seed % 50 == 0:
            progress(f"starts: {model.expression}, truth {seed} of {_TRUTHS}")
        excess, elapsed = _attempt(model, einstein_terms, seed)
        times.append(elapsed)
        if excess > _WITHIN:
            missed.append(seed)
            progress(f"starts: {model.expression}, seed {seed} missed the best chi-square by {excess:.2f}")
    percent = 100 * (1 - len(missed) / _TRUTHS)
    plural = "" if einstein_terms == 1 else "s"
    return Row(
        f"right minimum without a guess, {einstein_terms} Einstein term{plural}",
        f">= {target:g} %",
        f"{percent:.1f} %  ({_TRUTHS} truths, seeds 0..{_TRUTHS - 1}; median {1e3 * np.median(times):.0f} ms)",
        percent >= target,
    )


def starts_section() -> list[Row]:
    """Measure the success rate for one, two and three Einstein terms beside a Debye and an electronic term."""
    return [_success_row(number, target) for number, target in _TARGETS.items()]

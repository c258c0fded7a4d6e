"""Accuracy of the special functions, and their speed against scipy's quadrature and a compiled loop over GNU GSL."""

from __future__ import annotations

import shutil
import subprocess
import tempfile
from collections.abc import Callable
from functools import partial
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from benchmarks.measuring import Row, best_time, in_turn, not_measured, progress, ratio_row
from latticefit import functions

FloatArray = NDArray[np.float64]


def functions_section() -> list[Row]:
    """Accuracy of every special function; Debye heat capacity at x log-uniform in 1..150 against quad and GSL."""
    random = np.random.default_rng(1)
    few, many = (np.exp(random.uniform(0, np.log(150), size)) for size in (300, 1_000_000))
    progress("functions: accuracy against mpmath")
    rows = [accuracy_row()]
    with tempfile.TemporaryDirectory() as folder:
        compiled = gsl_loop(Path(folder))
        work: dict[str, Callable[[], float]] = {
            "latticefit 300": lambda: best_time(partial(functions.debye_heat_capacity, few)) / few.size,
            "latticefit 1e6": lambda: best_time(partial(functions.debye_heat_capacity, many)) / many.size,
            "quad": lambda: best_time(lambda: [quadrature_heat_capacity(x) for x in few]) / few.size,
        }
        if not isinstance(compiled, str):
            work |= {"GSL 300": partial(compiled, few), "GSL 1e6": partial(compiled, many)}
        times = in_turn("functions", work)
    for size, quad_target, gsl_target in (("300", 1000, 2.5), ("1e6", 4000, 10)):
        own = times[f"latticefit {size}"]
        for label, name, target in (("scipy quad", "quad", quad_target), ("a GSL C loop", f"GSL {size}", gsl_target)):
            what = f"Debye heat capacity against {label}, {size} values"
            if name in times:
                detail = f"  ({times[name] * 1e9:.4g} / {own * 1e9:.3g} ns a value)"
                rows.append(ratio_row(what, target, times[name], own, detail))
            else:
                rows.append(not_measured(what, f">= {target:g}x", str(compiled)))
    return rows


def quadrature_heat_capacity(x: float) -> float:
    """Return C/(3 N k_B) of Debye as it is usually written: scipy.integrate.quad over a numpy integrand."""
    from scipy.integrate import quad

    value, _ = quad(lambda t: t**4 * np.exp(t) / (np.exp(t) - 1) ** 2, 0, x)
    return float(3 / x**3 * value)


def accuracy_row() -> Row:
    """Return the largest relative error of all functions on a seeded sample, log-uniform in 1e-8..1e4."""
    try:
        import mpmath
    except ImportError:
        return not_measured("relative error of every special function", "<= 1e-14", "mpmath is not installed")
    random = np.random.default_rng(2)
    sample = np.concatenate([10 ** random.uniform(-8, 4, 40), random.uniform(0.5, 20, 20)])
    worst, where = 0.0, ""
    with mpmath.workdps(45):
        for x in sample:
            for name, (own, exact) in own_and_exact(float(x)).items():
                if abs(exact) >= np.finfo(float).tiny:
                    error = float(abs(own / exact - 1))
                    if error > worst:
                        worst, where = error, f"{name}, x = {x:.3g}"
    what = f"relative error of every special function, {sample.size} values of x in 1e-8..1e4"
    return Row(what, "<= 1e-14", f"{worst:.1e}  ({where})", worst <= 1e-14)


def own_and_exact(x: float) -> dict[str, tuple[Any, Any]]:
    """Return, for every function, latticefit's value at x and that of its definition by mpmath's quadrature."""
    import mpmath

    y = mpmath.mpf(x)
    ends = [mpmath.mpf(0)] + [end / y for end in (1, 4, 12, 30, 70) if end < y] + [min(1, 150 / y)]
    energy = y / mpmath.expm1(y)
    heat_capacity = y**2 * mpmath.exp(-y) / mpmath.expm1(-y) ** 2
    helmholtz = -mpmath.log1p(1 / mpmath.expm1(y))
    pairs: dict[str, tuple[Any, Any]] = {}
    for n in (1, 2, 3, 4):
        d = n * mpmath.quad(lambda s, n=n: s ** (n - 1) * (y * s / mpmath.expm1(y * s) if s else 1), ends)
        pairs[f"D{n}"] = functions.debye_function(n, x), d
        pairs[f"D{n} derivative"] = functions.debye_function_derivative(n, x), n / y * (energy - d)
        if n == 3:
            third = d
    exact = {
        "debye_heat_capacity": 4 * third - 3 * energy,
        "debye_energy": third,
        "debye_entropy": 4 * third / 3 - helmholtz,
        "debye_helmholtz": helmholtz - third / 3,
        "debye_heat_capacity_derivative": 3 / y * (heat_capacity - 4 * third + 3 * energy),
        "debye_energy_derivative": 3 / y * (energy - third),
        "einstein_heat_capacity": heat_capacity,
        "einstein_energy": energy,
        "einstein_entropy": energy - helmholtz,
        "einstein_helmholtz": helmholtz,
        "einstein_heat_capacity_derivative": heat_capacity * (2 / y - mpmath.coth(y / 2)),
        "einstein_energy_derivative": (energy - heat_capacity) / y,
    }
    return pairs | {name: (getattr(functions, name)(x), value) for name, value in exact.items()}


GSL_LOOP = r"""
#include <gsl/gsl_sf_debye.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <time.h>

/* argv: file of n doubles, n, repeats; prints the best time of one pass in seconds */
int main(int argc, char **argv) {
    long n = atol(argv[2]), repeats = atol(argv[3]);
    double *x = malloc(n * sizeof *x), *c = malloc(n * sizeof *c), best = 1e9;
    FILE *file = fopen(argv[1], "rb");
    if (!file || fread(x, sizeof *x, n, file) != (size_t)n) return 1;
    for (long r = 0; r < repeats; r++) {
        struct timespec a, b;
        clock_gettime(CLOCK_MONOTONIC, &a);
        for (long i = 0; i < n; i++) c[i] = 4 * gsl_sf_debye_3(x[i]) - 3 * x[i] / expm1(x[i]);
        clock_gettime(CLOCK_MONOTONIC, &b);
        double t = (b.tv_sec - a.tv_sec) + 1e-9 * (b.tv_nsec - a.tv_nsec);
        if (t < best) best = t;
    }
    fprintf(stderr, "%g\n", c[n / 2]);
    printf("%.9g\n", best);
    return 0;
}
"""


def gsl_loop(folder: Path) -> Callable[[FloatArray], float] | str:
    """Return what times a compiled loop over GNU GSL in seconds per value, or why there is none."""
    compiler = shutil.which("gcc") or shutil.which("cc")
    if compiler is None:
        return "no C compiler here"
    source, program, data = (folder / name for name in ("loop.c", "loop", "x.bin"))
    source.write_text(GSL_LOOP)
    command = [compiler, "-O2", str(source), "-o", str(program), "-lgsl", "-lgslcblas", "-lm"]
    if subprocess.run(command, capture_output=True, check=False).returncode != 0:
        return "GNU GSL with its headers (libgsl-dev) is not installed here"

    def seconds_per_value(x: FloatArray) -> float:
        x.tofile(data)
        repeats = max(3, 3_000_000 // x.size)
        run = [str(program), str(data), str(x.size), str(repeats)]
        printed = subprocess.run(run, capture_output=True, text=True, check=True).stdout
        return float(printed) / x.size

    return seconds_per_value

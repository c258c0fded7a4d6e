"""Whole processes as a user starts them: `latticefit --help`, `fit` on a file of 300 points, and `table`."""

from __future__ import annotations

import shutil
import subprocess
import sys
import tempfile
from functools import partial
from pathlib import Path

import numpy as np

from benchmarks.measuring import Row, best_time, cost_row, in_turn, progress
from latticefit.models import build_model, heat_capacity

__all__ = ["process_section", "startup_section"]

_TERMS = "debye + einstein + electronic"
_TRUTH = np.array([240.0, 3.2, 480.0, 2.4, 1.5e-3])
_SEED = 4
_FIGURES = {"default figures": ([], 5.0), "--figures none": (["--figures", "none"], 2.5)}  # options, limit in s
_LADDER, _TABLE = 5.0, 1.0  # limits in s
_GRID = "0.5:5:0.5, 10:300:10"


def _latticefit() -> list[str]:
    """Return the installed command of this Python, else the package run as a module."""
    command = shutil.which("latticefit", path=str(Path(sys.executable).parent))
    return [command] if command else [sys.executable, "-m", "latticefit"]


def _run(words: list[str], folder: Path | None = None) -> None:
    finished = subprocess.run(words, cwd=folder, capture_output=True, text=True, check=False)
    if finished.returncode != 0:
        raise SystemExit(f"{' '.join(words)} ended with {finished.returncode}: {finished.stderr.strip()}")


def _time_row(what: str, limit: float, seconds: float, remark: str = "") -> Row:
    return Row(what, f"<= {limit:g} s{remark}", f"{seconds:.2f} s", seconds <= limit)


def startup_section() -> list[Row]:
    """Time `latticefit --help` against a Python that does nothing."""
    times = in_turn(
        "startup",
        {
            "python -c pass": lambda: best_time(partial(_run, [sys.executable, "-c", "pass"])),
            "latticefit --help": lambda: best_time(partial(_run, [*_latticefit(), "--help"])),
        },
    )
    bare, own = times.values()
    detail = f"  ({own * 1e3:.0f} / {bare * 1e3:.0f} ms)"
    return [
        _time_row("latticefit --help, whole process", 0.3, own),
        cost_row("latticefit --help against bare Python", 5, own, bare, detail),
    ]


def _write_measurement(path: Path) -> None:
    """Write 300 invented points from 2 to 300 K with 0.5 % noise."""
    T = np.geomspace(2, 300, 300)
    noise = 1 + 0.005 * np.random.default_rng(_SEED).standard_normal(T.size)
    C = heat_capacity(build_model(_TERMS), T, _TRUTH) * noise
    lines = ["# invented data", "T_K,Cp_J_molK", *(f"{t:.6g},{c:.6g}" for t, c in zip(T, C, strict=True))]
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")


def process_section() -> list[Row]:
    """Time `latticefit fit`, with and without named terms, and `latticefit table` on what was saved."""
    rows = []
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        _write_measurement(folder / "run.csv")
        words = [*_latticefit(), "fit", "run.csv", "--terms", _TERMS, "--sigma", "0.5%", "--out", "out", "--replace"]
        for label, (options, limit) in _FIGURES.items():
            progress(f"process: latticefit fit, {label}")
            seconds = best_time(partial(_run, [*words, *options], folder))
            rows.append(_time_row(f"latticefit fit, 300 points, {label}, whole process", limit, seconds))
        rows += _ladder_and_table_rows(folder)
    return rows


def _ladder_and_table_rows(folder: Path) -> list[Row]:
    """Return the rows of a fit that compares the ladder of candidates, and of a table of its saved result."""
    ladder = [*_latticefit(), "fit", "run.csv", "--sigma", "0.5%", "--molar-mass", "60 g/mol"]
    ladder += ["--out", "ladder", "--replace"]
    table = [*_latticefit(), "table", "ladder/result.json", "--grid", _GRID, "--per", "kg"]
    progress("process: latticefit fit without --terms")
    fitted = best_time(partial(_run, ladder, folder))
    progress("process: latticefit table")
    evaluated = best_time(partial(_run, table, folder))
    what = "latticefit fit, 300 points, without --terms, whole process"
    return [
        _time_row(what, _LADDER, fitted, ", own target"),
        _time_row("latticefit table of that result, 40 temperatures, whole process", _TABLE, evaluated),
    ]

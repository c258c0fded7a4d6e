"""How times are measured, and the rows that targets and measurements become.

Each piece of work is repeated for a good while (at least three times) and the best repeat counts, since every
disturbance only adds time. One call goes before the clock starts: it builds tables and fills caches.
"""

from __future__ import annotations

import sys
import time
from collections.abc import Callable
from dataclasses import dataclass

__all__ = ["Row", "best_time", "cost_row", "in_turn", "not_measured", "progress", "ratio_row"]

_ROUNDS = 3


@dataclass(frozen=True)
class Row:
    """One target: what, the target, what was measured, and whether it is met (None: not measured)."""

    what: str
    target: str
    measured: str
    met: bool | None


def ratio_row(what: str, target: float, slow: float, fast: float, detail: str = "") -> Row:
    """Return the row of a ratio of two times that must reach `target`."""
    ratio = slow / fast
    return Row(
        what, f">= {target:g}x", f"{ratio:.0f}x{detail}" if ratio >= 100 else f"{ratio:.1f}x{detail}", ratio >= target
    )


def cost_row(what: str, limit: float, cost: float, unit: float, detail: str = "") -> Row:
    """Return the row of a time that must not exceed `limit` times another one."""
    ratio = cost / unit
    return Row(what, f"<= {limit:g}x", f"{ratio:.2f}x{detail}", ratio <= limit)


def not_measured(what: str, target: str, why: str) -> Row:
    return Row(what, target, f"not measured: {why}", None)


def progress(text: str) -> None:
    print(text, file=sys.stderr, flush=True)


def best_time(work: Callable[[], object], budget: float = 0.2) -> float:
    """Return the shortest time of one call in seconds, over repeats that fill the budget, after one call unclocked."""
    work()
    best, spent, repeats = float("inf"), 0.0, 0
    while spent < budget or repeats < 3:
        begin = time.perf_counter()
        work()
        elapsed = time.perf_counter() - begin
        best, spent, repeats = min(best, elapsed), spent + elapsed, repeats + 1
    return best


def in_turn(section: str, work: dict[str, Callable[[], float]]) -> dict[str, float]:
    """Return the best time of each measurement, made in turn in three rounds: ratios of them carry over."""
    times = dict.fromkeys(work, float("inf"))
    for count in range(1, _ROUNDS + 1):
        for name, measure in work.items():
            progress(f"{section}: round {count} of {_ROUNDS}, {name}")
            times[name] = min(times[name], measure())
    return times

"""Candidate models on the same data: JSON, text and rows."""

from __future__ import annotations

from math import inf
from textwrap import wrap
from typing import Any

from ..records import Candidate, Comparison
from ..wording import harmless
from .content import Grid

__all__ = ["candidate_grid", "comparison_record", "ranking_lines", "ranking_text"]

_COLUMNS = (
    "k: free parameters. dAICc: against the best plausible candidate; within 2 is a tie, and then the fewest "
    "parameters win."
)


def comparison_record(comparison: Comparison) -> dict[str, Any]:
    """Return a comparison as in the contract of ``rank --json``."""
    chosen = comparison.candidates[comparison.chosen]
    return {
        "candidates": [_candidate(each) for each in comparison.candidates],
        "chosen": {"terms": chosen.terms, "mode_sum": chosen.mode_sum, "cp_cv": chosen.cp_cv},
        "because": comparison.because,
        "dropped": list(comparison.dropped),
    }


def _candidate(each: Candidate) -> dict[str, Any]:
    return {
        "terms": each.terms,
        "mode_sum": each.mode_sum,
        "cp_cv": each.cp_cv,
        "free_parameters": each.free_parameters,
        "chi_square": each.chi_square,
        "reduced_chi_square": each.reduced_chi_square,
        "aicc": each.aicc,
        "bic": each.bic,
        "delta_aicc": each.delta_aicc,
        "weight": each.weight,
        "hold_out_rms_pull": None,
        "plausible": each.plausible,
        "reasons": list(each.reasons),
    }


def _number(value: float | None, digits: int) -> str:
    if value is None:
        return "-"
    return f"{value:.{digits}f}" if abs(value) < 1e4 else f"{value:.1e}"


def _by_rank(comparison: Comparison) -> list[int]:
    """Positions of the candidates: plausible ones first, by AICc."""

    def key(k: int) -> tuple[bool, float]:
        each = comparison.candidates[k]
        return not each.plausible, inf if each.aicc is None else each.aicc

    return sorted(range(len(comparison.candidates)), key=key)


def _cells(each: Candidate) -> tuple[str, str, str, str, str, str]:
    return (
        each.terms,
        each.cp_cv,
        str(each.free_parameters),
        _number(each.reduced_chi_square, 2),
        _number(each.delta_aicc, 1),
        f"{each.weight:.2f}" if each.plausible else "-",
    )


def candidate_grid(comparison: Comparison) -> Grid:
    """Give the candidates as a table, the chosen one marked, with the reason where one is not plausible."""
    rows = []
    for k in _by_rank(comparison):
        each = comparison.candidates[k]
        remark = "chosen" if k == comparison.chosen else "" if each.plausible else f"not plausible: {each.reasons[0]}"
        rows.append((*_cells(each), remark))
    return Grid(("model", "Cp-Cv", "k", "chi2/dof", "dAICc", "weight", "remark"), tuple(rows), (_COLUMNS,))


def ranking_lines(comparison: Comparison) -> list[str]:
    """Return the candidates within 80 columns, the chosen one marked with ``>``."""
    lines = [f"  {'model':<34}{'Cp-Cv':<17}{'k':>2} {'chi2/dof':>9} {'dAICc':>8} {'weight':>6}"]
    for k in _by_rank(comparison):
        each = comparison.candidates[k]
        terms, form, parameters, reduced, delta, weight = _cells(each)
        mark = ">" if k == comparison.chosen else " "
        lines.append(f"{mark} {terms:<34}{form:<17}{parameters:>2} {reduced:>9} {delta:>8} {weight:>6}")
        lines += [f"      not plausible: {each.reasons[0]}"] if each.reasons else []
    return lines


def ranking_text(comparison: Comparison, name: str) -> str:
    """Return the ranking for people: the table, what its columns are, and the choice in one sentence."""
    chosen = comparison.candidates[comparison.chosen]
    form = "" if chosen.cp_cv == "none" else f" with {chosen.cp_cv}"
    lines = [
        f"{harmless(name)}: {len(comparison.candidates)} candidates, same points, same uncertainties",
        "",
        *ranking_lines(comparison),
        "",
        *wrap(f"Chosen: {chosen.terms}{form}: {comparison.because}.", 80),
        *wrap(_COLUMNS, 80),
        *(line for each in comparison.dropped for line in wrap(f"Left out: {each}", 80)),
    ]
    return "\n".join(lines) + "\n"

"""The level of a heat capacity in one sentence with numbers."""

from __future__ import annotations

from collections.abc import Sequence

from ..records import LevelExplanation, LevelFinding
from ..rounding import round_to_uncertainty

__all__ = ["explained", "level_sentence", "mode_sum_text"]


def level_sentence(finding: LevelFinding, uncounted: str | None = None) -> str:
    """Return what was found of the level, the numbers, and the slips that would explain it.

    Parameters
    ----------
    finding : LevelFinding
    uncounted : str or None
        Why there is no mode sum, where there is none.
    """
    if finding.ratio_to_classical is None or finding.temperature is None:
        return f"the level cannot be judged: {finding.reason}"
    at_top = f"{_number(finding.ratio_to_classical)} times 3nR at {finding.temperature:.4g} K"
    counted = uncounted
    if finding.mode_sum_ratio is not None and finding.mode_sum_u is not None:
        counted = f"the modes add up to {mode_sum_text(finding.mode_sum_ratio, finding.mode_sum_u)} of 3 per atom"
    if finding.verdict in ("plausible", "not judged"):
        facts = ", ".join(each for each in (f"the heat capacity is {at_top}", _thetas(finding), counted) if each)
        judged = finding.verdict == "plausible"
        return f"plausible: {facts}" if judged else f"the level cannot be judged: {finding.reason} ({facts})"
    reasons = explained(finding.explanations, finding.mode_sum_ratio, finding.mode_sum_u)
    if finding.verdict == "suspicious":
        if finding.mode_sum_ratio is None:
            return f"the heat capacity is {at_top}, {_thetas(finding)} ({counted}); {reasons}"
        return f"{counted}; {reasons}"
    theta = _thetas(finding)
    what = f"the heat capacity is {at_top}, which no solid reaches"
    if finding.ratio_to_classical < 1:
        what, theta = f"the heat capacity is {at_top}, {theta}, which no solid has", ""
    aside = ", ".join(each for each in (theta, counted) if each)
    return f"{what}{f' ({aside})' if aside else ''}; {reasons}"


def explained(explanations: Sequence[LevelExplanation], ratio: float | None, u: float | None) -> str:
    """Return the slips that could explain a level, as the second half of a sentence; `ratio` is the mode sum over 3n.

    One that has no rival and that the mode sum meets within u would explain it; of all others no more is said than that
    they could.
    """
    if explanations:
        first = explanations[0].expected
        sure = len(explanations) == 1 and first is not None and ratio is not None and abs(ratio - first) <= (u or 0.0)
        return f"that {'would' if sure else 'could'} be explained by " + ", or by ".join(
            map(_explanation, explanations)
        )
    words = "no single slip of unit, mass, formula or water gives that; check mass, molar mass, formula and addenda"
    if ratio is not None and ratio < 1:
        return f"{words}, unless stiff modes are not excited yet"
    return f"{words}, unless something beside the lattice adds to it (a transition, magnetism, a melting point nearby)"


def _explanation(each: LevelExplanation) -> str:
    factor = "" if each.expected is None else f" (factor {_number(each.expected)})"
    return f"{each.words}{factor}: {each.remedy}"


def _thetas(finding: LevelFinding) -> str:
    if finding.theta_low is None or finding.theta_high is None:
        return "theta_D of single points undefined at or above 3nR"
    low, high = _kelvin(finding.theta_low), _kelvin(finding.theta_high)
    return f"theta_D of single points {f'{low} K' if low == high else f'{low} to {high} K'}"


def _kelvin(value: float) -> str:
    return f"{value:.0f}" if value >= 100 else f"{value:.3g}"


def _number(value: float) -> str:
    return f"{value:.0f}" if 1000 <= value < 1e7 else f"{value:.3g}"


def mode_sum_text(value: float, u: float) -> str:
    """Return a value with u in brackets, in units of its last digits: ``0.774(16)``."""
    value_text, u_text = round_to_uncertainty(value, u)
    mantissa, mark, power = value_text.partition("e")
    u_mantissa = u_text.partition("e")[0]
    digits = u_mantissa.replace(".", "").lstrip("0") if u_mantissa.startswith("0.") else u_mantissa
    return f"{mantissa}({digits}){mark}{power}"

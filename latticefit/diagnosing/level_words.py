"""The level of a heat capacity in one sentence with numbers."""

from __future__ import annotations

from collections.abc import Sequence

from ..records import LevelExplanation, LevelFinding
from ..rounding import round_to_uncertainty

__all__ = ["explained", "level_sentence", "mode_sum_text"]


def level_sentence(finding: LevelFinding) -> str:
    """Return what was found of the level, the numbers, and the slips that would explain it."""
    if finding.ratio_to_classical is None or finding.temperature is None:
        return f"the level cannot be judged: {finding.reason}"
    at_top = f"{_number(finding.ratio_to_classical)} times 3nR at {finding.temperature:.4g} K"
    if finding.verdict == "not judged":
        return f"the level cannot be judged: {finding.reason} (the heat capacity is {at_top})"
    counted = None
    if finding.mode_sum_ratio is not None and finding.mode_sum_u is not None:
        counted = f"the modes add up to {mode_sum_text(finding.mode_sum_ratio, finding.mode_sum_u)} of 3 per atom"
    if finding.verdict == "plausible":
        facts = [f"the heat capacity is {at_top}", _thetas(finding), counted]
        return f"plausible: {', '.join(each for each in facts if each)}"
    if finding.verdict == "suspicious":
        return f"{counted}; {explained(finding.explanations, finding.mode_sum_ratio)}"
    what = f"the heat capacity is {at_top}, which no solid reaches"
    if finding.ratio_to_classical < 1:
        what = f"the heat capacity is {at_top}, {_thetas(finding)}, which no solid has"
    return (
        f"{what}{'' if counted is None else f' ({counted})'}; {explained(finding.explanations, finding.mode_sum_ratio)}"
    )


def explained(explanations: Sequence[LevelExplanation], ratio: float | None) -> str:
    """Return the slips that would give a level, as the second half of a sentence; `ratio` is the mode sum over 3n."""
    if explanations:
        return "that is what " + ", or what ".join(_explanation(each) for each in explanations)
    words = "no single slip of unit, mass, formula or water gives that; check mass, molar mass, formula and addenda"
    if ratio is not None and ratio < 1:
        return f"{words}, unless stiff modes are not excited yet"
    return f"{words}, unless something beside the lattice adds to it (a transition, magnetism, a melting point nearby)"


def _explanation(each: LevelExplanation) -> str:
    return f"{each.words} would give ({_number(each.expected)}): {each.remedy}"


def _thetas(finding: LevelFinding) -> str:
    if finding.theta_low is None or finding.theta_high is None:
        return ""
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

"""The level of a heat capacity as reports show it: one line of words, and the record of result.json."""

from __future__ import annotations

from typing import Any

from ..records import LevelFinding

__all__ = ["level_is_in_doubt", "level_record", "level_text"]


def level_is_in_doubt(finding: LevelFinding | None) -> bool:
    """Whether a level is to be pointed out: suspicious or impossible."""
    return finding is not None and finding.verdict in ("suspicious", "impossible")


def level_text(finding: LevelFinding) -> str:
    """Return the verdict on a level and the numbers behind it in one line."""
    return f"{finding.verdict}: {finding.sentence}" if level_is_in_doubt(finding) else finding.sentence


def level_record(finding: LevelFinding | None) -> dict[str, Any] | None:
    """Return what was found of a level as plain dicts, lists, numbers and None."""
    if finding is None:
        return None
    return {
        "verdict": finding.verdict,
        "reason": finding.reason,
        "temperature_K": finding.temperature,
        "ratio_to_classical": finding.ratio_to_classical,
        "theta_debye_pointwise_K": [finding.theta_low, finding.theta_high],
        "mode_sum_ratio": finding.mode_sum_ratio,
        "mode_sum_u": finding.mode_sum_u,
        "explanations": [
            {"slip": each.slip, "words": each.words, "expected_ratio": each.expected, "remedy": each.remedy}
            for each in finding.explanations
        ],
        "text": finding.sentence,
    }

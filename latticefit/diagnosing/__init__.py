"""Residual statistics, validity facts, the verdict in words, and the named warnings."""

from __future__ import annotations

from typing import TYPE_CHECKING

from ..lazy import on_first_use

if TYPE_CHECKING:
    from .case import Case
    from .diagnosis import diagnose
    from .level import LEVEL_IMPOSSIBLE, examine_level, examine_prepared_level
    from .level_words import explained, level_sentence
    from .reach import (
        REACH_STOP,
        REACH_WARN,
        TOP_STOP,
        Reach,
        high_temperature_ratio,
        low_temperature_reach,
        theta_debye_two,
    )
    from .rules import RULES, find_warnings
    from .statistics import akaike, bayes, durbin_watson, lag1_correlation, residual_statistics, runs_test

__all__ = [
    "LEVEL_IMPOSSIBLE",
    "REACH_STOP",
    "REACH_WARN",
    "RULES",
    "TOP_STOP",
    "Case",
    "Reach",
    "akaike",
    "bayes",
    "diagnose",
    "durbin_watson",
    "examine_level",
    "examine_prepared_level",
    "explained",
    "find_warnings",
    "high_temperature_ratio",
    "lag1_correlation",
    "level_sentence",
    "low_temperature_reach",
    "residual_statistics",
    "runs_test",
    "theta_debye_two",
]

__getattr__ = on_first_use(
    __name__,
    {
        "case": ("Case",),
        "diagnosis": ("diagnose",),
        "level": ("LEVEL_IMPOSSIBLE", "examine_level", "examine_prepared_level"),
        "level_words": ("explained", "level_sentence"),
        "reach": (
            "REACH_STOP",
            "REACH_WARN",
            "TOP_STOP",
            "Reach",
            "high_temperature_ratio",
            "low_temperature_reach",
            "theta_debye_two",
        ),
        "rules": (
            "RULES",
            "find_warnings",
        ),
        "statistics": (
            "akaike",
            "bayes",
            "durbin_watson",
            "lag1_correlation",
            "residual_statistics",
            "runs_test",
        ),
        "verdict": (),
    },
)

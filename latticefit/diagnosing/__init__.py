"""Residual statistics, validity facts, the verdict in words, and the named warnings."""

from __future__ import annotations

from typing import TYPE_CHECKING

from ..lazy import on_first_use

if TYPE_CHECKING:
    from .case import Case
    from .diagnosis import diagnose
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
    "find_warnings",
    "high_temperature_ratio",
    "lag1_correlation",
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

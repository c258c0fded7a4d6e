"""Residual statistics, validity facts, the verdict in words, and the named warnings."""

from .diagnose import diagnose
from .rules import REACH_STOP, REACH_WARN, RULES, Case, find_warnings
from .statistics import akaike, bayes, durbin_watson, lag1_correlation, residual_statistics, runs_test
from .verdict import validity_facts, verdict

__all__ = [
    "REACH_STOP",
    "REACH_WARN",
    "RULES",
    "Case",
    "akaike",
    "bayes",
    "diagnose",
    "durbin_watson",
    "find_warnings",
    "lag1_correlation",
    "residual_statistics",
    "runs_test",
    "validity_facts",
    "verdict",
]

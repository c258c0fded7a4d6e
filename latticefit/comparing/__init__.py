"""Candidate models on the same data: the ladder, plausibility, ranking, and the choice in one sentence."""

from .compare import TIE, Compared, choose, compare, name_of
from .ladder import LADDER, candidates
from .plausible import SAME_THETA, objections

__all__ = ["LADDER", "SAME_THETA", "TIE", "Compared", "candidates", "choose", "compare", "name_of", "objections"]

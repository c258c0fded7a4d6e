"""Physical contributions to the heat capacity, one file each, and their registry."""

from .registry import TERMS, term
from .term import ParameterSpec, Term

__all__ = ["TERMS", "ParameterSpec", "Term", "term"]

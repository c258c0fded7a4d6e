"""Lattice heat capacity: Einstein, Debye and mixed phonon models fitted to measured Cp(T)."""

from ._version import __version__

__all__ = ["__version__"]

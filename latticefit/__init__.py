"""Lattice heat capacity: Einstein, Debye and mixed phonon models fitted to measured Cp(T).

>>> import latticefit as lf
>>> measurement = lf.read("run.csv", formula="Cu")  # doctest: +SKIP
>>> fit = lf.fit(measurement, terms="debye + einstein + electronic", cp_cv="nernst-lindemann")  # doctest: +SKIP
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

from ._version import __version__

if TYPE_CHECKING:
    from . import functions, models
    from .calls import Fit, Saved, fit, load, rank, read, write_measurement
    from .errors import FitError, InputError, LatticefitError
    from .records import Measurement

__all__ = [
    "Fit",
    "FitError",
    "InputError",
    "LatticefitError",
    "Measurement",
    "Saved",
    "__version__",
    "fit",
    "functions",
    "load",
    "models",
    "rank",
    "read",
    "write_measurement",
]

_HOME = {
    "Fit": "calls",
    "FitError": "errors",
    "InputError": "errors",
    "LatticefitError": "errors",
    "Measurement": "records",
    "Saved": "calls",
    "load": "calls",
    "rank": "calls",
    "fit": "calls",
    "read": "calls",
    "write_measurement": "calls",
}


def __getattr__(name: str) -> Any:
    """Import on first use, so that ``latticefit --help`` does not wait for pandas and lmfit."""
    if name in ("functions", "models"):
        return import_module(f".{name}", __name__)
    if name in _HOME:
        return getattr(import_module(f".{_HOME[name]}", __name__), name)
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")


def __dir__() -> list[str]:
    return __all__

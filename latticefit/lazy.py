"""Names of a package that are imported on first use, so that a command waits only for what it needs."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from importlib import import_module
from typing import Any

__all__ = ["on_first_use"]


def on_first_use(package: str, homes: Mapping[str, tuple[str, ...]]) -> Callable[[str], Any]:
    """Return the ``__getattr__`` of a package whose names live in its modules.

    Parameters
    ----------
    package : str
        Its ``__name__``.
    homes : mapping
        Names by module.
    """
    home_of = {name: module for module, names in homes.items() for name in names}

    def get(name: str) -> Any:
        if name in home_of:
            return getattr(import_module(f".{home_of[name]}", package), name)
        raise AttributeError(f"module {package!r} has no attribute {name!r}")

    return get

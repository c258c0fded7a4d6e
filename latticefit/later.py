"""Words of the agreed command line and run sheet that this version cannot act on: refused by name, never ignored.

Whoever builds one removes it here.
"""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType

__all__ = ["LATER_COMMANDS", "LATER_KEYS", "LATER_OPTIONS"]

LATER_KEYS: Mapping[str, frozenset[str]] = MappingProxyType(
    {
        "": frozenset[str](),
        "sample": frozenset(("density", "scale_uncertainty")),
        "run": frozenset[str](),
        "model": frozenset[str](),
        "report": frozenset[str](),
    }
)
"""Keys of the run sheet by table; the tables themselves stand under the empty name."""

LATER_OPTIONS: frozenset[str] = frozenset(f"--{key.replace('_', '-')}" for keys in LATER_KEYS.values() for key in keys)
"""Options: the same words as the keys, and those that have no key."""

LATER_COMMANDS: frozenset[str] = frozenset(("batch", "elastic", "excess"))

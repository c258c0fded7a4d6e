"""What every record rests on: the array type, a few literal types, and read-only arrays."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import fields
from types import MappingProxyType
from typing import Literal

import numpy as np
from numpy.typing import NDArray

__all__ = ["Basis", "FloatArray", "Frozen", "Level", "Quantity", "SigmaKind", "empty"]

FloatArray = NDArray[np.float64]
Basis = Literal["mol", "gram", "sample"]
Quantity = Literal["Cp", "Cv"]
SigmaKind = Literal["stated", "estimated"]
Level = Literal["note", "warn", "stop"]


class Frozen:
    """Make every array of a frozen dataclass read-only and every mapping a read-only view."""

    def __post_init__(self) -> None:
        for entry in fields(self):  # type: ignore[arg-type]
            value = getattr(self, entry.name)
            if isinstance(value, np.ndarray):
                held = value.copy()
                held.flags.writeable = False
                object.__setattr__(self, entry.name, held)
            elif isinstance(value, dict):
                object.__setattr__(self, entry.name, MappingProxyType(dict(value)))


def empty() -> Mapping[str, float]:
    """Return an empty read-only mapping, the default of settings by parameter name."""
    return MappingProxyType({})

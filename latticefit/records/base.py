"""What every record rests on: the array type, a few literal types, and read-only arrays and mappings."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import fields
from typing import Any, Literal, TypeVar

import numpy as np
from numpy.typing import NDArray

__all__ = [
    "Basis",
    "FloatArray",
    "Frozen",
    "Level",
    "LevelVerdict",
    "ParameterStatus",
    "Quantity",
    "ReadOnly",
    "Replicates",
    "SigmaKind",
    "TemperatureScale",
    "empty",
]

FloatArray = NDArray[np.float64]
Basis = Literal["mol", "gram", "sample"]
Quantity = Literal["Cp", "Cv"]
SigmaKind = Literal["stated", "estimated"]
Replicates = Literal["keep", "average", "drop-first"]
TemperatureScale = Literal["ITS-90", "IPTS-68"]
Level = Literal["note", "warn", "stop"]
LevelVerdict = Literal["plausible", "suspicious", "impossible", "not judged"]
ParameterStatus = Literal["fitted", "fixed", "tied", "at_bound", "undetermined"]

Value = TypeVar("Value")


class ReadOnly(Mapping[str, Value]):
    """A mapping that cannot be changed; unlike the one of the standard library it is pickled, copied and hashed."""

    __slots__ = ("_held",)

    def __init__(self, held: Mapping[str, Value]) -> None:
        self._held: dict[str, Value] = {name: _read_only(value) for name, value in held.items()}

    def __getitem__(self, name: str) -> Value:
        return self._held[name]

    def __iter__(self) -> Iterator[str]:
        return iter(self._held)

    def __len__(self) -> int:
        return len(self._held)

    def __hash__(self) -> int:
        return hash(frozenset(self._held.items()))

    def __repr__(self) -> str:
        return repr(self._held)

    def __reduce__(self) -> tuple[type[ReadOnly[Value]], tuple[dict[str, Value]]]:
        # made anew, because an array that is unpickled or copied can be written to
        return type(self), (self._held,)


def _read_only(value: Any) -> Any:  # whatever it is given comes back, read-only where it can be
    if isinstance(value, np.ndarray):
        held = value.copy()
        held.flags.writeable = False
        return held
    return ReadOnly(value) if isinstance(value, dict) else value


class Frozen:
    """Make every array of a frozen dataclass read-only and every dict a read-only mapping, also in copies of it."""

    def __post_init__(self) -> None:
        for entry in fields(self):  # type: ignore[arg-type]
            object.__setattr__(self, entry.name, _read_only(getattr(self, entry.name)))

    def __setstate__(self, state: dict[str, Any]) -> None:
        """Fill a copy or an unpickled record: numpy does not keep arrays read-only on that way."""
        for name, value in state.items():
            object.__setattr__(self, name, _read_only(value))


def empty() -> Mapping[str, float]:
    """Return an empty read-only mapping, the default of settings by parameter name."""
    return ReadOnly({})

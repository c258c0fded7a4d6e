"""Reading a saved result back: result.json becomes the fit it holds, without the data and without a refit."""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import dataclass
from math import inf
from pathlib import Path
from typing import Any, get_args

import numpy as np

from ..constants import STANDARD_TEMPERATURE
from ..deriving.amounts import Amount, difference_per, table_per
from ..deriving.differences import energy_differences
from ..deriving.thermodynamic_table import default_grid, functions_table
from ..errors import InputError
from ..models import build_model
from ..reading.options import parse_grid
from ..records import (
    EnergyDifference,
    FitRecord,
    FloatArray,
    ParameterStatus,
    ParameterValue,
    Sample,
    SavedResult,
    ThermodynamicTable,
)
from ..terms import ParameterSpec
from .result import SCHEMA

__all__ = ["evaluate", "read_result"]

_MOST_BYTES = 100_000_000
_TINY, _LARGEST, _HUGE = 1e-6, 1e6, 1e300  # what temperatures, masses and atoms, and any number, can be


def read_result(path: Path) -> SavedResult:
    """Read a result.json, or the one in a report folder.

    Parameters
    ----------
    path : Path
        The file, or the folder that holds it.

    Returns
    -------
    SavedResult
        Everything that is needed to evaluate the model on any grid.

    Raises
    ------
    InputError
        When the file is missing, is no latticefit result, or lacks something.
    """
    file = path / "result.json" if path.is_dir() else path
    record = _load(file)
    schema = record.get("schema") if isinstance(record, dict) else None
    if schema != SCHEMA:
        raise InputError(f"{file} is no latticefit result (its schema is {schema!r}, not {SCHEMA!r})")
    try:
        return _saved(_Part(record, ""))
    except _WrongError as error:
        raise InputError(f"{file} is not a complete latticefit result: {error}") from None
    except InputError as error:  # an unknown term or form of Cp-Cv
        raise InputError(f"{file} is not a complete latticefit result: {error}") from None


def _load(file: Path) -> Any:
    try:
        if file.stat().st_size > _MOST_BYTES:
            raise InputError(f"{file} is too large to be a latticefit result")
        return json.loads(file.read_text(encoding="utf-8"), parse_constant=_refuse_constant)
    except FileNotFoundError:
        raise InputError(f"{file}: there is no such file; give a result.json or a report folder") from None
    except OSError as error:
        raise InputError(f"{file} cannot be read ({error.strerror or error})") from None
    except (ValueError, RecursionError):
        raise InputError(f"{file} is no latticefit result: it is not JSON") from None


def _refuse_constant(name: str) -> float:
    raise ValueError(f"{name} is no JSON")


class _WrongError(Exception):
    """A part of the record is missing or cannot be what it says."""


@dataclass(frozen=True)
class _Part:
    """A table of the record with its path, giving checked values."""

    content: Any
    path: str

    def __post_init__(self) -> None:
        if not isinstance(self.content, dict):
            raise _WrongError(f"{self.path or 'it'} is no table")

    def _value(self, key: str) -> Any:
        if key not in self.content:
            raise _WrongError(f"{self.path}{key} is missing")
        return self.content[key]

    def _wrong(self, key: str) -> _WrongError:
        return _WrongError(f"{self.path}{key} cannot be {str(self.content[key])[:40]!r}")

    def part(self, key: str) -> _Part:
        return _Part(self._value(key), f"{self.path}{key}.")

    def text(self, key: str) -> str:
        if not isinstance(self._value(key), str):
            raise self._wrong(key)
        return str(self.content[key])

    def one_of(self, key: str, *choices: str) -> Any:
        if self.text(key) not in choices:
            raise self._wrong(key)
        return self.content[key]

    def flag(self, key: str) -> bool:
        if not isinstance(self._value(key), bool):
            raise self._wrong(key)
        return bool(self.content[key])

    def number(self, key: str, low: float = -_HUGE, high: float = _HUGE) -> float:
        value = self._value(key)
        if isinstance(value, bool) or not isinstance(value, (int, float)) or not low <= value <= high:
            raise self._wrong(key)
        return float(value)

    def optional(self, key: str, low: float = -_HUGE, high: float = _HUGE) -> float | None:
        return None if self.content.get(key) is None else self.number(key, low, high)

    def square(self, key: str, size: int) -> FloatArray:
        try:
            matrix = np.array(self._value(key), dtype=float)
        except (TypeError, ValueError):
            raise _WrongError(f"{self.path}{key} is no matrix of numbers") from None
        sound = matrix.shape == (size, size) and np.isfinite(matrix).all() and np.all(np.diag(matrix) >= 0)
        if not sound or not np.allclose(matrix, matrix.T, rtol=1e-6, atol=0):
            raise _WrongError(f"{self.path}{key} is no covariance of {size} parameters")
        return matrix


def _saved(record: _Part) -> SavedResult:
    sample, data = record.part("sample"), record.part("data")
    mass = sample.optional("molar_mass_g_mol", _TINY, _LARGEST)
    lowest = data.number("temperature_min_K", _TINY, _LARGEST)
    return SavedResult(
        sample=Sample(
            name=sample.text("name"),
            formula=None if sample.content.get("formula") is None else sample.text("formula"),
            atoms=sample.optional("atoms_per_formula_unit", _TINY, _LARGEST),
            molar_mass=None if mass is None else mass / 1e3,
            melting_point=sample.optional("melting_point_K", _TINY, _LARGEST),
        ),
        quantity=data.one_of("quantity", "Cp", "Cv"),
        lowest=lowest,
        highest=data.number("temperature_max_K", lowest, _LARGEST),
        fit=_fit(record),
        describes=record.part("verdict").flag("describes"),
    )


def _fit(record: _Part) -> FitRecord:
    chosen, fit, covariance = record.part("model"), record.part("fit"), record.part("covariance")
    model = build_model(chosen.text("terms"), chosen.text("cp_cv"))
    entries = record.part("parameters")
    if set(model.names) != set(entries.content) or covariance.content.get("names") != list(model.names):
        raise _WrongError(f"its parameters are not those of {model.expression!r}")
    parameters = tuple(
        _parameter(name, spec, entries.part(name)) for name, spec in zip(model.names, model.specs, strict=True)
    )
    size = len(model.names)
    return FitRecord(
        terms=model.expression,
        mode_sum=chosen.one_of("mode_sum", "fixed", "free"),
        cp_cv=model.cp_cv.name,
        atoms=record.part("sample").optional("atoms_per_formula_unit", _TINY, _LARGEST),
        names=model.names,
        values=np.array([each.value for each in parameters]),
        covariance=covariance.square("matrix", size),
        carried=None if covariance.content.get("carried") is None else covariance.square("carried", size),
        parameters=parameters,
        covariance_kind=covariance.one_of("kind", "absolute", "scaled"),
        scale_factor=covariance.number("scale_factor", 0.0),
        condition=inf if fit.content.get("condition") is None else fit.number("condition"),
        converged=fit.flag("converged"),
        message=fit.text("message"),
        chi_square=fit.number("chi_square", 0.0),
        degrees_of_freedom=int(fit.number("degrees_of_freedom", 0)),
        free_parameters=int(fit.number("free_parameters", 0)),
        evaluations=int(fit.number("evaluations", 0)),
        starts_tried=int(fit.number("starts_tried", 0)),
        distinct_minima=int(fit.number("distinct_minima", 0)),
    )


def _parameter(name: str, spec: ParameterSpec, entry: _Part) -> ParameterValue:
    value = entry.number("value", spec.low, spec.high)
    low, high, start = (entry.optional(key) for key in ("low", "high", "start"))
    return ParameterValue(
        name=name,
        value=value,
        u=entry.optional("u", 0.0),
        u_fit=entry.optional("u_fit", 0.0),
        unit=entry.text("unit"),
        status=entry.one_of("status", *get_args(ParameterStatus)),
        low=-inf if low is None else low,
        high=inf if high is None else high,
        start=value if start is None else start,
        meaning=entry.text("meaning"),
    )


def evaluate(
    saved: SavedResult,
    grid: str | Sequence[float] | None,
    pairs: Sequence[tuple[float, float]] = (),
    per: Amount = "mol",
) -> tuple[ThermodynamicTable, tuple[EnergyDifference, ...]]:
    """Evaluate a saved result: its table on a grid, and differences between pairs of temperatures.

    Parameters
    ----------
    saved : SavedResult
    grid : str, numbers or None
        Temperatures in K, a text as for `fit`; the standard grid when None. 298.15 K is added to a text or standard
        grid, numbers are taken in their order.
    pairs : sequence of (low, high)
        K.
    per : {"mol", "g", "kg"}

    Raises
    ------
    InputError
        For an unreadable grid, or an amount that needs an unknown molar mass.
    """
    if grid is None or isinstance(grid, str):
        wanted = default_grid(saved.lowest, saved.highest) if grid is None else np.array(parse_grid(grid))
        T = np.union1d(wanted, [STANDARD_TEMPERATURE])
    else:
        T = np.array(grid, dtype=float)
    table = functions_table(saved.fit, T, saved.lowest, saved.highest, saved.quantity, saved.describes)
    differences = energy_differences(saved, pairs)
    return (
        table_per(table, saved.sample, per),
        tuple(difference_per(each, saved.sample, per) for each in differences),
    )

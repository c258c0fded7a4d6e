"""Reading a saved result back: result.json becomes the fit it holds, without the data and without a refit."""

from __future__ import annotations

import json
from collections.abc import Sequence
from math import inf
from pathlib import Path
from typing import Any, cast

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
    ParameterValue,
    Quantity,
    Sample,
    SavedResult,
    ThermodynamicTable,
)
from .result import SCHEMA

__all__ = ["evaluate", "read_result"]

_MOST_BYTES = 100_000_000


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
        return _saved(record)
    except (KeyError, TypeError, ValueError, IndexError) as error:
        raise InputError(f"{file} is not a complete latticefit result: {error!r} is missing or wrong") from None


def _load(file: Path) -> Any:
    try:
        if file.stat().st_size > _MOST_BYTES:
            raise InputError(f"{file} is too large to be a latticefit result")
        return json.loads(file.read_text(encoding="utf-8"))
    except FileNotFoundError:
        raise InputError(f"{file}: there is no such file; give a result.json or a report folder") from None
    except OSError as error:
        raise InputError(f"{file} cannot be read ({error.strerror or error})") from None
    except (ValueError, RecursionError):
        raise InputError(f"{file} is no latticefit result: it is not JSON") from None


def _saved(record: dict[str, Any]) -> SavedResult:
    sample, data = record["sample"], record["data"]
    mass = sample["molar_mass_g_mol"]
    return SavedResult(
        sample=Sample(
            name=str(sample["name"]),
            formula=sample["formula"],
            atoms=sample["atoms_per_formula_unit"],
            molar_mass=None if mass is None else float(mass) / 1e3,
            melting_point=sample.get("melting_point_K"),
        ),
        quantity=cast(Quantity, data["quantity"]),
        lowest=float(data["temperature_min_K"]),
        highest=float(data["temperature_max_K"]),
        fit=_fit(record),
        describes=bool(record["verdict"]["describes"]),
    )


def _fit(record: dict[str, Any]) -> FitRecord:
    model, fit, covariance = record["model"], record["fit"], record["covariance"]
    names = build_model(model["terms"], model["cp_cv"]).names
    if set(names) != set(record["parameters"]) or list(covariance["names"]) != list(names):
        raise ValueError(f"the parameters of {model['terms']!r}")
    parameters = tuple(_parameter(name, record["parameters"][name]) for name in names)
    matrix = np.array(covariance["matrix"], dtype=float)
    if matrix.shape != (len(names), len(names)):
        raise ValueError("the covariance matrix")
    return FitRecord(
        terms=model["terms"],
        mode_sum=model["mode_sum"],
        cp_cv=model["cp_cv"],
        atoms=record["sample"]["atoms_per_formula_unit"],
        names=names,
        values=np.array([each.value for each in parameters]),
        covariance=matrix,
        parameters=parameters,
        covariance_kind=covariance["kind"],
        scale_factor=float(covariance["scale_factor"]),
        condition=inf if fit["condition"] is None else float(fit["condition"]),
        converged=bool(fit["converged"]),
        message=str(fit["message"]),
        chi_square=float(fit["chi_square"]),
        degrees_of_freedom=int(fit["degrees_of_freedom"]),
        free_parameters=int(fit["free_parameters"]),
        evaluations=int(fit["evaluations"]),
        starts_tried=int(fit["starts_tried"]),
        distinct_minima=int(fit["distinct_minima"]),
    )


def _parameter(name: str, entry: dict[str, Any]) -> ParameterValue:
    return ParameterValue(
        name=name,
        value=float(entry["value"]),
        u=entry["u"],
        u_fit=entry["u_fit"],
        unit=str(entry["unit"]),
        status=entry["status"],
        low=-inf if entry["low"] is None else float(entry["low"]),
        high=inf if entry["high"] is None else float(entry["high"]),
        start=float(entry["value"] if entry["start"] is None else entry["start"]),
        meaning=str(entry["meaning"]),
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

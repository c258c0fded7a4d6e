"""The tables of a result as pandas DataFrames, units in the column names, for notebooks."""

from __future__ import annotations

from dataclasses import asdict

import pandas as pd

from ..records import Analysis, Comparison, FitRecord, ThermodynamicTable
from .ranking import comparison_record
from .result import thermodynamic_rows
from .tables import residual_rows

__all__ = [
    "characteristic_temperatures_frame",
    "functions_frame",
    "parameters_frame",
    "parameters_of",
    "ranking_frame",
    "residuals_frame",
    "warnings_frame",
]


def parameters_frame(analysis: Analysis) -> pd.DataFrame:
    """Return the parameters, one row each, by name; values in SI, the unit of each in column `unit`."""
    return parameters_of(analysis.fit)


def ranking_frame(comparison: Comparison) -> pd.DataFrame:
    """Return the candidates, plausible ones first, by AICc; ``attrs["because"]`` says why the chosen one was."""
    rows = [
        {**candidate, "reasons": "; ".join(candidate["reasons"]), "chosen": k == comparison.chosen}
        for k, candidate in enumerate(comparison_record(comparison)["candidates"])
    ]
    frame = pd.DataFrame(rows).sort_values(["plausible", "aicc"], ascending=[False, True], ignore_index=True)
    frame.attrs["because"] = comparison.because
    return frame


def parameters_of(fit: FitRecord) -> pd.DataFrame:
    """Return the parameters of a fit, as `parameters_frame`."""
    columns = ["name", "value", "u", "u_fit", "unit", "status", "low", "high", "start", "meaning"]
    rows = [{key: getattr(each, key) for key in columns} for each in fit.parameters]
    return _numeric(pd.DataFrame(rows, columns=columns).set_index("name"), ["value", "u", "u_fit"])


def characteristic_temperatures_frame(analysis: Analysis) -> pd.DataFrame:
    """Return the characteristic temperatures in K, one row each, by key; NaN where the value is withheld."""
    rows = [
        {
            "key": each.key,
            "symbol": each.symbol,
            "value_K": each.value,
            "u_K": each.u,
            "u_fit_K": each.u_fit,
            "low_K": each.low,
            "high_K": each.high,
            "status": each.status,
            "reason": each.reason,
            "definition": each.definition,
            "source": each.source,
        }
        for each in analysis.derived.characteristic_temperatures
    ]
    return _numeric(pd.DataFrame(rows).set_index("key"), ["value_K", "u_K", "u_fit_K", "low_K", "high_K"])


def residuals_frame(analysis: Analysis) -> pd.DataFrame:
    """Return every row of the files with its residual, columns as in residuals.csv; `used` is True or False."""
    frame = pd.DataFrame(residual_rows(analysis))
    frame["used"] = frame["used"] == "yes"
    numbers = [name for name in frame.columns if name.endswith(("_K", "_percent", "_normalised"))]
    return _numeric(frame, numbers)


def warnings_frame(analysis: Analysis) -> pd.DataFrame:
    """Return the warnings, one row each, gravest first; empty with its columns where there are none."""
    columns = ["code", "level", "concerns", "message", "found", "threshold", "advice"]
    return pd.DataFrame([asdict(each) for each in analysis.warnings], columns=columns)


def functions_frame(table: ThermodynamicTable) -> pd.DataFrame:
    """Return the thermodynamic functions, columns as in table.csv; NaN where a value is withheld."""
    frame = pd.DataFrame(thermodynamic_rows(table))
    return _numeric(frame, [name for name in frame.columns if name not in {"origin", "u_reason"}])


def _numeric(frame: pd.DataFrame, columns: list[str]) -> pd.DataFrame:
    """Make None a NaN in columns of numbers, also where a whole column is empty."""
    return frame.astype(dict.fromkeys(columns, float))

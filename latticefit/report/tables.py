"""table.csv and residuals.csv: full precision, and no cell that a spreadsheet would run as a formula."""

from __future__ import annotations

import csv
import io
from collections.abc import Sequence
from typing import Any

from ..records import Analysis
from ..wording import harmless
from .points import measured_points
from .result import thermodynamic_rows

__all__ = ["residual_rows", "residuals_csv", "table_csv"]

_LEFT_OUT, _AVERAGED = "the row was left out at reading", "the mean of its set has one"
_FORMULA_MARKS = ("=", "+", "-", "@")


def table_csv(analysis: Analysis) -> str:
    """Return the thermodynamic functions on the grid; columns are the keys of `thermodynamic_functions`."""
    return _csv(thermodynamic_rows(analysis.derived.table))


def residuals_csv(analysis: Analysis) -> str:
    """Return every row of the files, fitted, masked or left out at reading, with its residual and theta_D(T)."""
    return _csv(residual_rows(analysis))


def residual_rows(analysis: Analysis) -> list[dict[str, Any]]:
    """Return the rows of residuals.csv in the order of the files; None where a value is not known."""
    rows = [*_measured_rows(analysis), *_excluded_rows(analysis)]
    return [row for _, row in sorted(rows, key=lambda pair: (pair[0], pair[1]["line"]))]


def _place(analysis: Analysis, run: int, line: int) -> dict[str, Any]:
    reading = analysis.measurement.readings[run]
    return {"file": reading.file, "run": reading.label, "line": line}


def _known(value: float) -> float | None:
    return None if value != value else float(value)


def _measured_rows(analysis: Analysis) -> list[tuple[int, dict[str, Any]]]:
    points, theta = measured_points(analysis), analysis.derived.pointwise_theta
    addenda = analysis.measurement.addenda
    rows = [
        _place(analysis, int(points.run[i]), int(points.line[i]))
        | {
            "temperature_K": _known(points.temperature[i]),
            "heat_capacity_J_mol_K": _known(points.heat_capacity[i]),
            **({} if addenda is None else {"addenda_J_mol_K": _known(addenda[i])}),
            "sigma_J_mol_K": _known(points.sigma[i]),
            "model_J_mol_K": _known(points.model[i]),
            "residual_J_mol_K": _known(points.residual[i]),
            "residual_percent": _known(points.residual_percent[i]),
            "residual_normalised": _known(points.residual_normalised[i]),
            "used": "yes" if points.used[i] else "no",
            "reason": points.reasons[i],
            "flag": points.flags[i],
            "theta_debye_K": _known(theta.theta[i]),
            "theta_debye_u_K": _known(theta.u[i]),
            "theta_debye_reason": theta.reasons[i],
        }
        for i in range(points.temperature.size)
    ]
    return list(zip(points.run.tolist(), rows, strict=True))


def _excluded_rows(analysis: Analysis) -> list[tuple[int, dict[str, Any]]]:
    excluded = analysis.measurement.excluded
    rows = [
        _place(analysis, each.run, each.line)
        | {
            "temperature_K": _known(each.temperature),
            "heat_capacity_J_mol_K": _known(each.heat_capacity),
            **({} if analysis.measurement.addenda is None else {"addenda_J_mol_K": None}),
            "sigma_J_mol_K": _known(each.sigma),
            "model_J_mol_K": None,
            "residual_J_mol_K": None,
            "residual_percent": None,
            "residual_normalised": None,
            "used": "no",
            "reason": each.reason,
            "flag": None,
            "theta_debye_K": None,
            "theta_debye_u_K": None,
            "theta_debye_reason": _LEFT_OUT if each.averaged_into is None else _AVERAGED,
        }
        for each in excluded
    ]
    return list(zip((each.run for each in excluded), rows, strict=True))


def _cell(value: Any) -> str:
    """A number in full precision, a text without control characters that no spreadsheet takes for a formula."""
    if value is None:
        return ""
    if isinstance(value, str):
        text = harmless(value)
        return f"'{text}" if text.lstrip().startswith(_FORMULA_MARKS) else text
    return repr(value)


def _csv(rows: Sequence[dict[str, Any]]) -> str:
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(rows[0])
    writer.writerows([_cell(value) for value in row.values()] for row in rows)
    return out.getvalue()

"""result.json: the whole result for machines, full precision, null where a value is not known."""

from __future__ import annotations

import json
from math import isfinite, sqrt
from typing import Any

from ..records import (
    Analysis,
    DerivedValue,
    FitRecord,
    FloatArray,
    NamedWarning,
    ParameterValue,
    ResidualStatistics,
    ThermodynamicTable,
)
from .corrections import addenda_record
from .level import level_record
from .noticed import lack_of_fit_record, overlap_record, points_averaged, points_read, rows_left_out
from .ranking import comparison_record

__all__ = ["SCHEMA", "json_text", "result_record", "thermodynamic_rows"]

SCHEMA = "latticefit-result/1"
"""Name and version of the layout of result.json."""

_ENTHALPY_NAMES = ("enthalpy{}_J_mol", "gibbs_energy_function{}_J_mol_K")
_INTERNAL_NAMES = ("internal_energy{}_J_mol", "helmholtz_energy_function{}_J_mol_K")


def _number(value: float | None) -> float | None:
    """A plain float, or None where it is missing, NaN or infinite: JSON knows neither."""
    return None if value is None or not isfinite(value) else float(value)


def _numbers(values: FloatArray) -> list[float | None]:
    return [_number(each) for each in values.tolist()]


def json_text(record: dict[str, Any]) -> str:
    """Return a result record as JSON text that is UTF-8 and free of NaN, keys in the order of the contract."""
    text = json.dumps(record, allow_nan=False, ensure_ascii=False, indent=2)
    # A file name that is no valid text holds lone surrogates: written as JSON escapes they survive any encoding.
    return text.encode("utf-8", "backslashreplace").decode("utf-8") + "\n"


def result_record(analysis: Analysis) -> dict[str, Any]:
    """Return the result as plain dicts, lists, numbers and None (schema ``latticefit-result/1``).

    Parameters
    ----------
    analysis : Analysis
        All records of one run.

    Returns
    -------
    dict
        Parameters in SI units; enough to evaluate the model on any grid with uncertainties from the covariance.
    """
    derived, provenance = analysis.derived, analysis.provenance
    return {
        "schema": SCHEMA,
        "sample": _sample(analysis),
        "data": _data(analysis),
        "model": {
            "terms": analysis.fit.terms,
            "mode_sum": analysis.fit.mode_sum,
            "cp_cv": analysis.fit.cp_cv,
            "chosen_because": analysis.comparison.because,
        },
        "comparison": comparison_record(analysis.comparison),
        "parameters": {each.name: _parameter(each) for each in analysis.fit.parameters},
        "covariance": _covariance(analysis),
        "fit": _fit(analysis),
        "residuals": _residuals(analysis.diagnosis.statistics),
        "characteristic_temperatures": {each.key: _derived_value(each) for each in derived.characteristic_temperatures},
        "zero_point_energy": _derived_value(derived.zero_point_energy),
        "thermodynamic_functions": thermodynamic_rows(derived.table),
        "components": {
            "temperature_K": _numbers(derived.table.temperature),
            "heat_capacity_J_mol_K": {name: _numbers(each) for name, each in derived.table.components.items()},
        },
        "validity": [
            {"name": each.name, "holds": bool(each.holds), "detail": each.detail}
            for each in analysis.diagnosis.validity
        ],
        "verdict": {"describes": bool(analysis.diagnosis.describes), "text": analysis.diagnosis.verdict},
        "warnings": [_warning(each) for each in analysis.warnings],
        "provenance": {
            "version": provenance.version,
            "created": provenance.created,
            "random_seed": int(provenance.random_seed),
            "packages": dict(provenance.packages),
            "command": provenance.command,
        },
    }


def _sample(analysis: Analysis) -> dict[str, Any]:
    sample = analysis.measurement.sample
    molar_mass = None if sample.molar_mass is None else round(1e3 * sample.molar_mass, 9)  # kg to g, no digit noise
    return {
        "name": sample.name,
        "formula": sample.formula,
        "atoms_per_formula_unit": _number(sample.atoms),
        "molar_mass_g_mol": _number(molar_mass),
        "melting_point_K": _number(sample.melting_point),
        "mass_mg": _number(None if sample.mass is None else round(1e6 * sample.mass, 9)),
        "mass_u_mg": _number(None if sample.mass_u is None else round(1e6 * sample.mass_u, 9)),
    }


def _data(analysis: Analysis) -> dict[str, Any]:
    measurement, prepared = analysis.measurement, analysis.prepared
    return {
        "sources": [{"file": each.file, "sha256": each.sha256, "label": each.label} for each in measurement.readings],
        "addenda": addenda_record(measurement),
        "quantity": measurement.quantity,
        "points_read": points_read(measurement),
        "points_averaged": points_averaged(measurement)[0],
        "points_fitted": int(prepared.temperature.size),
        "rows_excluded": rows_left_out(measurement),
        "temperature_min_K": _number(prepared.temperature[0]),
        "temperature_max_K": _number(prepared.temperature[-1]),
        "sigma_kind": prepared.sigma_kind,
        "sigma_text": prepared.sigma_text,
        "level": level_record(analysis.level),
        "overlaps": overlap_record(prepared.overlaps),
        "overlaps_compared": prepared.overlaps_compared,
        "repairs": [{"file": each.file, "line": each.line, "message": each.message} for each in measurement.repairs],
    }


def _parameter(parameter: ParameterValue) -> dict[str, Any]:
    return {
        "value": _number(parameter.value),
        "u": _number(parameter.u),
        "u_fit": _number(parameter.u_fit),
        "unit": parameter.unit,
        "status": parameter.status,
        "low": _number(parameter.low),
        "high": _number(parameter.high),
        "start": _number(parameter.start),
        "meaning": parameter.meaning,
    }


def _covariance(analysis: Analysis) -> dict[str, Any]:
    fit = analysis.fit
    return {
        "names": list(fit.names),
        "matrix": [_numbers(row) for row in fit.covariance],
        "carried": None if fit.carried is None else [_numbers(row) for row in fit.carried],
        "kind": fit.covariance_kind,
        "scale_factor": _number(fit.scale_factor),
        "inflation_autocorrelation": _inflation(analysis.diagnosis.statistics.lag1_correlation),
    }


def _inflation(lag1_correlation: float | None) -> float | None:
    """Factor sqrt((1+rho)/(1-rho)) by which correlated residuals make u_fit too small; 1 where rho is not positive."""
    if lag1_correlation is None or not -1 < lag1_correlation < 1:
        return None
    return sqrt((1 + lag1_correlation) / (1 - lag1_correlation)) if lag1_correlation > 0 else 1.0


def _fit(analysis: Analysis) -> dict[str, Any]:
    fit: FitRecord = analysis.fit
    statistics = analysis.diagnosis.statistics
    return {
        "converged": bool(fit.converged),
        "message": fit.message,
        "chi_square": _number(fit.chi_square),
        "chi_square_p": _number(statistics.chi_square_p),
        "degrees_of_freedom": int(fit.degrees_of_freedom),
        "reduced_chi_square": _number(statistics.reduced_chi_square),
        "aicc": _number(statistics.aicc),
        "bic": _number(statistics.bic),
        "free_parameters": int(fit.free_parameters),
        "condition": _number(fit.condition),
        "evaluations": int(fit.evaluations),
        "starts_tried": int(fit.starts_tried),
        "distinct_minima": int(fit.distinct_minima),
    }


def _residuals(statistics: ResidualStatistics) -> dict[str, Any]:
    return {
        "rms_percent": _number(statistics.rms_percent),
        "max_abs_percent": _number(statistics.max_abs_percent),
        "max_abs_percent_temperature_K": _number(statistics.max_abs_percent_temperature),
        "durbin_watson": _number(statistics.durbin_watson),
        "lag1_correlation": _number(statistics.lag1_correlation),
        "runs_test_p": _number(statistics.runs_test_p),
        "longest_run": int(statistics.longest_run),
        "lack_of_fit": lack_of_fit_record(statistics.lack_of_fit),
        "bands": [
            {
                "temperature_low_K": _number(each.temperature_low),
                "temperature_high_K": _number(each.temperature_high),
                "points": int(each.points),
                "rms_percent": _number(each.rms_percent),
                "max_abs_percent": _number(each.max_abs_percent),
            }
            for each in statistics.bands
        ],
    }


def _derived_value(value: DerivedValue) -> dict[str, Any]:
    return {
        "value": _number(value.value),
        "u": _number(value.u),
        "u_fit": _number(value.u_fit),
        "low": _number(value.low),
        "high": _number(value.high),
        "unit": value.unit,
        "symbol": value.symbol,
        "definition": value.definition,
        "source": value.source,
        "status": value.status,
        "reason": value.reason,
    }


def _warning(warning: NamedWarning) -> dict[str, Any]:
    def plain(value: float | str | None) -> float | str | None:
        return value if isinstance(value, str) else _number(value)

    return {
        "code": warning.code,
        "level": warning.level,
        "concerns": warning.concerns,
        "message": warning.message,
        "found": plain(warning.found),
        "threshold": plain(warning.threshold),
        "advice": warning.advice,
    }


def _per(name: str, table: ThermodynamicTable) -> str:
    """Name of a column with the amount that the table is for."""
    return name.replace("_J_mol", f"_J_{table.per}")


def thermodynamic_rows(table: ThermodynamicTable) -> list[dict[str, Any]]:
    """Return the rows of a table of thermodynamic functions, keys as in result.json and table.csv.

    With quantity Cv the energy is U(T)-U(0) and the function -(F(T)-U(0))/T: the keys of enthalpy and Gibbs energy
    stand there with None, those of internal and Helmholtz energy beside them.
    """
    energy_names = _INTERNAL_NAMES if table.quantity == "Cv" else _ENTHALPY_NAMES
    columns: dict[str, list[Any]] = {"temperature_K": _numbers(table.temperature)}
    named = (
        ("heat_capacity", "heat_capacity{}_J_mol_K"),
        ("energy", energy_names[0]),
        ("entropy", "entropy{}_J_mol_K"),
        ("free_energy_function", energy_names[1]),
    )
    for attribute, name in named:
        for mark in ("", "_u", "_u_fit"):
            columns[_per(name.format(mark), table)] = _numbers(getattr(table, attribute + mark))
    if table.quantity == "Cv":
        for name in _ENTHALPY_NAMES:
            for mark in ("", "_u", "_u_fit"):
                columns[_per(name.format(mark), table)] = [None] * table.temperature.size
    from_standard = "internal_energy_from_298{}_J_mol" if table.quantity == "Cv" else "enthalpy_from_298{}_J_mol"
    for mark in ("", "_u"):
        columns[_per(from_standard.format(mark), table)] = _numbers(getattr(table, "energy_from_standard" + mark))
    columns["entropy_fraction_below_data"] = _numbers(table.entropy_fraction_below_data)
    columns["origin"] = list(table.origin)
    columns["u_reason"] = list(table.u_reasons)
    return [dict(zip(columns, row, strict=True)) for row in zip(*columns.values(), strict=True)]

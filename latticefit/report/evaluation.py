"""A saved result evaluated on a grid: aligned text, CSV and JSON for the `table` command."""

from __future__ import annotations

import csv
import io
from collections.abc import Sequence
from typing import Any

from ..records import EnergyDifference, SavedResult, ThermodynamicTable
from ..wording import harmless
from .content import quantity_symbols
from .result import thermodynamic_rows
from .wording import concise, plain_number, plus_minus

__all__ = ["difference_rows", "evaluation_csv", "evaluation_record", "evaluation_text"]

_MARKS = {"measured": "", "extrapolated_below": "below", "extrapolated_above": "above"}


def _unit(per: str, kelvin: bool) -> str:
    return f"J/({per} K)" if kelvin else f"J/{per}"


def evaluation_text(
    saved: SavedResult, table: ThermodynamicTable, differences: Sequence[EnergyDifference], where: str
) -> str:
    """Return the table for people: u in brackets, columns aligned, notes below."""
    per = table.per
    energy = quantity_symbols(table.quantity)[1][0]
    symbols = (*quantity_symbols(table.quantity), f"{energy}(T)-{energy}(298)")
    kelvin = (True, False, True, True, False)
    names = ("heat_capacity", "energy", "entropy", "free_energy_function", "energy_from_standard")
    columns = [
        ["T", "K", *(plain_number(t, 6) for t in table.temperature)],
        *(
            [symbol, _unit(per, each), *map(concise, getattr(table, name), getattr(table, f"{name}_u"))]
            for symbol, each, name in zip(symbols, kelvin, names, strict=True)
        ),
        ["", "", *(_MARKS[each] for each in table.origin)],
    ]
    widths = [max(len(cell) for cell in column) for column in columns]
    lines = [f"{harmless(saved.sample.name)}: {saved.fit.terms}, {saved.fit.cp_cv}, from {harmless(where)}", ""]
    for row in zip(*columns, strict=True):
        lines.append("  ".join(cell.rjust(width) for cell, width in zip(row, widths, strict=True)).rstrip())
    lines += [
        "",
        "Brackets: standard uncertainty u (k = 1) of the last digits. below, above: outside the data.",
    ]
    lines += [f"(?): u withheld, {reason}." for reason in dict.fromkeys(r for r in table.u_reasons if r)]
    for each in differences:
        symbol = "U" if each.quantity == "Cv" else "H"
        unit = _unit(each.per, False)
        lines.append(
            f"{symbol}({each.high:g} K)-{symbol}({each.low:g} K) = {_with_u(each.energy, each.energy_u, unit)}"
        )
        lines.append(
            f"S({each.high:g} K)-S({each.low:g} K) = {_with_u(each.entropy, each.entropy_u, _unit(each.per, True))}"
        )
        lines += [f"  withheld: {each.reason}"] if each.reason else []
    return "\n".join(lines) + "\n"


def _with_u(value: float | None, u: float | None, unit: str) -> str:
    if value is None:
        return "not given"
    return plus_minus(value, u, unit) + ("" if u is not None else " (u withheld)")


def difference_rows(differences: Sequence[EnergyDifference]) -> list[dict[str, Any]]:
    """Return the differences as plain values, units in the keys."""
    return [
        {
            "temperature_low_K": each.low,
            "temperature_high_K": each.high,
            f"{'internal_energy' if each.quantity == 'Cv' else 'enthalpy'}_difference_J_{each.per}": each.energy,
            f"{'internal_energy' if each.quantity == 'Cv' else 'enthalpy'}_difference_u_J_{each.per}": each.energy_u,
            f"entropy_difference_J_{each.per}_K": each.entropy,
            f"entropy_difference_u_J_{each.per}_K": each.entropy_u,
            "u_reason": each.reason,
        }
        for each in differences
    ]


def evaluation_record(table: ThermodynamicTable, differences: Sequence[EnergyDifference]) -> dict[str, Any]:
    """Return the table and the differences for ``--json``."""
    return {"thermodynamic_functions": thermodynamic_rows(table), "differences": difference_rows(differences)}


def evaluation_csv(table: ThermodynamicTable, differences: Sequence[EnergyDifference]) -> str:
    """Return the table as CSV with full digits; the differences follow after an empty line with their own header."""
    stream = io.StringIO()
    for block in (thermodynamic_rows(table), difference_rows(differences)):
        if block:
            stream.write("\n" if stream.tell() else "")
            writer = csv.DictWriter(stream, block[0].keys(), lineterminator="\n")
            writer.writeheader()
            writer.writerows(block)
    return stream.getvalue()

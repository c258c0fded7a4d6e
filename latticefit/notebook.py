"""What a notebook holds: a finished fit, and a saved result read back."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from .deriving import functions_table
from .errors import InputError
from .reading.settings import REPORT, checked, temperatures, wrong
from .records import Analysis, FloatArray, SavedResult

if TYPE_CHECKING:
    import pandas as pd
    from matplotlib.figure import Figure

__all__ = ["Fit", "Saved"]


@dataclass(frozen=True, eq=False, repr=False)
class Fit:
    """A finished fit: DataFrames, figures and the report of one `Analysis`."""

    analysis: Analysis

    @property
    def parameters(self) -> pd.DataFrame:
        """Value, u, u_fit, unit and status of every parameter."""
        from .report import parameters_frame

        return parameters_frame(self.analysis)

    @property
    def characteristic_temperatures(self) -> pd.DataFrame:
        """theta_D(T->0), moments and equivalent Einstein temperatures, K."""
        from .report import characteristic_temperatures_frame

        return characteristic_temperatures_frame(self.analysis)

    @property
    def residuals(self) -> pd.DataFrame:
        """Every point with model, residuals, and whether it was used or why not."""
        from .report import residuals_frame

        return residuals_frame(self.analysis)

    @property
    def warnings(self) -> pd.DataFrame:
        """The named warnings, gravest first."""
        from .report import warnings_frame

        return warnings_frame(self.analysis)

    def table(self, temperature: float | Iterable[float] | FloatArray | str | None = None) -> pd.DataFrame:
        """Thermodynamic functions at temperatures in K (numbers or a grid text); the standard grid when left out."""
        from .report import functions_frame

        if temperature is None:
            return functions_frame(self.analysis.derived.table)
        wanted = temperatures(temperature, "temperature")
        fitted = self.analysis.prepared
        return functions_frame(
            functions_table(
                self.analysis.fit,
                np.array(wanted),
                float(fitted.temperature[0]),
                float(fitted.temperature[-1]),
                fitted.measurement.quantity,
                self.analysis.diagnosis.describes,
            )
        )

    def figure(self, name: str) -> Figure:
        """Draw one of the report's figures, e.g. ``"residuals"``."""
        from .report import draw_figure

        if not isinstance(name, str):
            raise wrong("name", "the name of a figure", name)
        return draw_figure(name, self.analysis)

    def save(self, out: str | Path, *, replace: bool = False, figures: str = "svg") -> Path:
        """Write the report folder and return its path."""
        from .report import write_report

        if not isinstance(out, (str, Path)) or not str(out).strip():
            raise wrong("out", "a folder to write to", out)
        checked({"figures": figures}, REPORT)
        return write_report(self.analysis, Path(out), replace, figures)

    def __repr__(self) -> str:
        from .report import summary_text

        return summary_text(self.analysis, None).rstrip()

    def __str__(self) -> str:
        from .report import text_report

        return text_report(self.analysis)

    def _repr_html_(self) -> str:
        from .report import html_summary

        return html_summary(self.analysis)


@dataclass(frozen=True, eq=False, repr=False)
class Saved:
    """A saved result: evaluated on any grid without the data and without a refit."""

    result: SavedResult

    def __repr__(self) -> str:
        saved = self.result
        return f"Saved({saved.sample.name!r}, {saved.fit.terms!r}, {saved.lowest:.4g} to {saved.highest:.4g} K)"

    @property
    def parameters(self) -> pd.DataFrame:
        """Value, u, u_fit, unit and status of every parameter."""
        from .report import parameters_of

        return parameters_of(self.result.fit)

    def table(
        self, temperature: float | Iterable[float] | FloatArray | str | None = None, per: str = "mol"
    ) -> pd.DataFrame:
        """Thermodynamic functions at temperatures in K (numbers or a grid text), per mol, g or kg."""
        from .report import evaluate, functions_frame

        wanted = None if temperature is None else temperatures(temperature, "temperature")
        return functions_frame(evaluate(self.result, wanted, (), _amount(per))[0])

    def between(self, low: float, high: float, per: str = "mol") -> pd.DataFrame:
        """Differences of energy and entropy between two temperatures in K, with u; per mol, g or kg."""
        import pandas as pd

        from .report import difference_rows, evaluate

        first, second = temperatures((low, high), "low and high")
        if not first < second:
            raise wrong("low", f"below high ({high:g} K)", low)
        found = evaluate(self.result, (first, second), ((first, second),), _amount(per))[1]
        return pd.DataFrame(difference_rows(found))


def _amount(per: Any) -> Any:
    if per not in ("mol", "g", "kg"):
        raise InputError(f"per must be 'mol', 'g' or 'kg', not {per!r}")
    return per

"""Tables, figures, text, HTML, JSON and the report folder: renderings of one `Analysis`, no arithmetic."""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from .cautions import CAUTIONS
    from .figures import FIGURES, draw_figure, render
    from .folder import check_out_folder, write_report
    from .frames import (
        characteristic_temperatures_frame,
        functions_frame,
        parameters_frame,
        residuals_frame,
        warnings_frame,
    )
    from .html import html_report, html_summary
    from .result import json_text, result_record
    from .tables import residuals_csv, table_csv
    from .text import summary_text, text_report

__all__ = [
    "CAUTIONS",
    "FIGURES",
    "characteristic_temperatures_frame",
    "check_out_folder",
    "draw_figure",
    "functions_frame",
    "html_report",
    "html_summary",
    "json_text",
    "parameters_frame",
    "render",
    "residuals_csv",
    "residuals_frame",
    "result_record",
    "summary_text",
    "table_csv",
    "text_report",
    "warnings_frame",
    "write_report",
]

_HOMES = {
    "cautions": ("CAUTIONS",),
    "figures": ("FIGURES", "draw_figure", "render"),
    "folder": ("check_out_folder", "write_report"),
    "frames": (
        "characteristic_temperatures_frame",
        "functions_frame",
        "parameters_frame",
        "residuals_frame",
        "warnings_frame",
    ),
    "html": ("html_report", "html_summary"),
    "result": ("json_text", "result_record"),
    "tables": ("residuals_csv", "table_csv"),
    "text": ("summary_text", "text_report"),
}


def __getattr__(name: str) -> Any:
    """Import on first use: matplotlib, pandas, rich and jinja2 together take a second."""
    for home, names in _HOMES.items():
        if name in names:
            return getattr(import_module(f".{home}", __name__), name)
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")

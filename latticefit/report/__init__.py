"""Tables, figures, text, HTML, JSON and the report folder: renderings of one `Analysis`, no arithmetic."""

from __future__ import annotations

from typing import TYPE_CHECKING

from ..lazy import on_first_use

if TYPE_CHECKING:
    from .cautions import CAUTIONS
    from .evaluation import difference_rows, evaluation_csv, evaluation_record, evaluation_text
    from .figures import FIGURES, draw_figure, render
    from .folder import check_out_folder, write_report
    from .frames import (
        characteristic_temperatures_frame,
        functions_frame,
        parameters_frame,
        parameters_of,
        ranking_frame,
        residuals_frame,
        warnings_frame,
    )
    from .html import html_report, html_summary
    from .measurement_file import measurement_csv, write_measurement_file
    from .ranking import comparison_record, ranking_text
    from .result import json_text, result_record
    from .saved import evaluate, read_result
    from .tables import residuals_csv, table_csv
    from .text import summary_text, text_report

__all__ = [
    "CAUTIONS",
    "FIGURES",
    "characteristic_temperatures_frame",
    "check_out_folder",
    "comparison_record",
    "difference_rows",
    "draw_figure",
    "evaluate",
    "evaluation_csv",
    "evaluation_record",
    "evaluation_text",
    "functions_frame",
    "html_report",
    "html_summary",
    "json_text",
    "measurement_csv",
    "parameters_frame",
    "parameters_of",
    "ranking_frame",
    "ranking_text",
    "read_result",
    "render",
    "residuals_csv",
    "residuals_frame",
    "result_record",
    "summary_text",
    "table_csv",
    "text_report",
    "warnings_frame",
    "write_measurement_file",
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
        "parameters_of",
        "ranking_frame",
        "residuals_frame",
        "warnings_frame",
    ),
    "evaluation": ("difference_rows", "evaluation_csv", "evaluation_record", "evaluation_text"),
    "ranking": ("comparison_record", "ranking_text"),
    "saved": ("evaluate", "read_result"),
    "html": ("html_report", "html_summary"),
    "measurement_file": ("measurement_csv", "write_measurement_file"),
    "result": ("json_text", "result_record"),
    "tables": ("residuals_csv", "table_csv"),
    "text": ("summary_text", "text_report"),
}


__getattr__ = on_first_use(__name__, _HOMES)

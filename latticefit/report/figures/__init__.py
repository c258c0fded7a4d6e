"""Figures of a report, one file each, and the registry of them."""

from __future__ import annotations

from .registry import FIGURES, ReportFigure, figure
from .rendering import draw_figure, render

__all__ = ["FIGURES", "ReportFigure", "draw_figure", "figure", "render"]

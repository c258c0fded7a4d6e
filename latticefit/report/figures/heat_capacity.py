"""Heat capacity against temperature: data, fit, components, 3nR, and the percent residuals below."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Polygon, Rectangle

from ...constants import GAS_CONSTANT
from ...records import Analysis, FloatArray, ThermodynamicTable
from ...rounding import percent_text
from ...wording import harmless
from ..points import measured_points
from ..wording import plain_number
from .drawing import PointArtists, draw_fit, draw_points, largest, mark_beyond, masked_regions
from .report_figure import ReportFigure
from .residuals import ResidualArtists, plot_residuals
from .style import (
    component_label,
    component_looks,
    heat_capacity_label,
    legend_above,
    shade_outside,
    temperature_label,
)

__all__ = ["FIGURE", "CurveArtists", "HeatCapacityArtists", "draw_curves"]


@dataclass(frozen=True)
class CurveArtists:
    """The fit over the points fitted, its extrapolations (dashed), and its components by name."""

    fit: Line2D
    extrapolated: tuple[Line2D, ...]
    components: Mapping[str, Line2D]


@dataclass(frozen=True)
class HeatCapacityArtists:
    """What the figure consists of."""

    axes: Axes
    residual_panel: ResidualArtists
    points: PointArtists
    curves: CurveArtists
    classical_limit: Line2D | None
    masks: tuple[Polygon | Rectangle, ...]


def draw_curves(axes: Axes, curve: ThermodynamicTable, scale: FloatArray) -> CurveArtists:
    """Draw the heat capacity of a model and of its components, each multiplied by `scale` (shape of the curve)."""
    T = curve.temperature
    fit, extrapolated = draw_fit(axes, curve, curve.heat_capacity * scale)
    components, looks = {}, component_looks(curve.components)
    for name, values in curve.components.items():
        colour, dashes = looks[name]
        (components[name],) = axes.plot(
            T, values * scale, color=colour, linestyle=dashes, linewidth=1.0, zorder=3.5, label=component_label(name)
        )
    return CurveArtists(fit, extrapolated, components)


def _plot_heat_capacity(axes: Axes, analysis: Analysis) -> tuple[PointArtists, CurveArtists, Line2D | None]:
    points, curve = measured_points(analysis), analysis.derived.curve
    drawn = draw_points(axes, analysis, points, points.heat_capacity, points.sigma)
    curves = draw_curves(axes, curve, np.ones_like(curve.temperature))
    limit, top = None, largest(points.heat_capacity[points.used], curve.heat_capacity)
    if analysis.fit.atoms is not None:
        level = 3 * analysis.fit.atoms * GAS_CONSTANT
        limit = axes.axhline(level, color="#555555", linewidth=0.7, linestyle=(0, (1, 2.5)), label=r"$3nR$")
        top = max(top, level)
    axes.set_xlim(0.0, max(float(curve.temperature[-1]), 1.02 * largest(points.temperature)))
    lowest = -largest(*(-each for each in curve.components.values()), np.zeros(1))
    axes.set_ylim(lowest, 1.07 * top)
    mark_beyond(axes, points, points.heat_capacity)
    axes.set_ylabel(heat_capacity_label(analysis))
    return drawn, curves, limit


def draw(figure: Figure, analysis: Analysis) -> HeatCapacityArtists:
    """Draw the heat capacity with its components, and the percent residuals in a panel below."""
    upper, lower = figure.subplots(2, 1, sharex=True, height_ratios=(3.0, 1.15))
    drawn, curves, limit = _plot_heat_capacity(upper, analysis)
    panel = plot_residuals(lower, analysis)
    hatched = [
        axes.axvspan(low, high, facecolor="none", edgecolor="#bbbbbb", hatch="////", linewidth=0.0, zorder=-4)
        for low, high in masked_regions(analysis)
        for axes in (upper, lower)
    ]
    for axes in (upper, lower):
        shade_outside(axes, analysis)
    lower.set_xlabel(temperature_label())
    legend_above(figure, upper)
    return HeatCapacityArtists(upper, panel, drawn, curves, limit, tuple(hatched))


def alt(analysis: Analysis) -> str:
    """State what was measured over which range and whether the model describes it."""
    prepared, statistics = analysis.prepared, analysis.diagnosis.statistics
    symbol = analysis.measurement.quantity
    return (
        f"{symbol} against temperature: {prepared.temperature.size} points fitted from "
        f"{plain_number(prepared.temperature[0])} to {plain_number(prepared.temperature[-1])} K with "
        f"{analysis.fit.terms}; the residuals in the panel below have an rms of "
        f"{percent_text(statistics.rms_percent)}. {harmless(analysis.diagnosis.verdict)}"
    )


FIGURE = ReportFigure("heat_capacity", "Heat capacity and its parts", 98.0, draw, alt)

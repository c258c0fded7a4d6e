"""Residuals in percent of the model against temperature, with the sigma of the points as a band."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from matplotlib.axes import Axes
from matplotlib.collections import PolyCollection
from matplotlib.figure import Figure
from matplotlib.lines import Line2D

from ...records import Analysis
from ...rounding import percent_text
from ..points import MeasuredPoints, measured_points
from ..wording import plain_number
from .drawing import PointArtists, draw_points, largest, mark_beyond
from .report_figure import ReportFigure
from .style import FIT_COLOUR, legend_above, logarithmic_temperature, temperature_label

__all__ = ["FIGURE", "ResidualArtists", "plot_residuals"]


_LARGEST_PERCENT = 200.0  # a model that vanishes as T -> 0 would stretch the frame without end


@dataclass(frozen=True)
class ResidualArtists:
    """What the residual panel consists of."""

    axes: Axes
    points: PointArtists
    band: PolyCollection
    zero: Line2D
    beyond: Line2D | None
    flagged: Line2D | None = None


def plot_residuals(axes: Axes, analysis: Analysis) -> ResidualArtists:
    """Draw percent residuals on given axes; the scale of T is left as it is.

    The frame holds every fitted point up to 200 %; what lies beyond it is marked at its edge.
    """
    points, prepared = measured_points(analysis), analysis.prepared
    model = np.abs(analysis.diagnosis.model)
    beyond_all = 2 * _LARGEST_PERCENT
    width = 100 * np.divide(prepared.sigma, model, out=np.full_like(model, beyond_all), where=model > 0)
    width = np.minimum(width, beyond_all)
    band = axes.fill_between(
        prepared.temperature, -width, width, facecolor=FIT_COLOUR, alpha=0.18, edgecolor="none", label=r"$\pm\sigma$"
    )
    zero = axes.axhline(0.0, color=FIT_COLOUR, linewidth=0.8)
    drawn = draw_points(axes, analysis, points, points.residual_percent, None)
    end = min(_LARGEST_PERCENT, 1.18 * max(largest(np.abs(points.residual_percent[points.used])), float(np.min(width))))
    axes.set_ylim(-end, end)
    beyond = mark_beyond(axes, points, points.residual_percent)
    axes.set_ylabel("residual / %")
    return ResidualArtists(axes, drawn, band, zero, beyond)


def _ring_flagged(axes: Axes, points: MeasuredPoints) -> Line2D | None:
    """Draw a ring around every point that lies too far from its neighbours; None where there is none."""
    chosen = np.array([flag is not None for flag in points.flags])
    if not chosen.any():
        return None
    (line,) = axes.plot(
        points.temperature[chosen],
        points.residual_percent[chosen],
        linestyle="none",
        marker="o",
        markersize=7.0,
        markerfacecolor="none",
        markeredgecolor="black",
        markeredgewidth=0.7,
        zorder=3.5,
        label="far from neighbours",
    )
    return line


def draw(figure: Figure, analysis: Analysis) -> ResidualArtists:
    """Draw percent residuals against the logarithm of T, with the +-sigma of the points and rings around outliers."""
    axes = figure.add_subplot()
    artists = replace(plot_residuals(axes, analysis), flagged=_ring_flagged(axes, measured_points(analysis)))
    logarithmic_temperature(axes, analysis.prepared.measurement.temperature)
    axes.set_xlabel(temperature_label())
    legend_above(figure, axes)
    return artists


def alt(analysis: Analysis) -> str:
    """State how large the residuals are, where, and whether they run in waves."""
    statistics = analysis.diagnosis.statistics
    waves = ""
    if statistics.runs_test_p is not None:
        waves = f" The longest run of one sign is {statistics.longest_run} points"
        waves += f" (runs test p = {plain_number(statistics.runs_test_p, 2)})."
    return (
        f"Percent residuals against temperature on a logarithmic axis: rms {percent_text(statistics.rms_percent)}, "
        f"largest {percent_text(statistics.max_abs_percent)} at "
        f"{plain_number(statistics.max_abs_percent_temperature)} K.{waves}"
    )


FIGURE = ReportFigure("residuals", "Residuals", 66.0, draw, alt)

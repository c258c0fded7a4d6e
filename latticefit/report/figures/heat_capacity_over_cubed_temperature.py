"""C/T^3 against the logarithm of T: plateau and hump, the most telling view of a lattice."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D

from ...records import Analysis, FloatArray, ThermodynamicTable
from ...terms import TERMS
from ..points import measured_points
from ..wording import plain_number
from .drawing import PointArtists, draw_points, largest, mark_beyond
from .heat_capacity import CurveArtists, draw_curves
from .report_figure import ReportFigure
from .style import legend_above, logarithmic_temperature, shade_outside, temperature_label

__all__ = ["FIGURE", "CubedArtists", "plot_heat_capacity_over_cubed_temperature"]

_MILLI = 1e3
# An electronic or other upturn on cooling may reach above the lattice by this factor before the frame cuts it off.
_HEADROOM = 3.0


@dataclass(frozen=True)
class CubedArtists:
    """What the figure consists of."""

    axes: Axes
    points: PointArtists
    curves: CurveArtists
    beyond: Line2D | None


def _lattice(curve: ThermodynamicTable) -> FloatArray:
    """Heat capacity of the lattice terms alone; of everything where there are none."""
    parts = [
        values
        for name, values in curve.components.items()
        if (kind := name.rstrip("0123456789")) in TERMS and TERMS[kind].lattice
    ]
    return np.sum(parts, axis=0) if parts else curve.heat_capacity


def plot_heat_capacity_over_cubed_temperature(axes: Axes, analysis: Analysis) -> CubedArtists:
    """Draw C/T^3 of data, fit and components in mJ/(mol K^4) on given axes.

    Where an upturn on cooling (electronic, T^-2) would flatten the lattice to the ground line, the frame ends at three
    times the highest lattice value and points beyond it are marked at its edge.
    """
    points, curve = measured_points(analysis), analysis.derived.curve
    cube = _MILLI / points.temperature**3
    scale = _MILLI / curve.temperature**3
    y = points.heat_capacity * cube
    drawn = draw_points(axes, analysis, points, y, points.sigma * cube)
    curves = draw_curves(axes, curve, scale)
    everything = largest(y[points.used], curve.heat_capacity * scale)
    top = min(everything, _HEADROOM * largest(_lattice(curve) * scale))
    axes.set_ylim(0.0, 1.08 * top)
    beyond = mark_beyond(axes, points, y)
    symbol = "C_V" if analysis.measurement.quantity == "Cv" else "C_p"
    axes.set_ylabel(rf"${symbol}\,T^{{-3}}$ / (mJ mol$^{{-1}}$ K$^{{-4}}$)")
    return CubedArtists(axes, drawn, curves, beyond)


def draw(figure: Figure, analysis: Analysis) -> CubedArtists:
    """Draw C/T^3 against the logarithm of T."""
    axes = figure.add_subplot()
    artists = plot_heat_capacity_over_cubed_temperature(axes, analysis)
    logarithmic_temperature(axes, analysis.derived.curve.temperature, analysis.measurement.temperature)
    shade_outside(axes, analysis)
    axes.set_xlabel(temperature_label())
    legend_above(figure, axes)
    return artists


def alt(analysis: Analysis) -> str:
    """State where the hump of C/T^3 lies and whether the data reach the plateau below it."""
    curve = analysis.derived.curve
    lattice = _lattice(curve) / curve.temperature**3
    top = int(np.argmax(np.where(np.isfinite(lattice), lattice, -np.inf)))
    low = float(analysis.prepared.temperature[0])
    where = f"the lattice part of the fit is highest at {plain_number(curve.temperature[top], 3)} K"
    if curve.temperature[top] < low:
        where += f", below the lowest point fitted ({plain_number(low)} K)"
    return (
        f"Heat capacity divided by the cube of the temperature, on a logarithmic temperature axis, with fit and "
        f"components: {where}."
    )


FIGURE = ReportFigure(
    "heat_capacity_over_cubed_temperature", "Heat capacity over the cube of temperature", 72.0, draw, alt
)

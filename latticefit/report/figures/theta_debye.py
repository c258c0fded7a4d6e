"""Calorimetric Debye temperature of every point, with theta_D(T->0) and the moments of the spectrum at the margin."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.container import ErrorbarContainer
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.text import Text

from ...records import Analysis, DerivedValue
from ..points import MeasuredPoints, measured_points
from ..wording import plain_number, plus_minus
from .drawing import PointArtists, draw_fit, draw_points, finite, mark_beyond
from .report_figure import ReportFigure
from .style import FIT_COLOUR, legend_above, logarithmic_temperature, shade_outside, temperature_label

__all__ = ["FIGURE", "ThetaArtists"]

# Labels in the margin, every second moment: the column is narrow.
_LABELS = {
    "theta_debye_low_temperature": r"$T\!\to\!0$",
    "theta_debye_moment_minus_2": r"$-2$",
    "theta_debye_moment_minus_1": "",
    "theta_debye_moment_0": r"$0$",
    "theta_debye_moment_1": "",
    "theta_debye_moment_2": r"$2$",
}
_MOMENT = r"moment $m$"
# Points whose bar is a longer part of theta do not stretch the frame: at T = theta 1 % of C is 10 % of theta.
_LARGEST_BAR = 0.04
_ENOUGH = 5  # sharp points; with fewer the frame holds the middle eighty percent of all


@dataclass(frozen=True)
class ThetaArtists:
    """What the figure consists of; `withheld` are the words that stand in place of a missing value."""

    axes: Axes
    margin: Axes
    points: PointArtists
    model: Line2D
    extrapolated: tuple[Line2D, ...]
    characteristic: tuple[ErrorbarContainer, ...]
    withheld: tuple[Text, ...]
    beyond: Line2D | None


def _characteristic(analysis: Analysis) -> list[DerivedValue]:
    return [each for each in analysis.derived.characteristic_temperatures if each.key in _LABELS]


def _limits(analysis: Analysis, points: MeasuredPoints) -> tuple[float, float]:
    """Frame that holds the sharp points, the characteristic values, and the model unless it runs away from them."""
    theta, u = analysis.derived.pointwise_theta.theta, analysis.derived.pointwise_theta.u
    fitted = points.used & np.isfinite(theta)
    sharp = fitted & (u <= _LARGEST_BAR * theta)
    shown = theta[sharp]
    if shown.size < _ENOUGH and fitted.any():
        shown = np.quantile(theta[fitted], (0.1, 0.9))
    values = [(each.value, each.u or 0.0) for each in _characteristic(analysis) if each.value is not None]
    together = np.concatenate([shown, [value - u for value, u in values], [value + u for value, u in values]])
    if together.size == 0:
        return 0.0, 1.0
    low, high = float(np.min(together)), float(np.max(together))
    model = finite(analysis.derived.model_theta)
    model = model[(model > low / 2) & (model < 2 * high)]
    low, high = float(np.min(model, initial=low)), float(np.max(model, initial=high))
    pad = max(0.12 * (high - low), 0.02 * high)
    return low - pad, high + pad


def _places(values: list[DerivedValue]) -> list[float]:
    """Places along the margin: theta_D(T->0) apart from the moments, because its label is wider."""
    return [0.0 if each.key == "theta_debye_low_temperature" else 0.9 + i for i, each in enumerate(values)]


def _draw_margin(axes: Axes, values: list[DerivedValue]) -> tuple[tuple[ErrorbarContainer, ...], tuple[Text, ...]]:
    drawn, withheld = [], []
    places = _places(values)
    for place, each in zip(places, values, strict=True):
        if each.value is None:
            words = axes.text(
                place,
                0.5,
                each.status,
                rotation=90,
                ha="center",
                va="center",
                color="#555555",
                fontsize=6.5,
                transform=axes.get_xaxis_transform(),
            )
            withheld.append(words)
            continue
        marker = "*" if each.key == "theta_debye_low_temperature" else "o"
        drawn.append(
            axes.errorbar(
                place,
                each.value,
                yerr=each.u or 0.0,
                fmt=marker,
                color=FIT_COLOUR,
                elinewidth=0.8,
                capsize=1.5,
                markersize=6.0 if marker == "*" else 3.0,
            )
        )
    axes.set_xlim(places[0] - 0.9, places[-1] + 0.6)
    axes.set_xticks(places, [_LABELS[each.key] for each in values])
    axes.tick_params(axis="x", labelsize=6.5, top=False, length=2)
    axes.tick_params(axis="y", labelleft=False)
    axes.set_xlabel(_MOMENT)
    return tuple(drawn), tuple(withheld)


def draw(figure: Figure, analysis: Analysis) -> ThetaArtists:
    """Draw theta_D(T) of points and model, and the characteristic values in a margin with the same scale."""
    axes, margin = figure.subplots(1, 2, sharey=True, width_ratios=(2.0, 1.0))
    points, derived = measured_points(analysis), analysis.derived
    theta, u = derived.pointwise_theta.theta, derived.pointwise_theta.u
    drawn = draw_points(axes, analysis, points, theta, u)
    model, extrapolated = draw_fit(axes, derived.curve, derived.model_theta)
    axes.set_ylim(*_limits(analysis, points))
    beyond = mark_beyond(axes, points, theta)
    logarithmic_temperature(axes, derived.curve.temperature, analysis.measurement.temperature)
    shade_outside(axes, analysis)
    characteristic, withheld = _draw_margin(margin, _characteristic(analysis))
    axes.set_xlabel(temperature_label())
    axes.set_ylabel(r"$\theta_{\mathrm{D}}$ / K")
    legend_above(figure, axes)
    return ThetaArtists(axes, margin, drawn, model, extrapolated, characteristic, withheld, beyond)


def alt(analysis: Analysis) -> str:
    """State theta_D(T->0) or that it is withheld, and the span of the pointwise values over sharp points."""
    low = next(each for each in _characteristic(analysis) if each.key == "theta_debye_low_temperature")
    if low.value is None:
        limit = f"theta_D(T->0) is {low.status}"
    else:
        limit = f"theta_D(T->0) is {plus_minus(low.value, low.u, low.unit)}"
    model = finite(analysis.derived.model_theta)
    span = ""
    if model.size:
        span = f"; over the curve the model runs from {plain_number(float(np.min(model)), 3)} to "
        span += f"{plain_number(float(np.max(model)), 3)} K"
    return f"Calorimetric Debye temperature of each point against temperature: {limit}{span}."


FIGURE = ReportFigure("theta_debye", "Debye temperature against temperature", 72.0, draw, alt, numbers=(_MOMENT,))

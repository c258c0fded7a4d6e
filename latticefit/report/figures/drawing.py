"""Points and fit on any axes: a symbol per run, hollow where not fitted, dashed where extrapolated, none lost."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from matplotlib import font_manager
from matplotlib.axes import Axes
from matplotlib.container import ErrorbarContainer
from matplotlib.lines import Line2D
from numpy.typing import NDArray

from ...records import Analysis, FloatArray, ThermodynamicTable
from ...wording import harmless
from ..points import MeasuredPoints
from .style import FIT_COLOUR, run_look

__all__ = ["PointArtists", "draw_fit", "draw_points", "finite", "largest", "mark_beyond", "masked_regions"]


_LONGEST_LABEL = 24
_EDGE_INSET = 3.5  # points from the edge of the frame to the marks of what lies beyond it


@dataclass(frozen=True)
class PointArtists:
    """Drawn points: one container per run for the fitted ones, one line for the rest (None where all are fitted)."""

    fitted: tuple[ErrorbarContainer, ...]
    not_fitted: Line2D | None


def draw_points(
    axes: Axes, analysis: Analysis, points: MeasuredPoints, y: FloatArray, u: FloatArray | None
) -> PointArtists:
    """Draw `y` of every measured point against temperature.

    Parameters
    ----------
    axes : matplotlib Axes
    analysis : Analysis
    points : MeasuredPoints
    y, u : ndarray, shape (m,)
        In the order of `points`; `u` is the half length of the bars, None for no bars. NaN is not drawn.
    """
    readings = analysis.measurement.readings
    fitted = []
    for run, reading in enumerate(readings):
        chosen = points.used & (points.run == run) & np.isfinite(y)
        if not chosen.any():
            continue
        colour, marker = run_look(run)
        label = "fitted points" if len(readings) == 1 else _shortened(reading.label)
        fitted.append(
            axes.errorbar(
                points.temperature[chosen],
                y[chosen],
                yerr=None if u is None else np.where(np.isfinite(u[chosen]), u[chosen], 0.0),
                fmt=marker,
                color=colour,
                markersize=2.6,
                elinewidth=0.5,
                markeredgewidth=0.0,
                zorder=3,
                label=label,
            )
        )
    return PointArtists(tuple(fitted), _hollow(axes, points, y))


def _shortened(label: str) -> str:
    """A run label that cannot spread over the figure, and that matplotlib neither hides nor reads as mathematics."""
    known = font_manager.get_font(font_manager.findfont("DejaVu Sans")).get_charmap()
    text = "".join(each if ord(each) in known else "?" for each in harmless(label))
    text = text if len(text) <= _LONGEST_LABEL else f"{text[: _LONGEST_LABEL - 1]}…"
    text = text.replace("$", r"\$")
    return f" {text}" if text.startswith("_") else text


def _hollow(axes: Axes, points: MeasuredPoints, y: FloatArray) -> Line2D | None:
    chosen = ~points.used & np.isfinite(y)
    if not chosen.any():
        return None
    (line,) = axes.plot(
        points.temperature[chosen],
        y[chosen],
        linestyle="none",
        marker="o",
        markersize=3.2,
        markerfacecolor="white",
        markeredgecolor="#666666",
        markeredgewidth=0.6,
        zorder=2.5,
        label="not fitted",
    )
    return line


def draw_fit(axes: Axes, curve: ThermodynamicTable, y: FloatArray) -> tuple[Line2D, tuple[Line2D, ...]]:
    """Draw `y` (shape of the curve) as a full line over the points fitted and dashed below and above them."""
    T, inside = curve.temperature, np.flatnonzero(np.array(curve.origin) == "measured")
    first, last = (int(inside[0]), int(inside[-1])) if inside.size else (0, T.size - 1)
    measured = slice(first, last + 1)
    (fit,) = axes.plot(T[measured], y[measured], color=FIT_COLOUR, linewidth=1.3, zorder=4, label="fit")
    extrapolated: list[Line2D] = []
    for part in (slice(0, first + 1), slice(last, T.size)):
        if T[part].size > 1:
            label = "_" if extrapolated else "extrapolated"
            extrapolated += axes.plot(
                T[part], y[part], color=FIT_COLOUR, linewidth=1.3, linestyle=(0, (2.2, 1.2)), zorder=4, label=label
            )
    return fit, tuple(extrapolated)


def mark_beyond(axes: Axes, points: MeasuredPoints, y: FloatArray) -> Line2D | None:
    """Mark points above or below the present limits by a triangle at the edge; None where all lie inside."""
    low, high = axes.get_ylim()
    above, below = y > high, y < low
    if not (above.any() or below.any()):
        return None
    inset = (high - low) * _EDGE_INSET * axes.figure.dpi / 72 / axes.bbox.height
    T = np.concatenate([points.temperature[above], points.temperature[below]])
    edge = np.concatenate([np.full(above.sum(), high - inset), np.full(below.sum(), low + inset)])
    (line,) = axes.plot(T, edge, linestyle="none", marker="d", color="#666666", markersize=2.8, label="outside frame")
    axes.set_ylim(low, high)
    return line


def masked_regions(analysis: Analysis) -> tuple[tuple[float, float], ...]:
    """Masked temperature intervals of all runs, in K, each once."""
    return tuple(dict.fromkeys(each for reading in analysis.measurement.readings for each in reading.settings.mask))


def finite(values: FloatArray) -> NDArray[np.float64]:
    """Only the finite values."""
    return np.asarray(values[np.isfinite(values)])


def largest(*arrays: FloatArray) -> float:
    """Largest finite value of all arrays, at least the smallest positive number that a frame can end at."""
    return float(np.max(finite(np.concatenate(arrays)), initial=np.finfo(float).tiny))

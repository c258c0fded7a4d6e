"""Look of the figures: colours, lines and marks that also differ in grey, labels in quantity calculus."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from contextlib import contextmanager
from itertools import cycle
from math import ceil
from typing import Any, Final

import matplotlib.style
import numpy as np
from matplotlib.axes import Axes
from matplotlib.container import ErrorbarContainer
from matplotlib.figure import Figure
from matplotlib.ticker import FuncFormatter, LogLocator, NullFormatter

from ...records import Analysis, FloatArray

__all__ = [
    "DATA_COLOUR",
    "FIT_COLOUR",
    "WIDTH_MM",
    "component_label",
    "component_looks",
    "figure_style",
    "heat_capacity_label",
    "legend_above",
    "logarithmic_temperature",
    "run_look",
    "shade_outside",
    "temperature_label",
]

WIDTH_MM: Final[float] = 86.0
"""Width of one journal column (common practice, no source)."""

DATA_COLOUR = "#1a1a1a"
FIT_COLOUR = "#0072b2"
_OUTSIDE_COLOUR = "#e9e9e4"

# Eight colours that stay apart for colour-blind readers: M. Okabe and K. Ito, Color Universal Design (2008), from
# memory. The lightness differs too, and every line and mark has its own pattern or shape.
_COMPONENT_LOOKS: Final[dict[str, tuple[str, Any]]] = {
    "debye": ("#d55e00", (0, (5, 1.6))),
    "einstein": ("#009e73", (0, (5, 1.4, 1.2, 1.4))),
    "electronic": ("#a2527f", (0, (1.2, 1.4))),
    "cp_minus_cv": ("#b07d00", (0, (3, 1.2, 1, 1.2, 1, 1.2))),
}
_OTHER_LOOKS: Final[tuple[tuple[str, Any], ...]] = (
    ("#56b4e9", (0, (8, 2))),
    ("#777777", (0, (2, 2))),
    ("#5f4b8b", (0, (6, 1.2, 2, 1.2))),
    ("#8a3b12", (0, (3.5, 3))),
)
_RUN_LOOKS: Final[tuple[tuple[str, str], ...]] = (
    (DATA_COLOUR, "o"),
    ("#d98200", "s"),
    ("#6a6a6a", "^"),
    ("#3f9fd8", "D"),
    ("#8a3b12", "v"),
    ("#5f4b8b", "P"),
)

_SETTINGS: Final[dict[str, Any]] = {
    "axes.axisbelow": True,
    "axes.labelsize": 8.0,
    "axes.linewidth": 0.6,
    "axes.unicode_minus": True,
    "figure.facecolor": "white",
    "font.family": ["DejaVu Sans"],
    "font.size": 7.5,
    "legend.borderaxespad": 0.2,
    "legend.columnspacing": 1.2,
    "legend.fontsize": 7.0,
    "legend.frameon": False,
    "legend.handlelength": 2.6,
    "legend.handletextpad": 0.5,
    "legend.labelspacing": 0.25,
    "lines.linewidth": 1.1,
    "lines.markersize": 3.0,
    "mathtext.fontset": "dejavusans",
    "svg.fonttype": "path",
    "svg.hashsalt": "latticefit",
    "xtick.direction": "in",
    "xtick.labelsize": 7.0,
    "xtick.major.width": 0.6,
    "xtick.minor.width": 0.4,
    "xtick.top": True,
    "ytick.direction": "in",
    "ytick.labelsize": 7.0,
    "ytick.major.width": 0.6,
    "ytick.minor.width": 0.4,
    "ytick.right": True,
}


@contextmanager
def figure_style() -> Iterator[None]:
    """Put matplotlib's defaults and the settings above in force, and what was there before back afterwards."""
    with matplotlib.style.context(["default", _SETTINGS]):
        yield


def component_looks(names: Iterable[str]) -> dict[str, tuple[str, Any]]:
    """Return colour and dash pattern of each component of a model, e.g. ``debye`` and ``einstein2``.

    Whatever has no look of its own takes the next of the others, so that no two components look alike while there are
    enough of these.
    """
    others = cycle(_OTHER_LOOKS)
    return {name: _COMPONENT_LOOKS.get(name.removesuffix("1")) or next(others) for name in names}


def component_label(name: str) -> str:
    """Return the name of a component as the legend shows it."""
    return {"cp_minus_cv": r"$C_p - C_V$"}.get(name, name)


def run_look(run: int) -> tuple[str, str]:
    """Return colour and marker of a run."""
    return _RUN_LOOKS[run % len(_RUN_LOOKS)]


def temperature_label() -> str:
    """Return the label of a temperature axis."""
    return r"$T$ / K"


def heat_capacity_label(analysis: Analysis) -> str:
    """Return the label of a heat-capacity axis, Cp or Cv as measured."""
    symbol = r"C_V" if analysis.measurement.quantity == "Cv" else r"C_p"
    return rf"${symbol}$ / (J mol$^{{-1}}$ K$^{{-1}}$)"


def shade_outside(axes: Axes, analysis: Analysis) -> None:
    """Shade what lies outside the points fitted, within the present limits of the axis."""
    left, right = axes.get_xlim()
    low, high = float(analysis.prepared.temperature[0]), float(analysis.prepared.temperature[-1])
    for start, end in ((left, low), (high, right)):
        if start < end:
            axes.axvspan(start, end, facecolor=_OUTSIDE_COLOUR, edgecolor="none", zorder=-5)
    axes.set_xlim(left, right)


def legend_above(figure: Figure, axes: Axes) -> None:
    """Put the legend of `axes` above the figure, where it can cover nothing, in as many columns as fit."""
    handles, labels = axes.get_legend_handles_labels()
    order = sorted(range(len(labels)), key=lambda i: not isinstance(handles[i], ErrorbarContainer))  # points first
    for most in (4, 3, 2, 1):
        columns = ceil(len(labels) / ceil(len(labels) / most))  # rows of even length
        legend = figure.legend(
            [handles[i] for i in order], [labels[i] for i in order], loc="outside upper center", ncols=columns
        )
        if most == 1 or legend.get_window_extent().width <= 0.98 * figure.bbox.width:
            return
        legend.remove()


def logarithmic_temperature(axes: Axes, *temperatures: FloatArray) -> None:
    """Make the temperature axis logarithmic from the lowest to the highest of all T, with plain numbers as ticks."""
    axes.set_xscale("log")
    T = np.concatenate(temperatures)
    low, high = float(np.min(T)), float(np.max(T))
    axes.set_xlim(low / 1.08, high * 1.08)
    axes.xaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))
    if high / low < 30:
        axes.xaxis.set_major_locator(LogLocator(subs=(1.0, 2.0, 5.0)))
    axes.xaxis.set_minor_formatter(NullFormatter())

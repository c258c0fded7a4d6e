"""A figure as SVG or PNG bytes: the same bytes for the same analysis."""

from __future__ import annotations

import io
from typing import Literal

from matplotlib.figure import Figure

from ...records import Analysis
from .registry import figure
from .style import WIDTH_MM, figure_style

__all__ = ["draw_figure", "render"]

_MM_PER_INCH = 25.4
_PNG_DPI = 200


def draw_figure(name: str, analysis: Analysis) -> Figure:
    """Return a new matplotlib Figure of one journal column's width, drawn without touching any global state.

    Raises
    ------
    InputError
        When there is no figure of that name.
    """
    kind = figure(name)
    with figure_style():
        picture = Figure(figsize=(WIDTH_MM / _MM_PER_INCH, kind.height / _MM_PER_INCH), layout="constrained")
        kind.draw(picture, analysis)
    return picture


def render(picture: Figure, file_format: Literal["svg", "png"]) -> bytes:
    """Return a drawn figure as the bytes of an SVG or a PNG file.

    Text in the SVG is drawn as outlines: labels with mathematics stay where they were laid out on any machine.
    """
    out = io.BytesIO()
    with figure_style():
        if file_format == "svg":
            nothing = dict.fromkeys(("Creator", "Date", "Format", "Type"))
            picture.savefig(out, format="svg", metadata=nothing)
        else:
            picture.savefig(out, format="png", dpi=_PNG_DPI, metadata={"Software": None})
    return out.getvalue()

"""What every figure of a report provides."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from matplotlib.figure import Figure

from ...records import Analysis

__all__ = ["ReportFigure"]


@dataclass(frozen=True)
class ReportFigure:
    """A figure of the report.

    Attributes
    ----------
    name : str
        Name of its files, and in `Fit.figure`.
    title : str
        Heading in the report.
    height : float
        Height in mm at a width of 86 mm (one journal column).
    draw : callable ``(figure, analysis) -> artists``
        Draws on an empty matplotlib Figure and returns a frozen dataclass of the artists.
    alt : callable ``(analysis) -> str``
        The finding in words, for those who do not see the picture.
    numbers : tuple of str
        Labels of axes that show a pure number; every other label reads quantity / unit.
    """

    name: str
    title: str
    height: float
    draw: Callable[[Figure, Analysis], Any]
    alt: Callable[[Analysis], str]
    numbers: tuple[str, ...] = ()

"""The figures by name. A new figure is one file beside this one and one line here."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType

from ...errors import InputError, nearest
from . import heat_capacity, heat_capacity_over_cubed_temperature, residuals, theta_debye
from .report_figure import ReportFigure

__all__ = ["FIGURES", "ReportFigure", "figure"]

_FIGURES: dict[str, ReportFigure] = {
    each.name: each
    for each in (
        heat_capacity.FIGURE,
        residuals.FIGURE,
        heat_capacity_over_cubed_temperature.FIGURE,
        theta_debye.FIGURE,
    )
}

FIGURES: Mapping[str, ReportFigure] = MappingProxyType(_FIGURES)
"""Every figure of a report, in the order in which it is shown: a view, so that whoever imports it sees all of them."""


def figure(name: str) -> ReportFigure:
    """Return the figure of that name.

    Raises
    ------
    InputError
        When there is no such figure; the nearest name is offered.
    """
    try:
        return FIGURES[name]
    except KeyError:
        raise InputError(f"{name!r} is not a figure of the report; {nearest(name, FIGURES)}") from None

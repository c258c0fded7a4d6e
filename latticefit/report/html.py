"""The report as one self-contained HTML page: inline figures and style, no outside request, everything escaped."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from typing import Any

from jinja2 import Environment, PackageLoader, StrictUndefined
from markupsafe import Markup, escape

from ..records import Analysis
from ..wording import harmless
from . import content
from .cautions import CAUTIONS
from .figures import FIGURES
from .ranking import candidate_grid

__all__ = ["html_report", "html_summary"]

_WARNING_LOOKS = {"stop": "bad", "warn": "mind", "note": "plain"}
# Plain symbols of the records and how a page sets them; applied in this order to escaped text.
_SYMBOLS = tuple(
    (re.compile(plain), shown)
    for plain, shown in (
        (r"&lt;((?:ln )?theta(?:\^[a-z0-9])?)&gt;", r"⟨\1⟩"),
        (r"\^\(([^()]+)\)", r"<sup>\1</sup>"),
        (r"\^(-?\d+|[a-z])", r"<sup>\1</sup>"),
        (r"theta_([DE])", r"<i>θ</i><sub>\1</sub>"),
        (r"\btheta\b", "<i>θ</i>"),
        (r"\bbeta\b", "<i>β</i>"),
        (r"\bgamma\b", "<i>γ</i>"),
        (r"\bpi\b", "π"),
        (r"-&gt;", "→"),
    )
)


@dataclass(frozen=True)
class _Picture:
    """A figure ready for the page: markup of its SVG, and its finding in words."""

    name: str
    title: str
    alt: str
    svg: Markup


def html_report(analysis: Analysis, pictures: Mapping[str, bytes], sheet_text: str) -> str:
    """Return the report as an HTML page.

    Parameters
    ----------
    analysis : Analysis
        All records of one run.
    pictures : mapping of figure name to SVG bytes
        Figures to show; empty for a page without figures.
    sheet_text : str
        The run sheet that repeats the report.
    """
    return (
        _environment()
        .get_template("page.html")
        .render(
            _first_screen(analysis),
            measured=content.measured_rows(analysis)[1:],
            model=content.model_rows(analysis),
            quality=content.fit_rows(analysis),
            pictures=[_picture(name, svg, analysis) for name, svg in pictures.items()],
            parameters=content.parameter_rows(analysis),
            temperatures=content.temperature_rows(analysis),
            standard=content.standard_rows(analysis),
            functions=content.function_grid(analysis.derived.table),
            bands=content.band_grid(analysis),
            chosen_because=harmless(analysis.comparison.because),
            candidates=candidate_grid(analysis.comparison) if len(analysis.comparison.candidates) > 1 else None,
            validity=content.validity_rows(analysis),
            warnings=_warnings(analysis),
            repairs=content.repair_rows(analysis),
            cautions=CAUTIONS,
            provenance=content.provenance_rows(analysis),
            sheet="\n".join(harmless(line) for line in sheet_text.splitlines()),
        )
    )


def html_summary(analysis: Analysis) -> str:
    """Return the first screen of the report as an HTML fragment with its own style, for notebooks."""
    return _environment().get_template("summary.html").render(_first_screen(analysis))


@cache
def _environment() -> Environment:
    environment = Environment(
        loader=PackageLoader("latticefit", "report"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    environment.filters["symbols"] = _symbols
    return environment


def _symbols(text: str) -> Markup:
    """Escape a text and set the symbols in it with their subscripts and arrows."""
    marked = str(escape(text))
    for pattern, replacement in _SYMBOLS:
        marked = pattern.sub(replacement, marked)
    return Markup(marked)


def _first_screen(analysis: Analysis) -> dict[str, Any]:
    quantity, points, fit_range = content.measured_rows(analysis)[2:5]
    return {
        "headline": content.headline(analysis),
        "under": f"{quantity.value}; {points.value}, {fit_range.value}; model {content.model_rows(analysis)[0].value}",
        "describes": analysis.diagnosis.describes,
        "verdict": harmless(analysis.diagnosis.verdict),
        "withheld": content.withheld_notes(analysis),
        "keys": content.key_rows(analysis),
    }


def _warnings(analysis: Analysis) -> list[dict[str, str]]:
    return [
        {
            "level": each.level,
            "kind": _WARNING_LOOKS[each.level],
            "code": harmless(each.code),
            "message": row.value,
            "advice": row.note,
        }
        for each, row in zip(analysis.warnings, content.warning_rows(analysis), strict=True)
    ]


def _picture(name: str, svg: bytes, analysis: Analysis) -> _Picture:
    kind = FIGURES[name]
    return _Picture(name, kind.title, kind.alt(analysis), Markup(_inline(name, svg.decode("utf-8"))))


def _inline(name: str, svg: str) -> str:
    """Make an SVG file part of a page: no prolog, ids of its own, described by the finding below it."""
    body = svg[svg.index("<svg") :]
    body = re.sub(r"<metadata>.*?</metadata>", "", body, flags=re.DOTALL)
    body = re.sub(r'\bid="', f'id="{name}-', body)
    body = re.sub(r'href="#', f'href="#{name}-', body)
    body = re.sub(r"url\(#", f"url(#{name}-", body)
    return body.replace("<svg", f'<svg role="img" aria-labelledby="{name}-finding"', 1)

"""The HTML page: self-contained, escaped, the first screen says what matters."""

from __future__ import annotations

import re
from dataclasses import replace
from html.parser import HTMLParser
from pathlib import Path

import pytest
from analysis_factory import CASES, build, renamed, undetermined

from latticefit.records import Analysis
from latticefit.report import CAUTIONS, FIGURES, draw_figure, html_report, html_summary, render, text_report
from latticefit.report.text import summary_text

ATTACK = "<script>alert(1)</script>"
VOID = {"meta", "link", "img", "br", "hr", "input"}


class _Page(HTMLParser):
    """Tags, attributes and visible text of a page; fails on tags that do not match."""

    def __init__(self, page: str) -> None:
        super().__init__()
        self.open: list[str] = []
        self.tags: list[tuple[str, dict[str, str | None]]] = []
        self.words = ""
        self.feed(page)
        self.close()
        assert self.open == []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append((tag, dict(attrs)))
        if tag not in VOID:
            self.open.append(tag)

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append((tag, dict(attrs)))

    def handle_endtag(self, tag: str) -> None:
        assert self.open.pop() == tag

    def handle_data(self, data: str) -> None:
        if not {"style", "defs"} & set(self.open):
            self.words += data


def _page(analysis: Analysis, figures: bool = True) -> str:
    pictures = {name: render(draw_figure(name, analysis), "svg") for name in FIGURES} if figures else {}
    return html_report(analysis, pictures, "[sample]\nformula = 'Cu'\n")


@pytest.fixture(scope="module")
def metal(tmp_path_factory: pytest.TempPathFactory) -> Analysis:
    """A good fit of two runs."""
    return build(CASES["metal"], tmp_path_factory.mktemp("metal"))


@pytest.fixture(scope="module")
def page(metal: Analysis) -> str:
    """Its page with figures."""
    return _page(metal)


def test_page_is_well_formed_and_has_one_id_each(page: str) -> None:
    """Tags close in order, and no identifier stands twice although several drawings share a page."""
    ids = [attributes["id"] for _, attributes in _Page(page).tags if "id" in attributes]
    assert len(ids) > 50
    assert len(ids) == len(set(ids))
    names = set(ids)
    assert {each for each in re.findall(r'href="#([^"]+)"|url\(#([^)]+)\)', page) for each in each if each} <= names


def test_page_asks_for_nothing_outside(page: str) -> None:
    """No script, no link, no image, no font: the page is one file, and its policy says so."""
    tags = _Page(page).tags
    assert {tag for tag, _ in tags}.isdisjoint({"script", "link", "img", "iframe", "object", "image", "base"})
    for _, attributes in tags:
        assert "src" not in attributes
        assert (attributes.get("href") or attributes.get("xlink:href") or "#").startswith("#")
        assert not any(name.startswith("on") for name in attributes)
    assert "@import" not in page
    assert "default-src 'none'" in page


def test_a_name_that_is_markup_stays_text(metal: Analysis) -> None:
    """A sample, label, command and sheet named <script> are shown, never run."""
    hostile = renamed(metal, ATTACK)
    hostile = replace(
        hostile,
        provenance=replace(hostile.provenance, command=ATTACK),
        diagnosis=replace(hostile.diagnosis, verdict=ATTACK),
        comparison=replace(hostile.comparison, because=f'"{ATTACK}'),
    )
    text = html_report(hostile, {}, ATTACK)
    assert "<script" not in text
    assert _Page(text).words.count(ATTACK) >= 6
    assert "<script" not in html_summary(hostile)


def test_control_characters_are_escapes(metal: Analysis) -> None:
    """Direction marks and escape sequences in a name are shown as escapes."""
    text = html_report(renamed(metal, "a\x1b\u202eb\udc80"), {}, "x = '\u202e'")
    assert r"a\x1b\u202eb\udc80" in text
    assert "\u202e" not in text
    text.encode("utf-8")


def test_first_screen_says_what_matters(page: str) -> None:
    """Before the first heading of a section: sample, verdict, model and key numbers with u."""
    first = _Page(page[: page.index("<h2>")].replace('<div class="pair">\n<section>', "") + "</main></body></html>")
    for words in (
        "Haldenium HM-4 (Cu)", "describes the data", "debye + einstein + electronic", "326.61 ± 0.61 K",
        "34.508 ± 0.059 J/(mol K)", "5107.9 ± 5.6 J/mol", "0.7200 ± 0.0035 mJ/(mol K²)",
    ):  # fmt: skip
        assert words in first.words


def test_a_bad_fit_is_said_so_on_the_first_screen(tmp_path: Path) -> None:
    """The verdict of a misfit is marked and comes before any number."""
    text = _page(build(CASES["misfit"], tmp_path), figures=False)
    assert "Not to be relied on" in text
    assert text.index("does not describe the data") < text.index("± ")


def test_page_shows_the_numbers_of_the_text_report(page: str, metal: Analysis) -> None:
    """Every value ± u of the text stands in the page as well, and every row of the table."""
    words = _Page(page).words
    values = re.findall(r"[\d.]+ ± [\d.]+", text_report(metal))
    assert len(values) >= 20
    assert all(value in words for value in values)
    assert all(value in words for value in re.findall(r"[\d.]+ ± [\d.]+", summary_text(metal, None)))
    assert all(cell in words for cell in re.findall(r"\S+\(\d+\)", text_report(metal)))


def test_each_figure_has_its_finding_as_text(page: str, metal: Analysis) -> None:
    """An inline drawing is an image described by the caption below it."""
    tags = _Page(page).tags
    drawings = [attributes for tag, attributes in tags if tag == "svg"]
    captions = {attributes["id"] for tag, attributes in tags if tag == "figcaption"}
    assert len(drawings) == len(FIGURES)
    assert all(each["role"] == "img" and each["aria-labelledby"] in captions for each in drawings)
    assert FIGURES["residuals"].alt(metal) in _Page(page).words


def test_page_without_figures(metal: Analysis) -> None:
    """With no figures the page has no empty section for them."""
    text = _page(metal, figures=False)
    assert "<svg" not in text
    assert "Figures" not in _Page(text).words


def test_cautions_sheet_and_warnings_stand_in_the_page(tmp_path: Path) -> None:
    """Cautions word for word, the sheet, each warning with what to do."""
    found = build(CASES["coldstop"], tmp_path)
    words = _Page(_page(found, figures=False)).words
    assert all(caution in words for caution in CAUTIONS)
    assert "formula = 'Cu'" in words
    assert found.warnings[0].message in words
    assert found.warnings[0].advice in words


def test_symbols_are_set_without_touching_file_names(metal: Analysis) -> None:
    """theta_D becomes a symbol with subscript; a file called beta keeps its name."""
    reading = replace(metal.measurement.readings[0], file="beta theta_D.csv")
    measurement = replace(metal.measurement, readings=(reading, metal.measurement.readings[1]))
    text = html_report(replace(metal, measurement=measurement), {}, "")
    assert "<i>θ</i><sub>D</sub>(T→0)" in text
    assert "beta theta_D.csv" in text


def test_summary_is_a_fragment_with_its_own_style(metal: Analysis) -> None:
    """What a notebook shows is no whole page, and its style touches nothing outside it."""
    text = html_summary(metal)
    assert "<html" not in text
    assert "326.61 ± 0.61 K" in text
    style = re.sub(r"@media[^{]+\{", "", text[text.index("<style>") + 7 : text.index("</style>")])
    selectors = [each for group in re.findall(r"([^{}]+)\{", style) for each in group.split(",")]
    assert all(each.strip().startswith(".latticefit") for each in selectors)


def test_page_of_a_failed_fit(tmp_path: Path) -> None:
    """Nothing determined: the page is written all the same, without nan or None."""
    words = _Page(_page(undetermined(tmp_path))).words
    assert re.search(r"\b(nan|inf)\b", words) is None

"""Pages: valid HTML, inert whatever people typed, headings in order, words for drawings, contrast, Markdown alike."""

from __future__ import annotations

import dataclasses
import re
from collections.abc import Iterator
from html.parser import HTMLParser
from itertools import pairwise
from pathlib import Path

import html5lib
import pytest
from exchange.shown import HOSTILE, hostile_run, things_of

from kb.book import Book, build_demo, open_book
from kb.book.pages import page_of, save_page, teach_notebooks
from kb.exchange.report import build_page
from kb.exchange.report_html import page_html, style_sheet
from kb.exchange.report_markdown import page_markdown
from kb.progress import Silent
from kb.showing import ShowsItself, show_with


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Book]:
    path, _ = build_demo(str(tmp_path_factory.mktemp("demo") / "demo.sidepath"), Silent())
    with open_book(path, read_only=True) as opened:
        yield opened


@pytest.fixture(scope="module")
def things(book: Book) -> dict[str, object]:
    return things_of(book)


KINDS = ("run", "reading", "assessment", "recurring", "coverage", "calibration", "replay", "route", "hostile")


@pytest.mark.parametrize("kind", KINDS)
def test_pages_are_valid_html(things: dict[str, object], kind: str) -> None:
    """Parsed by html5lib in strict mode, which raises at the first parse error of the HTML standard."""
    html5lib.HTMLParser(strict=True).parse(page_html(build_page(things[kind], "a book")))


class _Seen(HTMLParser):
    """Collects tags, attributes, and heading levels."""

    def __init__(self) -> None:
        super().__init__()
        self.tags: list[tuple[str, dict[str, str | None]]] = []
        self.headings: list[int] = []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append((tag, dict(attrs)))
        if re.fullmatch(r"h[1-6]", tag):
            self.headings.append(int(tag[1]))


def _seen(text: str) -> _Seen:
    parser = _Seen()
    parser.feed(text)
    return parser


@pytest.mark.parametrize("kind", KINDS)
def test_pages_ask_for_nothing_and_run_nothing(things: dict[str, object], kind: str) -> None:
    text = page_html(build_page(things[kind], HOSTILE))
    seen = _seen(text)
    assert not {"script", "img", "iframe", "link", "object", "embed", "form", "a", "base"} & {t for t, _ in seen.tags}
    for _, attributes in seen.tags:
        assert not any(name.startswith("on") or name in ("src", "href", "xlink:href", "style") for name in attributes)
    policy = next(
        a["content"] for t, a in seen.tags if t == "meta" and a.get("http-equiv") == "Content-Security-Policy"
    )
    assert policy is not None and policy.startswith("default-src 'none'; style-src 'sha256-")
    assert "url(" not in style_sheet() and "@import" not in style_sheet()
    assert not re.search("[\x00-\x08\x0b\x0c\x0e-\x1f\u202a-\u202e\u2066-\u2069]", text)


def test_a_hostile_note_is_still_there_to_be_read() -> None:
    text = page_html(build_page(hostile_run()))
    assert "&lt;script&gt;alert(1)&lt;/script&gt;" in text
    assert "{{ 7*7 }}" in text


@pytest.mark.parametrize("kind", KINDS)
def test_headings_are_in_order_and_there_is_one_title(things: dict[str, object], kind: str) -> None:
    levels = _seen(page_html(build_page(things[kind]))).headings
    assert levels.count(1) == 1 and levels[0] == 1
    assert all(b <= a + 1 for a, b in pairwise(levels))


@pytest.mark.parametrize("kind", KINDS)
def test_every_drawing_has_a_title_and_a_description(things: dict[str, object], kind: str) -> None:
    text = page_html(build_page(things[kind]))
    drawings = re.findall(r"<svg (?![^>]*aria-hidden).*?</svg>", text, re.S)
    assert drawings
    for drawing in drawings:
        assert 'role="img"' in drawing[:400]
        assert re.search(r"<title>[^<]+</title>", drawing) and re.search(r"<desc>[^<]+</desc>", drawing)


def test_tables_have_captions_and_scopes(things: dict[str, object]) -> None:
    text = page_html(build_page(things["recurring"]))
    assert text.count("<table>") == text.count("<caption>") > 0
    assert all("scope" in attributes for tag, attributes in _seen(text).tags if tag == "th")


def test_the_marked_atoms_of_a_finding_are_drawn(things: dict[str, object]) -> None:
    text = page_html(build_page(things["assessment"]))
    assert 'class="mark-motif"' in text and 'class="mark-centre"' in text and 'class="mark-leaving"' in text


def _themes() -> dict[str, dict[str, str]]:
    """Return the colours of the style sheet by theme: light, dark, print."""
    sheet = style_sheet()
    blocks = re.findall(r"(?:@media ([^{]+)\{[^{}]*(?:\{[^{}]*\}\s*)?)?\s*\.sidepath \{([^}]*--paper[^}]*)\}", sheet)
    themes = {}
    for media, body in blocks:
        name = "dark" if "dark" in media else "print" if "print" in media else "light"
        themes[name] = dict(re.findall(r"--(\w+): (#[0-9a-f]{6})", body))
    return themes


def _luminance(colour: str) -> float:
    parts = [int(colour[i : i + 2], 16) / 255 for i in (1, 3, 5)]
    r, g, b = (c / 12.92 if c <= 0.03928 else ((c + 0.055) / 1.055) ** 2.4 for c in parts)
    return 0.2126 * r + 0.7152 * g + 0.0722 * b


def _contrast(one: str, other: str) -> float:
    """Return the contrast ratio of WCAG 2 (W3C Recommendation, success criterion 1.4.3)."""
    a, b = sorted((_luminance(one), _luminance(other)), reverse=True)
    return (a + 0.05) / (b + 0.05)


def test_contrast_formula_at_its_ends() -> None:
    assert _contrast("#000000", "#ffffff") == pytest.approx(21)
    assert _contrast("#777777", "#ffffff") == pytest.approx(4.48, abs=0.01)  # the well-known near miss of WCAG 2


@pytest.mark.parametrize("theme", ["light", "dark", "print"])
def test_text_stands_out_in_every_theme(theme: str) -> None:
    """WCAG 2 asks 4.5 of text and 3 of graphics."""
    colours = _themes()[theme]
    assert len(colours) == 11
    for ink in ("ink", "quiet", "serious", "caution", "note", "accent"):
        for ground in ("paper", "panel"):
            assert _contrast(colours[ink], colours[ground]) >= 4.5, (ink, ground)
    assert _contrast("#1b1b1b", colours["drawing"]) >= 4.5
    for mark in ("#8a2f7f", "#1f6f8b", "#a8480c", "#3c6e3a"):
        assert _contrast(mark, colours["drawing"]) >= 3


@pytest.mark.parametrize("kind", KINDS)
def test_markdown_says_the_same_and_is_inert(things: dict[str, object], kind: str) -> None:
    page = build_page(things[kind], HOSTILE)
    text = page_markdown(page)
    html = page_html(page)
    for section in page.sections:
        assert section.heading in html.replace("&#39;", "'").replace("&amp;", "&").replace("&#34;", '"')
    outside = re.sub(r"\\.", "", text)
    assert "<" not in outside and "](" not in outside and "`" not in outside and "://" not in outside
    assert len(re.findall(r"^#{1,6} ", text, re.M)) == len(_seen(html).headings)
    assert not re.search("[\x00-\x08\x0b\x0c\x0e-\x1f\u202a-\u202e]", text)


def test_a_note_in_markdown_keeps_its_lines_in_a_quote() -> None:
    text = page_markdown(build_page(dataclasses.replace(hostile_run(), note="one\n# two\n<b>three</b>")))
    assert "> one  \n> \\# two  \n> &lt;b&gt;three&lt;/b&gt;  " in text


def test_pages_are_written_whole_by_their_ending(book: Book, tmp_path: Path) -> None:
    for name, begins in (("page.html", "<!DOCTYPE html>"), ("page.md", "# Run R-0040")):
        save_page(book, book.get("R-0040"), tmp_path / name)
        assert (tmp_path / name).read_text(encoding="utf-8").startswith(begins)
    assert sorted(p.name for p in tmp_path.iterdir()) == ["page.html", "page.md"]
    assert "421" in str(page_of(book, book.get("R-0040")).source)


def test_a_value_shows_itself_in_a_notebook_once_a_book_was_opened(things: dict[str, object]) -> None:
    for thing in things.values():
        assert isinstance(thing, ShowsItself)
        shown = thing._repr_html_()
        assert shown is not None and 'class="sidepath in-notebook"' in shown and "<script" not in shown
    show_with(lambda thing: "other")
    assert hostile_run()._repr_html_() == "other"
    teach_notebooks()

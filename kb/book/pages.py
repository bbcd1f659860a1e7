"""Pages of an open book: what a run, a check, an audit or a route looks like when it is handed round.

It owns the line that says where a page came from, which words name an audit, and teaching notebooks how values show
themselves. Laying out is `kb.exchange.report`.
"""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from kb.errors import ImportFileError, InvalidRecord
from kb.showing import show_with

if TYPE_CHECKING:
    from kb.book.asked import AskedBook
    from kb.exchange.report_blocks import Page
    from kb.progress import Progress
    from kb.record.plan import Plan

AUDITS = ("recurring", "replay", "coverage", "calibration")


def teach_notebooks() -> None:
    """Let what has a page show itself in a notebook too; loads nothing until one is shown."""
    show_with(_notebook_html)


def page_of(book: AskedBook, thing: object) -> Page:
    """Lay out a run, a reading, an assessment, an audit or a route of a book."""
    from kb.book.words import today
    from kb.exchange.report import build_page
    from kb.exchange.report_words import made_from

    name = Path(book.path).stem if "://" not in book.path else "on a server"
    return build_page(thing, made_from(name, book.count(), today()))


def save_page(book: AskedBook, thing: object, path: Path) -> None:
    """Write a page, HTML or (by the ending .md) Markdown."""
    from kb.exchange.report import write_page

    if path.is_dir():
        raise InvalidRecord(f"{path.name or path} is a folder.", "Name a file, such as page.html.", str(path))
    write_page(page_of(book, thing), path)


def markdown_of(book: AskedBook, thing: object) -> str:
    """Return the page of a thing as Markdown."""
    from kb.exchange.report_markdown import page_markdown

    return page_markdown(page_of(book, thing))


def thing_named(book: AskedBook, name: str, progress: Progress | None = None) -> object:
    """Return what a word names: an audit, a reaction SMILES, a route or plan file (.toml, .json), or a run by its code.

    Raises:
        RecordNotFound: no run has that code.
    """
    from kb.book import whole
    from kb.book.words import read_scheme

    if name in AUDITS:
        if name == "recurring":
            return whole.find_recurring_failures(book, progress=progress)
        if name == "replay":
            return whole.replay_book(book, progress=progress)
        if name == "coverage":
            return whole.measure_book_coverage(book, progress=progress)
        return whole.calibrate_book(book, progress=progress)
    if ">" in name:
        return read_scheme(name)
    if name.lower().endswith((".toml", ".json")):
        return _from_file(book, Path(name))
    return book.get(name)


def plan_from_file(path: Path) -> Plan:
    """Read a planned step from a TOML or JSON file: `scheme` and the words of conditions.

    Raises:
        ImportFileError: the file cannot be read or holds no plan.
    """
    from kb.book.plan_words import plan_from_words

    words = _words(path)
    if not isinstance(words, dict) or not isinstance(words.get("scheme"), str):
        raise ImportFileError(
            f"{path.name} holds no planned step.", 'It needs scheme = "substrate>>product" and conditions.', str(path)
        )
    return plan_from_words(words)


def _words(path: Path) -> object:
    """Return what a TOML or JSON file holds, None where it is neither."""
    import json
    import tomllib

    try:
        text = path.read_text(encoding="utf-8")
        return json.loads(text) if path.suffix.lower() == ".json" else tomllib.loads(text)
    except (OSError, ValueError, RecursionError):
        return None


def _from_file(book: AskedBook, path: Path) -> object:
    """Return the ledger of a route file, or the assessment of a plan file (one with a `scheme`)."""
    from kb.book.routes import reckon_route

    words = _words(path)
    if isinstance(words, dict) and "scheme" in words and "step" not in words:
        return book.check(plan_from_file(path))
    return reckon_route(book, path)  # which says what is wrong with a file that is neither


def _notebook_html(thing: object) -> str:
    from kb.exchange.report import notebook_html

    return notebook_html(thing)

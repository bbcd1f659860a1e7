"""The door to pages: anything this project can show, laid out, and written as HTML or Markdown.

It owns which value makes which page, and writing the file whole or not at all. It opens no book and judges nothing.
"""

from __future__ import annotations

import os
import tempfile
from collections.abc import Callable
from pathlib import Path
from typing import Any

from kb.audit.calibration import Calibration
from kb.audit.coverage import Coverage
from kb.audit.recurrence_values import Recurrence
from kb.audit.replay_report import ReplayReport
from kb.chem.facts import Reading
from kb.exchange.report_assessment import assessment_page
from kb.exchange.report_audit import coverage_page, recurrence_page
from kb.exchange.report_blocks import Page
from kb.exchange.report_hindsight import calibration_page, replay_page
from kb.exchange.report_html import page_fragment, page_html
from kb.exchange.report_markdown import page_markdown
from kb.exchange.report_reading import reading_page
from kb.exchange.report_route import route_page
from kb.exchange.report_run import run_page
from kb.record.assessment import Assessment
from kb.record.run import Run
from kb.route.entries import Ledger
from kb.store.derivation import account_of_run

_PAGES: dict[type, Callable[[Any, str], Page]] = {
    Assessment: assessment_page,
    Recurrence: recurrence_page,
    ReplayReport: replay_page,
    Coverage: coverage_page,
    Calibration: calibration_page,
    Ledger: route_page,
    Reading: reading_page,
}


def build_page(thing: object, source: str = "") -> Page:
    """Lay out a run, a reading, an assessment, an audit or a route.

    Args:
        source: where it came from, for the foot of the page.

    Raises:
        TypeError: it is something else.
    """
    if isinstance(thing, Run):
        return run_page(thing, _reading(thing), source)
    if type(thing) not in _PAGES:
        raise TypeError(f"No page is known for {type(thing).__name__}.")
    return _PAGES[type(thing)](thing, source)


def notebook_html(thing: object) -> str:
    """Return what a notebook cell shows of a thing."""
    return page_fragment(build_page(thing))


def write_page(page: Page, path: Path) -> None:
    """Write a page by its ending, `.md` as Markdown and anything else as HTML; whole or not at all."""
    text = page_markdown(page) if path.suffix.lower() in (".md", ".markdown") else page_html(page)
    handle, half = tempfile.mkstemp(dir=path.parent, prefix=f".{path.name}.", suffix=".part")
    try:
        with os.fdopen(handle, "w", encoding="utf-8", newline="\n") as file:
            file.write(text)
        Path(half).chmod(0o644)
        Path(half).replace(path)
    except BaseException:
        Path(half).unlink(missing_ok=True)
        raise


def _reading(run: Run) -> Reading:
    return account_of_run(run).reading

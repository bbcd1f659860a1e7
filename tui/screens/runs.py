"""Runs: the record page by page, filtered and sorted, with the run under the cursor drawn beside the list."""

from __future__ import annotations

from dataclasses import replace
from functools import partial
from typing import ClassVar

from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal
from textual.widgets import Input, Static

from kb.record.run import Run
from kb.vocabulary import Verdict
from tui.ports import BookPort, RunPage, RunQuery
from tui.screens.base import PlaceScreen
from tui.screens.run_actions import RunActions
from tui.screens.run_detail import RunFound, RunScreen, load_run
from tui.styles import HERE
from tui.widgets.lines import SafeInput
from tui.widgets.panel import Panel
from tui.widgets.run_view import RunView
from tui.widgets.tables import CodeTable, RunTable

PAGE = 100
FILTER_S = 0.2
"""Pause in typing after which the list is narrowed [s]."""

SORTS = ("date", "code", "yield")
VERDICTS = ("", *map(str, Verdict))


class RunsScreen(RunActions[None], PlaceScreen):
    """The runs of the book."""

    PLACE = "runs"
    CSS_PATH = HERE / "runs.tcss"
    HELP = """
Runs. Type words to narrow the list; s changes the order, v shows only one verdict, x also shows withdrawn
runs, PgDn past the end and n / b turn the pages. The run under the cursor is drawn beside the list; Enter
opens it on a screen of its own. p takes it to planning, a amends it, w withdraws it; nothing is ever
deleted.
"""
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("slash", "filter", "Words", key_display="/", id="runs.filter", tooltip="Narrow the list by words"),
        Binding("s", "sort", "Sort", id="runs.sort", tooltip="By date, by code, by yield"),
        Binding("r", "turn", "Reverse", show=False, id="runs.turn", tooltip="Turn the order round"),
        Binding("v", "verdict", "Verdict", id="runs.verdict", tooltip="All, worked, partly, failed"),
        Binding("x", "withdrawn", "Withdrawn", show=False, id="runs.withdrawn", tooltip="Show withdrawn runs too"),
        Binding("n", "next_page", "Next", id="runs.next", tooltip="Next page"),
        Binding("b", "page_before", "Page before", show=False, id="runs.before", tooltip="Page before"),
    ]

    def __init__(self) -> None:
        super().__init__()
        self._query = RunQuery(limit=PAGE)
        self._page = RunPage(total=0)

    def compose_place(self) -> ComposeResult:
        """Lay out the list and the run."""
        with Horizontal(id="runs"):
            with Panel("Runs", id="runs-panel"):
                yield SafeInput(placeholder="words in notes, codes, projects…", id="runs-filter")
                yield RunTable(id="runs-table")
                yield Static("", id="runs-state", classes="quiet", markup=False)
            with Panel("Run", id="runs-run"):
                yield RunView(id="runs-view")

    def on_mount(self) -> None:
        """Start in the list."""
        super().on_mount()
        self.query_one(RunTable).focus()

    def book_arrived(self, book: BookPort) -> None:
        """Show the first page."""
        self._load(offset=0)

    def on_screen_resume(self) -> None:
        """Show what was recorded meanwhile."""
        if self.book is not None and self.is_mounted:
            self._load(offset=self._query.offset)

    def _load(self, **changes: object) -> None:
        """Ask for a page."""
        book = self.book
        self._query = replace(self._query, **changes)  # type: ignore[arg-type]
        if book is not None:
            self.ask("page", partial(book.page, self._query), self._show_page)

    def _show_page(self, page: RunPage) -> None:
        self._page = page
        self.show_trouble(None)
        table = self.query_one(RunTable)
        table.show(page.runs)
        query = self._query
        parts = [f"{query.offset + 1 if page.total else 0} to {query.offset + len(page.runs)} of {page.total:,}"]
        parts.append(f"by {query.sort}, {'rising' if query.is_ascending else 'falling'}")
        if query.verdict:
            parts.append(f"only {query.verdict}")
        if query.with_withdrawn:
            parts.append("withdrawn too")
        self.query_one("#runs-state", Static).update("; ".join(parts))
        self.refresh_bindings()

    @on(Input.Changed, "#runs-filter")
    def _filter_typed(self, event: Input.Changed) -> None:
        event.stop()
        self.later("filter", FILTER_S, lambda: self._load(words=event.value.strip(), offset=0))

    @on(Input.Submitted, "#runs-filter")
    def _filter_done(self, event: Input.Submitted) -> None:
        event.stop()
        self.query_one(RunTable).focus()

    @on(CodeTable.Looked)
    def _looked(self, event: CodeTable.Looked) -> None:
        book = self.book
        if event.code is None or book is None:
            self.forget("run")
            self.query_one(RunView).show(None, None)
            return
        self.ask("run", partial(load_run, event.code, book), self._show_run)

    def _show_run(self, found: RunFound) -> None:
        run, drawing, history = found
        self.query_one(RunView).show(run, drawing, history)
        self.query_one("#runs-run", Panel).say(f"Run {run.code}")
        self.refresh_bindings()

    @on(CodeTable.Opened)
    def _opened(self, event: CodeTable.Opened) -> None:
        self.app.push_screen(RunScreen(event.code))

    @property
    def shown_run(self) -> Run | None:
        """Return the run under the cursor."""
        views = self.query(RunView)
        return views.first().run if views else None

    def run_changed(self, run: Run) -> None:
        """Show the page again."""
        self._load()
        if self.book is not None:
            self.ask("run", partial(load_run, run.code or "", self.book), self._show_run)

    def check_action(self, action: str, parameters: tuple[object, ...]) -> bool | None:
        """Grey out pages that are not there."""
        query = self._query
        if action == "next_page":
            return True if query.offset + len(self._page.runs) < self._page.total else None
        if action == "page_before":
            return True if query.offset else None
        return super().check_action(action, parameters)

    def action_filter(self) -> None:
        """Go to the words."""
        self.query_one("#runs-filter").focus()

    def action_sort(self) -> None:
        """Take the next order."""
        self._load(sort=SORTS[(SORTS.index(self._query.sort) + 1) % len(SORTS)], offset=0)

    def action_turn(self) -> None:
        """Turn the order round."""
        self._load(is_ascending=not self._query.is_ascending, offset=0)

    def action_verdict(self) -> None:
        """Show the next verdict only."""
        at = VERDICTS.index(self._query.verdict)
        self._load(verdict=VERDICTS[(at + 1) % len(VERDICTS)], offset=0)

    def action_withdrawn(self) -> None:
        """Show withdrawn runs too, or not."""
        self._load(with_withdrawn=not self._query.with_withdrawn, offset=0)

    def action_next_page(self) -> None:
        """Turn the page."""
        self._load(offset=self._query.offset + PAGE)

    def action_page_before(self) -> None:
        """Turn back."""
        self._load(offset=max(0, self._query.offset - PAGE))

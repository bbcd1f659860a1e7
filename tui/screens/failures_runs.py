"""The runs behind a figure: named groups of runs in a list, the one under the cursor drawn beside it."""

from __future__ import annotations

from functools import partial
from typing import ClassVar

from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal
from textual.widgets import Footer, Static

from kb.record.run import Run
from tui.failure_words import Behind
from tui.ports import BookPort
from tui.present import safe
from tui.screens.run_actions import RunActions
from tui.screens.run_detail import RunFound, RunScreen, load_run
from tui.styles import HERE
from tui.widgets.figures import Column, FigureTable
from tui.widgets.panel import Panel
from tui.widgets.run_view import RunView

COLUMNS = (Column("Run", 7), Column("", 14, grows=1))


class RunsBehindScreen(RunActions[None]):
    """Runs that a figure was counted from."""

    CSS_PATH = [HERE / "runs.tcss", HERE / "failures.tcss"]  # noqa: RUF012 - as declared by Textual
    HELP = """
The runs behind a figure. Arrow keys walk through them, s goes on to the next group (failed, came through, false
alarms and so on), Enter opens a run on a screen of its own, Escape goes back.
"""
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("s", "group", "Next group", id="behind.group", tooltip="The next group of runs"),
        Binding("escape", "back", "Back", id="behind.back", tooltip="Back to the figures"),
    ]

    def __init__(self, held: Behind) -> None:
        super().__init__()
        self._held = held
        self._at = 0

    def compose(self) -> ComposeResult:
        """Lay out the list and the run."""
        yield Static(safe(self._held.title), id="behind-title", markup=False)
        with Horizontal(id="behind"):
            with Panel("Runs", id="behind-list"):
                yield Static("", id="behind-groups")
                yield FigureTable(COLUMNS, id="behind-table")
            with Panel("Run", id="behind-run"):
                yield RunView(id="behind-view")
        yield Static("", id="place-trouble", classes="trouble", markup=False)
        yield Footer(show_command_palette=False)

    def on_mount(self) -> None:
        """Show the first group."""
        super().on_mount()
        self._show_group()
        self.query_one(FigureTable).focus()

    def _show_group(self) -> None:
        groups = self._held.groups
        shown = groups[self._at]
        lines = [
            f"{'▸' if place == self._at else ' '}{len(group.codes):,} {group.title}"
            for place, group in enumerate(groups)
        ]
        self.query_one("#behind-groups", Static).update(safe("\n".join(lines), keep_lines=True))
        notes = shown.notes or ("",) * len(shown.codes)
        self.query_one(FigureTable).show_rows(
            [(safe(code), safe(note)) for code, note in zip(shown.codes, notes, strict=True)]
        )

    def book_arrived(self, book: BookPort) -> None:
        """Fetch the run under the cursor."""
        self._load()

    @property
    def _code(self) -> str | None:
        row = self.query_one(FigureTable).row
        codes = self._held.groups[self._at].codes
        return codes[row] if row is not None and row < len(codes) else None

    @on(FigureTable.Looked)
    def _looked(self, event: FigureTable.Looked) -> None:
        event.stop()
        self._load()

    def _load(self) -> None:
        book, code = self.book, self._code
        if book is not None and code is not None:
            self.ask("run", partial(load_run, code, book), self._show)

    def _show(self, found: RunFound) -> None:
        self.show_trouble(None)
        self.query_one(RunView).show(*found)
        self.query_one("#behind-run", Panel).say(f"Run {safe(found[0].code or '')}")
        self.refresh_bindings()

    @on(FigureTable.Opened)
    def _open(self, event: FigureTable.Opened) -> None:
        event.stop()
        if self._code is not None:
            self.app.push_screen(RunScreen(self._code))

    @property
    def shown_run(self) -> Run | None:
        """Return the run beside the list."""
        views = self.query(RunView)
        return views.first().run if views else None

    def run_changed(self, run: Run) -> None:
        """Fetch it again."""
        self._load()

    def check_action(self, action: str, parameters: tuple[object, ...]) -> bool | None:
        """Grey out the next group where there is only one."""
        if action == "group":
            return True if len(self._held.groups) > 1 else None
        return super().check_action(action, parameters)

    def action_group(self) -> None:
        """Show the next group."""
        self._at = (self._at + 1) % len(self._held.groups)
        self._show_group()

    def action_back(self) -> None:
        """Go back."""
        self.dismiss()

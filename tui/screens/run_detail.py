"""One run on a screen of its own, opened from a finding, a precedent or a search."""

from __future__ import annotations

from functools import partial
from typing import ClassVar

from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.widgets import Footer, Static

from kb.chem.layout import SchemeDrawing
from kb.record.run import Run
from tui.drawings import scheme_drawing
from tui.marks import mark_match
from tui.ports import BookPort, HistoryLine
from tui.present import safe
from tui.screens.run_actions import RunActions
from tui.styles import HERE
from tui.widgets.panel import Panel
from tui.widgets.run_view import RunView

RunFound = tuple[Run, SchemeDrawing, tuple[HistoryLine, ...]]


def load_run(code: str, book: BookPort) -> RunFound:
    """In the thread: return a run with its drawing and history."""
    run = book.get(code)
    return run, scheme_drawing(run.scheme), tuple(book.history(code))


class RunScreen(RunActions[None]):
    """One run."""

    CSS_PATH = HERE / "runs.tcss"
    HELP = "One run: what was done, what came out, who changed it. p takes it to planning, a amends, w withdraws."
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape", "back", "Back", id="run.back", tooltip="Back to where you came from"),
        Binding("ctrl+l", "numbers", "Numbers", id="run.numbers", tooltip="Atom numbers"),
    ]

    def __init__(self, code: str, matched: str = "", atoms: tuple[int, ...] = ()) -> None:
        super().__init__()
        self._code = code
        self._match = (matched, atoms)

    def compose(self) -> ComposeResult:
        """Lay out the run."""
        with Panel(f"Run {safe(self._code)}", id="run-panel"):
            yield RunView(id="run-view")
        yield Static("", id="place-trouble", classes="trouble", markup=False)
        yield Footer(show_command_palette=False)

    def on_mount(self) -> None:
        """Put the focus where keys scroll."""
        super().on_mount()
        self.query_one(RunView).focus()

    def book_arrived(self, book: BookPort) -> None:
        """Fetch the run."""
        self.ask("run", partial(load_run, self._code, book), self._show)

    def _show(self, found: RunFound) -> None:
        run, drawing, history = found
        self.query_one(RunView).show(run, mark_match(drawing, *self._match), history)
        self.refresh_bindings()

    @property
    def shown_run(self) -> Run | None:
        """Return the run."""
        views = self.query(RunView)
        return views.first().run if views else None

    def run_changed(self, run: Run) -> None:
        """Fetch it again."""
        if self.book is not None:
            self.book_arrived(self.book)

    def action_back(self) -> None:
        """Go back."""
        self.dismiss()

    def action_numbers(self) -> None:
        """Show or hide atom numbers."""
        from tui.widgets.structure import SchemeView

        for view in self.query(SchemeView):
            view.numbers = not view.numbers

"""The runs behind a step's yield: one opens at once, several are listed first.

Where a yield was typed no runs stand behind it; the closest ones to the step's own plan are offered then, and said to
be just that.
"""

from __future__ import annotations

from collections.abc import Sequence
from functools import partial
from typing import TYPE_CHECKING, ClassVar

from rich.text import Text
from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Vertical
from textual.widgets import Footer, Static

from kb.errors import RecordNotFound
from kb.record.run import Run
from kb.route.sequence import Step
from tui.ports import BookPort
from tui.present import safe
from tui.route_words import rests_words
from tui.screens.base import AskingScreen
from tui.screens.run_detail import RunScreen
from tui.styles import HERE
from tui.widgets.tables import CodeTable, RunTable

if TYPE_CHECKING:
    from tui.application import SidepathApp

MOST = 40
"""How many runs are listed; an estimate may rest a little on hundreds."""


def open_runs_behind(app: SidepathApp, step: Step) -> None:
    """Open the run behind a yield, or the list of them; say so where there is none."""
    codes, closest = step.yield_pct.runs, False
    if not codes and step.assessment is not None:
        codes, closest = tuple(p.run for p in step.assessment.precedents), True
    if not codes:
        app.notify("No runs stand behind this yield.", markup=False)
    elif len(codes) == 1 and not closest:
        app.push_screen(RunScreen(codes[0]))
    else:
        app.push_screen(RunsBehindScreen(step, codes[:MOST], closest))


class RunsBehindScreen(AskingScreen[None]):
    """The runs behind one yield."""

    CSS_PATH = HERE / "route.tcss"
    HELP = """
The runs behind one yield, those that carry most of it first. Where a yield was typed no runs stand behind it, and the
ones closest to the step's plan are listed instead. Enter opens a run; Escape goes back to the route.
"""
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape", "back", "Back", key_display="Esc", id="route-runs.back", tooltip="Back to the route"),
    ]

    def __init__(self, step: Step, codes: tuple[str, ...], closest: bool) -> None:
        super().__init__(classes="dialog-back")
        self._route_step = step
        self._codes = codes
        self._closest = closest

    @property
    def is_modal(self) -> bool:
        """Return True: nothing below takes keys."""
        return True

    def compose(self) -> ComposeResult:
        """Lay out what the yield rests on, and the runs."""
        title = "Closest runs to" if self._closest else "Runs behind the yield of"
        words = rests_words(self._route_step)
        if self._closest:
            words += " No runs stand behind it; these are the closest to its plan."
        with Vertical(classes="dialog", id="route-runs"):
            yield Static(Text(f"{title} {safe(self._route_step.name, 40)}", style="bold"))
            yield Static(Text(words), classes="quiet")
            yield RunTable(id="route-runs-table")
            yield Static("", id="place-trouble", classes="trouble", markup=False)
        yield Footer(show_command_palette=False)

    def book_arrived(self, book: BookPort) -> None:
        """Fetch the runs."""
        self.ask("runs", partial(_fetch, book, self._codes), self._show)

    def _show(self, runs: Sequence[Run]) -> None:
        table = self.query_one(RunTable)
        table.show(runs)
        table.focus()

    @on(CodeTable.Opened)
    def _opened(self, event: CodeTable.Opened) -> None:
        self.app.push_screen(RunScreen(event.code))

    def action_back(self) -> None:
        """Go back."""
        self.dismiss()


def _fetch(book: BookPort, codes: Sequence[str]) -> tuple[Run, ...]:
    """In the thread: return the runs; one that is gone meanwhile is left out."""
    found = []
    for code in codes:
        try:
            found.append(book.get(code))
        except RecordNotFound:
            continue
    return tuple(found)

"""A run in full: the scheme drawn with its conditions, what came out, the history."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from rich.table import Table
from rich.text import Text
from textual.app import ComposeResult
from textual.containers import VerticalScroll
from textual.widgets import Static

from kb.chem.layout import SchemeDrawing
from kb.record.run import Run
from tui.ports import HistoryLine
from tui.present import arrow_words, run_lines, safe
from tui.widgets.structure import SchemeView


class RunView(VerticalScroll):
    """One run, or words where there is none."""

    def __init__(self, **options: Any) -> None:
        super().__init__(**options)
        self.run: Run | None = None

    def compose(self) -> ComposeResult:
        """Lay out the drawing and the words."""
        yield SchemeView(classes="run-drawing", with_legend=True)
        yield Static("", classes="run-words")
        yield Static("", classes="run-history quiet")

    def show(
        self, run: Run | None, drawing: SchemeDrawing | None, history: Sequence[HistoryLine] = ()
    ) -> None:
        """Show a run; None clears."""
        is_same = run is not None and self.run is not None and run.code == self.run.code
        self.run = run
        view = self.query_one(SchemeView)
        words, past = self.query_one(".run-words", Static), self.query_one(".run-history", Static)
        if run is None:
            view.show(None)
            words.update("No run is chosen.")
            past.update("")
            return
        above, below = arrow_words(run.conditions)
        view.show(drawing, above, below)
        words.update(run_table(run))
        past.update(history_text(history))
        if not is_same:
            self.scroll_home(animate=False)


def run_table(run: Run) -> Table:
    """Return the lines of a run, long values wrapped under themselves."""
    table = Table.grid(padding=(0, 1))
    table.add_column(no_wrap=True)
    table.add_column(overflow="fold")
    for word, value in run_lines(run):
        table.add_row(Text(word, style="bold"), Text(value))
    return table


def history_text(history: Sequence[HistoryLine]) -> Text:
    """Return who changed the run, when, what and why."""
    text = Text()
    for line in history:
        when = line.when.strftime("%Y-%m-%d %H:%M") if line.when else "no date"
        text.append(f"{when}  {safe(line.who)}: {safe(line.what)}")
        text.append(f" ({safe(line.why)})\n" if line.why else "\n")
    return text

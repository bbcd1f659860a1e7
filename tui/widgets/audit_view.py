"""What the parts of the place *failures* share: the answer in a sentence on top, the figures and their runs below.

A part shows one audit, or says how to get it; it asks the book nothing itself.
"""

from __future__ import annotations

from typing import Any, ClassVar

from textual import on
from textual.app import ComposeResult
from textual.containers import Vertical
from textual.message import Message
from textual.widgets import Static

from tui.failure_words import Behind
from tui.present import safe
from tui.widgets.figures import FigureTable


class AuditView(Vertical):
    """One part."""

    KIND: ClassVar[str] = ""
    """Which question of the book it shows."""
    TITLE: ClassVar[str] = ""
    WAITS: ClassVar[str] = ""
    """What it says before there is an answer; a long question is only asked on a key."""
    IS_LONG: ClassVar[bool] = False

    class Looked(Message):
        """Another figure is looked at."""

    class RunsAsked(Message):
        """The runs behind a figure are asked for."""

        def __init__(self, view: AuditView) -> None:
            super().__init__()
            self.view = view

    def __init__(self) -> None:
        super().__init__(id=f"view-{self.KIND}", classes="audit-view")
        self.audit: Any = None

    def compose(self) -> ComposeResult:
        """Lay out the sentence and the figures."""
        yield Static(self.WAITS, classes="audit-lead", markup=False)
        with Vertical(classes="audit-figures"):
            yield from self.compose_figures()

    def compose_figures(self) -> ComposeResult:
        """Lay out the figures."""
        yield from ()

    def on_mount(self) -> None:
        """Show nothing but the sentence until there is an answer."""
        self.query_one(".audit-figures").display = False

    def say(self, words: str) -> None:
        """Change the sentence on top."""
        self.query_one(".audit-lead", Static).update(safe(words, keep_lines=True))

    def show(self, audit: Any) -> None:
        """Show an answer; None goes back to the beginning."""
        self.audit = audit
        self.query_one(".audit-figures").display = audit is not None
        if audit is None:
            self.say(self.WAITS)
        else:
            self.show_figures()

    def show_figures(self) -> None:
        """Show the figures of the answer."""

    def turn(self) -> None:
        """Show them another way."""

    @property
    def behind(self) -> Behind | None:
        """Return the runs behind the figure that is looked at."""
        return None

    @property
    def run_to_plan(self) -> str | None:
        """Return the code of a run that could be taken to planning."""
        return None

    def take_focus(self) -> None:
        """Put the focus where keys walk through the figures."""
        for table in self.query(FigureTable):
            table.focus()
            return

    @on(FigureTable.Looked)
    def _figure_looked_at(self, event: FigureTable.Looked) -> None:
        event.stop()
        if self.audit is not None:
            self.look(event.table)
        self.post_message(self.Looked())

    def look(self, table: FigureTable) -> None:
        """Take note that the cursor moved in a table."""

    @on(FigureTable.Opened)
    def _figure_opened(self, event: FigureTable.Opened) -> None:
        event.stop()
        self.post_message(self.RunsAsked(self))

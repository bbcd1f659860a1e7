"""First run: no book is open. Look at the demo, make a book, or open one that exists."""

from __future__ import annotations

from collections.abc import Callable
from functools import partial
from typing import ClassVar

from rich.text import Text
from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal, Vertical
from textual.widgets import Button, Footer, Input, ProgressBar, Static

from kb.errors import SidepathError
from tui.jobs import ThreadProgress
from tui.messages import JobProgressed
from tui.ports import BookPort
from tui.present import safe
from tui.screens.base import AskingScreen
from tui.styles import HERE
from tui.widgets.lines import SafeInput

WELCOME = (
    "Sidepath keeps a group's own runs, failed ones included, and tells before the next step is set up what the "
    "record and the literature say: what to expect, what is known against it, and which single change helps most.",
    "Choose a record book:",
)


class FirstRunScreen(AskingScreen[None]):
    """Choose a book."""

    CSS_PATH = HERE / "firstrun.tcss"
    HELP = """
The demo is a book of invented runs to look round in; nothing in it is a fact. A new book is one file; put
it where your group can reach it. An existing book is a file, or the URL of a database. Escape goes back to
the book that is open, if one is.
"""
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape", "back", "Back", id="first.back", tooltip="Back, or stop building the demo"),
        Binding("ctrl+d", "demo", "Demo", id="first.demo", tooltip="Build the demo book and open it"),
    ]

    def __init__(self, error: SidepathError | None = None) -> None:
        super().__init__(id="first-run")
        self._error = error
        self._progress: ThreadProgress | None = None

    def compose(self) -> ComposeResult:
        """Lay out the three ways."""
        with Vertical(id="first"):
            yield Static(Text("Sidepath", style="bold"), id="first-title")
            yield Static(Text("\n\n".join(WELCOME)), id="first-words")
            with Horizontal(classes="first-row"):
                yield Button("Look at the demo", id="first-demo", classes="-primary")
                yield Static("invented runs, to look round in", classes="quiet", markup=False)
            with Horizontal(classes="first-row"):
                yield Button("Make a new book", id="first-new")
                yield SafeInput(placeholder="where to keep it", id="first-new-path", classes="line")
            with Horizontal(classes="first-row"):
                yield Button("Open a book", id="first-open")
                yield SafeInput(placeholder="file, or URL of a database", id="first-open-path", classes="line")
            yield ProgressBar(id="first-progress", show_eta=False)
            yield Static("", id="place-trouble", classes="trouble", markup=False)
        yield Footer(show_command_palette=False)

    def on_mount(self) -> None:
        """Show why there is no book, if there is a reason worth showing."""
        super().on_mount()
        self.query_one("#first-new-path", Input).value = self.app.opener.default_place()
        self.query_one("#first-progress").display = False
        self.show_trouble(self._error)
        self.query_one("#first-demo").focus()

    @on(Button.Pressed, "#first-demo")
    def action_demo(self) -> None:
        """Build the demo and open it."""
        bar = self.query_one("#first-progress", ProgressBar)
        bar.display = True
        self._progress = ThreadProgress(self._report)
        self._open_with(partial(self.app.opener.demo, self._progress))

    @on(Button.Pressed, "#first-new")
    @on(Input.Submitted, "#first-new-path")
    def _new(self) -> None:
        place = self.query_one("#first-new-path", Input).value.strip()
        if not place:
            self.show_trouble(SidepathError("Say where to keep the new book.", "A file name is enough."))
            return
        self._open_with(partial(self.app.opener.create, place))

    @on(Button.Pressed, "#first-open")
    @on(Input.Submitted, "#first-open-path")
    def _existing(self) -> None:
        place = self.query_one("#first-open-path", Input).value.strip()
        if not place:
            self.show_trouble(SidepathError("Say which book to open.", "Give its file or URL."))
            return
        self._open_with(partial(self.app.opener.open, place))

    def _report(self, done: int, total: int | None, note: str) -> None:
        """In the thread: tell how far the demo is."""
        self.post_message(JobProgressed("demo", done, total, note))

    def _open_with(self, how: Callable[[], BookPort]) -> None:
        self.show_trouble(None)
        self.ask("open", how, self._use)

    def _use(self, book: BookPort) -> None:
        self._progress = None
        self.app.use_book(book)
        self.dismiss()

    def show_trouble(self, error: SidepathError | None) -> None:
        """Show what went wrong, and put the bar away."""
        super().show_trouble(error)
        if error is not None:
            self._progress = None
            for bar in self.query("#first-progress"):
                bar.display = False

    @on(JobProgressed)
    def _progressed(self, event: JobProgressed) -> None:
        event.stop()
        bar = self.query_one("#first-progress", ProgressBar)
        bar.update(total=event.total, progress=event.done)
        bar.tooltip = safe(event.note)

    def action_back(self) -> None:
        """Stop building, else go back to the open book; without one there is nowhere to go."""
        if self._progress is not None:
            self._progress.cancel()
        elif self.book is not None:
            self.dismiss()
        else:
            self.show_trouble(SidepathError("No book is open yet.", "Choose one, or leave with Ctrl+Q."))

"""Which route file: a path to type, those opened lately, and trouble in place until one can be read.

The file is looked up in the book while this dialog stands; Escape stops that. It gives the path with the route, or
None.
"""

from __future__ import annotations

from collections.abc import Sequence
from functools import partial
from pathlib import Path
from typing import ClassVar

from rich.text import Text
from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Vertical
from textual.widgets import Footer, Input, OptionList, Static
from textual.widgets.option_list import Option

from kb.errors import Cancelled, SidepathError
from kb.route.sequence import Route
from tui.ports import BookPort
from tui.present import safe
from tui.screens.base import AskingScreen, Progressed
from tui.styles import HERE
from tui.widgets.lines import SafeInput

Opened = tuple[str, Route]


class RouteFilesScreen(AskingScreen[Opened | None]):
    """Choose a route file and wait until it is looked up."""

    AUTO_FOCUS = "#route-path"
    CSS_PATH = HERE / "route.tcss"
    HELP = """
A route file is TOML or JSON; `sidepath route --help` shows one. Type its path and press Enter, or choose one that was
opened lately. Escape stops, or goes back.
"""
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape", "back", "Back", key_display="Esc", id="route-files.back", tooltip="Stop, or go back"),
    ]

    def __init__(self, last: str = "", at_once: str = "") -> None:
        super().__init__(classes="dialog-back")
        self._last = last
        self._at_once = at_once
        self._recent: tuple[str, ...] = ()
        self._is_opening = False

    @property
    def is_modal(self) -> bool:
        """Return True: nothing below takes keys."""
        return True

    def compose(self) -> ComposeResult:
        """Lay out the line and the list."""
        with Vertical(classes="dialog", id="route-files"):
            yield Static(Text("Open a route file", style="bold"))
            yield SafeInput(self._at_once or self._last, placeholder="path of a .toml or .json file", id="route-path")
            yield Static("", id="route-files-state", classes="quiet", markup=False)
            yield Static("", id="place-trouble", classes="trouble", markup=False)
            yield OptionList(compact=True, markup=False, id="route-recent")
            yield Static("Enter opens, Tab goes to the list, Escape goes back.", classes="quiet", markup=False)
        yield Footer(show_command_palette=False)

    def book_arrived(self, book: BookPort) -> None:
        """Fetch the recent ones, and begin at once where a file is named already."""
        self.ask("recent", book.recent_routes, self._show_recent)
        if self._at_once:
            self._open(self._at_once)

    def _show_recent(self, places: Sequence[str]) -> None:
        self._recent = tuple(places)
        listing = self.query_one("#route-recent", OptionList)
        listing.clear_options()
        if not self._recent:
            listing.add_option(Option(Text("No route was opened before.", style="dim"), disabled=True))
            return
        for place in self._recent:
            text = Text(safe(Path(place).name, 30), style="bold", no_wrap=True, overflow="ellipsis")
            text.append(f"  {safe(Path(place).parent)}", style="not bold dim")
            listing.add_option(Option(text))
        listing.highlighted = 0  # so that Enter means something

    @on(Input.Submitted, "#route-path")
    def _typed(self, event: Input.Submitted) -> None:
        event.stop()
        if not event.value.strip():
            self.show_trouble(SidepathError("Say which file.", "Give the path of a .toml or .json file."))
            return
        self._open(event.value.strip())

    @on(OptionList.OptionSelected, "#route-recent")
    def _chosen(self, event: OptionList.OptionSelected) -> None:
        event.stop()
        if event.option_index < len(self._recent):
            self.query_one("#route-path", Input).value = self._recent[event.option_index]
            self._open(self._recent[event.option_index])

    def _open(self, typed: str) -> None:
        book = self.book
        if book is None or self._is_opening:
            return
        self.show_trouble(None)
        self._is_opening = True
        self._say("looking the steps up…")
        self.ask("open", partial(_open, book, typed), self._opened, self._refused)

    def _opened(self, found: Opened) -> None:
        self.dismiss(found)

    def _refused(self, error: SidepathError) -> None:
        self.show_trouble(error)
        self.query_one("#route-path", Input).focus()

    def show_trouble(self, error: SidepathError | None) -> None:
        """Show what went wrong; nothing is being looked up then."""
        self._is_opening = False
        self._say("")
        super().show_trouble(error)

    @on(Progressed)
    def _got_on(self, event: Progressed) -> None:
        if event.kind == "open" and self._is_opening:
            self._say(event.words)

    def _say(self, words: str) -> None:
        for line in self.query("#route-files-state").results(Static):
            line.update(safe(words))

    def action_back(self) -> None:
        """Stop looking up; else leave without a route."""
        if self._is_opening:
            self.forget("open")
            self.show_trouble(Cancelled("Stopped.", "Enter opens it again."))
        else:
            self.dismiss(None)


def _open(book: BookPort, typed: str) -> Opened:
    """In the thread: look a file up and remember it."""
    try:
        path = str(Path(typed).expanduser().absolute())
    except (RuntimeError, ValueError, OSError):
        path = typed
    route = book.open_route(path)
    book.remember_route(path)
    return path, route

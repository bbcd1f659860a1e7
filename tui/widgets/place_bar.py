"""The top line: the places with their keys, which book is open, who writes, and whether work is going on."""

from __future__ import annotations

from typing import Any

from textual.app import ComposeResult
from textual.containers import Horizontal
from textual.content import Content
from textual.reactive import reactive
from textual.widgets import Static

from kb.plain import shortened

PLACES: tuple[tuple[str, str, str], ...] = (
    ("planning", "F2", "Planning"),
    ("runs", "F3", "Runs"),
    ("finding", "F4", "Finding"),
    ("failures", "F5", "Failures"),
    ("route", "F6", "Route"),
)
"""Name, key and title of each place in the order of the bar."""


class PlaceBar(Horizontal):
    """Where one is, and where one can go."""

    is_busy: reactive[bool] = reactive(False)
    progress: reactive[str] = reactive("")

    def __init__(self, place: str, **options: Any) -> None:
        super().__init__(**options)
        self._place = place

    def compose(self) -> ComposeResult:
        """Lay out the places and the state of the book."""
        yield Static(self._tabs(), id="place-tabs")
        yield Static("", id="place-status", markup=False)

    def on_mount(self) -> None:
        """Follow the book's state."""
        self.watch(self.app, "book_words", self._show_status)

    def watch_is_busy(self) -> None:
        """Say that work is going on once it takes long enough to be noticed."""
        if self.is_busy:
            self.set_timer(0.3, self._show_status)
        else:
            self._show_status()

    def watch_progress(self) -> None:
        """Say how far the work is."""
        self._show_status()

    def on_resize(self) -> None:
        """Fit the state of the book to what is left of the line."""
        self._show_status()

    def _show_status(self) -> None:
        line = self.query_one("#place-status", Static)
        words = getattr(self.app, "book_words", "")
        if self.is_busy:
            words = f"{self.progress}, Esc stops" if self.progress else f"working…  {words}"
        # its place is fixed: laying the whole screen out anew, twice for each check, would be felt in typing
        line.update(fit_status(words, line.size.width or len(words)), layout=False)

    def _tabs(self) -> Content:
        parts: list[Content] = []
        for name, key, title in PLACES:
            here = name == self._place
            text = f"▸{key} {title}" if here else f" {key} {title}"
            style = "bold $accent" if here else "$foreground"
            parts.append(Content.styled(text, style).stylize(f"@click=app.place('{name}')"))
        return Content("").join(parts)


def fit_status(words: str, width: int) -> str:
    """Return the state of the book in `width` characters.

    The name of the book gives way first, since how many runs there are and who may write must be seen.

    >>> fit_status("group-of-four.sidepath · 421 runs · read only", 32)
    'group-of… · 421 runs · read only'
    """
    name, dot, rest = words.partition(" · ")
    spare = len(words) - width
    if spare <= 0 or not dot:
        return shortened(words, width)
    return shortened(name, max(len(name) - spare, 1)) + dot + rest if len(name) - spare >= 4 else rest[:width]

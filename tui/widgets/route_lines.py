"""What if: the amount wanted, and yield and conditions of the chosen step, as lines to type over.

It holds text and says when a line was edited; applying it is for the screen's workers. Lines that differ from the file
are flagged. A step without a scheme has no conditions to change: its lines are closed.
"""

from __future__ import annotations

from collections.abc import Mapping
from functools import partial
from typing import Any

from textual import on
from textual.app import ComposeResult
from textual.containers import Horizontal, Vertical
from textual.message import Message
from textual.widgets import Input, Static

from kb.errors import SidepathError
from tui.condition_text import FIELD_WORDS
from tui.ports import BookPort
from tui.present import safe
from tui.route_state import CONDITIONS
from tui.widgets.step_form import KINDS, CatalogueSuggester, LineInput

WANTED = "wanted"
ROWS: tuple[tuple[str, ...], ...] = (
    (WANTED, "yield"),
    ("solvent", "temperature"),
    ("reagent", "base"),
    ("acid", "time"),
    ("additive", "concentration"),
)
WORDS = {WANTED: "Wanted", "yield": "Yield", **FIELD_WORDS}
CLOSED = "no scheme"
EMPTY = "none"
"""Shown in an empty line: an example there would be taken for what the file says."""


class RouteLines(Vertical):
    """The lines of a what-if."""

    class Changed(Message):
        """A line was edited by hand."""

        def __init__(self, field: str, text: str) -> None:
            super().__init__()
            self.field = field
            self.text = text

    def __init__(self, **options: Any) -> None:
        super().__init__(**options)
        self._suggesters = {
            field: CatalogueSuggester(KINDS[field], partial(self._show_offers, field))
            for field in CONDITIONS
            if field in KINDS
        }
        self._quiet: dict[str, str] = {}

    def compose(self) -> ComposeResult:
        """Lay out two lines a row."""
        for number, row in enumerate(ROWS):
            with Horizontal(classes="form-row optional" if number == len(ROWS) - 1 else "form-row"):
                for position, field in enumerate(row):
                    yield Static(WORDS[field], classes="form-word second" if position else "form-word", markup=False)
                    yield LineInput(field, EMPTY, self._suggesters.get(field))
        yield Static("", id="route-offers", classes="quiet", markup=False)
        yield Static("", id="route-line-trouble", classes="trouble", markup=False)

    def use_book(self, book: BookPort) -> None:
        """Complete names from this book's catalogue."""
        for suggester in self._suggesters.values():
            suggester.book = book

    def line(self, field: str) -> LineInput:
        """Return the input of a field."""
        return self.query_one(f"#field-{field}", LineInput)

    def fill(self, texts: Mapping[str, str], hints: Mapping[str, str], changed: set[str], is_closed: bool) -> None:
        """Set every line without saying so.

        Args:
            texts: by field; what is not named is emptied.
            hints: shown where a line is empty.
            changed: fields that differ from the file.
            is_closed: the step has no scheme, so that conditions cannot be typed.
        """
        for row in ROWS:
            for field in row:
                line, text = self.line(field), texts.get(field, "")
                if line.value != text:
                    self._quiet[field] = text
                    line.value = text
                    line.cursor_position = len(text)
                shut = is_closed and field in CONDITIONS
                line.disabled = shut
                line.placeholder = safe(hints.get(field, "")) or (CLOSED if shut else EMPTY)
                line.set_class(field in changed, "-changed")

    def show_errors(self, errors: Mapping[str, SidepathError]) -> None:
        """Flag the bad lines and say what is wrong with the first of them."""
        fields = [field for row in ROWS for field in row]
        for field in fields:
            self.line(field).set_class(field in errors, "-bad")
        first = next((field for field in fields if field in errors), None)
        trouble = self.query_one("#route-line-trouble", Static)
        trouble.set_class(first is not None, "-shown")
        if first is not None:
            more = f" ({len(errors) - 1} more)" if len(errors) > 1 else ""
            trouble.update(f"✗ {WORDS[first]}: {safe(errors[first])}{more}")

    def _show_offers(self, field: str, lead: str, names: tuple[str, ...]) -> None:
        """Show names that resemble what is typed; → takes the first."""
        self.line(field).offer(lead, names, self.query_one("#route-offers", Static))

    def on_descendant_blur(self) -> None:
        """Offers belong to the line in focus."""
        self.query_one("#route-offers").display = False

    @on(Input.Changed)
    def _tell(self, event: Input.Changed) -> None:
        event.stop()
        if isinstance(event.input, LineInput):
            field = event.input.field
            if self._quiet.pop(field, None) == event.value:
                return
            self.post_message(self.Changed(field, event.value))

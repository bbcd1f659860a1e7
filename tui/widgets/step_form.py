"""The form of a step: scheme and conditions as typed lines, with completion from the catalogue.

It holds text and says when it changed; reading the text is for the screen's workers. Errors come back by
field name and are shown under the form, the field itself flagged. Entries of one line are parted by
semicolons.
"""

from __future__ import annotations

import asyncio
from collections.abc import Callable, Mapping
from functools import partial
from typing import ClassVar

from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal, Vertical
from textual.message import Message
from textual.suggester import Suggester
from textual.widgets import Input, Static

from kb.errors import SidepathError
from tui.condition_text import FIELD_EXAMPLES, FIELD_WORDS, ConditionTexts
from tui.ports import BookPort
from tui.present import safe
from tui.widgets.lines import SafeInput

KINDS = {
    "reagent": "reagent",
    "base": "reagent",
    "acid": "reagent",
    "additive": "reagent",
    "solvent": "solvent",
}
"""Which list of the catalogue completes a field."""

PLAN_ROWS: tuple[tuple[str, ...], ...] = (
    ("reagent",),
    ("base",),
    ("acid",),
    ("additive",),
    ("solvent",),
    ("temperature", "time"),
    ("concentration", "scale"),
    ("atmosphere", "project"),
)
RUN_ROWS: tuple[tuple[str, ...], ...] = (*PLAN_ROWS, ("vessel", "workup"))


class CatalogueSuggester(Suggester):
    """Completes the last entry of a line from the catalogue.

    Names that only resemble it are offered, not taken.
    """

    def __init__(self, kind: str, offer: Callable[[str, tuple[str, ...]], None]) -> None:
        super().__init__(use_cache=False, case_sensitive=True)
        self.kind = kind
        self.book: BookPort | None = None
        self._offer = offer

    async def get_suggestion(self, value: str) -> str | None:
        """Return the line with its last entry completed, None when nothing begins like it."""
        head, mark, last = value.rpartition(";")
        start = last.strip()
        if self.book is None or len(start) < 2 or "=" in start or ":" in start:
            self._offer("", ())
            return None
        try:
            offers = await asyncio.to_thread(self.book.lookup, start, self.kind)
        except SidepathError:
            return None
        lead = head + mark + last[: len(last) - len(last.lstrip())]
        for offer in offers:
            if offer.name.casefold().startswith(start.casefold()) and len(offer.name) > len(start):
                self._offer("", ())
                return lead + start + offer.name[len(start) :]
        self._offer(lead, tuple(offer.name for offer in offers[:4]))
        return None


class LineInput(SafeInput):
    """One line of a form: Enter and the arrow keys walk through the lines.

    These keys are taken before the line sees them, in the order in which they were pressed: letters that
        follow an Enter belong to the next line however fast they come.
    """

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("enter", "leave_line", "Next line", show=False, priority=True, id="form.enter"),
        Binding("tab", "app.focus_next", "Next line", show=False, priority=True, id="form.tab"),
        Binding("shift+tab", "app.focus_previous", "Line before", show=False, priority=True, id="form.shift-tab"),
        Binding("down", "app.focus_next", "Next line", show=False, priority=True, id="form.next"),
        Binding("up", "app.focus_previous", "Line before", show=False, priority=True, id="form.previous"),
    ]

    def __init__(self, field: str, placeholder: str = "", suggester: Suggester | None = None) -> None:
        super().__init__(
            placeholder=placeholder,
            suggester=suggester,
            select_on_focus=False,
            id=f"field-{field}",
            classes="line",
        )
        self.field = field
        self.offered = ""

    def offer(self, lead: str, names: tuple[str, ...], words: Static) -> None:
        """Offer names that resemble what is typed, told in `words`; none takes the offer back."""
        self.offered = lead + names[0] if names else ""
        words.display = bool(names) and self.has_focus
        if names:
            others = f"; or {', '.join(names[1:])}" if len(names) > 1 else ""
            words.update(f"→ takes {safe(names[0])}{safe(others)}")

    def action_cursor_right(self, select: bool = False) -> None:
        """At the end of the line take the completion, else the name that is offered; elsewhere move."""
        if self.offered and not self._suggestion and self.cursor_position >= len(self.value):
            self.value, self.offered = self.offered, ""
            self.cursor_position = len(self.value)
            return
        super().action_cursor_right(select)

    def action_leave_line(self) -> None:
        """Go to the next line; the completion, if there is one, is taken once all letters are in."""
        self.call_later(self._take_completion)
        self.screen.focus_next()

    def _take_completion(self) -> None:
        if self._suggestion and self._suggestion.startswith(self.value) and self.cursor_position >= len(self.value):
            self.value = self._suggestion
            self.cursor_position = len(self.value)


class StepForm(Vertical):
    """Scheme and conditions of one step."""

    class Changed(Message):
        """A line was edited by hand."""

        def __init__(self, form: StepForm, field: str) -> None:
            super().__init__()
            self.form = form
            self.field = field

        @property
        def control(self) -> StepForm:
            """Return the form."""
            return self.form

    def __init__(self, rows: tuple[tuple[str, ...], ...] = PLAN_ROWS, *, id: str | None = None) -> None:  # noqa: A002
        super().__init__(id=id)
        self._rows = rows
        self._suggesters = {
            field: CatalogueSuggester(kind, partial(self._show_offers, field)) for field, kind in KINDS.items()
        }
        self._quiet: dict[str, str] = {}

    def compose(self) -> ComposeResult:
        """Lay out one line per row."""
        with Horizontal(classes="form-row"):
            yield Static("Scheme", classes="form-word", markup=False)
            yield LineInput("scheme", "SMILES, reaction SMILES, or a name")
        for row in self._rows:
            with Horizontal(classes="form-row"):
                for position, field in enumerate(row):
                    words = FIELD_WORDS.get(field, field.capitalize())
                    yield Static(words, classes="form-word second" if position else "form-word", markup=False)
                    yield LineInput(field, FIELD_EXAMPLES.get(field, ""), self._suggesters.get(field))
        yield Static("", id="form-offers", classes="quiet", markup=False)
        yield Static("", id="form-trouble", classes="trouble", markup=False)

    @property
    def fields(self) -> tuple[str, ...]:
        """Return the names of the lines, top to bottom."""
        return ("scheme", *(field for row in self._rows for field in row))

    def use_book(self, book: BookPort) -> None:
        """Complete names from this book's catalogue."""
        for suggester in self._suggesters.values():
            suggester.book = book

    def line(self, field: str) -> LineInput:
        """Return the input of a field."""
        return self.query_one(f"#field-{field}", LineInput)

    @property
    def state(self) -> dict[str, str]:
        """Return every line as typed."""
        return {field: self.line(field).value for field in self.fields}

    @property
    def texts(self) -> ConditionTexts:
        """Return the condition lines."""
        return ConditionTexts.from_dict(self.state)

    def fill(self, state: Mapping[str, str]) -> None:
        """Set lines without saying so; fields that are not named stay."""
        for field in self.fields:
            if field in state and self.line(field).value != state[field]:
                self._quiet[field] = state[field]
                self.line(field).value = state[field]
                self.line(field).cursor_position = len(state[field])

    def show_errors(self, errors: Mapping[str, SidepathError]) -> None:
        """Flag the bad lines and say what is wrong with the first of them."""
        for field in self.fields:
            self.line(field).set_class(field in errors, "-bad")
        trouble = self.query_one("#form-trouble", Static)
        first = next((field for field in self.fields if field in errors), None)
        trouble.display = first is not None
        if first is not None:
            word = FIELD_WORDS.get(first, first.capitalize())
            more = f" ({len(errors) - 1} more)" if len(errors) > 1 else ""
            trouble.update(f"✗ {word}: {safe(errors[first])}{more}")

    def _show_offers(self, field: str, lead: str, names: tuple[str, ...]) -> None:
        """Show names that resemble what is typed; → takes the first."""
        self.line(field).offer(lead, names, self.query_one("#form-offers", Static))

    def on_descendant_blur(self) -> None:
        """Offers belong to the line in focus."""
        self.query_one("#form-offers").display = False

    @on(Input.Changed)
    def _tell(self, event: Input.Changed) -> None:
        event.stop()
        if isinstance(event.input, LineInput):
            field = event.input.field
            if self._quiet.pop(field, None) == event.value:
                return
            self.post_message(self.Changed(self, field))

"""The entry form itself: every line, choice and list of a run, filled from texts and read back as texts.

It knows where each field is and nothing of what the fields mean; that is `tui.entry_state`. One `Changed`
is posted for any edit by hand, none while it is being filled.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from textual import on
from textual.app import ComposeResult
from textual.containers import Horizontal, Vertical, VerticalScroll
from textual.message import Message
from textual.widgets import Button, Input, Select, Static, TextArea

from kb.chem.layout import SchemeDrawing
from kb.errors import SidepathError
from kb.vocabulary import Cause, Method, Verdict
from tui.entry_state import FIGURES, INTEGRALS, SHARES, failures_in, read_split, rows_in
from tui.present import words_of
from tui.widgets.lines import NoteArea, SafeInput
from tui.widgets.panel import Panel
from tui.widgets.product_rows import ProductRows
from tui.widgets.step_form import RUN_ROWS, StepForm
from tui.widgets.tick_list import TickList

TEXT_FIELDS = (*(name for name, _, _ in FIGURES), "dr", "motif", "reference", "date", "by")
CHOICES: dict[str, tuple[tuple[str, str], ...]] = {
    "how": (("integrals or areas", INTEGRALS), ("shares in %", SHARES)),
    "method": tuple((str(m).upper() if m is not Method.ISOLATED else "isolated", str(m)) for m in Method),
    "verdict": tuple((str(v), str(v)) for v in Verdict),
    "cause": tuple((str(c), str(c)) for c in Cause),
}
BLANK = ("verdict", "cause")
"""Choices that may stay open."""


class EntryForm(VerticalScroll, can_focus=False):
    """All fields of a run."""

    class Changed(Message):
        """Something was edited by hand."""

    def __init__(self, who: str, **options: Any) -> None:
        super().__init__(**options)
        self._who = who
        self._is_filling = False

    def compose(self) -> ComposeResult:
        """Lay out the step, the outcome and the words."""
        with Vertical(id="entry-left"):
            with Panel("Step as run"):
                yield StepForm(RUN_ROWS, id="step-form")
                yield Static("", id="reading", markup=False)
            with Panel("How it went"):
                yield from self._choice_row("verdict", "Verdict")
                yield TickList(id="field-failures")
                yield from self._line_row(("motif", "Motif lost", "SMARTS of what was hit"))
                yield from self._choice_row("cause", "Cause")
            with Panel("Words"):
                yield NoteArea(id="field-note", compact=True)
                yield from self._line_row(("reference", "Notebook", ""), ("date", "Date", "2026-03-01"))
                yield from self._line_row(("by", "By", self._who))
        with Vertical(id="entry-right"):
            with Panel("What was seen"):
                yield from self._choice_row("how", "Measured")
                yield from self._choice_row("method", "By")
                yield ProductRows(id="product-rows")
            with Panel("Figures"):
                pairs = [(name, word, "%") for name, word, _ in FIGURES]
                yield from self._line_row(*pairs[:2])
                yield from self._line_row(*pairs[2:])
                yield from self._line_row(("dr", "dr", "4:1"))
            with Horizontal(classes="buttons"):
                yield Button("Store the run", id="entry-store", classes="-primary")
                yield Button("Leave", id="entry-leave")

    def _line_row(self, *lines: tuple[str, str, str]) -> ComposeResult:
        with Horizontal(classes="form-row"):
            for position, (name, word, example) in enumerate(lines):
                classes = "form-word second wide-word" if position else "form-word wide-word"
                yield Static(word, classes=classes, markup=False)
                yield SafeInput(placeholder=example, id=f"field-{name}", classes="line")

    def _choice_row(self, name: str, word: str) -> ComposeResult:
        with Horizontal(classes="form-row"):
            yield Static(word, classes="form-word wide-word", markup=False)
            yield Select(
                CHOICES[name],
                prompt="not given" if name in BLANK else "choose",
                compact=True,
                allow_blank=name in BLANK,
                id=f"field-{name}",
                classes="choice",
            )

    @property
    def step(self) -> StepForm:
        """Return the lines of the step."""
        return self.query_one("#step-form", StepForm)

    @property
    def products(self) -> ProductRows:
        """Return the rows of the products."""
        return self.query_one(ProductRows)

    def offer_failures(self, modes: Sequence[tuple[str, str]], state: Mapping[str, str]) -> None:
        """Offer the controlled words for failures."""
        ticks = self.query_one(TickList)
        ticks.offer([(word, f"{words_of(word)}: {meaning}") for word, meaning in modes])
        ticks.tick(failures_in(state))

    def fill(self, state: Mapping[str, str]) -> None:
        """Write a state into every field but the products, without noting it as an edit."""
        self._is_filling = True
        try:
            self.step.fill(state)
            for name in TEXT_FIELDS:
                with self.prevent(Input.Changed):
                    self.query_one(f"#field-{name}", Input).value = state.get(name, "")
            for name, options in CHOICES.items():
                choice = self.query_one(f"#field-{name}", Select)
                with choice.prevent(Select.Changed):
                    if state.get(name) in {value for _, value in options}:
                        choice.value = state[name]
                    elif name in BLANK:
                        choice.clear()
            note = self.query_one("#field-note", TextArea)
            if note.text != state.get("note", ""):
                with note.prevent(TextArea.Changed):
                    note.load_text(state.get("note", ""))
            self.query_one(TickList).tick(failures_in(state))
        finally:
            self._is_filling = False

    def collect(self, state: Mapping[str, str]) -> dict[str, str]:
        """Return the state with what the fields hold now."""
        found = {**state, **self.step.state}
        for name in TEXT_FIELDS:
            found[name] = self.query_one(f"#field-{name}", Input).value
        for name in CHOICES:
            value = self.query_one(f"#field-{name}", Select).value
            found[name] = value if isinstance(value, str) else ""
        found["note"] = self.query_one("#field-note", TextArea).text
        found["failures"] = ",".join(self.query_one(TickList).ticked)
        found.update(self.products.figures)
        return found

    async def show_products(
        self, state: Mapping[str, str], drawings: Mapping[str, SchemeDrawing], in_words: bool, is_restored: bool
    ) -> None:
        """Show the products of a state.

        Lines are written into only when they are new or a state is restored: a figure that is being typed
            while the scheme is read again is never overwritten.
        """
        rows = rows_in(state)
        is_new = rows != self.products.rows
        if is_new:
            await self.products.set_rows(rows, in_words)
        if is_new or is_restored:
            self.products.fill(state)
        self.products.draw(drawings)
        self.show_split(state)

    def show_split(self, state: Mapping[str, str]) -> None:
        """Show what the figures come to."""
        self.products.show_split(read_split(state), state.get("how", INTEGRALS))

    def show_errors(self, errors: Mapping[str, SidepathError]) -> None:
        """Flag the bad fields and go to the first of them."""
        self.step.show_errors({k: v for k, v in errors.items() if k in self.step.fields})
        for name in TEXT_FIELDS:
            self.query_one(f"#field-{name}", Input).set_class(name in errors, "-bad")
        for name in errors:
            is_product = name.startswith("p") and "." in name
            target = f"#{name.replace('.', '-')}" if is_product else f"#field-{name}"
            if found := self.query(target):
                found.first().focus()
                return

    @on(StepForm.Changed)
    @on(Input.Changed)
    @on(Select.Changed)
    @on(TextArea.Changed)
    @on(TickList.Changed)
    @on(ProductRows.Changed)
    def _edited(self, event: Message) -> None:
        event.stop()
        if not self._is_filling:
            self.post_message(self.Changed())

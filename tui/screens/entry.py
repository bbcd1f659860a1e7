"""Recording a run, or amending one: the entry form put to the book, kept as a draft all the time.

It wires; reading the form is `tui.entry_state`, storing is the book's. Products are proposed from the
scheme, so that nobody has to draw them. A save that fails leaves the form as it is, with the reason.
"""

from __future__ import annotations

import asyncio
import datetime as dt
from collections.abc import Callable
from functools import partial
from typing import ClassVar
from uuid import uuid4

from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.widgets import Button, Footer, Static

from kb.chem.facts import Reading
from kb.chem.layout import SchemeDrawing
from kb.errors import SidepathError
from kb.record.run import Run
from kb.vocabulary import Fate, Method
from tui.copy_texts import run_texts
from tui.drawings import scheme_drawing
from tui.entry_state import (
    INTEGRALS,
    EntryRead,
    ProductRow,
    changes_between,
    possible_rows,
    read_entry,
    rows_in,
    state_of_outcome,
    with_rows,
)
from tui.jobs import EditLog
from tui.messages import RunStored
from tui.plan_state import read_plan
from tui.ports import BookPort
from tui.present import reading_words, safe
from tui.screens.base import AskingScreen
from tui.styles import HERE
from tui.widgets.entry_form import EntryForm

KEEP_S = 0.5
"""Pause after an edit until the draft is saved [s]."""

READ_S = 0.3
"""Pause after an edit until the products are proposed anew [s]."""

READ_FIELDS = ("scheme", "reagent", "base", "acid", "additive", "solvent")
"""What decides which products can form."""

ReadScheme = tuple[Reading, dict[str, SchemeDrawing], tuple[ProductRow, ...]]


class EntryScreen(AskingScreen[Run | None]):
    """Record a run, or amend one."""

    CSS_PATH = HERE / "entry.tcss"
    HELP = """
The entry form. The step is what you planned; change what was done differently. Below "What was seen" stand
the products that could have formed: give the integral and the protons (H) behind it (or the area and 1, or
shares in %), "0" where you looked and found nothing, "seen" where you could not measure; leave empty what
you did not look for. Ctrl+S stores the run. Everything is kept as a draft while you type; Escape leaves,
F10 takes it up again.
"""
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("ctrl+s", "store", "Store", id="entry.store", tooltip="Store the run in the book"),
        Binding("escape", "leave", "Leave", id="entry.leave", tooltip="Leave; the form is kept as a draft"),
        Binding("ctrl+z", "undo", "Undo", show=False, id="entry.undo", tooltip="Take back the last edit"),
        Binding("ctrl+y", "redo", "Redo", show=False, id="entry.redo", tooltip="Do the edit again"),
        Binding("f9", "add_product", "Other product", key_display="F9", id="entry.add", tooltip="Add one by SMILES"),
    ]

    def __init__(self, state: dict[str, str], amending: Run | None = None, draft_key: str = "") -> None:
        super().__init__()
        self._amending = amending
        outcome = state_of_outcome(amending) if amending else {"date": dt.date.today().isoformat()}
        self._state = {"how": INTEGRALS, "method": str(Method.NMR), **outcome, **state}
        self._draft_key = draft_key or (f"amend-{amending.code}" if amending else f"run-{uuid4().hex[:8]}")
        self._log = EditLog(self._state)
        self._drawings: dict[str, SchemeDrawing] = {}
        self._laying_out = asyncio.Lock()
        self._was_edited = bool(draft_key)

    def compose(self) -> ComposeResult:
        """Lay out the title, the form and the keys."""
        title = f"Amend {safe(self._amending.code)}" if self._amending else "Record a run"
        yield Static(title, id="entry-title", markup=False)
        yield EntryForm(self.app.who, id="entry")
        yield Static("", id="place-trouble", classes="trouble", markup=False)
        yield Footer(show_command_palette=False)

    @property
    def form(self) -> EntryForm:
        """Return the form."""
        return self.query_one("#entry", EntryForm)

    def on_mount(self) -> None:
        """Fill the form."""
        super().on_mount()
        self._fill()
        self.form.step.line("scheme").focus()

    def book_arrived(self, book: BookPort) -> None:
        """Offer the book's failure modes and read the scheme."""
        self.form.step.use_book(book)
        self.ask("modes", book.failure_modes, lambda modes: self.form.offer_failures(modes, self._state))
        self._read_scheme()
        self.refresh_bindings()

    def _fill(self) -> None:
        """Write the state into the form."""
        self.form.fill(self._state)
        self._lay_out_products(is_restored=True)

    def _lay_out_products(self, is_restored: bool = False) -> None:
        self.run_worker(self._show_products(is_restored), group="rows")

    async def _show_products(self, is_restored: bool) -> None:
        async with self._laying_out:  # rows are mounted one set after the other, never half a set
            if not is_restored:
                self._state = self.form.collect(self._state)
            await self.form.show_products(self._state, self._drawings, self.app.in_words, is_restored)

    @on(EntryForm.Changed)
    def _edited(self) -> None:
        before, self._state = self._state, self.form.collect(self._state)
        if self._state == before:
            return
        self._was_edited = True
        changed = next(k for k in self._state if self._state.get(k) != before.get(k))
        self._log.note(changed, self._state)
        self.form.show_split(self._state)
        if any(self._state.get(name) != before.get(name) for name in READ_FIELDS):
            self.later("read", READ_S, self._read_scheme)
        self.later("keep", KEEP_S, self._keep)

    def _read_scheme(self) -> None:
        book = self.book
        if book is not None and self._state.get("scheme", "").strip():
            self.ask("read", partial(_read, dict(self._state), book), self._show_reading, self._show_bad)

    def _show_reading(self, found: ReadScheme) -> None:
        reading, drawings, rows = found
        words = self.query_one("#reading", Static)
        words.set_class(not reading.ok, "-bad")
        words.update(("" if reading.ok else "✗ ") + reading_words(reading))
        self._drawings = {**self._drawings, **drawings}
        if reading.ok:
            self._state = with_rows(self.form.collect(self._state), rows)
        self._lay_out_products()

    def _show_bad(self, error: SidepathError) -> None:
        words = self.query_one("#reading", Static)
        words.add_class("-bad")
        words.update(f"✗ {safe(error)}")

    def _keep(self) -> None:
        """Save the draft."""
        book = self.book
        if book is not None and not book.is_read_only:
            self.ask("keep", partial(book.save_draft, self._draft_key, dict(self._state)), lambda _: None)

    def check_action(self, action: str, parameters: tuple[object, ...]) -> bool | None:
        """Grey out storing into a book that cannot be written."""
        if action == "store":
            return None if self.book is None or self.book.is_read_only else True
        return True

    @on(Button.Pressed, "#entry-store")
    def action_store(self) -> None:
        """Read the form and store the run; an amendment asks why first."""
        from tui.screens.asking import LineScreen

        if self.book is None or self.book.is_read_only:
            self.show_trouble(SidepathError("This book is open for reading only.", "Open one that can be written."))
            return
        self._state = self.form.collect(self._state)
        if self._amending is None:
            self._store("")
        else:
            screen = LineScreen("Why is the run amended?", "The reason is kept in the history.", go="Amend")
            self.app.push_screen(screen, lambda why: self._store(why) if why else None)

    def _store(self, why: str) -> None:
        book = self.book
        assert book is not None  # checked by action_store
        work = partial(_store_run, dict(self._state), book, self.app.who, self._amending, why)
        self.ask("store", work, self._stored)

    def _stored(self, read: EntryRead) -> None:
        self.form.show_errors(read.errors)
        self.show_trouble(next(iter(read.errors.values()), None))
        if read.run is None:
            return
        self._was_edited = False
        self.drop_later("keep")
        if self.book is not None:
            self._aside(partial(self.book.delete_draft, self._draft_key))
        self.app.notify(f"{read.run.code} is {'amended' if self._amending else 'recorded'}.", markup=False)
        for remark in read.remarks:
            self.app.notify(safe(remark), title="Does this add up?", severity="warning", markup=False)
        self.app.post_message(RunStored(read.run.code or ""))
        self.dismiss(read.run)

    @on(Button.Pressed, "#entry-leave")
    def action_leave(self) -> None:
        """Leave; what was typed stays as a draft."""
        if self._was_edited and self.book is not None and not self.book.is_read_only:
            self._state = self.form.collect(self._state)
            self._aside(partial(self.book.save_draft, self._draft_key, dict(self._state)))
            self.app.notify("Kept as a draft; F10 takes it up again.", markup=False)
        self.dismiss(None)

    def _aside(self, work: Callable[[], None]) -> None:
        """Let a worker of the application do what outlives this screen."""
        self.app.run_worker(work, thread=True, exit_on_error=False, group="drafts")

    def action_undo(self) -> None:
        """Take back the last edit."""
        self._restore(self._log.undo(), "Nothing to undo.")

    def action_redo(self) -> None:
        """Do the edit again."""
        self._restore(self._log.redo(), "Nothing to redo.")

    def _restore(self, state: dict[str, str] | None, otherwise: str) -> None:
        if state is None:
            self.app.notify(otherwise, markup=False, timeout=2)
            return
        self._state = with_rows(state, rows_in(self._state))
        self._fill()
        self.later("keep", KEEP_S, self._keep)

    def action_add_product(self) -> None:
        """Ask for the SMILES of another product."""
        from tui.screens.asking import LineScreen

        screen = LineScreen("Another product", "Its SMILES, or a word for it where the structure is not known:")
        self.app.push_screen(screen, self._add_product)

    def _add_product(self, text: str | None) -> None:
        if text:
            self.ask("product", partial(scheme_drawing, text), partial(self._product_drawn, text))

    def _product_drawn(self, text: str, drawing: SchemeDrawing) -> None:
        is_structure = drawing.left[0].drawing is not None
        row = ProductRow(fate=Fate.OTHER, smiles=text if is_structure else "", note="" if is_structure else text)
        self._state = with_rows(self.form.collect(self._state), (*rows_in(self._state), row))
        self._drawings[text] = drawing
        self._was_edited = True
        self._lay_out_products()
        self.later("keep", KEEP_S, self._keep)

    def copy_texts(self) -> dict[str, str]:
        """Return the run that is amended, or the scheme of the new one."""
        if self._amending is not None:
            return run_texts(self._amending)
        scheme = self._state.get("scheme", "")
        return {"SMILES": scheme} if scheme else {}


def _read(state: dict[str, str], book: BookPort) -> ReadScheme:
    """In the thread: say what the step can give under its conditions, and lay the products out."""
    plan = read_plan({**state, "scheme": book.scheme_text(state["scheme"].strip())}, book).plan
    reading = book.read_scheme(plan.scheme)
    if reading.ok:
        reading = book.check(plan, top=1).reading  # knows the nucleophile that is named in the conditions only
    kept = rows_in(state)
    wanted = possible_rows(reading) if reading.ok else kept
    smiles = {row.smiles for row in (*wanted, *kept) if row.smiles}
    return reading, {text: scheme_drawing(text) for text in smiles}, wanted


def _store_run(state: dict[str, str], book: BookPort, who: str, amending: Run | None, why: str) -> EntryRead:
    """In the thread: read the form and write the run, or say what is wrong with which field."""
    read = read_entry(state, book, who)
    if read.run is None:
        return read
    if amending is None:
        stored = book.add(read.run, who)
        return EntryRead(run=stored, remarks=tuple(book.remarks(stored)))
    changes = changes_between(amending, read.run)
    if not changes:
        return EntryRead(run=None, errors={"scheme": SidepathError("Nothing was changed.", "Change a field first.")})
    return EntryRead(run=book.amend(amending.code or "", changes, who, why, amending.revision))

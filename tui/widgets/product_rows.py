"""The products that may have formed, each drawn, with a place for its integral or share."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from textual import on
from textual.app import ComposeResult
from textual.containers import Horizontal, Vertical
from textual.content import Content
from textual.message import Message
from textual.widgets import Input, Static

from kb.chem.layout import SchemeDrawing
from tui.entry_state import INTEGRALS, ProductRow, RowShare, SplitRead
from tui.present import FATE_WORDS, bar_cells, bounds_short, percent, safe
from tui.widgets.lines import SafeInput
from tui.widgets.structure import SchemeView

BAR = 10


class ProductEntry(Horizontal):
    """One product."""

    def __init__(self, number: int, row: ProductRow, in_words: bool) -> None:
        super().__init__(classes="product")
        self.number = number
        self.row = row
        self._in_words = in_words

    def compose(self) -> ComposeResult:
        """Lay out the drawing, the words and the lines."""
        view = SchemeView(classes="product-drawing")
        view.in_words = self._in_words
        view.placeholder = "no structure given"
        yield view
        with Vertical(classes="product-words"):
            yield Static(Content(FATE_WORDS[self.row.fate]), classes="product-fate")
            yield Static(Content(safe(self.row.note or self.row.smiles, 200)), classes="product-note quiet")
            with Horizontal(classes="form-row"):
                yield Static("Integral", classes="form-word product-word", markup=False)
                yield SafeInput(placeholder="seen", id=f"p{self.number}-value", classes="line")
                yield Static("H", classes="form-word second product-protons", markup=False)
                yield SafeInput(placeholder="1", id=f"p{self.number}-protons", classes="line product-protons")
            yield Static("", classes="product-share", markup=False)

    @property
    def is_laid_out(self) -> bool:
        """Return True once the lines are there."""
        return bool(self.query(f"#p{self.number}-value"))

    def show_share(self, read: RowShare) -> None:
        """Show what the figure comes to, or what is wrong with it."""
        line = self.query_one(".product-share", Static)
        line.set_class(bool(read.error), "-bad")
        self.query_one(f"#p{self.number}-value").set_class(bool(read.error), "-bad")
        if read.error:
            line.update(f"✗ {safe(read.error)}")
        elif read.share is not None:
            bounds = "" if read.share.low == read.share.high else f" {bounds_short(read.share)}"
            line.update(f"{bar_cells(read.share, BAR)} {percent(read.share.mean)}{bounds}")
        else:
            line.update("seen, not measured" if read.is_seen else "")


class ProductRows(Vertical):
    """All products of the form."""

    class Changed(Message):
        """A figure was edited."""

    def __init__(self, **options: Any) -> None:
        super().__init__(**options)
        self._rows: tuple[ProductRow, ...] = ()

    def compose(self) -> ComposeResult:
        """Lay out the sum; rows come later."""
        yield Vertical(id="product-list")
        yield Static("", id="product-total", markup=False)

    @property
    def rows(self) -> tuple[ProductRow, ...]:
        """Return the rows that are shown."""
        return self._rows

    async def set_rows(self, rows: Sequence[ProductRow], in_words: bool) -> None:
        """Show these rows, in this order, empty."""
        self._rows = tuple(rows)
        listing = self.query_one("#product-list", Vertical)
        await listing.remove_children()
        await listing.mount(*(ProductEntry(n, row, in_words) for n, row in enumerate(rows)))

    def draw(self, drawings: Mapping[str, SchemeDrawing]) -> None:
        """Draw the products whose layout is there."""
        for entry in self.query(ProductEntry):
            if entry.row.smiles in drawings:
                entry.query_one(SchemeView).show(drawings[entry.row.smiles])

    def fill(self, state: Mapping[str, str]) -> None:
        """Write the figures of a state into the lines."""
        with self.prevent(Input.Changed):
            for entry in self.query(ProductEntry):
                for part in ("value", "protons"):
                    line = entry.query_one(f"#p{entry.number}-{part}", Input)
                    line.value = state.get(f"p{entry.number}.{part}", "")

    @property
    def figures(self) -> dict[str, str]:
        """Return what is written in the lines; nothing of rows that are just being laid out."""
        found = {}
        for entry in self.query(ProductEntry):
            for part in ("value", "protons"):
                for line in entry.query(f"#p{entry.number}-{part}").results(Input):
                    found[f"p{entry.number}.{part}"] = line.value
        return found

    def show_split(self, read: SplitRead, how: str) -> None:
        """Show every share and what they add up to."""
        entries = [entry for entry in self.query(ProductEntry) if entry.is_laid_out]
        for entry, share in zip(entries, read.rows, strict=False):
            entry.show_share(share)
            entry.set_class(how != INTEGRALS, "-shares")
            entry.query_one(".product-word", Static).update("Integral" if how == INTEGRALS else "Share, %")
        total = self.query_one("#product-total", Static)
        is_off = read.total is not None and not 0.95 <= read.total <= 1.05
        total.set_class(bool(read.error) or is_off, "-bad")
        if read.error:
            total.update(f"✗ {safe(read.error)}")
        elif read.total is None:
            total.update("Nothing measured yet.")
        elif how == INTEGRALS:
            total.update("Shares of what was integrated; they add up to 100 % by themselves.")
        else:
            total.update(
                f"Adds up to {percent(read.total)}" + (": something is missing or doubled." if is_off else ".")
            )

    @on(Input.Changed)
    def _tell(self, event: Input.Changed) -> None:
        event.stop()
        self.post_message(self.Changed())

"""Drafts: the forms that were kept unfinished, to be taken up or thrown away."""

from __future__ import annotations

from collections.abc import Sequence
from functools import partial
from typing import Any, ClassVar

from rich.text import Text
from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Vertical
from textual.widgets import OptionList, Static
from textual.widgets.option_list import Option

from tui.plan_state import PLAN_DRAFT
from tui.ports import BookPort, DraftLine
from tui.present import safe
from tui.screens.base import AskingScreen
from tui.styles import HERE


class DraftsScreen(AskingScreen[None]):
    """The kept forms."""

    CSS_PATH = HERE / "firstrun.tcss"
    HELP = "Forms that were kept unfinished. Enter takes one up again, Delete throws it away."
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape", "back", "Back", id="drafts.back", tooltip="Back"),
        Binding("delete", "drop", "Throw away", id="drafts.drop", tooltip="Throw the draft away"),
    ]

    def __init__(self) -> None:
        super().__init__(classes="dialog-back")
        self._drafts: tuple[DraftLine, ...] = ()

    @property
    def is_modal(self) -> bool:
        """Return True: nothing below takes keys."""
        return True

    def compose(self) -> ComposeResult:
        """Lay out the list."""
        with Vertical(classes="dialog", id="drafts-dialog"):
            yield Static(Text("Kept unfinished", style="bold"))
            yield OptionList(compact=True, markup=False, id="drafts-list")
            yield Static("Enter takes one up, Delete throws it away, Escape goes back.", classes="quiet", markup=False)
            yield Static("", id="place-trouble", classes="trouble", markup=False)

    def book_arrived(self, book: BookPort) -> None:
        """Fetch the list."""
        self.ask("drafts", book.list_drafts, self._show)

    def _show(self, drafts: Sequence[DraftLine]) -> None:
        self._drafts = tuple(d for d in drafts if d.key != PLAN_DRAFT)
        listing = self.query_one("#drafts-list", OptionList)
        listing.clear_options()
        if not self._drafts:
            listing.add_option(Option(Text("Nothing is kept.", style="dim"), disabled=True))
            return
        for draft in self._drafts:
            when = draft.saved_at.strftime("%Y-%m-%d %H:%M") if draft.saved_at else ""
            text = Text(f"{when:<17}", style="dim")
            text.append(safe(draft.title, 54) or "without a scheme")
            listing.add_option(Option(text))
        listing.highlighted = 0
        listing.focus()

    @on(OptionList.OptionSelected, "#drafts-list")
    def _take_up(self, event: OptionList.OptionSelected) -> None:
        event.stop()
        book = self.book
        if book is not None and event.option_index < len(self._drafts):
            key = self._drafts[event.option_index].key
            self.ask("load", lambda: book.load_draft(key), partial(self._open, key))

    def _open(self, key: str, draft: dict[str, Any] | None) -> None:
        from tui.screens.entry import EntryScreen

        state = {k: v for k, v in (draft or {}).items() if isinstance(v, str)}
        self.dismiss()
        self.app.push_screen(EntryScreen(state, draft_key=key))

    def action_drop(self) -> None:
        """Throw the highlighted draft away."""
        book = self.book
        listing = self.query_one("#drafts-list", OptionList)
        if book is not None and listing.highlighted is not None and listing.highlighted < len(self._drafts):
            key = self._drafts[listing.highlighted].key
            self.ask("drop", lambda: book.delete_draft(key), lambda _: self.book_arrived(book))

    def action_back(self) -> None:
        """Go back."""
        self.dismiss()

"""Opening real books: one that exists, a new one, or the demo.

It owns what is done where a book cannot be written (it is opened for reading) and where the default book lies.
"""

from __future__ import annotations

from pathlib import Path

from kb.errors import StoreRefused
from kb.progress import Progress
from tui.desk import load_chemistry
from tui.far_desk import FarDesk
from tui.plan_state import PLAN_DRAFT, state_of_plan
from tui.ports import BookPort


class DeskOpener:
    """Opens real books; keeps to `tui.application.Opener`."""

    def open(self, place: str | None) -> BookPort:
        """Open a book; one that cannot be written is opened for reading."""
        try:
            return FarDesk(place)
        except StoreRefused:
            return FarDesk(place, read_only=True)

    def create(self, place: str | None) -> BookPort:
        """Make a new book and open it."""
        from kb.book import create_book
        default = self.default_place()
        return FarDesk(create_book(None if place is None or place == default else str(Path(place).expanduser())))

    def demo(self, progress: Progress) -> BookPort:
        """Build the demo book where it is not there yet, open it, and lay its planned step in the form."""
        from kb.book import build_demo, demo_plan
        load_chemistry()
        place, _ = build_demo(None, progress)
        desk = FarDesk(str(place))
        if desk.load_draft(PLAN_DRAFT) is None:
            desk.save_draft(PLAN_DRAFT, state_of_plan(demo_plan()))
        return desk

    def default_place(self) -> str:
        """Return where the default book is or would be."""
        from kb.paths import default_book

        return str(default_book())

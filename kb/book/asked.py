"""What the record as a whole, routes and pages ask of an open book.

It owns a protocol and nothing else, so that these files stand beside the façade without importing it, and the façade
may call them.
"""

from __future__ import annotations

import datetime as dt
from typing import TYPE_CHECKING, Protocol

if TYPE_CHECKING:
    from kb.assess.record_view import RecordView
    from kb.record.assessment import Assessment
    from kb.record.plan import Plan
    from kb.record.run import Run
    from kb.search.finder import Finder
    from kb.store.store import Store
    from kb.store.values import HouseRule


class AskedBook(Protocol):
    """An open book, as far as it is asked here; `kb.book.Book` is one."""

    store: Store

    @property
    def path(self) -> str:
        """Return where the book is."""
        ...

    def count(self) -> int:
        """Return how many runs stand."""
        ...

    def view(self) -> RecordView:
        """Return the columns that judgement reads."""
        ...

    def finder(self) -> Finder:
        """Return the search over this book."""
        ...

    def rules(self) -> tuple[HouseRule, ...]:
        """Return the house rules, retired ones included."""
        ...

    def add_rule(self, rule: HouseRule) -> HouseRule:
        """Adopt a house rule."""
        ...

    def get(self, code: str) -> Run:
        """Return a run by code."""
        ...

    def check(self, plan: Plan, *, top: int = 5, at_date: dt.date | None = None) -> Assessment:
        """Check a planned step."""
        ...

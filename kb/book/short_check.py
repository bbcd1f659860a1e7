"""The short way of a check: one plan against a SQLite book as it was kept, without loading the store.

A command that checks one plan and ends would spend most of its time on loading SQLAlchemy and on turning the same
rows into the same columns. So the columns are kept in the cache folder (`kb/kept.py`) under the state of the book that
they were read from, and what little else is needed is read from the book itself (`kb/store/glance.py`). Where anything
is not as expected (no columns of this state, a server, a book that cannot be read) the answer is None, and the caller
opens the book, so that every refusal is worded in one place.
"""

from __future__ import annotations

import datetime as dt
import hashlib
from pathlib import Path
from typing import TYPE_CHECKING

from kb import kept, paths
from kb.errors import SidepathError
from kb.logs import tame_rdkit
from kb.record.assessment import Assessment
from kb.record.plan import Plan
from kb.store.glance import GlanceFailed, glance

if TYPE_CHECKING:
    from kb.book.facade import Book


def check_shortly(
    path_or_url: str | None, plan: Plan, *, top: int = 5, at_date: dt.date | None = None, wait_s: float
) -> Assessment | None:
    """Return the assessment that `Book.check` would give, or None where it cannot be had in the short way.

    Args:
        path_or_url: the book; None = the default place.
        plan, top, at_date: as for `Book.check`.
        wait_s: how long to wait for a lock [s].
    """
    address = path_or_url if path_or_url is not None else str(paths.default_book())
    try:
        with glance(address, wait_s) as look:
            if look is None:
                return None
            kept_view = kept.recall(_name(address), look.stamp)
            if kept_view is None:
                return None
            tame_rdkit()
            from kb.assess.acknowledged import note_acknowledged, plan_key
            from kb.assess.assessment import assess
            from kb.store.derivation import account_of_plan

            account = account_of_plan(plan)
            rest = kept_view.tanimoto(account.facts.substrate)
            view = kept_view.view(look)
            if at_date is not None:
                stands = view.dated_until(at_date)
                view, rest = view.only(stands), None if rest is None else rest[stands]
            found = assess(plan, view, look.house_rules(), rest, top, account)
            return note_acknowledged(found, look.acknowledgements(plan_key(plan)))
    except (GlanceFailed, SidepathError, OSError):
        return None  # the store will say what is the matter, if it is


def keep_for_next_time(book: Book) -> bool:
    """Keep the columns that a book was just checked by; return whether they could be kept."""
    try:
        with glance(book.path, 0.0) as look:
            if look is None:
                return False
            view = book.view_at(look.version)
            if view is None:
                return False
            from kb.assess.kept_view import keepable_view

            worth = keepable_view(view, look, book.store.book.deriving.recipe)
            return worth is not None and kept.keep(_name(book.path), look.stamp, worth)
    except (GlanceFailed, OSError):
        return False


def _name(address: str) -> str:
    """Return under which name the columns of a book are kept: one for each place."""
    place = str(Path(address).expanduser().absolute())
    return f"view-{hashlib.blake2b(place.encode(errors='surrogateescape'), digest_size=8).hexdigest()}"

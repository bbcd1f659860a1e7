"""A part of the demo book as a book of its own, for tests that need a real book but not a large one."""

from __future__ import annotations

from dataclasses import replace
from itertools import islice
from pathlib import Path
from uuid import uuid4

from kb.book import Book, create_book, open_book


def early_part(demo: Book, place: Path, runs: int) -> str:
    """Make a book of the first dated runs of the demo; return its place."""
    address = create_book(str(place))
    dated = (run for run in demo.store.iter_runs() if run.date is not None)
    with open_book(address) as book:
        for run in islice(dated, runs):
            book.add(replace(run, code=None, run_id=uuid4()), "XX")
    return address

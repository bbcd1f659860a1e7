"""What differs between the engines that keep books: the interface that each of them fills.

It owns the list of differences and nothing else. SQLite (`on_sqlite.py`) and PostgreSQL (`on_postgres.py`) fill it;
`engine.py` chooses. Whatever is the same on both is written once, above this, and asks nobody which engine it is on.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from contextlib import AbstractContextManager
from typing import Any, Protocol

import sqlalchemy as sa

from kb.errors import StoreError
from kb.store.address import Address, without_password

Waiting = Callable[[float], None]
"""Told now and then, while a writer waits, for how long it has waited [s]."""

Verdict = tuple[bool, str]
"""Whether a check passed, and what it found in a sentence."""


def first_line(error: BaseException) -> str:
    """Return what an error says, one line of it, without the passwords of an address."""
    said = str(error).strip()
    return without_password(said.splitlines()[0][:200]) if said else type(error).__name__


class WordIndex(Protocol):
    """Full text over what people wrote; a word of a search must begin a word of the run."""

    checks_by_writing: bool
    """Whether `is_consistent` needs the write transaction."""

    def create(self, connection: sa.Connection) -> None:
        """Make the empty index."""

    def forget(self, connection: sa.Connection, run_keys: Iterable[int]) -> None:
        """Take runs out; called before their rows change."""

    def learn(self, connection: sa.Connection, run_keys: Sequence[int]) -> None:
        """Take runs in; called after their rows were written."""

    def search(
        self, connection: sa.Connection, pieces: Sequence[str], limit: int | None, include_withdrawn: bool
    ) -> list[tuple[int, float]]:
        """Return (run_key, score) of the runs that hold all the pieces, best first."""

    def keys_with(self, connection: sa.Connection, wanted: Sequence[Sequence[str]]) -> list[int]:
        """Return the runs that hold one alternative of every word, in no order; schemes are not looked at."""

    def vocabulary(self, connection: sa.Connection) -> list[str]:
        """Return every word of the index, folded."""

    def is_consistent(self, connection: sa.Connection) -> bool:
        """Return True when the index says the same as the record."""

    def rebuild(self, connection: sa.Connection) -> None:
        """Make the index anew from the record."""


class Dialect(Protocol):
    """One engine's way of doing what every book needs."""

    words: WordIndex
    read_options: Mapping[str, Any]
    """Execution options of a read transaction, in which everything is of one moment."""
    write_options: Mapping[str, Any]
    """Execution options of the one write transaction; with them the engine waits for its turn when it begins."""

    def make_engine(self, address: Address, *, read_only: bool, wait_s: float, on_wait: Waiting | None) -> sa.Engine:
        """Return an engine for a book that is there; nothing is opened yet."""

    def prepare_for_writing(self, engine: sa.Engine, address: Address) -> None:
        """Do what a book needs once before it is written to."""

    def in_our_words(self, error: BaseException, book: str) -> StoreError:
        """Return what the driver says as an error of ours, naming the book."""

    def revising(self, connection: sa.Connection) -> AbstractContextManager[None]:
        """Hold the write transaction in which schema revisions run; raise StoreDamaged where they break a key."""

    def check_files(self, connection: sa.Connection) -> Verdict:
        """Check what lies under the tables."""

    def check_keys(self, connection: sa.Connection) -> Verdict:
        """Check that every row that points somewhere points at something."""

"""A whole book carried over to another place: from a file to a server, from a server to a file, or between two files.

Every table goes along as it is: runs, history with its hashes, derived facts, drafts, attached files. The book keeps
its identity, so that the old place and the new one can still be merged. It is read as of one moment while others use
it, and the old book is left as it was. At the new place the book is there whole or not at all: it is written in the
transaction, or the file, that makes it, read back, and compared row by row before it counts. It refuses a place where
something is already.
"""

from __future__ import annotations

import hashlib
from collections.abc import Iterator
from dataclasses import dataclass
from functools import partial
from pathlib import Path
from typing import Any
from uuid import UUID

import sqlalchemy as sa

from kb.errors import Cancelled, StoreDamaged
from kb.progress import Progress, Silent
from kb.store import schema, words
from kb.store.engine import Address, parse_address, translated
from kb.store.history import note_event
from kb.store.rows import AttachmentBlobRow, Row
from kb.store.session import book_id_of, need, utc_now
from kb.store.store import Store

ROWS_AT_ONCE = 1000
FILES_AT_ONCE = 4
"""Attached files in memory at a time; one may have 50 MB."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Moved:
    """What was carried over.

    Attributes:
        book: the new place, for showing.
        book_id: identity of the book, the same as before.
        rows: number of rows by table.
    """

    book: str
    book_id: UUID
    rows: dict[str, int]

    def as_dict(self) -> dict[str, Any]:
        """Return it as plain values."""
        return {"book": self.book, "book_id": str(self.book_id), "runs": self.rows["run"], "rows": self.rows}


def move(store: Store, target: str | Path, *, who: str, progress: Progress | None = None) -> Moved:
    """Carry a book over to a place where nothing is yet; return what went along.

    Args:
        store: the book; it is only read.
        target: path, or URL of a database without a book.
        who: initials of who moves it, for the book's own log at the new place.
        progress: told in rows; stopped = nothing is left at the new place.

    Raises:
        StoreExists: something is at the new place.
        StoreMissing, StoreRefused: no such folder or database, no permission, disk full.
        StoreDamaged: what was read back differs; nothing is left at the new place.
        Cancelled: stopped.
    """
    need(who, "Say who moves the book", "initials (--as)")
    return copy_all(store, target, progress, said=(who, f"From {store.book.address}."))


def copy_all(
    store: Store, target: str | Path, progress: Progress | None = None, *, said: tuple[str, str] | None = None
) -> Moved:
    """Carry a book over without a word in its log, unless who and what is to be `said` there; see `move`."""
    where = parse_address(target)
    counted: dict[str, int] = {}
    with store.book.reading() as source:
        book_id = book_id_of(source)
        schema.create(where, partial(_pour, store, source, where, counted, progress or Silent(), said))
    return Moved(book=str(where), book_id=book_id, rows=counted)


def _pour(
    store: Store,
    source: sa.Connection,
    where: Address,
    counted: dict[str, int],
    progress: Progress,
    said: tuple[str, str] | None,
    target: sa.Connection,
) -> None:
    """Fill fresh tables from another book, parents before children, and compare."""
    tables = Row.metadata.sorted_tables
    total = 2 * sum(source.execute(sa.select(sa.func.count()).select_from(table)).scalar_one() for table in tables)
    done = 0
    for table in tables:
        here, there = _Digest(), _Digest()
        for rows in _batches(source, table, store.book.address):
            target.execute(sa.insert(table), rows)
            here.take(rows)
            done += len(rows)
            _go_on(progress, done, total, "rows carried over")
        for rows in _batches(target, table, where):
            there.take(rows)
            done += len(rows)
            _go_on(progress, done, total, "rows compared")
        if here != there:
            raise StoreDamaged(
                f"What was read back of {table.name} is not what was written.", "Nothing was kept of the copy."
            )
        counted[table.name] = here.count
    words.rebuild(target)
    if said is not None:
        note_event(target, utc_now(), said[0], "moved", said[1])


def _batches(connection: sa.Connection, table: sa.Table, address: Address) -> Iterator[list[dict[str, Any]]]:
    """Yield the rows of a table; trouble with reading them names the book at `address`."""
    size = FILES_AT_ONCE if table is AttachmentBlobRow.__table__ else ROWS_AT_ONCE
    statement = sa.select(table).execution_options(yield_per=size)
    with translated(address):
        for part in connection.execute(statement).mappings().partitions():
            yield [dict(row) for row in part]


def _go_on(progress: Progress, done: int, total: int, note: str) -> None:
    if progress.cancelled():
        raise Cancelled("Moving was stopped.", "Nothing was left at the new place; the book is as it was.")
    progress.advance(done, total, note)


@dataclass(slots=True)
class _Digest:
    """Number of rows and sum of their digests: equal for equal rows in any order, for engines sort text differently."""

    count: int = 0
    total: int = 0

    def take(self, rows: list[dict[str, Any]]) -> None:
        """Add some rows; floats, moments and bytes count to the last bit."""
        for row in rows:
            digest = hashlib.blake2b(repr(tuple(row.values())).encode("utf-8", "surrogatepass"), digest_size=16)
            self.total = (self.total + int.from_bytes(digest.digest())) % 2**128
        self.count += len(rows)

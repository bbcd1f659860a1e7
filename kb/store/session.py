"""One open book: its engine, its transactions, and what it derives facts with.

Everything on this floor that touches the database is handed one of these and asks it for a transaction.
Connections never leave the floor.
"""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable, Iterable, Iterator
from contextlib import AbstractContextManager, contextmanager
from dataclasses import dataclass
from uuid import UUID

import sqlalchemy as sa

from kb.errors import InvalidRecord, StoreRefused
from kb.record.json_fields import UNKEEPABLE
from kb.store import engine as engines
from kb.store import history, recording
from kb.store.deriving import Deriving, Encodings
from kb.store.form import BOOK_ID, CHANGES, CREATED_AT

__all__ = ["BOOK_ID", "CHANGES", "CREATED_AT"]

Clock = Callable[[], dt.datetime]


def utc_now() -> dt.datetime:
    """Return the moment, aware, in UTC."""
    return dt.datetime.now(dt.UTC)


@dataclass(frozen=True, slots=True, kw_only=True)
class OpenBook:
    """An open book.

    Attributes:
        address: where it is.
        engine: how it is reached.
        deriving: the callables that make facts.
        read_only: it was opened for reading only.
        clock: gives moments.
    """

    address: engines.Address
    engine: sa.Engine
    deriving: Deriving
    read_only: bool = False
    clock: Clock = utc_now

    def reading(self) -> AbstractContextManager[sa.Connection]:
        """Hand out a read transaction: everything read is of one moment."""
        return engines.reading(self.engine, self.address)

    @contextmanager
    def writing(self, *, is_change: bool = True) -> Iterator[sa.Connection]:
        """Hand out the write transaction; the counter of changes goes up with it.

        Args:
            is_change: False for what no answer rests on (a draft): the counter stays, and with it whatever others
                have read of the book, which would take seconds to read again after every word that is typed.

        Raises:
            StoreRefused: opened for reading only.
            StoreBusy: another writer held on too long.
        """
        if self.read_only:
            raise StoreRefused(f"{self.address} was opened for reading only.", "Open it for writing.")
        with engines.writing(self.engine, self.address) as connection:
            yield connection
            if is_change:
                counter = history.read_meta(connection, CHANGES)
                history.write_meta(connection, CHANGES, str(int(counter or 0) + 1))

    def foreseen(self, smiles: Iterable[str]) -> Encodings:
        """Encode, before the write lock is taken, the structures that the book does not hold yet."""
        encodings = Encodings(deriving=self.deriving)
        self.foresee(encodings, smiles)
        return encodings

    def foresee(self, encodings: Encodings, smiles: Iterable[str]) -> None:
        """Encode those of the structures that neither the book nor the encodings hold yet."""
        if self.deriving.encode is not None:
            wanted = set(smiles) - encodings.by_smiles.keys()
            with self.reading() as connection:
                encodings.foresee(wanted - recording.known_structures(connection, wanted).keys())


def book_id_of(connection: sa.Connection) -> UUID:
    """Return the UUID of the book; a copy of the file has the same."""
    return UUID(history.read_meta(connection, BOOK_ID))


def need(text: str, what: str, how: str) -> None:
    """Raise InvalidRecord where a person, a reason or a name is missing or holds what no book keeps."""
    if not isinstance(text, str) or not text.strip():
        raise InvalidRecord(f"{what}.", f"Give {how}.", text)
    keepable(text)


def keepable(*texts: str) -> None:
    """Raise InvalidRecord where a text holds NUL or unpaired surrogates, which no book keeps."""
    for text in texts:
        if UNKEEPABLE.search(text):
            raise InvalidRecord(f"{ascii(text)[:60]} holds characters that no book keeps.", "Leave them out.", text)

"""How a book is reached: which engine an address means, transactions, and the database's complaints in our words.

It knows engines and transactions, no tables. What an engine does in its own way is in `on_sqlite.py` and
`on_postgres.py`; this file chooses between them, by address, by connection or by who complains. It refuses to make
anything where no book is (only `Store.create` does) and to write to a book opened for reading.

Invariants, on either engine
    a reader sees one moment, never waits for the writer, and the writer never waits for readers.
    one writer: a write transaction has its turn before its first statement, so it never fails half-way for want
    of it; who waits too long is told so (StoreBusy).
"""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import sqlalchemy as sa

from kb.errors import SidepathError, StoreBusy, StoreDamaged, StoreError, StoreMissing, StoreRefused
from kb.store.address import Address, parse_address
from kb.store.dialect import Dialect, Waiting, first_line
from kb.store.on_postgres import OnPostgres
from kb.store.on_sqlite import OnSqlite

__all__ = [
    "WAIT_S",
    "Address",
    "Waiting",
    "dialect_of",
    "make_engine",
    "parse_address",
    "prepare_for_writing",
    "reading",
    "translated",
    "writing",
]

WAIT_S = 30.0
"""How long a writer waits for another before StoreBusy [s]; a bulk import commits every second or so."""

ON_SQLITE: Dialect = OnSqlite()
ON_POSTGRES: Dialect = OnPostgres()


def dialect_of(where: Address | sa.Connection | sa.Engine) -> Dialect:
    """Return the engine's way of doing things, for an address or for what leads there."""
    if isinstance(where, Address):
        return ON_POSTGRES if where.url is not None else ON_SQLITE
    return ON_POSTGRES if where.dialect.name == "postgresql" else ON_SQLITE


def make_engine(address: Address, *, read_only: bool, wait_s: float, on_wait: Waiting | None = None) -> sa.Engine:
    """Return an engine for a book that is there; nothing is opened yet."""
    return dialect_of(address).make_engine(address, read_only=read_only, wait_s=wait_s, on_wait=on_wait)


@contextmanager
def reading(engine: sa.Engine, address: Address) -> Iterator[sa.Connection]:
    """Hand out a connection inside one read transaction: everything read is of one moment."""
    options = dialect_of(engine).read_options
    with translated(address), engine.connect().execution_options(**options) as connection, connection.begin():
        yield connection


@contextmanager
def writing(engine: sa.Engine, address: Address) -> Iterator[sa.Connection]:
    """Hand out a connection whose turn it is to write; commits at the end, or rolls all of it back."""
    options = dialect_of(engine).write_options
    with translated(address), engine.connect().execution_options(**options) as connection, connection.begin():
        yield connection


def prepare_for_writing(engine: sa.Engine, address: Address) -> None:
    """Do what a book needs once before it is written to.

    Raises:
        StoreRefused: the book lies where it cannot be written safely.
    """
    with translated(address):
        dialect_of(address).prepare_for_writing(engine, address)


@contextmanager
def translated(address: Address | Path) -> Iterator[None]:
    """Turn what the database or the system says into the store's errors, naming the book."""
    try:
        yield
    except sqlite3.Error as error:
        raise ON_SQLITE.in_our_words(error, str(address)) from error
    except sa.exc.DBAPIError as error:
        said = error.orig or error
        whose = ON_SQLITE if isinstance(said, sqlite3.Error) else ON_POSTGRES
        raise whose.in_our_words(said, str(address)) from error
    except sa.exc.TimeoutError as error:
        raise StoreBusy(f"{address} has no free connection.", "Close what is open, or try again.") from error
    except sa.exc.SQLAlchemyError as error:
        raise StoreDamaged(
            f"{address} holds what this program cannot read ({first_line(error)}).", "Run `sidepath verify`."
        ) from error
    except BrokenPipeError:  # whoever reads our output went away; nothing to do with the book
        raise
    except OSError as error:
        raise _system_refused(error, str(address)) from error
    except SidepathError:
        raise
    except (ValueError, TypeError, OverflowError) as error:  # a column holds what it was never given
        raise StoreDamaged(
            f"{address} holds a value that cannot be read ({first_line(error)}).", "Run `sidepath verify`."
        ) from error


def _system_refused(error: OSError, book: str) -> StoreError:
    what = error.strerror or first_line(error)
    if isinstance(error, FileNotFoundError):
        return StoreMissing(f"There is no {error.filename or book}.", "Check the path.", what)
    return StoreRefused(f"{book}: {what}.", "Check permissions and room on the disk.", what)

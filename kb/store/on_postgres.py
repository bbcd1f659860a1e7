"""Books in a PostgreSQL database: how it is reached, how writers take turns, what the server's complaints mean.

One schema of a database holds one book: the one that the search path names first, `public` unless the address says
otherwise (`?options=-csearch_path%3Dname`). The database must be there, in UTF-8; making and guarding it is the
server's business, and so is a backup of all of it (pg_dump).

Invariants
    a reader sees one moment    read transactions are REPEATABLE READ and READ ONLY.
    one writer                  a write transaction first takes an advisory lock that belongs to the book, and is READ
                                COMMITTED so that it sees what the writer before it left. Writers queue in the order in
                                which they came; readers never wait.
    durability                  is the server's: with `fsync` and `synchronous_commit` on, as they are unless somebody
                                changed it, an acknowledged run survives a power cut.
    one calendar                sessions speak UTC and ISO dates, however the server is set up.
The advisory lock is a promise among this program's own processes; whoever writes by other means should take it too.
"""

from __future__ import annotations

import logging
import time
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from typing import Any

import sqlalchemy as sa
from sqlalchemy.pool import ConnectionPoolEntry

from kb.errors import StoreBusy, StoreDamaged, StoreError, StoreMissing, StoreRefused
from kb.store.address import Address
from kb.store.dialect import Verdict, Waiting, WordIndex, first_line
from kb.store.rows import Row
from kb.store.words_postgres import PostgresWords

log = logging.getLogger(__name__)

LOCK_CLASS = 0x51DE
"""First half of the advisory lock's key, which keeps it apart from other programs' locks; the book's schema is the
second."""

CONNECT_WAIT_S = 10
SLICE_MS = 1000
"""How long a writer waits in the server's queue before it says so [ms]. It then queues anew, each time for twice as
long: with many writers whoever left the queue every second would never come to its head."""

_LOCK = f"SELECT pg_advisory_xact_lock({LOCK_CLASS}, hashtext(current_schema()))"
_TRY_LOCK = f"SELECT pg_try_advisory_xact_lock({LOCK_CLASS}, hashtext(current_schema()))"


class OnPostgres:
    """PostgreSQL's way of doing what every book needs; see `Dialect`."""

    words: WordIndex = PostgresWords()
    read_options: Mapping[str, Any] = {"isolation_level": "REPEATABLE READ", "postgresql_readonly": True}
    write_options: Mapping[str, Any] = {"isolation_level": "READ COMMITTED", "writes": True}

    def make_engine(self, address: Address, *, read_only: bool, wait_s: float, on_wait: Waiting | None) -> sa.Engine:
        """Return an engine for a book on a server; nothing is opened yet.

        Raises:
            StoreRefused: the driver is not installed.
        """
        assert address.url is not None
        url = address.url
        if "connect_timeout" not in url.query:
            url = url.update_query_dict({"connect_timeout": str(CONNECT_WAIT_S)})
        try:
            engine = sa.create_engine(url, pool_pre_ping=True, max_overflow=20, hide_parameters=True)
        except ImportError as error:
            raise StoreRefused(
                f"{address} cannot be reached: the driver is not installed ({first_line(error)}).",
                "Install it: `pip install 'sidepath[postgres]'`.",
                str(address),
            ) from error

        def prepare(raw: Any, _entry: ConnectionPoolEntry) -> None:
            _prepare(raw, wait_s)

        def begin(connection: sa.Connection) -> None:
            if connection.get_execution_options().get("writes"):
                _take_turn(connection, address, wait_s, on_wait)

        sa.event.listen(engine, "connect", prepare)
        sa.event.listen(engine, "begin", begin)
        return engine

    def prepare_for_writing(self, engine: sa.Engine, address: Address) -> None:
        """Do nothing: the server keeps its own log."""

    def in_our_words(self, error: BaseException, book: str) -> StoreError:
        """Return what the server or the driver says as an error of ours."""
        return _in_our_words(error, book)

    @contextmanager
    def revising(self, connection: sa.Connection) -> Iterator[None]:
        """Hold the write transaction; the server refuses a row that would point nowhere by itself."""
        with connection.execution_options(**self.write_options).begin():
            yield

    def check_files(self, connection: sa.Connection) -> Verdict:
        """Tell where the record lies; its pages are the server's, which notices a broken one when it reads it."""
        version = connection.exec_driver_sql("SHOW server_version").scalar_one()
        sums = connection.exec_driver_sql("SHOW data_checksums").scalar_one()
        return True, f"The server keeps its files (PostgreSQL {str(version).split()[0]}, checksums {sums})."

    def check_keys(self, connection: sa.Connection) -> Verdict:
        """Check that the server still enforces every key: a constraint may be dropped, or not validated."""
        loose = connection.execute(
            sa.text(
                "SELECT count(*) FROM pg_constraint WHERE contype = 'f' AND convalidated "
                "AND connamespace = current_schema()::regnamespace"
            )
        ).scalar_one()
        wanted = sum(len(table.foreign_key_constraints) for table in Row.metadata.tables.values()) + 1
        if loose < wanted:
            return False, f"The server enforces {loose} of {wanted} keys; somebody took the others away."
        return True, f"The server enforces all {loose} keys."


def _prepare(raw: Any, wait_s: float) -> None:
    """Set what a session must agree on with every other; short locks (of a migration) are waited for like a turn."""
    with raw.cursor() as cursor:
        cursor.execute(f"SET lock_timeout TO {max(1, int(wait_s * 1000))}")
        cursor.execute("SET timezone TO 'UTC'")
        cursor.execute("SET datestyle TO 'ISO, YMD'")
    raw.commit()


def _take_turn(connection: sa.Connection, address: Address, wait_s: float, on_wait: Waiting | None) -> None:
    """Wait until no other writer holds the book, as the first thing of a transaction."""
    import psycopg

    raw: Any = connection.connection.dbapi_connection
    began, slice_ms = time.monotonic(), SLICE_MS
    try:
        if raw.execute(_TRY_LOCK).fetchone()[0]:
            return
        while True:
            left_ms = int((wait_s - (time.monotonic() - began)) * 1000)
            if left_ms <= 0:
                raise StoreBusy(f"{address} is being written by somebody else for too long.", "Try again in a minute.")
            raw.execute(f"SET LOCAL lock_timeout TO {min(slice_ms, left_ms)}")
            try:
                raw.execute(_LOCK)
            except psycopg.errors.LockNotAvailable:
                raw.rollback()
                slice_ms *= 2
                waited = time.monotonic() - began
                log.info("waiting for another writer for %.0f s", waited)
                if on_wait is not None:
                    on_wait(waited)
            else:
                raw.execute("SET LOCAL lock_timeout TO DEFAULT")
                return
    except psycopg.Error as error:
        raise _in_our_words(error, str(address)) from error


# What the server says, by SQLSTATE: https://www.postgresql.org/docs/current/errcodes-appendix.html

_UNREACHABLE = "Check that the server runs, and host, port and name in the address."


def _in_our_words(error: BaseException, book: str) -> StoreError:
    state, said = getattr(error, "sqlstate", None) or "", first_line(error)
    if state in ("55P03", "57014", "40001", "40P01"):  # no lock in time, cancelled, serialisation, deadlock
        return StoreBusy(f"{book} is being used by somebody else for too long.", "Try again in a minute.", said)
    if state in ("53300", "57P03"):  # too many connections; starting up or shutting down
        return StoreBusy(f"The server of {book} takes no more visitors now ({said}).", "Try again in a minute.", said)
    if state == "42501":
        return StoreRefused(
            f"You may not do that in {book} ({said}).",
            "Ask who keeps the server for the role of a contributor or a curator (see migrations/roles.sql).",
            said,
        )
    if state == "25006":
        return StoreRefused(f"{book} cannot be written now ({said}).", "Ask who keeps the server.", said)
    if state == "53100":
        return StoreRefused(f"The disk of the server that holds {book} is full.", "Nothing was half-written.", said)
    if state.startswith(("XX001", "XX002")):
        return StoreDamaged(f"{book} is damaged on the server ({said}).", "Restore the server's last backup.", said)
    if state == "42P01" and "alembic_version" in said:
        return StoreMissing(f"There is no book in {book}.", "Check the address, or make one: `sidepath new`.", said)
    if state in ("42P01", "42703", "42883"):  # no such table, column or function
        return StoreDamaged(f"{book} is no record book, or a part of it is gone ({said}).", "Check the address.", said)
    if state.startswith("22"):
        return StoreRefused(f"{book} cannot keep a value that was given ({said}).", "Nothing was written.", said)
    if not state or state.startswith(("08", "57P", "28", "3D")):
        return _not_reached(state, said, book)
    return StoreError(f"{book}: {said}.", "Run `sidepath verify`.", said)


def _not_reached(state: str, said: str, book: str) -> StoreError:
    """Return why there is no connection; the driver gives no SQLSTATE for most of it."""
    if state.startswith("3D") or ("database" in said and "does not exist" in said):
        return StoreMissing(f"There is no database for {book} ({said}).", "Ask for one: `createdb NAME`.", said)
    if state.startswith("28") or "authentication failed" in said or "pg_hba.conf" in said or "no password" in said:
        return StoreRefused(
            f"The server of {book} does not let you in ({said}).",
            "Check user and password; ~/.pgpass keeps a password out of the address.",
            said,
        )
    return StoreRefused(
        f"The server of {book} cannot be reached ({said}).",
        f"{_UNREACHABLE} If a run was being recorded, look whether it is there before you record it again.",
        said,
    )

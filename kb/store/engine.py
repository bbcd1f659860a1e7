"""How a book is reached: address to engine, one writer at a time, and the database's complaints in our words.

It knows engines and transactions, no tables. It refuses to make a file where none is (only `Store.create`
does), to write to a book opened for reading, and to put a book's write-ahead log on a network file system,
where SQLite's shared memory does not work (https://www.sqlite.org/wal.html, "all processes using a database
must be on the same host").

Invariants for SQLite
    write-ahead log     readers never wait for the writer, nor the writer for them; a reader sees one moment.
    synchronous=FULL    a commit returns after the log is on the disk: an acknowledged run survives a power
                        cut, not only `kill -9`. NORMAL would be quicker per run, but may lose the last runs
                        of a power cut, and one run a minute is what people write.
    one writer          every write transaction starts with BEGIN IMMEDIATE, so a transaction never fails
                        half-way for want of the lock. Waiting is ours, with random pauses: SQLite's own
                        starves latecomers.
    foreign_keys=ON     set before the first statement; inside a transaction it would be ignored without a
                        word.
The listeners are attached to our engines only. Other engines need `begin_write` to take an equivalent lock.
"""

from __future__ import annotations

import logging
import os
import random
import sqlite3
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import sqlalchemy as sa
from sqlalchemy.pool import ConnectionPoolEntry

from kb.errors import SidepathError, StoreBusy, StoreDamaged, StoreError, StoreMissing, StoreRefused

log = logging.getLogger(__name__)

WAIT_S = 30.0
"""How long a writer waits for another before StoreBusy [s]; a bulk import commits every second or so."""

NETWORK_FILE_SYSTEMS = frozenset(
    {
        *("nfs", "nfs4", "cifs", "smb", "smb2", "smb3", "smbfs", "afs", "ncpfs", "glusterfs", "ceph"),
        *("lustre", "beegfs", "davfs", "fuse.davfs2", "fuse.sshfs", "fuse.rclone", "fuse.glusterfs", "fuse.s3fs"),
    }
)
"""Types, as the Linux mount table writes them, of file systems that several machines may mount."""

LOCK_WAIT_MS = 5000
"""How long SQLite itself waits for short locks: recovering a log after a crash, folding it in [ms]."""

Waiting = Callable[[float], None]
"""Told now and then, while a writer waits, for how long it has waited [s]."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Address:
    """Where a book is.

    Attributes:
        text: as given.
        path: the file, for SQLite; None for a server.
        url: the SQLAlchemy URL of a server; None for SQLite.
    """

    text: str
    path: Path | None = None
    url: sa.URL | None = None

    def __str__(self) -> str:
        return str(self.path) if self.path else (self.url.render_as_string() if self.url else self.text)


def parse_address(address: str | Path) -> Address:
    """Return where a book is, from a path or a SQLAlchemy URL.

    Raises:
        StoreError: empty, or a URL that SQLAlchemy cannot read, or an in-memory book (each thread would see
            another).
    """
    text = str(address)
    if not text.strip() or "\x00" in text:
        raise StoreError("No book is named.", "Give a path, or a URL such as postgresql+psycopg://host/name.", text)
    if "://" not in text:
        return Address(text=text, path=Path(text).expanduser())
    try:
        url = sa.make_url(text)
        backend = url.get_backend_name()
    except (sa.exc.ArgumentError, ValueError) as error:
        raise StoreError(f"{text} is no address of a book.", "Give a path or a SQLAlchemy URL.", text) from error
    if backend != "sqlite":
        return Address(text=text, url=url)
    if not url.database or url.database == ":memory:":
        raise StoreError("A book in memory would be lost, and each thread would see another.", "Give a file.", text)
    return Address(text=text, path=Path(url.database))


def make_engine(address: Address, *, read_only: bool, wait_s: float, on_wait: Waiting | None = None) -> sa.Engine:
    """Return an engine for a book that is there; nothing is opened yet."""
    if address.path is None:
        assert address.url is not None
        try:
            return sa.create_engine(address.url, pool_pre_ping=True)
        except (sa.exc.NoSuchModuleError, ImportError) as error:
            raise StoreError(
                f"{address} cannot be reached: {_first_line(error)}.",
                "Check the first word of the URL; PostgreSQL wants `pip install sidepath[postgres]`.",
                address.text,
            ) from error
    path = address.path
    is_sealed = read_only and not os.access(path.absolute().parent, os.W_OK)

    def connect() -> sqlite3.Connection:
        mode = "mode=ro" if read_only else "mode=rw"
        if is_sealed and not path.with_name(path.name + "-wal").exists():
            mode += "&immutable=1"  # nobody can lay a log beside it for us to read, and none is there
        uri = f"{path.absolute().as_uri()}?{mode}"
        return sqlite3.connect(uri, uri=True, check_same_thread=False, timeout=LOCK_WAIT_MS / 1000)

    pool = {"poolclass": sa.pool.NullPool} if is_sealed else {"poolclass": sa.pool.QueuePool, "max_overflow": 20}
    engine = sa.create_engine("sqlite://", creator=connect, **pool)
    sa.event.listen(engine, "connect", _prepare)
    sa.event.listen(engine, "begin", lambda connection: _begin(connection, wait_s, on_wait))
    return engine


def _prepare(raw: Any, _entry: ConnectionPoolEntry) -> None:
    raw.isolation_level = None  # the driver must not begin transactions of its own
    raw.execute("PRAGMA foreign_keys=ON")
    raw.execute("PRAGMA synchronous=FULL")
    raw.execute("PRAGMA cache_size=-65536")  # 64 MB


def _begin(connection: sa.Connection, wait_s: float, on_wait: Waiting | None) -> None:
    raw: Any = connection.connection.dbapi_connection
    if not connection.get_execution_options().get("writes"):
        raw.execute("BEGIN")
        return
    began = time.monotonic()
    told = 1.0
    while True:
        raw.execute("PRAGMA busy_timeout=20")
        try:
            raw.execute("BEGIN IMMEDIATE")
        except sqlite3.OperationalError as error:
            waited = time.monotonic() - began
            if not _error_name(error).startswith(("SQLITE_BUSY", "SQLITE_LOCKED")) or waited > wait_s:
                raise
            if waited > told:
                told = waited + 1.0
                log.info("waiting for another writer for %.0f s", waited)
                if on_wait is not None:
                    on_wait(waited)
            time.sleep(random.uniform(0.001, 0.02))
        else:
            return
        finally:
            raw.execute(f"PRAGMA busy_timeout={LOCK_WAIT_MS}")


@contextmanager
def reading(engine: sa.Engine, address: Address) -> Iterator[sa.Connection]:
    """Hand out a connection inside one read transaction: everything read is of one moment."""
    with translated(address), engine.connect() as connection, connection.begin():
        yield connection


@contextmanager
def writing(engine: sa.Engine, address: Address) -> Iterator[sa.Connection]:
    """Hand out a connection that holds the write lock; commits at the end, or rolls all of it back."""
    with (
        translated(address),
        engine.connect().execution_options(writes=True) as connection,
        connection.begin(),
    ):
        begin_write(connection)
        yield connection


def begin_write(connection: sa.Connection) -> None:
    """Take the one-writer lock where the engine's BEGIN does not (PostgreSQL: an advisory lock)."""
    if connection.dialect.name == "postgresql":
        connection.execute(sa.text("SELECT pg_advisory_xact_lock(hashtext(current_database() || ':sidepath'))"))


def set_write_ahead(engine: sa.Engine, address: Address) -> None:
    """Switch a SQLite book to the write-ahead log, for good.

    Raises:
        StoreRefused: the book lies on a network file system.
    """
    if address.path is None:
        return
    refuse_network_file_system(address.path)
    with translated(address):
        raw = engine.raw_connection()
        try:
            cursor = raw.cursor()
            cursor.execute("PRAGMA journal_mode=WAL")
            cursor.close()
        finally:
            raw.close()


def refuse_network_file_system(path: Path) -> None:
    """Raise StoreRefused where the mount table says that `path` lies on another machine."""
    kind = file_system_of(path, Path("/proc/self/mounts"))
    if kind in NETWORK_FILE_SYSTEMS:
        raise StoreRefused(
            f"{path} lies on a network file system ({kind}), where several machines would damage a book.",
            "Keep the book on a local disk, or share it through a PostgreSQL server (--book postgresql+psycopg://...).",
            str(path),
        )


def file_system_of(path: Path, mounts: Path) -> str | None:
    """Return the type of the file system that holds `path`, by a mount table; None = cannot tell."""
    try:
        lines = mounts.read_text(encoding="utf-8", errors="replace").splitlines()
        place = path.absolute().parent.resolve()
    except OSError:
        return None
    best: tuple[int, str | None] = (-1, None)
    for line in lines:
        fields = line.split(" ")
        if len(fields) < 3:
            continue
        mount = Path(fields[1].replace("\\040", " "))
        if place == mount or mount in place.parents:
            best = max(best, (len(mount.parts), fields[2]), key=lambda found: found[0])
    return best[1]


@contextmanager
def translated(address: Address | Path) -> Iterator[None]:
    """Turn what the database or the system says into the store's errors, naming the book."""
    try:
        yield
    except sqlite3.Error as error:
        raise _in_our_words(error, str(address)) from error
    except sa.exc.DBAPIError as error:
        raise _in_our_words(error.orig or error, str(address)) from error
    except sa.exc.TimeoutError as error:
        raise StoreBusy(f"{address} has no free connection.", "Close what is open, or try again.") from error
    except sa.exc.SQLAlchemyError as error:
        raise StoreDamaged(
            f"{address} holds what this program cannot read ({_first_line(error)}).", "Run `sidepath verify`."
        ) from error
    except BrokenPipeError:  # whoever reads our output went away; nothing to do with the book
        raise
    except OSError as error:
        raise _system_refused(error, str(address)) from error
    except SidepathError:
        raise
    except (ValueError, TypeError, OverflowError) as error:  # a column holds what it was never given
        raise StoreDamaged(
            f"{address} holds a value that cannot be read ({_first_line(error)}).", "Run `sidepath verify`."
        ) from error


def _error_name(error: BaseException) -> str:
    return getattr(error, "sqlite_errorname", None) or ""


def _first_line(error: BaseException) -> str:
    return str(error).strip().splitlines()[0][:200] if str(error).strip() else type(error).__name__


def _in_our_words(error: BaseException, book: str) -> StoreError:
    name, said = _error_name(error), _first_line(error)
    if name.startswith(("SQLITE_BUSY", "SQLITE_LOCKED")):
        return StoreBusy(f"{book} is being written by somebody else for too long.", "Try again in a minute.", said)
    if name.startswith(("SQLITE_CORRUPT", "SQLITE_NOTADB")) or "decode to UTF-8" in said or "malformed" in said:
        return StoreDamaged(
            f"{book} is damaged or is no record book ({said}).",
            "Run `sidepath verify`, and `sidepath restore` from the last backup if it fails.",
            said,
        )
    if name == "SQLITE_FULL":
        return StoreRefused(f"The disk that holds {book} is full.", "Make room; nothing was half-written.", said)
    if name.startswith("SQLITE_IOERR"):
        return StoreRefused(
            f"The system could not read or write {book} ({said}; disk full, quota or a failing disk).",
            "Make room or check the disk; nothing was half-written.",
            said,
        )
    if name.startswith("SQLITE_READONLY"):
        return StoreRefused(f"{book} cannot be written.", "Ask for write permission on the file and its folder.", said)
    if name.startswith(("SQLITE_CANTOPEN", "SQLITE_PERM", "SQLITE_AUTH")):
        return StoreRefused(
            f"{book} cannot be opened.",
            "Check that the file and its folder exist and that you may write there.",
            said,
        )
    if "no such table" in said or "no such column" in said:
        return StoreDamaged(f"{book} is no record book, or a part of it is missing ({said}).", "Check the path.", said)
    return StoreError(f"{book}: {said}.", "Run `sidepath verify`.", said)


def _system_refused(error: OSError, book: str) -> StoreError:
    what = error.strerror or _first_line(error)
    if isinstance(error, FileNotFoundError):
        return StoreMissing(f"There is no {error.filename or book}.", "Check the path.", what)
    return StoreRefused(f"{book}: {what}.", "Check permissions and room on the disk.", what)

"""Books in one SQLite file: how it is opened, how writers take turns, what SQLite's complaints mean.

It refuses to make a file where none is, to write to a book opened for reading, and to put a write-ahead log on a
network file system, where SQLite's shared memory does not work (https://www.sqlite.org/wal.html, "all processes using
a database must be on the same host").

Invariants
    write-ahead log     readers never wait for the writer, nor the writer for them; a reader sees one moment.
    synchronous=FULL    a commit returns after the log is on the disk: an acknowledged run survives a power
                        cut, not only `kill -9`. NORMAL would be quicker per run, but may lose the last runs
                        of a power cut, and one run a minute is what people write.
    one writer          every write transaction starts with BEGIN IMMEDIATE, so a transaction never fails
                        half-way for want of the lock. Waiting is ours, with random pauses: SQLite's own
                        starves latecomers.
    foreign_keys=ON     set before the first statement; inside a transaction it would be ignored without a
                        word.
The listeners are attached to our engines only.
"""

from __future__ import annotations

import logging
import os
import random
import sqlite3
import time
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import sqlalchemy as sa
from sqlalchemy.pool import ConnectionPoolEntry

from kb.errors import StoreBusy, StoreDamaged, StoreError, StoreRefused
from kb.store.address import Address
from kb.store.dialect import Verdict, Waiting, WordIndex, first_line
from kb.store.words_sqlite import SqliteWords

log = logging.getLogger(__name__)

NETWORK_FILE_SYSTEMS = frozenset(
    {
        *("nfs", "nfs4", "cifs", "smb", "smb2", "smb3", "smbfs", "afs", "ncpfs", "glusterfs", "ceph"),
        *("lustre", "beegfs", "davfs", "fuse.davfs2", "fuse.sshfs", "fuse.rclone", "fuse.glusterfs", "fuse.s3fs"),
    }
)
"""Types, as the Linux mount table writes them, of file systems that several machines may mount."""

LOCK_WAIT_MS = 5000
"""How long SQLite itself waits for short locks: recovering a log after a crash, folding it in [ms]."""


class OnSqlite:
    """SQLite's way of doing what every book needs; see `Dialect`."""

    words: WordIndex = SqliteWords()
    read_options: Mapping[str, Any] = {}
    write_options: Mapping[str, Any] = {"writes": True}

    def make_engine(self, address: Address, *, read_only: bool, wait_s: float, on_wait: Waiting | None) -> sa.Engine:
        """Return an engine for a book that is there; nothing is opened yet."""
        path = address.path
        assert path is not None
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

    def prepare_for_writing(self, engine: sa.Engine, address: Address) -> None:
        """Switch a book to the write-ahead log, for good.

        Raises:
            StoreRefused: the book lies on a network file system.
        """
        assert address.path is not None
        refuse_network_file_system(address.path)
        raw = engine.raw_connection()
        try:
            cursor = raw.cursor()
            cursor.execute("PRAGMA journal_mode=WAL")
            cursor.close()
        finally:
            raw.close()

    def in_our_words(self, error: BaseException, book: str) -> StoreError:
        """Return what SQLite says as an error of ours."""
        return _in_our_words(error, book)

    @contextmanager
    def revising(self, connection: sa.Connection) -> Iterator[None]:
        """Hold the write transaction with foreign keys off, or rebuilding a parent table would delete its children."""
        raw = connection.connection.dbapi_connection
        assert isinstance(raw, sqlite3.Connection)
        raw.execute("PRAGMA foreign_keys=OFF")  # before the transaction begins, or it is ignored
        with connection.execution_options(**self.write_options).begin():
            yield
            ok, detail = self.check_keys(connection)
            if not ok:
                raise StoreDamaged(
                    f"Migrating would leave a book whose {detail}", "It was left as it was. Run `sidepath verify`."
                )
        connection.invalidate()  # the next one has its foreign keys on again

    def check_files(self, connection: sa.Connection) -> Verdict:
        """Let SQLite check its pages and indices."""
        said = connection.exec_driver_sql("PRAGMA integrity_check(5)").scalars().all()
        ok = said == ["ok"]
        return ok, "The file is whole." if ok else f"The file is damaged: {'; '.join(said)[:300]}"

    def check_keys(self, connection: sa.Connection) -> Verdict:
        """Count rows that point nowhere."""
        broken = connection.exec_driver_sql("PRAGMA foreign_key_check").all()
        return not broken, f"{len(broken)} rows point nowhere." if broken else "Every row that points points somewhere."


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


def refuse_network_file_system(path: Path) -> None:
    """Raise StoreRefused where the mount table says that `path` lies on another machine."""
    kind = file_system_of(path, Path("/proc/self/mounts"))
    if kind in NETWORK_FILE_SYSTEMS:
        raise StoreRefused(
            f"{path} lies on a network file system ({kind}), where several machines would damage a book.",
            "Keep the book on a local disk, or share it through a PostgreSQL server (--book postgresql://...).",
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


def _error_name(error: BaseException) -> str:
    return getattr(error, "sqlite_errorname", None) or ""


def _in_our_words(error: BaseException, book: str) -> StoreError:
    name, said = _error_name(error), first_line(error)
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

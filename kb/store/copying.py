"""One file made into another, whole or not at all: copying a book, giving it its name, making the disk remember.

It uses SQLite's online backup interface, never a copy of the file: a file copied while somebody writes, or without its
log, is torn. A copy is written beside its target, checked, flushed, and only then given its name: a half-written
copy is never mistaken for a good one. Nothing is ever written over.
"""

from __future__ import annotations

import contextlib
import os
import re
import sqlite3
import time
from collections.abc import Iterator
from contextlib import closing, contextmanager
from functools import partial
from pathlib import Path
from uuid import uuid4

from kb.errors import Cancelled, StoreDamaged, StoreExists, StoreMissing
from kb.progress import Progress, Silent
from kb.store.engine import translated

PAGES_PER_STEP = 2000
"""Pages copied between two reports; 8 MB with SQLite's usual page of 4096 bytes."""

ABANDONED_S = 86_400.0
"""Time after which nobody is writing a draft any more [s]: a day; the largest copy takes minutes."""


def copy_book(source: Path, target: Path, progress: Progress | None = None) -> None:
    """Copy a book of any revision to a file that is not there yet, verified, in one piece.

    Raises:
        StoreExists, StoreMissing, StoreDamaged, StoreRefused: as for `backup`.
    """
    refuse_taken(target)
    sweep_drafts(target)
    with translated(source), closing(connect(source, "ro")) as read:
        read.execute("BEGIN")  # one moment for the whole copy, or writers would make it start over and over
        read.execute("SELECT count(*) FROM sqlite_master").fetchone()
        with _draft_beside(target) as draft, translated(target):
            with closing(connect(draft, "rwc")) as write:
                _pour(read, write, source, progress or Silent())
                trouble = quick_trouble(write)
            if trouble:
                raise StoreDamaged(
                    f"The copy of {source} does not verify ({trouble}), so it was not kept.",
                    "Run `sidepath verify`; the book itself may be damaged.",
                    str(source),
                )
            _flush(draft)
            put_in_place(draft, target)


def _pour(read: sqlite3.Connection, write: sqlite3.Connection, source: Path, progress: Progress) -> None:
    """Copy page by page into one plain file without a log of its own; it gets one when it is opened as a book."""
    try:
        read.backup(write, pages=PAGES_PER_STEP, progress=partial(_report, progress))
    except sqlite3.DatabaseError as error:
        if (error.sqlite_errorname or "").startswith(("SQLITE_CORRUPT", "SQLITE_NOTADB")):
            with translated(source):  # it is the source that is damaged, not the target
                raise
        raise
    write.execute("PRAGMA journal_mode=DELETE")


def _report(progress: Progress, _status: int, remaining: int, total: int) -> None:
    if progress.cancelled():
        raise Cancelled("The copy was stopped.", "Nothing was kept of it.")
    progress.advance(total - remaining, total, "pages copied")


def quick_trouble(connection: sqlite3.Connection) -> str:
    """Return the first thing that is wrong with a file as SQLite sees it; "" = nothing."""
    for statement in ("PRAGMA integrity_check(1)", "PRAGMA foreign_key_check"):
        for row in connection.execute(statement):
            if row[0] != "ok":
                return " ".join(str(part) for part in row)
    return ""


def refuse_taken(path: Path) -> None:
    """Raise StoreExists where something has that name, StoreMissing where its folder is not there."""
    if path.exists() or path.is_symlink():
        raise StoreExists(f"{path} is there already.", "Choose another name; nothing was overwritten.", str(path))
    if not path.absolute().parent.is_dir():
        raise StoreMissing(f"There is no folder {path.absolute().parent}.", "Make it first.", str(path))


def put_in_place(draft: Path, path: Path) -> None:
    """Give a finished file its name, at once, never over another; and make sure that the folder remembers it.

    Logs that a deleted book left under that name are set aside first: SQLite would play them into the new file.

    Raises:
        StoreExists: somebody was quicker.
    """
    with translated(path):
        _set_orphans_aside(path)
        try:
            os.link(draft, path)
        except FileExistsError as error:
            raise StoreExists(f"{path} is there already.", "Nothing was overwritten.", str(path)) from error
        except OSError:  # a file system without hard links
            refuse_taken(path)
            draft.rename(path)
        flush_folder(path.absolute().parent)


def _set_orphans_aside(path: Path) -> None:
    """Rename the logs of a book that is gone; nothing is deleted. Where the book is there, they are its own."""
    if path.exists():
        return
    for ending in ("-wal", "-shm", "-journal"):
        log = path.with_name(path.name + ending)
        if log.exists():
            log.rename(log.with_name(f"{log.name}.orphan-{uuid4().hex[:8]}"))


def flush_folder(folder: Path) -> None:
    """Write a folder's entries to the disk, where the system can do that."""
    with contextlib.suppress(OSError):
        handle = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)


@contextmanager
def _draft_beside(target: Path) -> Iterator[Path]:
    draft = target.with_name(f".{target.name}.{uuid4().hex[:8]}.copy")
    try:
        yield draft
    finally:
        for part in ("", "-wal", "-shm", "-journal"):
            with contextlib.suppress(OSError):
                draft.with_name(draft.name + part).unlink(missing_ok=True)


def sweep_drafts(target: Path) -> None:
    """Take away half-written copies that a killed program left in a folder, once they are a day old.

    Until then somebody may still be writing them. Only names of the form that this program gives to drafts of books are
    looked at: hidden, the ending of the target, eight hex digits, and what it was to be.
    """
    draft = re.compile(rf"\..+{re.escape(target.suffix)}\.[0-9a-f]{{8}}\.(copy|new|restored)(-wal|-shm|-journal)?")
    with contextlib.suppress(OSError):
        for path in target.absolute().parent.iterdir():
            if draft.fullmatch(path.name) and path.is_file() and time.time() - path.stat().st_mtime > ABANDONED_S:
                path.unlink(missing_ok=True)


def connect(path: Path, mode: str) -> sqlite3.Connection:
    """Return a bare connection: `mode` is ro, rw or rwc, as in SQLite's URIs."""
    uri = f"{path.absolute().as_uri()}?mode={mode}"
    connection = sqlite3.connect(uri, uri=True, isolation_level=None, timeout=5.0)
    connection.execute("PRAGMA synchronous=FULL")
    return connection


def _flush(path: Path) -> None:
    handle = os.open(path, os.O_RDONLY)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)

"""Copies of a book: backup while others write, rotation, restoring; all verified before they count.

It never writes over anything, except where a restore was told to, and then the old book is kept beside it. A book on a
server is copied into a file, row by row, and can be restored to a server from there; that guards against what happens
to the book, and does not replace the server's own backup (pg_dump), which keeps roles and grants too. `verify` is in
`checking.py`.
"""

from __future__ import annotations

import re
import sqlite3
from contextlib import closing
from pathlib import Path
from uuid import uuid4

from kb.errors import StoreBusy, StoreMissing
from kb.progress import Progress
from kb.store import copying, schema
from kb.store.checking import verify
from kb.store.engine import Address, parse_address, translated
from kb.store.moving import copy_all
from kb.store.session import utc_now
from kb.store.store import Store

__all__ = ["KEPT", "backup", "backups_in", "replace_book", "restore", "verify"]

KEPT = 10
"""Backups kept in a folder unless the settings say otherwise."""


def backup(store: Store, target: str | Path, *, keep: int = KEPT, progress: Progress | None = None) -> Path:
    """Copy a book while others use it; return where the copy is.

    Args:
        store: the book.
        target: a file that is not there yet, or a folder: then the copy is named after the book and the moment, and
            only the latest `keep` copies of that book in the folder are kept.
        keep: copies kept in a folder; at least 1.

    Raises:
        StoreExists: the file is there already. StoreMissing: its folder is not.
        StoreDamaged: the copy does not verify; it is thrown away and older copies are kept.
        StoreRefused: no permission or disk full.
    """
    wanted = Path(target).expanduser()
    if not wanted.is_dir():
        _copy(store, wanted, progress)
        return wanted
    named = file_name_of(store.book.address)
    stamp = utc_now().strftime("%Y%m%dT%H%M%S%fZ")
    copy = wanted / f"{named.stem}-{stamp}{named.suffix}"
    _copy(store, copy, progress)
    with translated(wanted):
        for old in backups_in(wanted, named)[max(keep, 1) :]:
            old.unlink()
    return copy


def _copy(store: Store, target: Path, progress: Progress | None) -> None:
    """Copy a file page by page, a server's book row by row; both verified."""
    path = store.book.address.path
    if path is not None:
        copying.copy_book(path, target, progress)
    else:
        copy_all(store, target, progress)


def file_name_of(address: Address) -> Path:
    """Return the file of a book, or a name for one: the database's, for a book on a server."""
    if address.path is not None:
        return address.path
    assert address.url is not None
    return Path(f"{re.sub(r'[^A-Za-z0-9_-]', '-', address.url.database or 'book')}.sidepath")


def backups_in(folder: Path, book: Path) -> list[Path]:
    """Return the copies of a book that `backup` made in a folder, the latest first."""
    named = re.compile(re.escape(book.stem) + r"-\d{8}T\d{12}Z" + re.escape(book.suffix))
    return sorted((p for p in folder.iterdir() if named.fullmatch(p.name)), reverse=True)


def restore(source: str | Path, target: str | Path) -> str:
    """Make a book from a backup, verified first; return where it is.

    Args:
        source: a backup, or any book.
        target: a file that is not there yet, or the URL of a database without a book.

    Raises:
        StoreExists: the target is there; `replace_book` moves it aside.
        StoreMissing, StoreDamaged, SchemaTooNew: the backup is not there, broken, or of a later program.
        SchemaBehind: an older form is restored to a file first, migrated there, and then moved.
    """
    origin, where = parse_address(source), parse_address(target)
    if origin.path is None or where.path is None:
        with Store.open(source, read_only=True) as backed_up:
            return copy_all(backed_up, target).book
    revision = schema.current(origin)
    if revision not in schema.SCHEMA_REVISIONS:
        schema.refuse_other_shape(origin, revision)
    copying.copy_book(origin.path, where.path)
    return str(where)


def replace_book(source: str | Path, target: str | Path) -> Path:
    """Put a backup in the place of a book; return where the old book went, whole, beside the new one.

    The backup is copied and verified before the old book is touched.

    Raises:
        StoreBusy: somebody has the old book open.
        StoreMissing, StoreDamaged, SchemaTooNew: as for `restore`; the old book is untouched then.
    """
    target_path = Path(target).expanduser()
    if not target_path.is_file():
        raise StoreMissing(f"There is no book {target_path}.", "Restore to it without replacing.", str(target_path))
    draft = target_path.with_name(f".{target_path.name}.{uuid4().hex[:8]}.restored")
    restore(source, draft)
    try:
        aside = _move_aside(target_path)
        copying.put_in_place(draft, target_path)
    finally:
        draft.unlink(missing_ok=True)
    return aside


def _move_aside(path: Path) -> Path:
    """Rename a book, its log folded in first, so that nothing of it stays under the old name."""
    aside = path.with_name(f"{path.stem}.replaced-{utc_now().strftime('%Y%m%dT%H%M%SZ')}{path.suffix}")
    copying.refuse_taken(aside)
    with translated(path):
        try:
            with closing(copying.connect(path, "rw")) as old:
                old.execute("PRAGMA journal_mode=DELETE")  # folds the log in; refused while anybody else has it open
        except sqlite3.OperationalError as error:
            if (error.sqlite_errorname or "").startswith(("SQLITE_BUSY", "SQLITE_LOCKED")):
                raise StoreBusy(f"{path} is in use.", "Close it everywhere, then restore again.", str(path)) from error
        except sqlite3.DatabaseError:
            pass  # too damaged to be opened: moved as it is
        path.rename(aside)
        for part in ("-wal", "-shm"):
            log = path.with_name(path.name + part)
            if log.exists():
                log.rename(aside.with_name(aside.name + part))
    return aside

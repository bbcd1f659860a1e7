"""Making, mending and restoring whole books: what a front end asks before a book is open."""

from __future__ import annotations

from pathlib import Path

from kb.errors import StoreRefused
from kb.progress import Progress


def create_book(book: str | None) -> str:
    """Make an empty book and return where it is; folders of the default place are made, others must be there.

    Raises:
        StoreExists: something is there already.
        StoreMissing, StoreRefused: no such folder, or no permission.
    """
    from kb import paths
    from kb.book.facade import open_book

    try:
        if book is None:
            paths.default_book().parent.mkdir(parents=True, exist_ok=True)
        with open_book(book, create=True) as new:
            return new.path
    except OSError as error:
        place = book if book is not None else str(paths.default_book())
        why = error.strerror or str(error)
        raise StoreRefused(f"No book can be made at {place}: {why}.", "Choose another place.", place) from error


def migrate_book(book: str | None, progress: Progress) -> str:
    """Bring a book up to this program, after a backup, and rebuild what another recipe derived; say what was done."""
    from kb import paths
    from kb.book.facade import open_book
    from kb.store.engine import parse_address
    from kb.store.schema import upgrade

    address = book if book is not None else str(paths.default_book())
    done = upgrade(parse_address(address))
    said = "The schema was up to date."
    if done is not None:
        kept = f" The book as it was: {done.copy}." if done.copy else " On a server no copy is made; pg_dump does."
        said = f"The schema went from {done.before} to {done.after}.{kept}"
    with open_book(address) as opened:
        rebuilt = opened.store.rebuild(progress)
    return f"{said} Runs read again: {rebuilt}." if rebuilt else f"{said} Derived facts were up to date."


def restore_book(source: str, target: str) -> str:
    """Make a new, verified book from a backup and return where it is; never overwrites.

    Args:
        source: a backup, or any book.
        target: a file that is not there yet, or the URL of a database without a book.
    """
    from kb.store.safekeeping import restore

    return restore(source, target)


def grants_file(place: str) -> Path | None:
    """Return the file of SQL grants that whoever keeps a server runs for a new book; None for a book in a file."""
    from kb.paths import shipped
    from kb.store.engine import parse_address

    return shipped("migrations") / "roles.sql" if parse_address(place).path is None else None

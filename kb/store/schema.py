"""The shape of a book over time: making one, opening one of the right shape, bringing an old one up to date.

A new book is made from `rows.py` at once, in a file beside the target that is then linked into place: it is
there whole or not at all, and never over something else. Older books are brought up to date by the revisions
in `migrations/`, run as a library; a test proves that both ways give the same tables. Alembic is loaded only
then, since it is slow to start.

Migrating runs all revisions in one transaction and leaves the book as it was if anything fails. A SQLite book
is copied first, and runs with `foreign_keys=OFF` (with it on, rebuilding a parent table would delete its
children without a word), every foreign key being checked afterwards. A book on a server is not copied: whoever
keeps the server backs it up (pg_dump).
"""

from __future__ import annotations

import contextlib
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING
from uuid import uuid4

import sqlalchemy as sa

from kb.errors import SchemaBehind, SchemaTooNew, StoreDamaged, StoreError, StoreExists, StoreMissing, StoreRefused
from kb.store import copying, on_sqlite, words
from kb.store import engine as engines
from kb.store.engine import Address, translated
from kb.store.history import TIP, note_event
from kb.store.mapping import table
from kb.store.rows import SCHEMA_HEAD, SCHEMA_REVISIONS, MetaRow, Row
from kb.store.session import BOOK_ID, CHANGES, CREATED_AT, utc_now

if TYPE_CHECKING:
    from alembic.config import Config


Fill = Callable[[sa.Connection], None]
"""Puts a book's content into fresh tables, inside the transaction that makes them."""


def create(address: Address, fill: Fill | None = None) -> None:
    """Make a book; nothing of it is to be seen before it is whole.

    Args:
        fill: puts content in; None = an empty book.

    Raises:
        StoreExists: something is there already.
        StoreMissing: the folder, or the server's database, is not there.
        StoreRefused: no permission, disk full, a network file system, or a database that is not in UTF-8.
    """
    if address.path is None:
        _create_on_server(address, fill or _start_empty)
        return
    path = address.path
    copying.refuse_taken(path)
    on_sqlite.refuse_network_file_system(path)
    draft = path.with_name(f".{path.name}.{uuid4().hex[:8]}.new")
    try:
        with translated(address):
            draft.touch(exist_ok=False)
            engine = engines.make_engine(Address(text=str(draft), path=draft), read_only=False, wait_s=5.0)
            try:
                with engines.writing(engine, address) as connection:
                    _lay_out(connection)
                    (fill or _start_empty)(connection)
                engine.dispose()
                engines.prepare_for_writing(engine, address)
            finally:
                engine.dispose()
        copying.put_in_place(draft, path)
    finally:
        for leftover in (draft, draft.with_name(draft.name + "-wal"), draft.with_name(draft.name + "-shm")):
            with contextlib.suppress(OSError):
                leftover.unlink(missing_ok=True)


def _create_on_server(address: Address, fill: Fill) -> None:
    engine = engines.make_engine(address, read_only=False, wait_s=5.0)
    try:
        with engines.writing(engine, address) as connection:
            encoding = connection.exec_driver_sql("SHOW server_encoding").scalar_one()
            if encoding != "UTF8":
                raise StoreRefused(
                    f"The database of {address} keeps text in {encoding}, which cannot hold every letter.",
                    "Ask for one in UTF-8: `createdb --encoding UTF8 --template template0 NAME`.",
                    str(address),
                )
            taken = {*Row.metadata.tables, "alembic_version", "run_words"} & set(_names_in(connection))
            if taken:
                what = "a book" if "alembic_version" in taken else f"tables of something else ({min(taken)})"
                raise StoreExists(f"{address} holds {what} already.", "Choose another database.", str(address))
            _lay_out(connection)
            fill(connection)
    finally:
        engine.dispose()


def _names_in(connection: sa.Connection) -> list[str]:
    statement = "SELECT relname FROM pg_class WHERE relnamespace = current_schema()::regnamespace"
    return list(connection.exec_driver_sql(statement).scalars())


def _lay_out(connection: sa.Connection) -> None:
    """Make the tables, without any row but the name of their form."""
    Row.metadata.create_all(connection, checkfirst=False)
    words.create(connection)
    connection.exec_driver_sql(
        "CREATE TABLE alembic_version (version_num VARCHAR(32) NOT NULL, "
        "CONSTRAINT alembic_version_pkc PRIMARY KEY (version_num))"
    )
    connection.execute(sa.text("INSERT INTO alembic_version VALUES (:head)"), {"head": SCHEMA_HEAD})


def _start_empty(connection: sa.Connection) -> None:
    facts = {BOOK_ID: uuid4().hex, CREATED_AT: utc_now().isoformat(), CHANGES: "0", TIP: ""}
    connection.execute(sa.insert(table(MetaRow)), [{"name": n, "value": v} for n, v in facts.items()])
    note_event(connection, utc_now(), "", "made", f"An empty book of form {SCHEMA_HEAD}.")


def open_engine(
    address: Address, *, read_only: bool, wait_s: float, on_wait: engines.Waiting | None = None
) -> sa.Engine:
    """Return the engine of a book that has the shape of this program.

    Raises:
        StoreMissing, StoreDamaged, StoreRefused: nothing there; no book; no permission.
        SchemaTooNew, SchemaBehind: made by a later program; to be migrated.
    """
    engine = _raw_engine(address, read_only=read_only, wait_s=wait_s, on_wait=on_wait)
    try:
        refuse_other_shape(address, _current(engine, address))
        if not read_only:
            engines.prepare_for_writing(engine, address)
    except BaseException:
        engine.dispose()
        raise
    return engine


def refuse_other_shape(address: Address, revision: str) -> None:
    """Raise where a book has not the shape that this program knows."""
    if revision not in SCHEMA_REVISIONS:
        raise SchemaTooNew(
            f"{address} was made by a later version of the program (revision {revision[:32]!r}).",
            "Update the program; the book was left as it is.",
            revision,
        )
    if revision != SCHEMA_HEAD:
        raise SchemaBehind(
            f"{address} has the older form {revision}; this program needs {SCHEMA_HEAD}.",
            "Run `sidepath migrate`; it makes a copy first.",
            revision,
        )


def current(address: Address) -> str:
    """Return the revision of a book, whatever it is."""
    engine = _raw_engine(address, read_only=True, wait_s=5.0)
    try:
        return _current(engine, address)
    finally:
        engine.dispose()


def _raw_engine(
    address: Address, *, read_only: bool, wait_s: float, on_wait: engines.Waiting | None = None
) -> sa.Engine:
    if address.path is not None:
        with translated(address):
            _refuse_no_book(address.path)
    return engines.make_engine(address, read_only=read_only, wait_s=wait_s, on_wait=on_wait)


def _refuse_no_book(path: Path) -> None:
    """Raise with a plain reason where a path holds no SQLite file, before SQLite is asked."""
    if not path.exists():
        raise StoreMissing(f"There is no book {path}.", "Check the path, or make one: `sidepath new`.", str(path))
    if path.is_dir():
        raise StoreDamaged(f"{path} is a folder, not a book.", "Name the file.", str(path))
    with path.open("rb") as file:
        head = file.read(16)
    if head != b"SQLite format 3\x00":
        what = "is empty" if not head else "is no record book"
        raise StoreDamaged(f"{path} {what}.", "Check the path, or restore a backup: `sidepath restore`.", str(path))


def _current(engine: sa.Engine, address: Address) -> str:
    with engines.reading(engine, address) as connection:
        versions = connection.execute(sa.text("SELECT version_num FROM alembic_version")).scalars().all()
    if len(versions) != 1 or not isinstance(versions[0], str):
        raise StoreDamaged(f"{address} does not say which form it has.", "Restore a backup.", str(address))
    return versions[0]


@dataclass(frozen=True, slots=True, kw_only=True)
class Upgraded:
    """What migrating did: the form before, the form after, and the copy of the old book (None = none was made)."""

    before: str
    after: str
    copy: Path | None


def upgrade(address: Address, *, backup: bool = True) -> Upgraded | None:
    """Bring a book up to date; return what was done, None where it is up to date already.

    Args:
        address: where the book is.
        backup: copy a SQLite book first, beside it.

    Raises:
        SchemaTooNew: made by a later program.
        StoreRefused: on a server, the role may not change tables.
        StoreDamaged: a foreign key would point nowhere, or a revision failed; the book was left as it was.
        StoreBusy: somebody is writing to it.
    """
    before = current(address)
    if before == SCHEMA_HEAD:
        return None
    if before not in SCHEMA_REVISIONS:
        refuse_other_shape(address, before)
    copied = _copy_aside(address.path, before) if backup and address.path is not None else None
    engine = _raw_engine(address, read_only=False, wait_s=5.0)
    try:
        run_revisions(engine, address)
        with engines.writing(engine, address) as connection:
            note_event(connection, utc_now(), "", "migrated", f"From form {before} to form {SCHEMA_HEAD}.")
    finally:
        engine.dispose()
    return Upgraded(before=before, after=SCHEMA_HEAD, copy=copied)


def run_revisions(engine: sa.Engine, address: Address, target: str = "head") -> None:
    """Run the revisions up to `target` on an engine, all of them in one transaction."""
    from alembic import command
    from alembic.util import CommandError

    config = alembic_config()
    with (
        translated(address),
        engine.connect() as connection,
        engines.dialect_of(engine).revising(connection),
    ):
        config.attributes["connection"] = connection
        try:
            command.upgrade(config, target)
        except CommandError as error:
            raise StoreError(f"{address} cannot be migrated: {error}.", "Install the program again.") from error


def alembic_config() -> Config:
    """Return the settings under which the revisions run as a library."""
    from alembic.config import Config

    from kb.paths import shipped

    config = Config()
    config.set_main_option("script_location", str(shipped("migrations")).replace("%", "%%"))
    return config


def _copy_aside(path: Path, revision: str) -> Path:
    stamp = utc_now().strftime("%Y%m%dT%H%M%SZ")
    target = path.with_name(f"{path.stem}.before-migration-{revision}-{stamp}{path.suffix}")
    if target.exists():
        raise StoreRefused(f"{target} is there already.", "Try again in a second.", str(target))
    copying.copy_book(path, target)
    return target

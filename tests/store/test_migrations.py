"""Migrating keeps every row, makes the tables of a new book, copies first, and leaves a book alone when it fails."""

from __future__ import annotations

import datetime as dt
import gzip
import re
from collections.abc import Iterator
from pathlib import Path
from typing import Any
from uuid import UUID

import pytest
import sqlalchemy as sa
from pytest_alembic import Config, create_alembic_fixture
from pytest_alembic import tests as alembic_tests
from pytest_alembic.runner import MigrationContext
from pytest_alembic.tests import experimental

import kb.paths
from kb.errors import SchemaBehind, SchemaTooNew, StoreDamaged, StoreError
from kb.record.run import Run
from kb.store import schema
from kb.store.checking import verify
from kb.store.copying import copy_book
from kb.store.engine import parse_address
from kb.store.rows import SCHEMA_REVISIONS
from kb.store.runs import RunFilter
from kb.store.store import Store
from tests.engines import Books
from tests.factories import CHEMISTRY, a_book, a_run
from tests.store.later_program import LATER, write_later_revisions

MIGRATIONS = kb.paths.shipped("migrations")
BOOKS = Path(__file__).parent.parent / "data" / "schema"

alembic = create_alembic_fixture(Config(config_options={"script_location": str(MIGRATIONS)}))


@pytest.fixture
def alembic_engine(books: Books) -> Iterator[sa.Engine]:
    """Give pytest-alembic a fresh place on each engine in turn."""
    engine = bare_engine(books, "alembic")
    yield engine
    engine.dispose()


def bare_engine(books: Books, name: str) -> sa.Engine:
    """Return an engine, without our listeners, for a place where nothing is yet."""
    address = parse_address(books / name)
    return sa.create_engine(address.url or f"sqlite:///{address.path}")


def test_there_is_one_newest_revision(alembic: MigrationContext) -> None:
    alembic_tests.test_single_head_revision(alembic)


def test_the_revisions_run_one_after_the_other(alembic: MigrationContext) -> None:
    alembic_tests.test_upgrade(alembic)


def test_the_revisions_make_what_the_program_expects(alembic: MigrationContext) -> None:
    alembic_tests.test_model_definitions_match_ddl(alembic)


def test_every_revision_can_be_taken_back_while_nothing_is_kept(alembic: MigrationContext) -> None:
    alembic_tests.test_up_down_consistency(alembic)


def test_taking_revisions_back_leaves_no_trace(alembic: MigrationContext) -> None:
    experimental.downgrade_leaves_no_trace.test_downgrade_leaves_no_trace(alembic)


def test_the_program_knows_all_revisions(alembic: MigrationContext) -> None:
    known = [r for r in alembic.history.revisions if r not in ("base", "heads")]
    assert tuple(known) == SCHEMA_REVISIONS
    listed = (Path(kb.paths.PACKAGE) / "store" / "rows.py").read_text()
    assert all(re.search(rf"^    {revision}    \S", listed, re.MULTILINE) for revision in SCHEMA_REVISIONS)


def test_no_revision_imports_the_program() -> None:
    for revision in (MIGRATIONS / "versions").glob("*.py"):
        assert "import kb" not in revision.read_text() and "from kb" not in revision.read_text()


def test_a_new_book_and_a_migrated_one_have_the_same_tables(books: Books) -> None:
    Store.create(books / "new.sidepath").close()
    engine = bare_engine(books, "migrated.sidepath")
    engine.connect().close()  # makes the file
    schema.run_revisions(engine, parse_address(books / "migrated.sidepath"))
    engine.dispose()
    assert len(books.shape("new.sidepath")) > 18
    assert books.shape("new.sidepath") == books.shape("migrated.sidepath")


@pytest.fixture
def later_program(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Let the program be one revision further; return where its revisions are."""
    copied = write_later_revisions(tmp_path)
    monkeypatch.setattr(kb.paths, "shipped", lambda name: copied)
    monkeypatch.setattr(schema, "SCHEMA_REVISIONS", ("0001", "0002"))
    monkeypatch.setattr(schema, "SCHEMA_HEAD", "0002")
    return copied


def a_full_book(place: Path | Books) -> list[Run]:
    """Make a book with children, history and facts in every table; return its runs."""
    with a_book(place, **CHEMISTRY) as store:
        for n in range(5):
            store.add(a_run(note=f"run {n}"), "MK")
        store.amend("1", {"note": "looked at again"}, "MK", "typing error")
        store.withdraw("2", "wrong flask", "MK")
        store.attachments.attach("3", "nmr.pdf", b"%PDF", "MK", "spectrum")
        return list(store.iter_runs(RunFilter(with_withdrawn=True)))


@pytest.mark.usefixtures("later_program")
def test_migrating_keeps_parents_and_children(books: Books, monkeypatch: pytest.MonkeyPatch) -> None:
    book = books / "book.sidepath"
    with monkeypatch.context() as earlier:
        earlier.setattr(schema, "SCHEMA_HEAD", "0001")
        a_full_book(books)
    before = books.contents("book.sidepath")
    assert all(before[t] for t in ("run", "component", "solvent", "product_seen", "history", "facts", "run_structure"))
    with pytest.raises(SchemaBehind, match="0001"):
        Store.open(book)
    done = schema.upgrade(parse_address(book))
    assert done is not None and (done.before, done.after) == ("0001", "0002")
    after = books.contents("book.sidepath")
    assert [row[3] for row in after["event"]] == ["made", "migrated"]
    assert after.pop("event")[:1] == before.pop("event")
    assert [row[:-1] for row in after.pop("run")] == before.pop("run")
    assert after == before
    assert schema.upgrade(parse_address(book)) is None


@pytest.mark.usefixtures("later_program")
def test_migrating_copies_the_book_first(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    book = tmp_path / "book.sidepath"
    with monkeypatch.context() as earlier:
        earlier.setattr(schema, "SCHEMA_HEAD", "0001")
        runs = a_full_book(tmp_path)
    done = schema.upgrade(parse_address(book))
    assert done is not None and done.copy is not None
    with monkeypatch.context() as earlier:
        earlier.setattr(schema, "SCHEMA_HEAD", "0001")
        with Store.open(done.copy) as copy:
            assert list(copy.iter_runs(RunFilter(with_withdrawn=True))) == runs


@pytest.mark.parametrize(
    "harm", ['op.execute("DELETE FROM run WHERE run_key = 1")', 'op.execute("SELECT colour FROM nowhere")']
)
def test_a_migration_that_fails_leaves_the_book_as_it_was(
    books: Books, later_program: Path, harm: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    book = books / "book.sidepath"
    with monkeypatch.context() as earlier:
        earlier.setattr(schema, "SCHEMA_HEAD", "0001")
        runs = a_full_book(books)
    (later_program / "versions" / "0002_later.py").write_text(LATER.format(extra=harm))
    before = books.contents("book.sidepath"), books.shape("book.sidepath")
    with pytest.raises((StoreDamaged, StoreError)):
        schema.upgrade(parse_address(book))
    assert (books.contents("book.sidepath"), books.shape("book.sidepath")) == before
    with monkeypatch.context() as earlier:
        earlier.setattr(schema, "SCHEMA_HEAD", "0001")
        with Store.open(book) as store:
            assert list(store.iter_runs(RunFilter(with_withdrawn=True))) == runs


def test_a_book_of_a_later_program_is_refused_and_left_alone(books: Books) -> None:
    a_book(books).close()
    books.execute("book.sidepath", "UPDATE alembic_version SET version_num = '0999'")
    before = books.contents("book.sidepath")
    for attempt in (Store.open, lambda p: schema.upgrade(parse_address(p)), lambda p: Store.open(p, read_only=True)):
        with pytest.raises(SchemaTooNew, match="later version"):
            attempt(books / "book.sidepath")
    assert books.contents("book.sidepath") == before


@pytest.mark.parametrize("revision", SCHEMA_REVISIONS)
def test_a_stored_book_of_every_released_form_comes_up_to_date(revision: str, books: Books) -> None:
    """The books were written by the program of that form; see tests/data/schema/README.md."""
    stored = books.folder / f"{revision}.sidepath"
    stored.write_bytes(gzip.decompress((BOOKS / f"{revision}.sidepath.gz").read_bytes()))
    if books.engine == "sqlite":
        stored.rename(books.folder / "book.sidepath")
    else:
        pour_into_form(stored, revision, books)
    book = books / "book.sidepath"
    schema.upgrade(parse_address(book))
    with Store.open(book, **CHEMISTRY) as store:
        store.rebuild()
        found = {run.code: run for run in store.iter_runs(RunFilter(with_withdrawn=True))}
        assert len(found) == 5
        assert found["R-0001"].note == "looked at again"
        assert found["R-0002"].withdrawn_why == "wrong flask"
        assert store.attachments.get(found["R-0003"].attachments[0].sha256) == b"%PDF"
        assert [c for c in verify(store, sample=None) if not c.ok] == []


def pour_into_form(stored: Path, revision: str, books: Books) -> None:
    """Make a server's book of a form by the revisions up to it, and fill it with the rows of a stored file."""
    engine, file = bare_engine(books, "book.sidepath"), sa.create_engine(f"sqlite:///{stored}")
    schema.run_revisions(engine, parse_address(books / "book.sidepath"), revision)
    theirs = sa.MetaData()
    theirs.reflect(engine)
    with file.connect() as read, engine.begin() as write:
        for table in theirs.sorted_tables:
            if table.name in ("alembic_version", "run_words"):
                continue
            rows = read.exec_driver_sql(f"SELECT * FROM {table.name}").mappings().all()
            values = [{c.name: as_stored(row[c.name], c.type) for c in table.c} for row in rows]
            if values:
                write.execute(sa.insert(table), values)
    engine.dispose()
    file.dispose()


def as_stored(value: Any, kind: sa.types.TypeEngine[Any]) -> Any:
    """Return what SQLite keeps of a UUID, a moment, a day or a truth value, as a server keeps it."""
    if value is None:
        return None
    if isinstance(kind, sa.Uuid):
        return UUID(value)
    if isinstance(kind, sa.DateTime):
        return dt.datetime.fromisoformat(value).replace(tzinfo=dt.UTC)
    if isinstance(kind, sa.Date):
        return dt.date.fromisoformat(value)
    return bool(value) if isinstance(kind, sa.Boolean) else value


def keep_a_book_of_this_form(folder: Path) -> Path:
    """Write a book of the newest form into tests/data/schema, once; return where."""
    target = BOOKS / f"{schema.SCHEMA_HEAD}.sidepath.gz"
    a_full_book(folder)
    copy_book(folder / "book.sidepath", folder / "copy.sidepath")
    with target.open("xb") as file:
        file.write(gzip.compress((folder / "copy.sidepath").read_bytes(), mtime=0))
    return target


if __name__ == "__main__":
    import tempfile

    with tempfile.TemporaryDirectory() as scratch:
        print(keep_a_book_of_this_form(Path(scratch)))

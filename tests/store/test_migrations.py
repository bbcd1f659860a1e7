"""Migrating keeps every row, makes the tables of a new book, copies first, and leaves a book alone when it fails."""

from __future__ import annotations

import gzip
import re
import sqlite3
from collections.abc import Iterator
from contextlib import closing
from pathlib import Path

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
from tests.factories import CHEMISTRY, a_book, a_run
from tests.store.later_program import LATER, write_later_revisions

MIGRATIONS = kb.paths.shipped("migrations")
BOOKS = Path(__file__).parent.parent / "data" / "schema"

alembic = create_alembic_fixture(Config(config_options={"script_location": str(MIGRATIONS)}))


@pytest.fixture
def alembic_engine(tmp_path: Path) -> Iterator[sa.Engine]:
    """Give pytest-alembic a file of its own."""
    engine = sa.create_engine(f"sqlite:///{tmp_path / 'alembic.sqlite'}")
    yield engine
    engine.dispose()


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


def shape_of(path: Path) -> dict[str, list[str]]:
    """Return the parts of the DDL of a file by name, white space and the order of constraints apart."""
    with closing(sqlite3.connect(path)) as connection:
        rows = connection.execute("SELECT name, sql FROM sqlite_master WHERE sql IS NOT NULL").fetchall()
    return {
        name: sorted(part.rstrip(" )") for part in re.sub(r"\s*([(),])\s*|\s+", r" \1", sql).split(" ,"))
        for name, sql in rows
    }


def test_a_new_book_and_a_migrated_one_have_the_same_tables(tmp_path: Path) -> None:
    a_book(tmp_path, "new.sidepath").close()
    migrated = tmp_path / "migrated.sidepath"
    migrated.touch()
    engine = sa.create_engine(f"sqlite:///{migrated}")
    schema.run_revisions(engine, parse_address(migrated))
    engine.dispose()
    assert shape_of(tmp_path / "new.sidepath") == shape_of(migrated)


@pytest.fixture
def later_program(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Let the program be one revision further; return where its revisions are."""
    copied = write_later_revisions(tmp_path)
    monkeypatch.setattr(kb.paths, "shipped", lambda name: copied)
    monkeypatch.setattr(schema, "SCHEMA_REVISIONS", ("0001", "0002"))
    monkeypatch.setattr(schema, "SCHEMA_HEAD", "0002")
    return copied


def a_full_book(path: Path) -> list[Run]:
    """Make a book with children, history and facts in every table; return its runs."""
    with a_book(path.parent, path.name, **CHEMISTRY) as store:
        for n in range(5):
            store.add(a_run(note=f"run {n}"), "MK")
        store.amend("1", {"note": "looked at again"}, "MK", "typing error")
        store.withdraw("2", "wrong flask", "MK")
        store.attachments.attach("3", "nmr.pdf", b"%PDF", "MK", "spectrum")
        return list(store.iter_runs(RunFilter(with_withdrawn=True)))


def contents_of(path: Path) -> dict[str, list[tuple[object, ...]]]:
    """Return all rows of all plain tables of a file."""
    with closing(sqlite3.connect(path)) as connection:
        tables = [
            row[0]
            for row in connection.execute("SELECT name FROM sqlite_master WHERE type = 'table'")
            if not row[0].startswith(("run_words", "sqlite_", "alembic"))
        ]
        return {t: sorted(connection.execute(f"SELECT * FROM {t}"), key=repr) for t in tables}


@pytest.mark.usefixtures("later_program")
def test_migrating_keeps_parents_and_children(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    book = tmp_path / "book.sidepath"
    with monkeypatch.context() as earlier:
        earlier.setattr(schema, "SCHEMA_HEAD", "0001")
        a_full_book(book)
    before = contents_of(book)
    assert all(before[t] for t in ("run", "component", "solvent", "product_seen", "history", "facts", "run_structure"))
    with pytest.raises(SchemaBehind, match="0001"):
        Store.open(book)
    done = schema.upgrade(parse_address(book))
    assert done is not None and (done.before, done.after) == ("0001", "0002")
    after = contents_of(book)
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
        runs = a_full_book(book)
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
    tmp_path: Path, later_program: Path, harm: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    book = tmp_path / "book.sidepath"
    with monkeypatch.context() as earlier:
        earlier.setattr(schema, "SCHEMA_HEAD", "0001")
        runs = a_full_book(book)
    (later_program / "versions" / "0002_later.py").write_text(LATER.format(extra=harm))
    before = contents_of(book)
    with pytest.raises((StoreDamaged, StoreError)):
        schema.upgrade(parse_address(book))
    assert contents_of(book) == before
    with monkeypatch.context() as earlier:
        earlier.setattr(schema, "SCHEMA_HEAD", "0001")
        with Store.open(book) as store:
            assert list(store.iter_runs(RunFilter(with_withdrawn=True))) == runs


def test_a_book_of_a_later_program_is_refused_and_left_alone(tmp_path: Path) -> None:
    book = tmp_path / "book.sidepath"
    a_book(tmp_path).close()
    with closing(sqlite3.connect(book)) as connection, connection:
        connection.execute("UPDATE alembic_version SET version_num = '0999'")
    before = book.read_bytes()
    for attempt in (Store.open, lambda p: schema.upgrade(parse_address(p)), lambda p: Store.open(p, read_only=True)):
        with pytest.raises(SchemaTooNew, match="later version"):
            attempt(book)
    assert book.read_bytes() == before


@pytest.mark.parametrize("revision", SCHEMA_REVISIONS)
def test_a_stored_book_of_every_released_form_comes_up_to_date(revision: str, tmp_path: Path) -> None:
    """The books were written by the program of that form; see tests/data/schema/README.md."""
    book = tmp_path / "book.sidepath"
    book.write_bytes(gzip.decompress((BOOKS / f"{revision}.sidepath.gz").read_bytes()))
    schema.upgrade(parse_address(book))
    with Store.open(book, **CHEMISTRY) as store:
        found = {run.code: run for run in store.iter_runs(RunFilter(with_withdrawn=True))}
        assert len(found) == 5
        assert found["R-0001"].note == "looked at again"
        assert found["R-0002"].withdrawn_why == "wrong flask"
        assert store.attachments.get(found["R-0003"].attachments[0].sha256) == b"%PDF"
        assert [c for c in verify(store, sample=None) if not c.ok] == []


def keep_a_book_of_this_form(folder: Path) -> Path:
    """Write a book of the newest form into tests/data/schema, once; return where."""
    target = BOOKS / f"{schema.SCHEMA_HEAD}.sidepath.gz"
    a_full_book(folder / "book.sidepath")
    copy_book(folder / "book.sidepath", folder / "copy.sidepath")
    with target.open("xb") as file:
        file.write(gzip.compress((folder / "copy.sidepath").read_bytes(), mtime=0))
    return target


if __name__ == "__main__":
    import tempfile

    with tempfile.TemporaryDirectory() as scratch:
        print(keep_a_book_of_this_form(Path(scratch)))

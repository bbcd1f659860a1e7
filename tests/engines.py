"""Places for books on either engine, so that one test says what must hold on both.

    def test_...(books: Books):          runs twice, on SQLite and on PostgreSQL
        a_book(books)                    a new book there, as with `a_book(tmp_path)`
        Store.open(books / "book.sidepath")   the same book again; a name is a file, or a schema of the test server

A test that takes `tmp_path` instead is about files, and says so by that. One server is started per process of the test
run, when the first test asks for one; without the `test` extra those tests are skipped with the reason, and under CI
they fail.
"""

from __future__ import annotations

import os
import re
import sqlite3
from collections.abc import Iterator
from contextlib import ExitStack, closing
from itertools import count
from pathlib import Path
from typing import Any, Protocol
from uuid import uuid4

import pytest

from kb.store.history import TIP
from kb.store.rows import SCHEMA_HEAD, Row
from kb.store.session import BOOK_ID, CHANGES, CREATED_AT
from kb.store.store import Store
from tests.postgres_server import DATABASE, OWNER, NoServer, running_server

ENGINES = ("sqlite", "postgresql")


Contents = dict[str, list[tuple[object, ...]]]


class Books(Protocol):
    """Where a test keeps its books; `books / name` is the address of one."""

    engine: str
    folder: Path
    """A folder for files beside the books: in it a laptop's book is a file whatever the group's is kept on."""

    def __truediv__(self, name: str) -> Path | str:
        """Return the address of the book of that name."""

    def make(self, name: str, **options: Any) -> Store:
        """Return a new empty book, open."""

    def mktemp(self, name: str) -> Books:
        """Return a fresh place, in which no name is taken."""

    def execute(self, name: str, statement: str) -> int:
        """Run SQL on a book behind the program's back; return the number of rows that it touched."""

    def contents(self, name: str) -> Contents:
        """Return all rows of all plain tables of a book, in no particular order of meaning."""

    def shape(self, name: str) -> dict[str, list[str]]:
        """Return what the engine says of each part of a book's shape."""


class Files:
    """Books in files of a folder."""

    engine = "sqlite"

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        self._numbers = count()

    def __truediv__(self, name: str) -> Path:
        return self.folder / name

    def make(self, name: str, **options: Any) -> Store:
        """Return a new empty book, open."""
        return Store.create(self / name, **options)

    def mktemp(self, name: str) -> Files:
        """Return a fresh place."""
        inner = self.folder / f"{name}{next(self._numbers)}"
        inner.mkdir()
        return Files(inner)

    def execute(self, name: str, statement: str) -> int:
        """Run SQL on a book."""
        with closing(sqlite3.connect(self.folder / name)) as raw, raw:
            return raw.execute(statement).rowcount

    def contents(self, name: str) -> Contents:
        """Return all rows of all plain tables of a book."""
        with closing(sqlite3.connect(self.folder / name)) as raw:
            tables = [
                row[0]
                for row in raw.execute("SELECT name FROM sqlite_master WHERE type = 'table'")
                if not row[0].startswith(("run_words", "sqlite_", "alembic"))
            ]
            return {t: sorted(raw.execute(f"SELECT * FROM {t}"), key=repr) for t in tables}

    def shape(self, name: str) -> dict[str, list[str]]:
        """Return the parts of the DDL by name, white space and the order of constraints apart."""
        with closing(sqlite3.connect(self.folder / name)) as raw:
            rows = raw.execute("SELECT name, sql FROM sqlite_master WHERE sql IS NOT NULL").fetchall()
        return {
            name: sorted(part.rstrip(" )") for part in re.sub(r"\s*([(),])\s*|\s+", r" \1", sql).split(" ,"))
            for name, sql in rows
        }


class Server:
    """A running server: an administrator's connection, fresh schemas, and books whose test is over.

    Making the tables of a book takes the server ten times as long as emptying them, so emptied books are used again by
    `a_book`; what tests did to the shape of a book is thrown away.
    """

    def __init__(self, folder: Path) -> None:
        import psycopg

        self.folder = folder
        self.admin: Any = psycopg.connect(host=str(folder), user=OWNER, dbname=DATABASE, autocommit=True)
        self.admin.execute("SET lock_timeout TO '5s'")
        self.spare: list[str] = []
        self._numbers = count(1)

    def new_schema(self) -> str:
        """Make an empty schema; return its name."""
        schema = f"book_{next(self._numbers)}"
        self.admin.execute(f"CREATE SCHEMA {schema}")
        return schema

    def address(self, schema: str, user: str = OWNER) -> str:
        """Return the URL of the book in a schema."""
        return f"postgresql://{user}@/{DATABASE}?host={self.folder}&options=-csearch_path%3D{schema}"

    def cut_off(self) -> None:
        """End the sessions that a test left open; nobody else uses this server."""
        self.admin.execute(
            "SELECT pg_terminate_backend(pid) FROM pg_stat_activity "
            "WHERE datname = current_database() AND pid <> pg_backend_pid() AND backend_type = 'client backend'"
        )

    def forget(self, schemas: list[str], reshaped: set[str]) -> None:
        """Empty the books in some schemas for the next test, or drop what is no ordinary book any more."""
        for schema in schemas:
            if schema in reshaped or len(self.spare) >= 6 or not self._is_book(schema):
                self.admin.execute(f"DROP SCHEMA {schema} CASCADE")
                continue
            for table in ("run_words", *(t.name for t in reversed(Row.metadata.sorted_tables))):
                self.admin.execute(f"DELETE FROM {schema}.{table}")
            self.spare.append(schema)

    def _is_book(self, schema: str) -> bool:
        if self.admin.execute("SELECT to_regclass(%s)", (f"{schema}.alembic_version",)).fetchone()[0] is None:
            return False
        forms = self.admin.execute(f"SELECT version_num FROM {schema}.alembic_version").fetchall()
        return bool(forms == [(SCHEMA_HEAD,)])

    def fill_spare(self, schema: str) -> None:
        """Write the first rows of a new book into an emptied one."""
        facts = {BOOK_ID: uuid4().hex, CREATED_AT: "2024-05-17T09:30:00+00:00", CHANGES: "0", TIP: ""}
        for name, value in facts.items():
            self.admin.execute(f"INSERT INTO {schema}.meta VALUES (%s, %s)", (name, value))
        self.admin.execute(f"INSERT INTO {schema}.event VALUES (1, now(), '', 'made', 'An empty book.')")


class Schemas:
    """Books in schemas of a server's database."""

    engine = "postgresql"

    def __init__(self, server: Server, folder: Path) -> None:
        self.server = server
        self.folder = folder
        self._schemas: dict[str, str] = {}
        self._reshaped: set[str] = set()
        self._inner: Schemas | None = None
        self._numbers = count()

    def __truediv__(self, name: str) -> str:
        return self.server.address(self.schema_of(name))

    def schema_of(self, name: str) -> str:
        """Return the schema of a book, made when it is named first."""
        if name not in self._schemas:
            self._schemas[name] = self.server.new_schema()
        return self._schemas[name]

    def make(self, name: str, **options: Any) -> Store:
        """Return a new empty book, open."""
        if name in self._schemas or not self.server.spare:
            return Store.create(self / name, **options)
        self._schemas[name] = self.server.spare.pop()
        self.server.fill_spare(self._schemas[name])
        return Store.open(self / name, **options)

    def mktemp(self, name: str) -> Schemas:
        """Return a fresh place; what was made in the one before is over."""
        if self._inner is not None:
            self._inner.forget()
        folder = self.folder / f"{name}{next(self._numbers)}"
        folder.mkdir()
        self._inner = Schemas(self.server, folder)
        return self._inner

    def forget(self) -> None:
        """Give back what was made here."""
        if self._inner is not None:
            self._inner.forget()
        self.server.forget(list(self._schemas.values()), self._reshaped)
        self._schemas.clear()

    def reshaped(self, name: str) -> None:
        """Note that a book is no ordinary one any more, so that no other test gets it."""
        self._reshaped.add(self.schema_of(name))

    def execute(self, name: str, statement: str) -> int:
        """Run SQL on a book."""
        if statement.startswith(("ALTER", "CREATE", "DROP")):
            self.reshaped(name)
        return int(self._ask(name, statement).rowcount)

    def contents(self, name: str) -> Contents:
        """Return all rows of all plain tables of a book."""
        found = self._ask(name, "SELECT tablename FROM pg_tables WHERE schemaname = current_schema()").fetchall()
        tables = [row[0] for row in found if not row[0].startswith(("run_words", "alembic"))]
        return {t: sorted(self._ask(name, f"SELECT * FROM {t}").fetchall(), key=repr) for t in tables}

    def shape(self, name: str) -> dict[str, list[str]]:
        """Return columns, constraints, indices and views by table, as the catalogue writes them."""
        asked = """SELECT relname, 'column ' || attname || ' ' || format_type(atttypid, atttypmod) || attnotnull::text
              FROM pg_attribute JOIN pg_class ON pg_class.oid = attrelid
              WHERE relnamespace = current_schema()::regnamespace AND attnum > 0 AND relkind IN ('r', 'v')
            UNION ALL SELECT conrelid::regclass::text, conname || ' ' || pg_get_constraintdef(oid)
              FROM pg_constraint WHERE connamespace = current_schema()::regnamespace
            UNION ALL SELECT tablename, regexp_replace(indexdef, ' ON \\S+', '')
              FROM pg_indexes WHERE schemaname = current_schema()
            UNION ALL SELECT viewname, definition FROM pg_views WHERE schemaname = current_schema()"""
        parts: dict[str, list[str]] = {}
        for table, said in self._ask(name, asked).fetchall():
            parts.setdefault(table, []).append(said)
        return {table: sorted(said) for table, said in parts.items()}

    def _ask(self, name: str, statement: str) -> Any:
        self.server.admin.execute(f"SET search_path TO {self.schema_of(name)}")
        return self.server.admin.execute(statement)


@pytest.fixture(scope="session")
def server() -> Iterator[Server]:
    """Give the PostgreSQL server of this process."""
    with ExitStack() as stack:
        try:
            folder = stack.enter_context(running_server())
        except NoServer as reason:
            said = f"no PostgreSQL server: {reason}"
            pytest.fail(said) if os.environ.get("CI") else pytest.skip(said)
        yield Server(folder)


@pytest.fixture
def schemas(server: Server, tmp_path: Path) -> Iterator[Schemas]:
    """Give places for books on PostgreSQL, for tests that are about it."""
    made = Schemas(server, tmp_path)
    yield made
    server.cut_off()
    made.forget()


@pytest.fixture(params=ENGINES)
def books(request: pytest.FixtureRequest, tmp_path: Path) -> Books:
    """Give places for books on each engine in turn."""
    if request.param == "sqlite":
        return Files(tmp_path)
    found: Schemas = request.getfixturevalue("schemas")
    return found

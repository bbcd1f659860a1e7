"""One look at a SQLite book without SQLAlchemy: for a check that gives one answer and ends.

Loading SQLAlchemy takes longer than such a check. What is read here is little: which state the book is in, the house
rules, some whole runs and some molecules; all of one moment, in one read transaction. It never writes, and it explains
nothing: where a book cannot be looked at so (a server, another form, a log that waits to be recovered, anything
unexpected), `glance` gives None or raises `GlanceFailed`, and the caller opens the book through the store, which says
in plain words what is the matter.
"""

from __future__ import annotations

import datetime as dt
import os
import sqlite3
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import Any
from uuid import UUID

from kb.record.run import Run
from kb.store.form import BOOK_ID, CHANGES, SCHEMA_HEAD, TIP
from kb.store.run_of_rows import CHILD_TABLES, run_from_rows
from kb.store.values import Acknowledgement, HouseRule
from kb.vocabulary import Role, Severity

_HEADER = b"SQLite format 3\x00"
_KEYS_AT_ONCE = 500
_LEFT = f"'{Role.SUBSTRATE}', '{Role.REAGENT}'"
"""Roles of the structures in which a check looks for motifs."""


class GlanceFailed(Exception):
    """Raised when a book turns out unreadable in this way; never shown to anybody."""


@contextmanager
def glance(address: str | Path, wait_s: float) -> Iterator[Glance | None]:
    """Hand out a look at a book, or None where it cannot be had.

    Args:
        address: a path; anything with "://" in it gives None.
        wait_s: how long SQLite may wait for a lock [s].

    Raises:
        GlanceFailed: reading failed half-way.
    """
    connection = _connection(str(address), wait_s)
    if connection is None:
        yield None
        return
    try:
        yield Glance(connection, Path(address).expanduser())
    except sqlite3.Error as error:
        raise GlanceFailed(str(error)) from error
    finally:
        connection.close()


class Glance:
    """A book at one moment.

    Attributes:
        version: the counter of changes.
        stamp: tells this state of this book from any other: its UUID, counter of changes, last history entry with its
            chain of hashes, and the standing of its files, so that even an edit behind the program's back is noticed.
    """

    def __init__(self, connection: sqlite3.Connection, path: Path) -> None:
        self._connection = connection
        files = [standing_of(path), standing_of(path.with_name(path.name + "-wal"))]
        connection.execute("BEGIN")
        meta = dict(connection.execute("SELECT name, value FROM meta"))
        forms = connection.execute("SELECT version_num FROM alembic_version").fetchall()
        if [tuple(form) for form in forms] != [(SCHEMA_HEAD,)] or BOOK_ID not in meta:
            raise GlanceFailed("another form")
        self.version = int(meta.get(CHANGES) or 0)
        self.stamp = " ".join([meta[BOOK_ID], meta.get(CHANGES, ""), meta.get(TIP, ""), *files])

    def house_rules(self) -> tuple[HouseRule, ...]:
        """Return the house rules in force, oldest first."""
        rows = self._connection.execute(
            "SELECT * FROM house_rule WHERE retired_at IS NULL ORDER BY created_at, rule_id"
        )
        return tuple(_rule_of(dict(row)) for row in rows)

    def acknowledgements(self, about: str) -> tuple[Acknowledgement, ...]:
        """Return who acknowledged which finding of a plan, oldest first."""
        rows = self._connection.execute("SELECT * FROM acknowledgement WHERE about = ? ORDER BY at", (about,))
        found = []
        for row in rows:
            at = _moment(row["at"])
            if at is not None:
                values = dict(row) | {"at": at, "acknowledgement_id": UUID(row["acknowledgement_id"])}
                found.append(Acknowledgement(**values))
        return tuple(found)

    def runs(self, run_keys: Sequence[int]) -> list[Run]:
        """Return the runs of these keys, in that order; keys that are not there are left out."""
        loaded: dict[int, Run] = {}
        children: list[dict[int, list[sqlite3.Row]]] = [{} for _ in CHILD_TABLES]
        for table, of_run in zip(CHILD_TABLES, children, strict=True):
            for row in self._of_keys(f"SELECT * FROM {table} WHERE run_key IN ", run_keys, " ORDER BY position"):
                of_run.setdefault(row["run_key"], []).append(row)
        for row in self._of_keys("SELECT * FROM run WHERE run_key IN ", run_keys):
            values = dict(row)
            values["run_id"] = UUID(row["run_id"])
            values["run_date"] = dt.date.fromisoformat(row["run_date"]) if row["run_date"] else None
            values["recorded_at"] = _moment(row["recorded_at"])
            values["is_reflux"] = bool(row["is_reflux"])
            loaded[row["run_key"]] = run_from_rows(values, [of_run.get(row["run_key"], ()) for of_run in children])
        return [loaded[key] for key in run_keys if key in loaded]

    def molecules(self, structure_ids: Sequence[int]) -> dict[int, bytes]:
        """Return the molecule of some structures as RDKit's binary."""
        rows = self._of_keys("SELECT structure_id, mol_binary FROM structure WHERE structure_id IN ", structure_ids)
        return {row[0]: row[1] for row in rows}

    def standing_runs(self) -> tuple[list[int], list[str]]:
        """Return key and code of the runs that stand, ascending by key."""
        rows = self._connection.execute("SELECT run_key, code FROM run WHERE withdrawn_why IS NULL ORDER BY run_key")
        found = [tuple(row) for row in rows]
        return [key for key, _ in found], [code for _, code in found]

    def left_structures(self, recipe: str) -> tuple[list[int] | None, bytes, bytes]:
        """Return the ids of the structures on left sides, ascending, and their screens and fingerprints, packed.

        None in place of the ids where one of them was not encoded by this recipe.
        """
        rows = self._connection.execute(
            "SELECT structure_id, augmented, morgan, recipe.name FROM structure "
            "LEFT JOIN recipe ON recipe.recipe_id = structure.recipe_id "
            "WHERE augmented IS NOT NULL AND structure_id IN "
            f"(SELECT structure_id FROM run_structure WHERE role IN ({_LEFT})) ORDER BY structure_id"
        ).fetchall()
        if any(row[3] != recipe for row in rows):
            return None, b"", b""
        return [row[0] for row in rows], b"".join(row[1] for row in rows), b"".join(row[2] for row in rows)

    def left_places(self) -> tuple[list[int], list[int], list[bool]]:
        """Return run key, structure id and whether it is the substrate, of every place on a left side."""
        rows = self._connection.execute(
            "SELECT run_key, structure_id, role FROM run_structure "
            f"WHERE role IN ({_LEFT}) ORDER BY run_key, role, position"
        )
        found = [tuple(row) for row in rows]
        return [f[0] for f in found], [f[1] for f in found], [f[2] == Role.SUBSTRATE for f in found]

    def _of_keys(self, statement: str, keys: Sequence[int], order: str = "") -> Iterator[sqlite3.Row]:
        for start in range(0, len(keys), _KEYS_AT_ONCE):
            chunk = [int(key) for key in keys[start : start + _KEYS_AT_ONCE]]
            yield from self._connection.execute(f"{statement}({','.join('?' * len(chunk))}){order}", chunk)


def standing_of(path: Path) -> str:
    """Return which file is at a path, how large it is and when it was written last; "-" where none is, or it is empty.

    An empty log is no log: SQLite makes and removes it as readers come and go.
    """
    try:
        told = path.stat()
    except OSError:
        return "-"
    return f"{told.st_dev}.{told.st_ino}.{told.st_size}.{told.st_mtime_ns}" if told.st_size else "-"


def _connection(address: str, wait_s: float) -> sqlite3.Connection | None:
    """Return a connection for reading, or None where the store had better be asked."""
    if "://" in address or "\x00" in address or not address.strip():
        return None
    path = Path(address).expanduser()
    try:
        with path.open("rb") as file:
            if file.read(len(_HEADER)) != _HEADER:
                return None
        if not os.access(path.absolute().parent, os.W_OK):
            return None  # SQLite cannot lay its shared memory beside the book; the store knows how to go about it
        connection = sqlite3.connect(f"{path.absolute().as_uri()}?mode=ro", uri=True, timeout=min(wait_s, 5.0))
    except (OSError, ValueError, sqlite3.Error):
        return None
    connection.isolation_level = None
    connection.row_factory = sqlite3.Row
    return connection


def _rule_of(values: dict[str, Any]) -> HouseRule:
    when = values.pop("when_text")
    moments = {name: _moment(values[name]) for name in ("created_at", "retired_at")}
    return HouseRule(**{**values, **moments, "when": when, "severity": Severity(values["severity"])})


def _moment(text: str | None) -> dt.datetime | None:
    return None if text is None else dt.datetime.fromisoformat(text).replace(tzinfo=dt.UTC)

"""The word index: full text over what people wrote, kept in step inside the transaction that changes a run.

SQLite: an FTS5 table with external content. The content is a view over the run and its children, so no text
is kept twice, and FTS5's own integrity check compares index and record. FTS5 wants the *old* text to take a
row out, hence the
order for every change: `forget`, change the rows, `learn`. Other engines bring their own full text here and
    nowhere else.

A search is plain words: each must occur, as the beginning of a word; "double quotes" hold words together. No
operator of the engine can be written by accident or on purpose.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence

import sqlalchemy as sa

from kb.errors import QueryError, StoreError
from kb.store.rows import RunRow
from kb.store.values import WordHit

COLUMNS = ("note", "materials", "failures", "labels", "scheme")
WEIGHTS = (4.0, 2.0, 3.0, 2.0, 1.0)
"""BM25 weight per column: what the chemist wrote about the run counts most. A judgement."""

CREATE = (
    """CREATE VIEW run_text AS SELECT run.run_key AS run_key, run.note AS note,
    coalesce((SELECT group_concat(name, ' ') FROM
      (SELECT name FROM component c WHERE c.run_key = run.run_key ORDER BY position)), '') || ' ' ||
    coalesce((SELECT group_concat(name, ' ') FROM
      (SELECT name FROM solvent s WHERE s.run_key = run.run_key ORDER BY position)), '') AS materials,
    coalesce((SELECT group_concat(mode, ' ') FROM
      (SELECT mode FROM failure f WHERE f.run_key = run.run_key ORDER BY position)), '') AS failures,
    coalesce(run.reference, '') || ' ' || coalesce(run.project, '') || ' ' || coalesce(run.series, '') || ' '
    || coalesce(run.by_initials, '') || ' ' || coalesce(run.workup, '') || ' ' || coalesce(run.vessel, '') ||
    ' ' || coalesce(run.atmosphere, '') || ' ' || coalesce(run.temperature_text, '') || ' ' ||
    coalesce(run.time_text, '') AS labels, run.scheme AS scheme FROM run""",
    f"""CREATE VIRTUAL TABLE run_words USING fts5({", ".join(COLUMNS)}, content='run_text',
    content_rowid='run_key', tokenize='unicode61 remove_diacritics 2')""",
)
"""What makes the index, for a new book; the baseline migration says the same in its own words."""

_PIECE = re.compile(r'"([^"]*)"|(\S+)')


def create(connection: sa.Connection) -> None:
    """Make the empty index."""
    _need_sqlite(connection)
    for statement in CREATE:
        connection.exec_driver_sql(statement)


def forget(connection: sa.Connection, run_keys: Iterable[int]) -> None:
    """Take runs out; call it before their rows change."""
    _need_sqlite(connection)
    names = ", ".join(COLUMNS)
    statement = (
        f"INSERT INTO run_words(run_words, rowid, {names}) SELECT 'delete', run_key, {names} FROM run_text "
        "WHERE run_key = ?"
    )
    for run_key in run_keys:
        connection.exec_driver_sql(statement, (run_key,))


def learn(connection: sa.Connection, run_keys: Sequence[int]) -> None:
    """Take runs in; call it after their rows were written."""
    _need_sqlite(connection)
    names = ", ".join(COLUMNS)
    head = f"INSERT INTO run_words(rowid, {names}) SELECT run_key, {names} FROM run_text WHERE run_key"
    if run_keys and run_keys[-1] - run_keys[0] + 1 == len(run_keys):
        connection.exec_driver_sql(f"{head} BETWEEN ? AND ?", (run_keys[0], run_keys[-1]))
        return
    for run_key in run_keys:
        connection.exec_driver_sql(f"{head} = ?", (run_key,))


def search(
    connection: sa.Connection, words: str, limit: int | None, include_withdrawn: bool
) -> list[WordHit]:
    """Return the runs that hold all the words, best first.

    Raises:
        QueryError: no word in it.
    """
    _need_sqlite(connection)
    standing = "" if include_withdrawn else "AND run.withdrawn_why IS NULL"
    found = connection.exec_driver_sql(
        f"SELECT run.run_key, bm25(run_words, {', '.join(str(w) for w in WEIGHTS)}) AS rank FROM run_words "
        f"JOIN run ON run.run_key = run_words.rowid WHERE run_words MATCH ? {standing} "
        "ORDER BY rank, run.run_key LIMIT ?",
        (_as_query(words), -1 if limit is None else limit),
    ).all()
    score = {row.run_key: -row.rank for row in found}
    named = {}
    keys = list(score)
    for start in range(0, len(keys), 10_000):
        rows = connection.execute(
            sa.select(RunRow.run_key, RunRow.run_id, RunRow.code).where(
                RunRow.run_key.in_(keys[start : start + 10_000])
            )
        )
        named.update({row.run_key: row for row in rows})
    return [WordHit(run_id=named[k].run_id, code=named[k].code, score=score[k]) for k in keys]


def is_consistent(connection: sa.Connection) -> bool:
    """Return True when the index says the same as the record."""
    _need_sqlite(connection)
    try:
        connection.exec_driver_sql("INSERT INTO run_words(run_words, rank) VALUES('integrity-check', 1)")
    except sa.exc.DatabaseError:
        return False
    return True


def rebuild(connection: sa.Connection) -> None:
    """Make the index anew from the record."""
    _need_sqlite(connection)
    connection.exec_driver_sql("INSERT INTO run_words(run_words) VALUES('rebuild')")


def _as_query(words: str) -> str:
    """Return the words as an FTS5 query of quoted prefixes, all of which must occur."""
    pieces = [(quoted or bare) for quoted, bare in _PIECE.findall(words.replace("\x00", " "))]
    usable = [piece.replace('"', " ").strip() for piece in pieces if any(c.isalnum() for c in piece)]
    if not usable:
        raise QueryError(f"There is no word in {words[:60]!r}.", "Give at least one word.", words)
    return " AND ".join(f'"{piece}"*' for piece in usable)


def _need_sqlite(connection: sa.Connection) -> None:
    if connection.dialect.name != "sqlite":
        raise StoreError(f"Words cannot be searched on {connection.dialect.name} yet.", "Use a SQLite book.")

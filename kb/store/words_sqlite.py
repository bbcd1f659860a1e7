"""The word index on SQLite: an FTS5 table with external content, a view over the run and its children.

No text is kept twice, and FTS5's own integrity check compares index and record. FTS5 wants the *old* text to take a
row out, hence the order for every change: `forget`, change the rows, `learn`.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence

import sqlalchemy as sa

from kb.errors import StoreError

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


class SqliteWords:
    """See `WordIndex`."""

    checks_by_writing = True

    def create(self, connection: sa.Connection) -> None:
        """Make the empty index."""
        for statement in CREATE:
            connection.exec_driver_sql(statement)

    def forget(self, connection: sa.Connection, run_keys: Iterable[int]) -> None:
        """Take runs out; call it before their rows change."""
        names = ", ".join(COLUMNS)
        statement = (
            f"INSERT INTO run_words(run_words, rowid, {names}) SELECT 'delete', run_key, {names} FROM run_text "
            "WHERE run_key = ?"
        )
        for run_key in run_keys:
            connection.exec_driver_sql(statement, (run_key,))

    def learn(self, connection: sa.Connection, run_keys: Sequence[int]) -> None:
        """Take runs in; call it after their rows were written."""
        names = ", ".join(COLUMNS)
        head = f"INSERT INTO run_words(rowid, {names}) SELECT run_key, {names} FROM run_text WHERE run_key"
        if run_keys and run_keys[-1] - run_keys[0] + 1 == len(run_keys):
            connection.exec_driver_sql(f"{head} BETWEEN ? AND ?", (run_keys[0], run_keys[-1]))
            return
        for run_key in run_keys:
            connection.exec_driver_sql(f"{head} = ?", (run_key,))

    def search(
        self, connection: sa.Connection, pieces: Sequence[str], limit: int | None, include_withdrawn: bool
    ) -> list[tuple[int, float]]:
        """Return (run_key, score) of the runs that hold all the pieces, best first."""
        standing = "" if include_withdrawn else "AND run.withdrawn_why IS NULL"
        found = connection.exec_driver_sql(
            f"SELECT run.run_key, bm25(run_words, {', '.join(str(w) for w in WEIGHTS)}) AS rank FROM run_words "
            f"JOIN run ON run.run_key = run_words.rowid WHERE run_words MATCH ? {standing} "
            "ORDER BY rank, run.run_key LIMIT ?",
            (" AND ".join(_prefix(piece) for piece in pieces), -1 if limit is None else limit),
        ).all()
        return [(row.run_key, -row.rank) for row in found]

    def keys_with(self, connection: sa.Connection, wanted: Sequence[Sequence[str]]) -> list[int]:
        """Return the runs that hold one alternative of every word, in no order; schemes are not looked at."""
        query = " AND ".join("(" + " OR ".join(_prefix(one) for one in some) + ")" for some in wanted)
        columns = " ".join(name for name in COLUMNS if name != "scheme")
        joined = connection.exec_driver_sql(  # as one text: tens of thousands of rows would take five times as long
            "SELECT group_concat(rowid) FROM run_words WHERE run_words MATCH ?", (f"{{{columns}}} : ({query})",)
        ).scalar()
        return [int(key) for key in joined.split(",")] if joined else []

    def vocabulary(self, connection: sa.Connection) -> list[str]:
        """Return every word of the index, folded."""
        try:
            connection.exec_driver_sql(
                "CREATE VIRTUAL TABLE IF NOT EXISTS temp.run_terms USING fts5vocab('main', 'run_words', 'row')"
            )
            return [row[0] for row in connection.exec_driver_sql("SELECT term FROM temp.run_terms")]
        except sa.exc.DatabaseError as error:
            raise StoreError("The word index cannot be read.", "Run `sidepath verify`.") from error

    def is_consistent(self, connection: sa.Connection) -> bool:
        """Return True when the index says the same as the record."""
        try:
            connection.exec_driver_sql("INSERT INTO run_words(run_words, rank) VALUES('integrity-check', 1)")
        except sa.exc.DatabaseError:
            return False
        return True

    def rebuild(self, connection: sa.Connection) -> None:
        """Make the index anew from the record."""
        connection.exec_driver_sql("INSERT INTO run_words(run_words) VALUES('rebuild')")


def _prefix(piece: str) -> str:
    """Return words that must occur together, the last as the beginning of a word, as a quoted FTS5 phrase."""
    return '"' + piece.replace('"', " ").replace("\x00", " ") + '"*'

"""The word index on PostgreSQL: one `tsvector` per run with a GIN index, searched by the server.

The server's own parsers differ from FTS5's (they know hosts, numbers with signs, hyphenated compounds) and its folding
hangs on the locale it was set up with, so words are told apart and folded here, once for what is kept and once for what
is asked: both engines then find the same runs. Matching, phrases, beginnings of words and ranking are the server's.

Limits of a `tsvector`: words beyond LONGEST_WORD letters are cut, text beyond LARGEST_BYTES is not indexed, and phrases
are found in the first 16,383 words of a run; the columns that people fill with little text therefore come first.
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterable, Sequence
from functools import cache
from typing import Any

import sqlalchemy as sa

CREATE = (
    """CREATE VIEW run_text AS SELECT run.run_key AS run_key, run.note AS note,
    coalesce((SELECT string_agg(name, ' ' ORDER BY position) FROM component c WHERE c.run_key = run.run_key), '')
    || ' ' ||
    coalesce((SELECT string_agg(name, ' ' ORDER BY position) FROM solvent s WHERE s.run_key = run.run_key), '')
    AS materials,
    coalesce((SELECT string_agg(mode, ' ' ORDER BY position) FROM failure f WHERE f.run_key = run.run_key), '')
    AS failures,
    concat_ws(' ', run.reference, run.project, run.series, run.by_initials, run.workup, run.vessel, run.atmosphere,
    run.temperature_text, run.time_text) AS labels, run.scheme AS scheme FROM run""",
    """CREATE TABLE run_words (run_key INTEGER NOT NULL CONSTRAINT pk_run_words PRIMARY KEY
    CONSTRAINT fk_run_words_run_key_run REFERENCES run (run_key), words TSVECTOR NOT NULL)""",
    "CREATE INDEX ix_run_words_words ON run_words USING gin (words)",
)
"""What makes the index, for a new book; the baseline migration says the same in its own words."""

COLUMNS = (("failures", "B"), ("materials", "C"), ("labels", "C"), ("note", "A"), ("scheme", "D"))
"""Columns of the view in the order in which their words are numbered, each with the label that carries its weight."""

WEIGHTS = "{0.25, 0.5, 0.75, 1.0}"
"""Weight of D, C, B and A: a quarter of those of the same columns in `words_sqlite.py`, since the server wants 0..1."""

NOT_SCHEME = "ABC"
GAP = 8
"""Numbers left out between two columns, so that no phrase reaches from one into the next."""

LONGEST_WORD = 500
"""Letters of a word that count; the server takes 2,046 bytes, and a letter has at most four."""

LARGEST_BYTES = 900_000
"""Where a run's text stops being indexed; the server takes 1 MiB with its own bookkeeping."""

DROPPED = frozenset(map(chr, range(0x300, 0x332))) - frozenset(
    "\u0305\u030d\u030e\u0310\u0312\u0313\u0314\u0315\u0316\u0317\u0318\u0319\u031a\u031c\u031d\u031e\u031f"
    "\u0320\u0321\u0322\u0329\u032a\u032b\u032c\u032f"
)
"""Accents that stand alone and that FTS5 leaves out; at the others it ends a word."""

BATCH = 500
_WORD = re.compile(r"[^\W_]+")


class PostgresWords:
    """See `WordIndex`."""

    checks_by_writing = False

    def create(self, connection: sa.Connection) -> None:
        """Make the empty index."""
        for statement in CREATE:
            connection.exec_driver_sql(statement)

    def forget(self, connection: sa.Connection, run_keys: Iterable[int]) -> None:
        """Do nothing: `learn` replaces what was known of a run, and no run is ever taken away."""

    def learn(self, connection: sa.Connection, run_keys: Sequence[int]) -> None:
        """Take runs in, in place of what was known of them; call it after their rows were written."""
        statement = sa.text(
            "INSERT INTO run_words (run_key, words) SELECT run_key, CAST(words AS tsvector) FROM "
            "unnest(CAST(:keys AS integer[]), CAST(:words AS text[])) AS fresh (run_key, words) "
            "ON CONFLICT (run_key) DO UPDATE SET words = excluded.words"
        )
        for keys, vectors in _vectors(connection, run_keys):
            connection.execute(statement, {"keys": keys, "words": vectors})

    def search(
        self, connection: sa.Connection, pieces: Sequence[str], limit: int | None, include_withdrawn: bool
    ) -> list[tuple[int, float]]:
        """Return (run_key, score) of the runs that hold all the pieces, best first."""
        query = _query([[piece] for piece in pieces])
        if not query:
            return []
        standing = "" if include_withdrawn else "AND run.withdrawn_why IS NULL"
        found = connection.execute(
            sa.text(
                "SELECT run.run_key, ts_rank(CAST(:weights AS real[]), run_words.words, query) AS score "
                "FROM CAST(:query AS tsquery) AS query, run_words JOIN run ON run.run_key = run_words.run_key "
                f"WHERE run_words.words @@ query {standing} ORDER BY score DESC, run.run_key LIMIT :limit"
            ),
            {"weights": WEIGHTS, "query": query, "limit": limit},
        ).all()
        return [(row.run_key, float(row.score)) for row in found]

    def keys_with(self, connection: sa.Connection, wanted: Sequence[Sequence[str]]) -> list[int]:
        """Return the runs that hold one alternative of every word, in no order; schemes are not looked at."""
        query = _query(wanted, NOT_SCHEME)
        if not query:
            return []
        statement = sa.text("SELECT run_key FROM run_words WHERE words @@ CAST(:query AS tsquery)")
        return list(connection.execute(statement, {"query": query}).scalars())

    def vocabulary(self, connection: sa.Connection) -> list[str]:
        """Return every word of the index, folded."""
        return list(connection.execute(sa.text("SELECT word FROM ts_stat('SELECT words FROM run_words')")).scalars())

    def is_consistent(self, connection: sa.Connection) -> bool:
        """Return True when the index says the same as the record."""
        keys = list(connection.execute(sa.text("SELECT run_key FROM run ORDER BY run_key")).scalars())
        known = connection.execute(sa.text("SELECT count(*) FROM run_words")).scalar_one()
        statement = sa.text(
            "SELECT count(*) FROM run_words JOIN unnest(CAST(:keys AS integer[]), CAST(:words AS text[])) "
            "AS fresh (run_key, words) ON fresh.run_key = run_words.run_key "
            "WHERE run_words.words = CAST(fresh.words AS tsvector)"
        )
        same = 0
        for some, vectors in _vectors(connection, keys):
            same += connection.execute(statement, {"keys": some, "words": vectors}).scalar_one()
        return known == same == len(keys)

    def rebuild(self, connection: sa.Connection) -> None:
        """Make the index anew from the record."""
        connection.execute(sa.text("DELETE FROM run_words"))
        self.learn(connection, list(connection.execute(sa.text("SELECT run_key FROM run ORDER BY run_key")).scalars()))


def words_of(text: str) -> list[str]:
    """Return the words of a text as they are kept and asked: small letters, accents off, letters and digits only.

    >>> words_of("Überschuß: K2CO3/DMF, group-loss")
    ['uberschuß', 'k2co3', 'dmf', 'group', 'loss']
    """
    folded = text.lower() if text.isascii() else "".join(map(_folded, text))
    return [word[:LONGEST_WORD] for word in _WORD.findall(folded)]


@cache
def _folded(letter: str) -> str:
    """Return a letter as FTS5 folds it: accents come off the letters a to z only; other scripts keep theirs.

    Source: compared with SQLite's `unicode61 remove_diacritics 2`, letter by letter; the tests do it again.
    """
    if letter in DROPPED:
        return ""
    small = letter.casefold() if len(letter.casefold()) == 1 else letter.lower()
    base = unicodedata.normalize("NFD", small)[0]
    return base if base.isascii() and small not in "ǡ" else small


def _vectors(connection: sa.Connection, run_keys: Sequence[int]) -> Iterable[tuple[list[int], list[str]]]:
    """Yield the keys of some runs and what the index should say of each, as the server writes a `tsvector`."""
    statement = sa.text("SELECT * FROM run_text WHERE run_key = ANY(CAST(:keys AS integer[])) ORDER BY run_key")
    for start in range(0, len(run_keys), BATCH):
        rows = connection.execute(statement, {"keys": list(run_keys[start : start + BATCH])}).mappings().all()
        yield [row["run_key"] for row in rows], [_vector(row) for row in rows]


def _vector(row: Any) -> str:
    """Return the `tsvector` of a row of the view: every word with its numbers and labels."""
    places: dict[str, list[str]] = {}
    number = size = 0
    for column, label in COLUMNS:
        for word in words_of(row[column]):
            number += 1
            known = places.get(word)
            size += 2 if known else len(word.encode()) + 8
            if size > LARGEST_BYTES:
                break
            if known is None:
                places[word] = [f"{number}{label}"]
            elif len(known) < 255:  # the server keeps that many numbers of a word
                known.append(f"{number}{label}")
        number += GAP
    return " ".join(f"'{word}':{','.join(numbers)}" for word, numbers in places.items())


def _query(wanted: Sequence[Sequence[str]], labels: str = "") -> str:
    """Return a `tsquery`: of every word one alternative, each a phrase whose last word may go on; "" = no word."""
    asked = []
    for alternatives in wanted:
        phrases = [_phrase(words, labels) for words in map(words_of, alternatives) if words]
        if phrases:
            asked.append("(" + " | ".join(phrases) + ")")
    return " & ".join(asked)


def _phrase(words: Sequence[str], labels: str) -> str:
    exact = [f"'{word}'{':' + labels if labels else ''}" for word in words[:-1]]
    return "(" + " <-> ".join([*exact, f"'{words[-1]}':*{labels}"]) + ")"

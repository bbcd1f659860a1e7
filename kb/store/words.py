"""The word index: full text over what people wrote, kept in step inside the transaction that changes a run.

Each engine brings its own full text (`words_sqlite.py`, `words_postgres.py`); this file says what a search is and names
what was found. For every change: `forget`, change the rows, `learn`.

A search is plain words: each must occur, as the beginning of a word; "double quotes" hold words together. No
operator of the engine can be written by accident or on purpose.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence

import sqlalchemy as sa

from kb.errors import QueryError
from kb.store.dialect import WordIndex
from kb.store.engine import dialect_of
from kb.store.rows import RunRow
from kb.store.values import WordHit

_PIECE = re.compile(r'"([^"]*)"|(\S+)')


def create(connection: sa.Connection) -> None:
    """Make the empty index."""
    index_of(connection).create(connection)


def forget(connection: sa.Connection, run_keys: Iterable[int]) -> None:
    """Take runs out; call it before their rows change."""
    index_of(connection).forget(connection, run_keys)


def learn(connection: sa.Connection, run_keys: Sequence[int]) -> None:
    """Take runs in; call it after their rows were written."""
    index_of(connection).learn(connection, run_keys)


def search(connection: sa.Connection, words: str, limit: int | None, include_withdrawn: bool) -> list[WordHit]:
    """Return the runs that hold all the words, best first.

    Raises:
        QueryError: no word in it.
    """
    found = index_of(connection).search(connection, _pieces(words), limit, include_withdrawn)
    named = {}
    for start in range(0, len(found), 10_000):
        keys = [key for key, _ in found[start : start + 10_000]]
        columns = sa.select(RunRow.run_key, RunRow.run_id, RunRow.code)
        named.update({row.run_key: row for row in connection.execute(columns.where(RunRow.run_key.in_(keys)))})
    return [WordHit(run_id=named[k].run_id, code=named[k].code, score=score) for k, score in found]


def keys_with(connection: sa.Connection, wanted: Sequence[Sequence[str]]) -> list[int]:
    """Return the runs that hold one alternative of every word, in no order; schemes are not words."""
    return index_of(connection).keys_with(connection, wanted)


def vocabulary(connection: sa.Connection) -> list[str]:
    """Return every word of the index, as it was folded (small letters, no accents)."""
    return index_of(connection).vocabulary(connection)


def rebuild(connection: sa.Connection) -> None:
    """Make the index anew from the record."""
    index_of(connection).rebuild(connection)


def mend(connection: sa.Connection) -> None:
    """Make the index anew where it does not say what the record says."""
    if not index_of(connection).is_consistent(connection):
        rebuild(connection)


def index_of(connection: sa.Connection) -> WordIndex:
    """Return the word index of the engine that a connection leads to."""
    return dialect_of(connection).words


def _pieces(words: str) -> list[str]:
    """Return the words and quoted phrases of a search."""
    pieces = [(quoted or bare) for quoted, bare in _PIECE.findall(words.replace("\x00", " "))]
    usable = [piece.replace('"', " ").strip() for piece in pieces if any(c.isalnum() for c in piece)]
    if not usable:
        raise QueryError(f"There is no word in {words[:60]!r}.", "Give at least one word.", words)
    return usable

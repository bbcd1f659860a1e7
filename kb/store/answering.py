"""What a book answers: runs by code, in pages or all, their history, their words, and what is derived.

It only reads, each answer inside one read transaction: it is of one moment whatever others write meanwhile.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from typing import TYPE_CHECKING
from uuid import UUID

import sqlalchemy as sa

from kb.errors import IndexStale
from kb.record.run import Run
from kb.store import facts, history, lineage, runs, words
from kb.store.rows import RunRow
from kb.store.runs import EVERY_STANDING_RUN, RunFilter, Sort
from kb.store.session import CHANGES, OpenBook, book_id_of
from kb.store.values import Conflict, Event, HistoryEntry, Page, StoredStructure, WordHit

if TYPE_CHECKING:
    import numpy as np


class Answers:
    """Everything that can be asked of a book without changing it.

    Attributes:
        book: for this floor only.
    """

    def __init__(self, book: OpenBook) -> None:
        self.book = book

    # Facts about the book

    @property
    def book_id(self) -> UUID:
        """Return the UUID of the book; a copy of the file has the same."""
        with self.book.reading() as connection:
            return book_id_of(connection)

    def data_version(self) -> int:
        """Return a number that goes up with every change by anybody, drafts left out; cheap to ask."""
        with self.book.reading() as connection:
            return int(history.read_meta(connection, CHANGES) or 0)

    def events(self) -> tuple[Event, ...]:
        """Return what was done to the book as a whole (made, migrated, merged), oldest first."""
        with self.book.reading() as connection:
            return tuple(history.events(connection))

    def tip(self) -> int:
        """Return the `seq` of the last history entry; 0 = none."""
        with self.book.reading() as connection:
            return history.read_tip(connection)[0]

    def count(self, wanted: RunFilter = EVERY_STANDING_RUN) -> int:
        """Return how many runs there are."""
        with self.book.reading() as connection:
            if wanted.run_ids is not None:
                return len(runs.matching(connection, wanted))
            inner = runs.select_keys(wanted).order_by(None).subquery()
            return connection.execute(sa.select(sa.func.count()).select_from(inner)).scalar_one()

    # Runs out

    def get(self, name: str | UUID) -> Run:
        """Return the run that a code or UUID names, withdrawn or not.

        Raises:
            RecordNotFound: there is none. RecordConflict: the number means several since a merge.
        """
        with self.book.reading() as connection:
            return runs.load(connection, [runs.get_key(connection, name)])[0]

    def get_many(self, run_ids: Iterable[UUID]) -> tuple[Run, ...]:
        """Return the runs of these UUIDs, in that order; unknown ones are left out."""
        wanted = list(run_ids)
        with self.book.reading() as connection:
            keys = runs.keys_of(connection, wanted)
            return tuple(runs.load(connection, [keys[i] for i in wanted if i in keys]))

    def iter_runs(
        self, wanted: RunFilter = EVERY_STANDING_RUN, sort: Sort = Sort.CODE, descending: bool = False
    ) -> Iterator[Run]:
        """Yield runs in order, all as of one moment, a batch in memory at a time."""
        with self.book.reading() as connection:
            keys = [key for key, _ in runs.matching(connection, wanted, sort, descending)]
            yield from runs.iter_load(connection, keys)

    def page(
        self,
        wanted: RunFilter = EVERY_STANDING_RUN,
        sort: Sort = Sort.CODE,
        descending: bool = False,
        page: int = 1,
        size: int = 200,
    ) -> Page:
        """Return one page (from 1) of runs, and how many there are; a page beyond the last is empty."""
        first = (max(page, 1) - 1) * size
        with self.book.reading() as connection:
            if wanted.run_ids is not None:
                found = runs.matching(connection, wanted, sort, descending)
                total, keys = len(found), [key for key, _ in found[first : first + size]]
            else:
                statement = runs.select_keys(wanted, sort, descending)
                inner = statement.order_by(None).subquery()
                total = connection.execute(sa.select(sa.func.count()).select_from(inner)).scalar_one()
                keys = [row[0] for row in connection.execute(statement.limit(size).offset(first))]
            return Page(total=total, page=max(page, 1), size=size, items=tuple(runs.load(connection, keys)))

    def matching_ids(
        self, wanted: RunFilter = EVERY_STANDING_RUN, sort: Sort = Sort.CODE, descending: bool = False
    ) -> tuple[UUID, ...]:
        """Return the UUIDs of the runs wanted, in order."""
        with self.book.reading() as connection:
            return tuple(run_id for _, run_id in runs.matching(connection, wanted, sort, descending))

    def history(self, name: str | UUID) -> tuple[HistoryEntry, ...]:
        """Return what was done to a run, oldest first, each entry after those it followed on."""
        with self.book.reading() as connection:
            run_id = _run_id(connection, runs.get_key(connection, name))
            return tuple(lineage.in_order(history.entries_of(connection, [run_id]).get(run_id, [])))

    def conflicts(self) -> tuple[Conflict, ...]:
        """Return what waits for somebody to settle, by code."""
        with self.book.reading() as connection:
            rows = connection.execute(
                sa.select(RunRow.run_id, RunRow.code).where(RunRow.has_conflict).order_by(RunRow.code_number)
            ).all()
            entries = history.entries_of(connection, [row.run_id for row in rows])
        return tuple(
            Conflict(code=row.code, run_id=row.run_id, field=name, claims=claims)
            for row in rows
            for name, claims in lineage.disputes(entries[row.run_id]).items()
        )

    def changed_since(self, seq: int) -> tuple[int, tuple[UUID, ...]]:
        """Return the tip and the runs that got history after `seq` (0 = all)."""
        with self.book.reading() as connection:
            return history.read_tip(connection)[0], tuple(history.changed_since(connection, seq))

    # What was derived

    def words(self, text: str, limit: int | None = None, include_withdrawn: bool = False) -> list[WordHit]:
        """Return the runs in which all these words begin a word, best first."""
        with self.book.reading() as connection:
            return words.search(connection, text, limit, include_withdrawn)

    def derived_columns(self) -> dict[str, np.ndarray]:
        """Return the facts of all runs that stand, by column (see `facts.py`).

        Raises:
            IndexStale: some were made by another recipe; `rebuild` mends it.
        """
        with self.book.reading() as connection:
            return facts.derived_columns(connection, self.book.deriving.recipe)

    def stale_count(self) -> int:
        """Return how many runs that stand have no facts of this store's recipe."""
        with self.book.reading() as connection:
            return len(facts.stale_keys(connection, self.book.deriving.recipe))

    def structures(self, after: int = 0, batch: int = 5000) -> Iterator[list[StoredStructure]]:
        """Yield structures with an id beyond `after`, ascending, in batches, all as of one moment.

        Raises:
            IndexStale: some were encoded by another recipe.
        """
        with self.book.reading() as connection:
            if self.book.deriving.encode is not None and facts.stale_structures(connection, self.book.deriving.recipe):
                raise IndexStale("Structures were encoded by another recipe.", "Rebuild them: `sidepath migrate`.")
            yield from facts.iter_structures(connection, after, batch)

    def places(self, run_ids: Iterable[UUID] | None = None) -> dict[str, np.ndarray]:
        """Return where structures stand in runs, by column; None = all runs that stand."""
        with self.book.reading() as connection:
            keys = None if run_ids is None else list(runs.keys_of(connection, run_ids).values())
            return facts.places(connection, keys)

    def names(self) -> dict[int, tuple[UUID, str]]:
        """Return UUID and code by `run_key`, for what the columns name by key."""
        with self.book.reading() as connection:
            rows = connection.execute(sa.select(RunRow.run_key, RunRow.run_id, RunRow.code))
            return {row.run_key: (row.run_id, row.code) for row in rows}


def _run_id(connection: sa.Connection, run_key: int) -> UUID:
    return connection.execute(sa.select(RunRow.run_id).where(RunRow.run_key == run_key)).scalar_one()

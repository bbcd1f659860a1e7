"""Which runs failed how: failure modes and motifs of the runs that stand, read in one go for judgement.

It only reads.
"""

from __future__ import annotations

import sqlalchemy as sa

from kb.store.rows import FailureRow, RunRow
from kb.store.store import Store

Failings = tuple[tuple[str, str | None], ...]


def failings_by_run(store: Store) -> dict[int, Failings]:
    """Return (mode, motif SMARTS or None) pairs by `run_key`, in the order they were given; runs without are absent."""
    statement = (
        sa.select(FailureRow.run_key, FailureRow.mode, FailureRow.motif)
        .join(RunRow, RunRow.run_key == FailureRow.run_key)
        .where(RunRow.withdrawn_why.is_(None))
        .order_by(FailureRow.run_key, FailureRow.position)
    )
    found: dict[int, Failings] = {}
    with store.book.reading() as connection:
        for key, mode, motif in connection.execute(statement):
            found[key] = (*found.get(key, ()), (mode, motif))
    return found

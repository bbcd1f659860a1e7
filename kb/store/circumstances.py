"""In which project and at which scale the runs that failed were run, read in one go for the audit of failures.

It only reads, and no whole run: of a hundred thousand runs an audit needs two columns.
"""

from __future__ import annotations

import sqlalchemy as sa

from kb.store.rows import FailureRow, RunRow
from kb.store.store import Store


def circumstances_of_failed(store: Store) -> dict[str, tuple[str | None, float | None]]:
    """Return (project, scale [mmol]) by code of the standing runs that name a failure; None = not recorded."""
    names_failure = sa.select(FailureRow.run_key)
    statement = sa.select(RunRow.code, RunRow.project, RunRow.scale_mmol).where(
        RunRow.withdrawn_why.is_(None), RunRow.run_key.in_(names_failure)
    )
    with store.book.reading() as connection:
        return {code: (project, scale) for code, project, scale in connection.execute(statement)}

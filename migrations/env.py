"""How the revisions are run: on a connection that the program hands over, never on one of Alembic's own.

`kb/store/schema.py` calls this as a library, inside one transaction for all revisions, with foreign keys off and
checked afterwards. There is no `alembic.ini`; the `alembic` command alone has no book to work on, so it is refused.
"""

from __future__ import annotations

from typing import Any

import sqlalchemy as sa
from alembic import context

from kb.errors import StoreError
from kb.store.rows import Row


def include_name(name: str | None, kind: str, parents: object) -> bool:
    """Leave out the word index, which is no table of the model (see `kb/store/words.py`)."""
    return not (kind == "table" and name is not None and name.startswith("run_words"))


def run(connection: sa.Connection) -> None:
    """Run what was asked on a connection."""
    context.configure(
        connection=connection,
        target_metadata=Row.metadata,
        render_as_batch=True,
        include_name=include_name,
        compare_type=True,
        compare_server_default=True,
        transaction_per_migration=True,
    )
    with context.begin_transaction():
        context.run_migrations()


def run_on(handed_over: Any) -> None:
    """Run on a connection, or on one of an engine (the schema tests); its owner's transaction is left to its owner."""
    if isinstance(handed_over, sa.Connection):
        run(handed_over)
        return
    if not hasattr(handed_over, "connect"):
        raise StoreError("No book was handed to the migrations.", "Run `sidepath migrate --book PATH` instead.")
    with handed_over.connect() as opened:
        if opened.in_transaction():
            run(opened)
            return
        if opened.dialect.name == "sqlite":
            opened.exec_driver_sql("PRAGMA foreign_keys=OFF")
        run(opened)
        opened.commit()


run_on(context.config.attributes.get("connection"))

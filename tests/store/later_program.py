"""The program one revision further, as a process: `python -m tests.store.later_program migrate BOOK`.

Its revision rebuilds the table of runs, so that there is a moment to be killed in.
"""

from __future__ import annotations

import shutil
import sys
import tempfile
from pathlib import Path

import kb.paths
from kb.store import schema
from kb.store.engine import parse_address

LATER = """
from __future__ import annotations
import sqlalchemy as sa
from alembic import op
revision = "0002"
down_revision = "0001"
branch_labels = None
depends_on = None


def upgrade() -> None:
    op.execute("DROP TABLE run_words")
    op.execute("DROP VIEW run_text")
    recreate = "always" if op.get_bind().dialect.name == "sqlite" else "never"
    with op.batch_alter_table("run", recreate=recreate) as batch:
        batch.add_column(sa.Column("colour", sa.Text(), nullable=True))
    {extra}
"""
"""A revision that rebuilds the parent of many children, as SQLite must for a new constraint."""


def write_later_revisions(folder: Path, extra: str = "pass") -> Path:
    """Copy the revisions into a folder and add a later one; return the folder."""
    copied = folder / "migrations"
    shutil.copytree(kb.paths.shipped("migrations"), copied, ignore=shutil.ignore_patterns("__pycache__"))
    (copied / "versions" / "0002_later.py").write_text(LATER.format(extra=extra))
    return copied


if __name__ == "__main__":
    with tempfile.TemporaryDirectory() as scratch:
        revisions = write_later_revisions(Path(scratch))
        kb.paths.shipped = lambda name: revisions
        schema.SCHEMA_REVISIONS = ("0001", "0002")
        schema.SCHEMA_HEAD = "0002"
        print("migrating", flush=True)
        print("migrated", schema.upgrade(parse_address(sys.argv[2])), flush=True)

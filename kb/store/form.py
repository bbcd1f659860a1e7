"""The names by which every reader knows a book: schema revisions, and the rows of the table `meta`.

They stand apart from the tables so that they can be had without SQLAlchemy.
"""

from __future__ import annotations

SCHEMA_REVISIONS = ("0001",)
"""All revisions that this program knows, oldest first."""

SCHEMA_HEAD = SCHEMA_REVISIONS[-1]

BOOK_ID, CREATED_AT, CHANGES = "book_id", "created_at", "changes"
"""Names of meta rows: the book's UUID, when it was made, how often anybody changed it."""

TIP = "history_tip"
"""Name of the meta row that holds "seq:chain" of the last history entry."""

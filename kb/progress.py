"""How a long job reports and is stopped: one small protocol, and the silent answer to it.

It never prints; a front end brings its own. Jobs report by elapsed time (every 0.25 s), not by count, so that
a fast job is not slowed by its own reports.
"""

from __future__ import annotations

from typing import Protocol


class Progress(Protocol):
    """What a long job is handed."""

    def advance(self, done: int, total: int | None, note: str = "") -> None:
        """Take note that `done` of `total` units are finished (total None = not known)."""

    def cancelled(self) -> bool:
        """Return True once the user asked to stop."""
        ...


class Silent:
    """Progress that nobody watches and nobody stops."""

    def advance(self, done: int, total: int | None, note: str = "") -> None:
        """Ignore the report."""

    def cancelled(self) -> bool:
        """Return False: nobody can ask."""
        return False

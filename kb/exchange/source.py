"""What every source of runs gives, whatever its format: rows, each a run or a rejection, and how far it has come."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Protocol

from kb.exchange.headings import ColumnMapping
from kb.exchange.rows import Rejection
from kb.record.run import Run


@dataclass(frozen=True, slots=True, kw_only=True)
class Read:
    """One row, read: a run or a rejection, and what a rejects file needs to give it back.

    Attributes:
        raw: cells of a table row, or the text of the record.
    """

    row: int
    run: Run | None = None
    rejection: Rejection | None = None
    raw: Sequence[str] | str = ""


class Source(Protocol):
    """A file being read."""

    @property
    def format_name(self) -> str:
        """Return the format, for the rejects file."""
        ...

    @property
    def mapping(self) -> ColumnMapping | None:
        """Return what the columns are taken for; None for formats without columns."""
        ...

    @property
    def unknown_names(self) -> Counter[str]:
        """Return the names met so far that the catalogue does not hold."""
        ...

    def __iter__(self) -> Iterator[Read]:
        """Yield every row once."""
        ...

    @property
    def done_share(self) -> float:
        """Return the part of the file that was read, 0..1."""
        ...

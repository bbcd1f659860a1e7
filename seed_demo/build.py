"""The demo book: the tables beside this file read into a book by the same path as anybody's import.

It owns the order in which the tables go in: by date, so that codes and history follow the calendar. It invents nothing:
what is invented stands in the tables, readable and by hand. It is loaded by its place on disk (a checkout or an
installed wheel), so it imports `kb` and nothing beside itself. The planned step that `sidepath demo` checks is
`planned_step.toml`, read by `kb.book.demo`.

A run is taken as recorded at five in the afternoon (UTC) of its day, so that the book looks as if it had been kept
while the work went on; one without a date follows the run above it in its table.
"""

from __future__ import annotations

import dataclasses
import datetime as dt
from collections import Counter
from collections.abc import Iterator
from pathlib import Path

from kb.exchange.headings import ColumnMapping
from kb.exchange.loading import LoadReport, Sink, load
from kb.exchange.source import Read
from kb.exchange.sources import open_source
from kb.progress import Progress, Silent

HERE = Path(__file__).parent
TABLES = HERE / "tables"
WHO = "demo"
"""Whose initials stand in the history; the runs themselves name invented people."""

_EVENING = dt.time(17, 0, tzinfo=dt.UTC)


def build(book: Sink, progress: Progress | None = None) -> LoadReport:
    """Read all tables into a book; running it again changes nothing.

    Args:
        book: an opened, writable store.
        progress: told runs done of all; asked whether to stop.

    Returns:
        The report of the import; with these tables nothing is rejected (tested).
    """
    return load(AllTables(), book, who=WHO, progress=progress or Silent())


class AllTables:
    """Every table as one source, its rows in order of date."""

    format_name = "csv"
    mapping: ColumnMapping | None = None

    def __init__(self) -> None:
        self.unknown_names: Counter[str] = Counter()
        self._dated: list[tuple[dt.date, Read]] = []
        for path in sorted(TABLES.glob("*.csv")):
            source = open_source(path)
            day = dt.date.min
            for row in source:
                if row.run is not None:
                    day = row.run.date or day
                    run = dataclasses.replace(row.run, recorded_at=dt.datetime.combine(day, _EVENING))
                    row = dataclasses.replace(row, run=run)
                self._dated.append((day, row))
            self.unknown_names.update(source.unknown_names)
        self._dated.sort(key=lambda item: item[0])
        self._given = 0

    def __iter__(self) -> Iterator[Read]:
        for _, row in self._dated:
            self._given += 1
            yield row

    @property
    def done_share(self) -> float:
        """Return the part that was given, 0..1."""
        return self._given / max(len(self._dated), 1)

"""Files into a book: batches, duplicates, rejects, progress and stopping.

It owns the job of an import, not the formats (`sources`) and not the storing: it hands a stream of runs to a `Sink`,
which keeps them batch by batch, each in one transaction or not at all. An import that was stopped, killed or partly
refused is simply run again: what is there already is counted as duplicate and left alone, also when it has been amended
since. Memory does not grow with the file.

Every row ends in exactly one of stored, duplicate, rejected; read is their sum. In a dry run nothing is written to the
book and `stored` counts what would be.
"""

from __future__ import annotations

import sqlite3
import time
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from itertools import islice
from pathlib import Path
from typing import Any, Protocol
from uuid import UUID

from kb.exchange.headings import ColumnMapping
from kb.exchange.rejects import RejectsFile
from kb.exchange.rows import Rejection
from kb.exchange.source import Read, Source
from kb.exchange.sources import open_source
from kb.progress import Progress, Silent
from kb.record.run import Run

BATCH = 1000
"""Runs looked up at once in a dry run."""

REPORT_EVERY_S = 0.25
"""Time between two reports of progress [s]."""

KEPT_REJECTIONS = 200
"""Rejections that the report itself carries; the rejects file has them all."""


class Sink(Protocol):
    """Where runs go: a store, or anything that keeps them."""

    def add_many(self, many: Iterable[Run], who: str, progress: Progress | None = None) -> Any:
        """Keep runs in one transaction each batch; those there already are left alone. Gives `stored`, `duplicate`."""
        ...

    def get_many(self, run_ids: Iterable[UUID]) -> tuple[Run, ...]:
        """Return those of the runs that are there."""
        ...


@dataclass(frozen=True, slots=True, kw_only=True)
class LoadReport:
    """What an import did.

    Attributes:
        read, stored, duplicate, rejected: rows; read is the sum of the others.
        stopped: the user stopped it; run it again to go on.
        dry_run: nothing was written.
        rejections: the first KEPT_REJECTIONS of them.
        unknown_names: materials that the catalogue does not hold, most frequent first, with their rows counted.
        mapping: what the columns were taken for; None for formats without columns.
        encoding, delimiter: as found, for text tables.
    """

    read: int = 0
    stored: int = 0
    duplicate: int = 0
    rejected: int = 0
    stopped: bool = False
    dry_run: bool = False
    rejections: tuple[Rejection, ...] = ()
    unknown_names: tuple[tuple[str, int], ...] = ()
    mapping: ColumnMapping | None = None
    encoding: str | None = None
    delimiter: str | None = None

    def as_dict(self) -> dict[str, Any]:
        """Return the contract's JSON object, with what else is known behind it."""
        return {
            "read": self.read,
            "stored": self.stored,
            "duplicate": self.duplicate,
            "rejected": self.rejected,
            "stopped": self.stopped,
            "dry_run": self.dry_run,
            "rejections": [r.as_dict() for r in self.rejections],
            "unknown_names": dict(self.unknown_names),
            "columns": {c.heading: {"field": c.field, "unit": c.unit, "how": c.how} for c in self.mapping.columns}
            if self.mapping
            else None,
            "encoding": self.encoding,
            "delimiter": self.delimiter,
        }


def load_file(
    path: Path,
    sink: Sink,
    *,
    who: str,
    progress: Progress | None = None,
    dry_run: bool = False,
    rejects: Path | None = None,
    format_name: str | None = None,
    mapping: Mapping[str, Any] | None = None,
    sheet: str | None = None,
) -> LoadReport:
    """Read a file into a book.

    Args:
        path: the file.
        sink: the book.
        who: initials of who imports, for the history; a run that names nobody stays without a name.
        progress: told rows done, an estimate of all rows, and words; asked whether to stop.
        dry_run: read everything, store nothing.
        rejects: where refused rows go, in the format they came in, with the reason; written only if there are any.
        format_name, mapping, sheet: see `open_source`.

    Raises:
        ImportFileError: the file as a whole cannot be read. StoreError: the book is in trouble; what was stored stays.
    """
    source = open_source(path, format_name=format_name, mapping=mapping, sheet=sheet)
    return load(source, sink, who=who, progress=progress, dry_run=dry_run, rejects=rejects)


def load(
    source: Source,
    sink: Sink,
    *,
    who: str,
    progress: Progress | None = None,
    dry_run: bool = False,
    rejects: Path | None = None,
) -> LoadReport:
    """Read an opened source into a book; see `load_file`."""
    job = _Job(source, sink, who, progress or Silent(), dry_run, rejects)
    try:
        return job.run()
    finally:
        job.close()


@dataclass(slots=True)
class _Job:
    """One import under way."""

    source: Source
    sink: Sink
    who: str
    progress: Progress
    dry_run: bool
    rejects_path: Path | None
    read: int = 0
    kept: int = 0
    stored: int = 0
    duplicate: int = 0
    rejected: int = 0
    stopped: bool = False
    rejections: list[Rejection] = field(default_factory=list)
    rejects: RejectsFile | None = None
    seen: _SeenBefore | None = None
    last_report_s: float = 0.0

    def run(self) -> LoadReport:
        if self.dry_run:
            for batch in self._batches():
                self._count(batch)
        else:
            report = self.sink.add_many(self._runs(), self.who, _Kept(self))
            self.stored, self.duplicate = report.stored, report.duplicate
            if self.stopped or getattr(report, "stopped", False):
                self.stopped = True  # rows that were read ahead and let go are read again next time
                self.read = self.stored + self.duplicate + self.rejected
        self.progress.advance(self.read, self.read, self._words())
        return self._report()

    def _runs(self) -> Iterator[Run]:
        """Yield the runs of the source as they are asked for; count and keep what is refused."""
        for row in self.source:
            self.read += 1
            if row.run is not None:
                yield row.run
            else:
                self._reject(row)
            if self._report_is_due() and self.progress.cancelled():
                self.stopped = True
                return

    def _batches(self) -> Iterator[list[Run]]:
        stream = self._runs()
        while batch := list(islice(stream, BATCH)):
            yield batch

    def close(self) -> None:
        for thing in (self.rejects, self.seen):
            if thing is not None:
                thing.close()

    def _count(self, batch: list[Run]) -> None:
        """Count what a dry run would store."""
        if self.seen is None:
            self.seen = _SeenBefore()
        ids = [run.run_id for run in batch]
        there = {run.run_id for run in self.sink.get_many(ids)}
        fresh = self.seen.count_new([i for i in ids if i not in there])
        self.stored += fresh
        self.duplicate += len(batch) - fresh

    def _reject(self, row: Read) -> None:
        rejection = row.rejection or Rejection(row=row.row, column=None, reason="The row could not be read.")
        self.rejected += 1
        if len(self.rejections) < KEPT_REJECTIONS:
            self.rejections.append(rejection)
        if self.rejects_path is None:
            return
        if self.rejects is None:
            headings = tuple(c.heading for c in self.source.mapping.columns) if self.source.mapping else ()
            self.rejects = RejectsFile(self.rejects_path, self.source.format_name, headings)
        self.rejects.add(row.raw, rejection)

    def _report_is_due(self) -> bool:
        now_s = time.monotonic()
        if now_s - self.last_report_s < REPORT_EVERY_S:
            return False
        self.last_report_s = now_s
        share = self.source.done_share
        total = max(round(self.read / share), self.read) if share > 0 else None
        self.progress.advance(self.read, total, self._words())
        return True

    def _words(self) -> str:
        parts = [
            f"{self.kept:,} in the book" if self.kept else "",
            f"{self.rejected:,} refused" if self.rejected else "",
        ]
        return ", ".join(p for p in parts if p)

    def _report(self) -> LoadReport:
        table = getattr(self.source, "table", None)
        return LoadReport(
            read=self.read,
            stored=self.stored,
            duplicate=self.duplicate,
            rejected=self.rejected,
            stopped=self.stopped,
            dry_run=self.dry_run,
            rejections=tuple(self.rejections),
            unknown_names=tuple(self.source.unknown_names.most_common(50)),
            mapping=self.source.mapping,
            encoding=getattr(table, "encoding", None),
            delimiter=getattr(table, "delimiter", None),
        )


class _Kept:
    """Hears from the book how many rows are in it, and tells it when to stop."""

    def __init__(self, job: _Job) -> None:
        self._job = job

    def advance(self, done: int, total: int | None, note: str = "") -> None:
        """Take note of how many rows the book has dealt with."""
        self._job.kept = done

    def cancelled(self) -> bool:
        """Return True once the user asked to stop; rows that were refused until then are counted."""
        return self._job.stopped or self._job.progress.cancelled()


class _SeenBefore:
    """The ids met in a dry run, in a temporary file, so that a million of them cost no memory."""

    def __init__(self) -> None:
        self._connection = sqlite3.connect("")
        self._connection.execute("CREATE TABLE seen (id BLOB PRIMARY KEY) WITHOUT ROWID")

    def count_new(self, ids: Sequence[UUID]) -> int:
        """Return how many of the ids were not met before; they are now."""
        rows = [(i.bytes,) for i in ids]
        before = self._connection.total_changes
        self._connection.executemany("INSERT OR IGNORE INTO seen VALUES (?)", rows)
        return self._connection.total_changes - before

    def close(self) -> None:
        """Drop the temporary file."""
        self._connection.close()

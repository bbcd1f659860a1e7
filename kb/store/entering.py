"""New runs into the book: who, when, a code for each, facts, the first history entry, in one transaction.

A run that is there already (by UUID) is left alone. What a run brings along from another book, its code and
its moment of entry, is kept where nobody else has that code.

Many runs go in by batches, one transaction each. Behind the first batch their chemistry is worked out in other
processes (`deriving_apart`) while the batches before are written; the book cannot be told from one written by one
process.
"""

from __future__ import annotations

import datetime as dt
from collections import deque
from collections.abc import Callable, Iterable, Iterator, Sequence
from concurrent.futures import Future, wait
from dataclasses import dataclass, replace
from uuid import UUID

import sqlalchemy as sa

from kb.errors import SidepathError
from kb.record.run import Run
from kb.store import history, lineage, recording
from kb.store.codes import parse_code, write_code
from kb.store.deriving import Encodings, Prepared
from kb.store.deriving_apart import Apart, Piece
from kb.store.rows import RunRow
from kb.store.session import OpenBook, book_id_of, need

AHEAD = 2
"""Batches whose chemistry is worked out while the one before them is written."""

PATIENCE_S = 0.25
"""Time between two looks whether to stop [s]."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Batch:
    """Runs that are not in the book yet, checked and ready to be derived.

    Attributes:
        given: how many runs it was made of, those that are there already counted too.
        fresh: the new ones, by UUID, in order.
        contents: what the history will say of each.
        now: the moment of entry.
    """

    given: int
    fresh: dict[UUID, Run]
    contents: dict[UUID, lineage.Content]
    now: dt.datetime


def enter(book: OpenBook, chunk: Sequence[Run], who: str) -> list[Run]:
    """Write those of the runs that are new; return them as stored, in order.

    Raises:
        InvalidRecord: a value that no book can keep, or no initials; then none of them is written.
    """
    batch = _sifted(book, chunk, who)
    if not batch.fresh:
        return []
    prepared = {run.run_id: book.deriving.prepare(run) for run in batch.fresh.values()}
    return _write(book, batch, prepared, Encodings(deriving=book.deriving), who)


def enter_many(
    book: OpenBook, chunks: Iterable[Sequence[Run]], who: str, stopped: Callable[[], bool] = lambda: False
) -> Iterator[tuple[int, int]]:
    """Write chunk by chunk, a transaction each; yield (runs given, runs stored) once each is on disk.

    Args:
        book: where to.
        chunks: asked for as they are needed, AHEAD of what is written.
        who: initials.
        stopped: asked while other processes are waited for; what is not written yet is then let go, so that nobody who
            pressed a key waits for work that the next import does just as well.

    Raises:
        InvalidRecord: as `enter`; the chunks before it stay.
    """
    stream = iter(chunks)
    first = next(stream, None)
    if first is None:
        return
    yield len(first), len(enter(book, first, who))
    if book.deriving.processes < 2:
        for few in stream:
            yield len(few), len(enter(book, few, who))
        return
    chunk = next(stream, None)
    if chunk is None:
        return
    refusal: SidepathError | None = None
    with Apart(book.deriving) as apart:
        waiting: deque[tuple[Batch, list[Future[Piece]]]] = deque()
        while chunk is not None or waiting:
            try:
                if chunk is not None:
                    batch = _sifted(book, chunk, who)
                    waiting.append((batch, apart.derive(list(batch.fresh.values()))))
                    chunk = next(stream, None)
            except SidepathError as error:  # what came before it is written first
                refusal, chunk = error, None
            if waiting and (len(waiting) > AHEAD or chunk is None):
                batch, pieces = waiting.popleft()
                if not _are_done(pieces, stopped):
                    return
                yield batch.given, len(_write(book, batch, *_gathered(book, batch, pieces), who))
    if refusal is not None:
        raise refusal


def _sifted(book: OpenBook, chunk: Sequence[Run], who: str) -> Batch:
    need(who, "Say who recorded it", "initials (--as)")
    now = book.clock()
    with book.reading() as connection:
        known = recording.known_ids(connection, [run.run_id for run in chunk])
    fresh: dict[UUID, Run] = {}
    for run in chunk:
        if run.run_id not in known:
            fresh.setdefault(run.run_id, run if run.recorded_at else replace(run, recorded_at=now))
    # refuses what no book can keep, before anything is worked out or locked
    contents = {run.run_id: lineage.content_of(replace(run, code=None)) for run in fresh.values()}
    return Batch(given=len(chunk), fresh=fresh, contents=contents, now=now)


def _are_done(pieces: Sequence[Future[Piece]], stopped: Callable[[], bool]) -> bool:
    """Wait for pieces; return False where somebody asked to stop before all were done."""
    while wait(pieces, timeout=PATIENCE_S).not_done:
        if stopped():
            return False
    return True


def _gathered(
    book: OpenBook, batch: Batch, pieces: Iterable[Future[Piece]]
) -> tuple[dict[UUID, Prepared], Encodings]:
    """Return what the pieces of a batch hold together."""
    found = [piece.result() for piece in pieces]
    prepared = dict(zip(batch.fresh, (p for piece in found for p in piece.prepared), strict=True))
    encodings = Encodings(deriving=book.deriving)
    for piece in found:
        encodings.by_smiles.update(piece.encoded)
    return prepared, encodings


def _write(
    book: OpenBook, batch: Batch, prepared: dict[UUID, Prepared], encodings: Encodings, who: str
) -> list[Run]:
    if not batch.fresh:
        return []
    book.foresee(encodings, (smiles for p in prepared.values() for _, _, smiles in p.places))
    with book.writing() as connection:
        known = recording.known_ids(connection, prepared)
        new = _with_codes(connection, [run for run in batch.fresh.values() if run.run_id not in known])
        book_id = book_id_of(connection)
        items = [recording.Placed(run=r, code_number=n, prepared=prepared[r.run_id]) for r, n in new]
        recording.insert_runs(connection, items, encodings)
        entries = [
            history.make_entry(
                run_id=run.run_id,
                revision=run.revision,
                action=lineage.ADD,
                who=who,
                at=batch.now,
                why="",
                changed=(),
                after={**batch.contents[run.run_id], "code": run.code},
                parents=(),
                book_id=book_id,
            )
            for run, _ in new
        ]
        history.append(connection, entries)
    return [run for run, _ in new]


def _with_codes(connection: sa.Connection, new: Sequence[Run]) -> list[tuple[Run, int]]:
    """Return each run with its code, and the number in it: the one it brings if free, else the next."""
    brought = {run.run_id: parse_code(run.code) if run.code else None for run in new}
    taken = recording.taken_numbers(connection, {code[0] for code in brought.values() if code})
    free = max([recording.next_free(connection, RunRow.code_number), *(c[0] + 1 for c in brought.values() if c)])
    given: list[tuple[Run, int]] = []
    for run in new:
        code = brought[run.run_id]
        if code is not None and code[0] not in taken:
            number, mark = code
            taken.add(number)
        else:
            number, mark = free, ""
            free += 1
        given.append((replace(run, code=write_code(number, mark)), number))
    return given

"""New runs into the book: who, when, a code for each, facts, the first history entry, in one transaction.

A run that is there already (by UUID) is left alone. What a run brings along from another book, its code and
its moment of entry, is kept where nobody else has that code.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import sqlalchemy as sa

from kb.record.run import Run
from kb.store import history, lineage, recording
from kb.store.codes import parse_code, write_code
from kb.store.rows import RunRow
from kb.store.session import OpenBook, book_id_of, need


def enter(book: OpenBook, chunk: Sequence[Run], who: str) -> list[Run]:
    """Write those of the runs that are new; return them as stored, in order.

    Raises:
        InvalidRecord: a value that no book can keep, or no initials; then none of them is written.
    """
    need(who, "Say who recorded it", "initials (--as)")
    now = book.clock()
    with book.reading() as connection:
        known = recording.known_ids(connection, [run.run_id for run in chunk])
    fresh: dict[object, Run] = {}
    for run in chunk:
        if run.run_id not in known:
            fresh.setdefault(run.run_id, run if run.recorded_at else replace(run, recorded_at=now))
    # refuses what no book can keep, before anything is worked out or locked
    contents = {run.run_id: lineage.content_of(replace(run, code=None)) for run in fresh.values()}
    if not fresh:
        return []
    prepared = {run.run_id: book.deriving.prepare(run) for run in fresh.values()}
    encodings = book.foreseen(smiles for p in prepared.values() for _, _, smiles in p.places)
    with book.writing() as connection:
        known = recording.known_ids(connection, prepared)
        new = _with_codes(connection, [run for run in fresh.values() if run.run_id not in known])
        book_id = book_id_of(connection)
        items = [recording.Placed(run=r, code_number=n, prepared=prepared[r.run_id]) for r, n in new]
        recording.insert_runs(connection, items, encodings)
        entries = [
            history.make_entry(
                run_id=run.run_id,
                revision=run.revision,
                action=lineage.ADD,
                who=who,
                at=now,
                why="",
                changed=(),
                after={**contents[run.run_id], "code": run.code},
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

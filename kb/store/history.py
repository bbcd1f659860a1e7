"""The append-only history on disk: entries in and out, the chain of hashes, the tip.

It adds and reads; nothing here changes or removes an entry. What entries *mean* is `lineage.py`.

Invariant: the row `seq` holds `chain = SHA-256(chain of seq - 1 + entry_id)`, the first one starting from "",
and the meta row `history_tip` holds "seq:chain" of the last, so that a missing tail is noticed too. The tip
is written in the same transaction as the entry.
"""

from __future__ import annotations

import datetime as dt
import json
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import replace
from typing import Any
from uuid import UUID

import sqlalchemy as sa

from kb.errors import StoreDamaged
from kb.store import lineage
from kb.store.form import TIP
from kb.store.mapping import table
from kb.store.rows import EventRow, HistoryRow, MetaRow
from kb.store.values import Change, Event, HistoryEntry

CHUNK = 500


def read_meta(connection: sa.Connection, name: str) -> str:
    """Return a fact about the book; "" where it is not set."""
    value = connection.execute(sa.select(MetaRow.value).where(MetaRow.name == name)).scalar()
    return value or ""


def write_meta(connection: sa.Connection, name: str, value: str) -> None:
    """Set a fact about the book that is there already."""
    connection.execute(sa.update(MetaRow).where(MetaRow.name == name).values(value=value))


def note_event(connection: sa.Connection, at: dt.datetime, who: str, action: str, detail: str) -> None:
    """Write down what was done to the book as a whole."""
    last = connection.execute(sa.select(sa.func.max(EventRow.event_id))).scalar() or 0
    values = {"event_id": last + 1, "at": at, "who": who, "action": action, "detail": detail}
    connection.execute(sa.insert(table(EventRow)).values(**values))


def events(connection: sa.Connection) -> list[Event]:
    """Return what was done to the book as a whole, oldest first."""
    rows = connection.execute(sa.select(table(EventRow)).order_by(EventRow.event_id)).all()
    return [Event(at=row.at, who=row.who, action=row.action, detail=row.detail) for row in rows]


def read_tip(connection: sa.Connection) -> tuple[int, str]:
    """Return `seq` and `chain` of the last entry; (0, "") for an empty history."""
    seq, _, chain = read_meta(connection, TIP).partition(":")
    return (int(seq), chain) if seq.isdigit() else (0, "")


def append(connection: sa.Connection, entries: Sequence[HistoryEntry]) -> list[HistoryEntry]:
    """Write entries behind the last one, in the order given; return them with their `seq`."""
    if not entries:
        return []
    seq, chain = read_tip(connection)
    numbered, values = [], []
    for entry in entries:
        seq, chain = seq + 1, lineage.next_chain(chain, entry.entry_id)
        numbered.append(replace(entry, seq=seq))
        values.append(
            {
                "seq": seq,
                "entry_id": entry.entry_id,
                "run_id": entry.run_id,
                "revision": entry.revision,
                "action": entry.action,
                "who": entry.who,
                "at": entry.at,
                "why": entry.why,
                "parents": ",".join(entry.parents),
                "changed": lineage.canonical([[c.field, c.old, c.new] for c in entry.changed]),
                "after": lineage.canonical(entry.after),
                "book_id": entry.book_id,
                "received_at": entry.received_at,
                "chain": chain,
            }
        )
    connection.execute(sa.insert(table(HistoryRow)), values)
    write_meta(connection, TIP, f"{seq}:{chain}")
    return numbered


def make_entry(
    *,
    run_id: UUID,
    revision: int,
    action: str,
    who: str,
    at: dt.datetime,
    why: str,
    changed: tuple[Change, ...],
    after: Mapping[str, Any],
    parents: tuple[str, ...],
    book_id: UUID,
) -> HistoryEntry:
    """Return an entry with its hash; `seq` 0 until it is appended."""
    entry = HistoryEntry(
        seq=0,
        entry_id="",
        run_id=run_id,
        revision=revision,
        action=action,
        who=who,
        at=at,
        why=why,
        changed=changed,
        after=after,
        parents=parents,
        book_id=book_id,
    )
    return replace(entry, entry_id=lineage.entry_id_of(entry))


def entries_of(connection: sa.Connection, run_ids: Iterable[UUID]) -> dict[UUID, list[HistoryEntry]]:
    """Return the entries of each run by `seq`; a run without any is left out."""
    wanted = list(run_ids)
    found: dict[UUID, list[HistoryEntry]] = {}
    for start in range(0, len(wanted), CHUNK):
        rows = connection.execute(
            sa.select(table(HistoryRow))
            .where(HistoryRow.run_id.in_(wanted[start : start + CHUNK]))
            .order_by(HistoryRow.seq)
        ).mappings()
        for row in rows:
            found.setdefault(row["run_id"], []).append(entry_of(row))
    return found


def iter_rows(connection: sa.Connection) -> Iterator[tuple[HistoryEntry, str]]:
    """Yield every entry with the chain hash stored beside it, by `seq`."""
    last = 0
    while True:
        rows = (
            connection.execute(
                sa.select(table(HistoryRow)).where(HistoryRow.seq > last).order_by(HistoryRow.seq).limit(CHUNK)
            )
            .mappings()
            .all()
        )
        for row in rows:
            yield entry_of(row), row["chain"]
        if len(rows) < CHUNK:
            return
        last = rows[-1]["seq"]


def changed_since(connection: sa.Connection, seq: int) -> list[UUID]:
    """Return the runs that got history after `seq`."""
    return list(connection.execute(sa.select(HistoryRow.run_id).where(HistoryRow.seq > seq).distinct()).scalars())


def entry_of(row: sa.RowMapping) -> HistoryEntry:
    """Return the entry of a row.

    Raises:
        StoreDamaged: the row holds no JSON where there must be some.
    """
    try:
        changed = tuple(Change(field=f, old=old, new=new) for f, old, new in json.loads(row["changed"]))
        after = json.loads(row["after"])
    except (ValueError, TypeError) as error:
        raise StoreDamaged(
            f"Entry {row['seq']} of the history is damaged.",
            "Run `sidepath verify`, and restore a backup.",
            row["seq"],
        ) from error
    return HistoryEntry(
        seq=row["seq"],
        entry_id=row["entry_id"],
        run_id=row["run_id"],
        revision=row["revision"],
        action=row["action"],
        who=row["who"],
        at=row["at"],
        why=row["why"],
        changed=changed,
        after=after,
        parents=tuple(p for p in row["parents"].split(",") if p),
        book_id=row["book_id"],
        received_at=row["received_at"],
    )

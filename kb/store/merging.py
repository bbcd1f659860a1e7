"""Two books made one: a laptop's and the group's, or two copies that went their own ways.

What a run is follows from the *set* of its history entries (`lineage.py`), and entries are named by what they say, so
merging is a union: doing it twice, in steps, or the other way round comes to the same content, and no entry is lost.
Each entry keeps who, when, why and the book in which it was made. Where two people changed the same field of a run
without knowing of each other, the later change stands and the field is reported until somebody settles it
(`Store.settle`). Where two runs were given the same number, both get letters of their UUID behind it (`codes.py`).

House rules, acknowledgements and attached files come along; drafts do not, they are somebody's unfinished form.
The other book is only read. The work is done in transactions of some hundred runs, each whole; stopped or killed, it
is simply run again.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any
from uuid import UUID

import sqlalchemy as sa

from kb.errors import InvalidRecord, RecordConflict, StoreDamaged
from kb.progress import Progress, Silent
from kb.record.run import Run
from kb.store import history, lineage, recording
from kb.store.codes import marks_of, parse_code, write_code
from kb.store.curation import ACKNOWLEDGEMENT, BLOB, RULE
from kb.store.deriving import Prepared
from kb.store.mapping import table
from kb.store.rows import RunRow
from kb.store.session import OpenBook, need
from kb.store.store import Store
from kb.store.values import HistoryEntry, MergeReport

CHUNK = 200
"""Runs per transaction."""


@dataclass(slots=True)
class _Tally:
    added: int = 0
    same: int = 0
    updated: int = 0
    renamed: dict[UUID, tuple[str, str]] = field(default_factory=dict)


def merge(store: Store, other: str | Path, *, who: str, progress: Progress | None = None) -> MergeReport:
    """Take another book in; the other book is left as it is.

    Args:
        store: the book that grows.
        other: path or URL of the other one; it must have the same form (`sidepath migrate` it first).
        who: initials of who merges, for the book's own log; every entry keeps its own author.
        progress: asked before each transaction; what was taken in stays.

    Raises:
        StoreMissing, StoreDamaged, SchemaBehind, SchemaTooNew: of the other book.
        RecordConflict: the other book is this book.
    """
    need(who, "Say who merges", "initials (--as)")
    progress = progress or Silent()
    with Store.open(other, read_only=True) as source:
        if _is_same_place(store.book, source.book):
            raise RecordConflict(f"{source.book.address} is this very book.", "Name the other one.")
        tally = _Tally()
        with source.book.reading() as theirs:
            files = _take_files(store.book, theirs)
            rules = _take_house_rules(store.book, theirs)
            acknowledged = _take_acknowledgements(store.book, theirs)
            ids = list(theirs.execute(sa.select(RunRow.run_id).order_by(RunRow.run_key)).scalars())
            done = 0
            for start in range(0, len(ids), CHUNK):
                if progress.cancelled():
                    break
                chunk = ids[start : start + CHUNK]
                _take_runs(store.book, history.entries_of(theirs, chunk), tally)
                done += len(chunk)
                progress.advance(done, len(ids), "runs compared")
    if tally.added or tally.updated:
        with store.book.writing() as connection:
            said = f"{tally.added} runs added, {tally.updated} changed, {tally.same} the same."
            history.note_event(connection, store.book.clock(), who, "merged", f"With {source.book.address}: {said}")
    both = set(ids)
    return MergeReport(
        added=tally.added,
        same=tally.same,
        updated=tally.updated,
        conflicts=tuple(c for c in store.conflicts() if c.run_id in both),
        renamed=tuple(sorted(tally.renamed.values())),
        house_rules=rules,
        acknowledgements=acknowledged,
        attachments=files,
        stopped=done < len(ids),
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class _Merged:
    """A run as both histories together say it is."""

    run: Run
    claim: tuple[int, str]
    news: tuple[HistoryEntry, ...]
    has_conflict: bool


def _merged(mine: Sequence[HistoryEntry], theirs: Sequence[HistoryEntry]) -> _Merged:
    known = {entry.entry_id for entry in mine}
    news = [entry for entry in lineage.in_order([*mine, *theirs]) if entry.entry_id not in known]
    for entry in news:
        if lineage.entry_id_of(entry) != entry.entry_id:
            raise StoreDamaged(
                f"The other book's history was edited (entry {entry.seq}).",
                "Nothing of that run was taken. Run `sidepath verify` on the other book.",
                entry.seq,
            )
    entries = [*mine, *news]
    try:
        content, revision = lineage.replay(entries)
        run = lineage.run_of(content, run_id=entries[0].run_id, revision=revision)
        claim = parse_code(content["code"])
        has_conflict = bool(lineage.disputes(entries))
    except (InvalidRecord, KeyError) as error:
        raise StoreDamaged(
            f"The history of run {entries[0].run_id} cannot be read: {error}.", "Run `sidepath verify` on both books."
        ) from error
    if claim is None:
        raise StoreDamaged(f"Run {run.run_id} has no code.", "Run `sidepath verify` on both books.")
    return _Merged(run=run, claim=claim, news=tuple(news), has_conflict=has_conflict)


def _take_runs(book: OpenBook, theirs: Mapping[UUID, Sequence[HistoryEntry]], tally: _Tally) -> None:
    """Take in the entries of some runs, in one transaction; none where there is nothing new."""
    with book.reading() as connection:
        mine = history.entries_of(connection, theirs)
    foreseen = {i: _merged(mine.get(i, ()), entries) for i, entries in theirs.items()}
    prepared = {i: book.deriving.prepare(m.run) for i, m in foreseen.items() if m.news}
    tally.same += len(foreseen) - len(prepared)
    if not prepared:
        return
    encodings = book.foreseen(smiles for p in prepared.values() for _, _, smiles in p.places)
    with book.writing() as connection:
        mine = history.entries_of(connection, prepared)
        merged = {i: _merged(mine.get(i, ()), theirs[i]) for i in prepared}
        for i, now in merged.items():
            if now.run != foreseen[i].run:  # somebody amended it meanwhile
                prepared[i] = book.deriving.prepare(now.run)
        codes = _settle_codes(connection, merged, tally)
        keys = _keys(connection, mine)
        new = [i for i in merged if i not in mine]
        placed = {i: _placed(m, codes[i], prepared[i]) for i, m in merged.items()}
        recording.insert_runs(connection, [placed[i] for i in new], encodings)
        for i, key in keys.items():
            recording.update_run(connection, key, placed[i], encodings)
        received = book.clock()
        news = [replace(entry, received_at=received) for m in merged.values() for entry in m.news]
        history.append(connection, news)
    tally.added += len(new)
    tally.updated += len(keys)


def _placed(merged: _Merged, code: str, prepared: Prepared) -> recording.Placed:
    return recording.Placed(
        run=replace(merged.run, code=code),
        code_number=merged.claim[0],
        prepared=prepared,
        has_conflict=merged.has_conflict,
    )


def _keys(connection: sa.Connection, run_ids: Iterable[UUID]) -> dict[UUID, int]:
    statement = sa.select(RunRow.run_id, RunRow.run_key).where(RunRow.run_id.in_(list(run_ids)))
    return {row.run_id: row.run_key for row in connection.execute(statement)}


def _settle_codes(connection: sa.Connection, merged: Mapping[UUID, _Merged], tally: _Tally) -> dict[UUID, str]:
    """Return the codes of the merged runs, and rename runs of this book whose number is no longer theirs alone."""
    columns = sa.select(RunRow.run_id, RunRow.code, RunRow.code_number)
    here = {row.run_id: row for row in connection.execute(columns.where(RunRow.run_id.in_(list(merged))))}
    numbers = {m.claim[0] for m in merged.values()} | {row.code_number for row in here.values()}
    beside = [
        row for row in connection.execute(columns.where(RunRow.code_number.in_(numbers))) if row.run_id not in merged
    ]
    groups: dict[int, dict[UUID, str]] = {}
    for run_id, m in merged.items():
        groups.setdefault(m.claim[0], {})[run_id] = m.claim[1]
    for run_id, entries in history.entries_of(connection, [row.run_id for row in beside]).items():
        claim = _merged(entries, ()).claim
        groups.setdefault(claim[0], {})[run_id] = claim[1]
    codes = {i: write_code(n, mark) for n, group in groups.items() for i, mark in marks_of(group).items()}
    before = {row.run_id: row.code for row in [*here.values(), *beside]}
    changed = {i: code for i, code in before.items() if codes[i] != code}
    for run_id, code in changed.items():  # out of the way first, two runs may swap
        _write_code(connection, run_id, f"~{run_id.hex}")
        tally.renamed[run_id] = (code, codes[run_id])
    for run_id in changed:
        _write_code(connection, run_id, codes[run_id])
    for run_id, m in merged.items():
        if run_id not in before and codes[run_id] != write_code(*m.claim):
            tally.renamed[run_id] = (write_code(*m.claim), codes[run_id])
    return {i: codes[i] for i in merged}


def _write_code(connection: sa.Connection, run_id: UUID, code: str) -> None:
    connection.execute(sa.update(table(RunRow)).where(RunRow.run_id == run_id).values(code=code))


def _take_files(book: OpenBook, theirs: sa.Connection) -> int:
    """Take in attached files, one per transaction, before the runs that name them."""
    with book.reading() as connection:
        known = set(connection.execute(sa.select(BLOB.c.sha256)).scalars())
    missing = [sha for sha in theirs.execute(sa.select(BLOB.c.sha256)).scalars() if sha not in known]
    for sha256 in missing:
        content = theirs.execute(sa.select(BLOB.c.content).where(BLOB.c.sha256 == sha256)).scalar_one()
        with book.writing() as connection:
            if connection.execute(sa.select(BLOB.c.sha256).where(BLOB.c.sha256 == sha256)).scalar() is None:
                connection.execute(sa.insert(BLOB).values(sha256=sha256, content=content))
    return len(missing)


def _take_acknowledgements(book: OpenBook, theirs: sa.Connection) -> int:
    column = ACKNOWLEDGEMENT.c.acknowledgement_id
    with book.reading() as connection:
        known = set(connection.execute(sa.select(column)).scalars())
    rows = [dict(row) for row in theirs.execute(sa.select(ACKNOWLEDGEMENT)).mappings()]
    missing = [row for row in rows if row["acknowledgement_id"] not in known]
    if missing:
        with book.writing() as connection:
            known = set(connection.execute(sa.select(column)).scalars())
            missing = [row for row in missing if row["acknowledgement_id"] not in known]
            if missing:
                connection.execute(sa.insert(ACKNOWLEDGEMENT), missing)
    return len(missing)


def _take_house_rules(book: OpenBook, theirs: sa.Connection) -> int:
    """Take in rules; a rule written twice keeps its first author, one retired twice its first retirement."""
    brought = {row["rule_id"]: dict(row) for row in theirs.execute(sa.select(RULE)).mappings()}
    with book.reading() as connection:
        if not _rule_news(connection, brought):
            return 0
    with book.writing() as connection:
        news = _rule_news(connection, brought)
        for rule_id, (values, is_new) in news.items():
            if is_new:
                connection.execute(sa.insert(RULE).values(**values))
            else:
                connection.execute(sa.update(RULE).where(RULE.c.rule_id == rule_id).values(**values))
    return sum(is_new for _, is_new in news.values())


def _rule_news(connection: sa.Connection, brought: dict[str, dict[str, Any]]) -> dict[str, tuple[dict[str, Any], bool]]:
    """Return the rules to write: columns, and whether the rule is new here."""
    here = {row["rule_id"]: dict(row) for row in connection.execute(sa.select(RULE)).mappings()}
    news: dict[str, tuple[dict[str, Any], bool]] = {}
    for rule_id, row in brought.items():
        mine = here.get(rule_id)
        if mine is None:
            news[rule_id] = (row, True)
            continue
        first = min(mine, row, key=lambda r: (r["created_at"], r["author"]))
        retired = [r for r in (mine, row) if r["retired_at"] is not None]
        last = min(retired, key=lambda r: (r["retired_at"], r["retired_by"], r["retired_why"])) if retired else mine
        both = {**first, **{name: last[name] for name in ("retired_at", "retired_by", "retired_why")}}
        if both != mine:
            news[rule_id] = (both, False)
    return news


def _is_same_place(one: OpenBook, other: OpenBook) -> bool:
    if one.address.path is not None and other.address.path is not None:
        return one.address.path.samefile(other.address.path)
    return one.address.url is not None and one.address.url == other.address.url

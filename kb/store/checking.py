"""Whether a book is whole: file, keys, history, record against history, words, derived facts, attachments, codes.

Every check says what it looked at and what it found, in a sentence; none of them changes anything. A check that cannot
be carried out because the file is broken has failed. The order is from the file upwards, so the first failure is
usually the cause of the others.
"""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Iterator
from dataclasses import replace
from typing import Any
from uuid import UUID

import sqlalchemy as sa

from kb.errors import InvalidRecord, StoreError
from kb.progress import Progress, Silent
from kb.store import engine as engines
from kb.store import facts, history, lineage, runs, words
from kb.store.codes import marks_of, parse_code, write_code
from kb.store.dialect import Verdict
from kb.store.mapping import FACT_FIELDS, table
from kb.store.rows import AttachmentBlobRow, AttachmentRow, FactsRow, RecipeRow, RunRow, StructureRow
from kb.store.store import Store
from kb.store.values import Check, HistoryEntry

SAMPLE = 200
"""Runs and structures derived anew by default; all of them would take as long as the first import."""


def verify(store: Store, progress: Progress | None = None, sample: int | None = SAMPLE) -> tuple[Check, ...]:
    """Check a book; return one Check each.

    Args:
        store: open for reading or writing; derived facts are compared only if it has the callables.
        sample: how many runs and structures are derived anew, spread over the book; None = all.
    """
    progress = progress or Silent()
    checks: tuple[tuple[str, Callable[[sa.Connection], Verdict]], ...] = (
        ("file", lambda connection: engines.dialect_of(connection).check_files(connection)),
        ("foreign keys", lambda connection: engines.dialect_of(connection).check_keys(connection)),
        ("history", _history),
        ("record", _record),
        ("codes", _codes),
        ("words", lambda connection: _words(connection, store)),
        ("facts", lambda connection: _facts(connection, store, sample)),
        ("structures", lambda connection: _structures(connection, store, sample)),
        ("attachments", _attachments),
    )
    found = []
    for number, (name, check) in enumerate(checks):
        if progress.cancelled():
            break
        try:
            with store.book.reading() as connection:
                ok, detail = check(connection)
        except StoreError as error:
            ok, detail = False, error.message
        except (ValueError, TypeError, KeyError) as error:
            ok, detail = False, f"A value cannot be read ({type(error).__name__})."
        found.append(Check(name=name, ok=ok, detail=detail))
        progress.advance(number + 1, len(checks), name)
    return tuple(found)


def _history(connection: sa.Connection) -> Verdict:
    chain, last = "", 0
    known: set[str] = set()
    for entry, stored in history.iter_rows(connection):
        chain = lineage.next_chain(chain, entry.entry_id)
        where = f"Entry {entry.seq} of the history"
        if entry.seq != last + 1:
            return False, f"Entries {last + 1} to {entry.seq - 1} of the history are missing."
        if lineage.entry_id_of(entry) != entry.entry_id:
            return False, f"{where} was edited: it no longer says what was written."
        if stored != chain:
            return False, f"{where} does not follow on the one before it."
        if any(parent not in known for parent in entry.parents):
            return False, f"{where} follows on an entry that is not there."
        known.add(entry.entry_id)
        last = entry.seq
    if history.read_tip(connection) != (last, chain):
        return False, f"The history ends at entry {last}, but the book says {history.read_tip(connection)[0]}."
    return True, f"{last} entries, each as it was written."


def _record(connection: sa.Connection) -> Verdict:
    """Compare every run with what its history says it is."""
    keys = connection.execute(sa.select(RunRow.run_key).order_by(RunRow.run_key)).scalars().all()
    for start in range(0, len(keys), runs.BATCH):
        chunk = runs.load(connection, keys[start : start + runs.BATCH])
        entries = history.entries_of(connection, [run.run_id for run in chunk])
        for run in chunk:
            trouble = _trouble_of(run, entries.get(run.run_id, []))
            if trouble:
                return False, f"{run.code} {trouble}"
    wrong = _wrong_flags(connection)
    if wrong:
        return False, f"{wrong} is marked wrongly as disputed or undisputed."
    return True, f"{len(keys)} runs, each as its history says."


def _trouble_of(run: Any, entries: list[HistoryEntry]) -> str:
    if not entries:
        return "has no history."
    try:
        content, revision = lineage.replay(entries)
        said = lineage.run_of(content, run_id=run.run_id, revision=revision)
    except InvalidRecord as error:
        return f"has a history that cannot be read: {error.message}"
    if replace(said, code=run.code) != run:
        differing = [name for name in run.__dataclass_fields__ if getattr(run, name) != getattr(said, name)]
        return f"was changed outside the history ({', '.join(n for n in differing if n != 'code')})."
    return ""


def _wrong_flags(connection: sa.Connection) -> str:
    """Return the code of a run whose conflict flag is wrong; only runs with several entries can be."""
    flagged = connection.execute(sa.select(RunRow.run_id, RunRow.code).where(RunRow.has_conflict)).all()
    merged = connection.execute(
        sa.text("SELECT DISTINCT run_id FROM history WHERE received_at IS NOT NULL OR parents LIKE '%,%'")
    ).scalars()
    ids = {row.run_id for row in flagged} | {UUID(str(value)) for value in merged}
    codes = {row.run_id: row.code for row in connection.execute(sa.select(RunRow.run_id, RunRow.code))} if ids else {}
    disputed = {i for i, entries in history.entries_of(connection, ids).items() if lineage.disputes(entries)}
    wrong = disputed ^ {row.run_id for row in flagged}
    return codes[min(wrong)] if wrong else ""


def _codes(connection: sa.Connection) -> Verdict:
    rows = connection.execute(sa.select(RunRow.run_id, RunRow.code, RunRow.code_number)).all()
    by_number: dict[int, dict[UUID, str]] = {}
    for row in rows:
        parsed = parse_code(row.code)
        if parsed is None or parsed[0] != row.code_number:
            return False, f"{row.code} does not agree with its number {row.code_number}."
        by_number.setdefault(row.code_number, {})[row.run_id] = parsed[1]
    if len({row.code for row in rows}) != len(rows):
        return False, "Two runs have the same code."
    for number, claimed in by_number.items():
        if len(claimed) > 1 and len(set(marks_of(claimed).values())) != len(claimed):
            return False, f"{write_code(number)} cannot be told apart."
    return True, f"{len(rows)} codes, each once."


def _words(connection: sa.Connection, store: Store) -> Verdict:
    """Let the engine compare index and record; SQLite wants the write lock for that, though it writes nothing."""
    index = words.index_of(connection)
    if not index.checks_by_writing:
        same = index.is_consistent(connection)
    elif store.book.read_only:
        return True, "The word index is compared only in a book that is open for writing."
    else:
        with engines.writing(store.book.engine, store.book.address) as writing:
            same = index.is_consistent(writing)
    if same:
        return True, "The word index says what the record says."
    return False, "The word index does not say what the record says; `sidepath migrate` makes it anew."


def _facts(connection: sa.Connection, store: Store, sample: int | None) -> Verdict:
    deriving = store.book.deriving
    stored = connection.execute(sa.select(sa.func.count()).select_from(table(FactsRow))).scalar_one()
    if deriving.derive is None:
        return True, f"Runs with facts: {stored}; nothing was at hand to derive them anew."
    stale = len(facts.stale_keys(connection, deriving.recipe))
    if stale:
        return False, f"Runs read by another recipe: {stale}; `sidepath migrate` reads them again."
    keys = connection.execute(sa.select(FactsRow.run_key).order_by(FactsRow.run_key)).scalars().all()
    looked_at = _spread(keys, sample)
    for start in range(0, len(looked_at), runs.BATCH):
        chunk = looked_at[start : start + runs.BATCH]
        rows = {
            row["run_key"]: row
            for row in connection.execute(
                sa.select(table(FactsRow), RecipeRow.name.label("recipe"))
                .join(RecipeRow, RecipeRow.recipe_id == FactsRow.recipe_id)
                .where(FactsRow.run_key.in_(chunk))
            ).mappings()
        }
        for key, run in zip(chunk, runs.load(connection, chunk), strict=True):
            derived = deriving.prepare(run).facts
            if derived is None or any(rows[key][f] != getattr(derived, f) for f in FACT_FIELDS):
                return False, f"{run.code} gives other facts when it is read again."
    return True, f"{len(looked_at)} of {len(keys)} runs read again, with the same facts."


def _structures(connection: sa.Connection, store: Store, sample: int | None) -> Verdict:
    deriving = store.book.deriving
    ids = connection.execute(sa.select(StructureRow.structure_id).order_by(StructureRow.structure_id)).scalars().all()
    if deriving.encode is None:
        return True, f"{len(ids)} structures; nothing was at hand to encode them anew."
    stale = len(facts.stale_structures(connection, deriving.recipe))
    if stale:
        return False, f"{stale} structures were encoded by another recipe; `sidepath migrate` encodes them again."
    looked_at = _spread(ids, sample)
    for row in _structure_rows(connection, looked_at):
        encoded = deriving.encoded(row.smiles)
        for name in ("mol_binary", "augmented", "pattern", "morgan"):
            if getattr(row, name) != getattr(encoded, name, None):
                return False, f"Structure {row.structure_id} gives another {name} when it is encoded again."
    return True, f"{len(looked_at)} of {len(ids)} structures encoded again, with the same screens."


def _structure_rows(connection: sa.Connection, ids: list[int]) -> Iterator[Any]:
    for start in range(0, len(ids), 1000):
        yield from connection.execute(
            sa.select(table(StructureRow)).where(StructureRow.structure_id.in_(ids[start : start + 1000]))
        )


def _attachments(connection: sa.Connection) -> Verdict:
    blobs = table(AttachmentBlobRow)
    kept = connection.execute(sa.select(blobs.c.sha256)).scalars().all()
    for sha256 in kept:
        content = connection.execute(sa.select(blobs.c.content).where(blobs.c.sha256 == sha256)).scalar_one()
        if hashlib.sha256(content).hexdigest() != sha256:
            return False, f"The attached file {sha256[:12]} was changed."
    named = set(connection.execute(sa.select(AttachmentRow.sha256).distinct()).scalars())
    missing = len(named - set(kept))
    note = f"; {missing} more are named by runs that came without their files" if missing else ""
    return True, f"{len(kept)} attached files, each as it was kept{note}."


def _spread(items: Any, sample: int | None) -> list[int]:
    """Return at most `sample` of the items, evenly spread, first and last included."""
    if sample is None or len(items) <= sample:
        return list(items)
    return [items[round(n * (len(items) - 1) / (sample - 1))] for n in range(sample)]

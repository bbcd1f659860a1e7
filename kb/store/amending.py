"""Changes to a run that is there: amended, withdrawn, reinstated or settled, with the entry that says so.

A change is worked out on the run as it stands, facts included, before the write lock is taken; if somebody
was quicker it is worked out again. Only a person who named the revision that they saw is refused
(RecordConflict), since they decided on something that is no longer there.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import replace
from typing import Any
from uuid import UUID

import sqlalchemy as sa

from kb.errors import InvalidRecord, RecordConflict
from kb.record.run import Run
from kb.store import history, lineage, recording, runs
from kb.store.codes import parse_code
from kb.store.deriving import Encodings, Prepared
from kb.store.session import OpenBook, book_id_of, need
from kb.store.values import Change, HistoryEntry

TRIES = 20
GIVEN_BY_STORE = ("run_id", "code", "recorded_at", "revision", "withdrawn_why")
"""Fields that no amendment may name."""


def change(
    book: OpenBook,
    name: str | UUID,
    action: str,
    changed: Callable[[Run], Run],
    *,
    who: str,
    why: str,
    expected_revision: int | None,
) -> Run:
    """Change a run and keep the entry; return it as it stands then.

    Args:
        name: code or UUID.
        action: word of the history.
        changed: what the run shall say, from what it says now; may be called again.
        expected_revision: the revision that the person saw; None = whatever stands.

    Raises:
        RecordConflict: somebody changed the run since that revision.
        InvalidRecord: nothing would change, or who or why is missing.
    """
    need(who, "Say who changes the run", "initials (--as)")
    need(why, "Say why the run is changed", "a reason (--why)")
    for _ in range(TRIES):
        with book.reading() as connection:
            before = runs.load(connection, [runs.get_key(connection, name)])[0]
        if expected_revision is not None and before.revision != expected_revision:
            raise RecordConflict(
                f"{before.code} was changed since revision {expected_revision}; now it is {before.revision}.",
                "Look at its history and amend it again.",
                before.code,
            )
        after = changed(before)
        lineage.content_of(after)
        prepared = book.deriving.prepare(after)
        encodings = book.foreseen(smiles for _, _, smiles in prepared.places)
        with book.writing() as connection:
            run_key = runs.get_key(connection, before.run_id)
            if runs.load(connection, [run_key])[0] == before:
                entry, entries = _entry(connection, before, after, action, who, why, book)
                stored = replace(
                    after,
                    run_id=before.run_id,
                    revision=entry.revision,
                    code=before.code,
                    recorded_at=before.recorded_at,
                )
                _write(
                    connection,
                    run_key,
                    stored,
                    prepared,
                    bool(lineage.disputes([*entries, entry])),
                    encodings,
                )
                return stored
    raise RecordConflict(f"{name} is being changed by others all the time.", "Try again.", str(name))


def with_changes(run: Run, changes: Mapping[str, Any]) -> Run:
    """Return the run with fields replaced, "outcome.dr" reaching one level down.

    Raises:
        InvalidRecord: no such field, or one that the store gives.
    """
    for name, value in changes.items():
        outer, _, inner = name.partition(".")
        holder = getattr(run, outer, None) if inner else run
        if (inner or outer) not in getattr(holder, "__dataclass_fields__", ()) or outer in GIVEN_BY_STORE:
            raise InvalidRecord(
                f"{name[:60]!r} is no field of a run that can be amended.", "See `sidepath show`.", name
            )
        run = replace(run, **{outer: replace(getattr(run, outer), **{inner: value}) if inner else value})
    return run


def with_choices(run: Run, choices: Mapping[str, Any]) -> Run:
    """Return the run with fields set to portable JSON values; None = not recorded."""
    content = {**lineage.content_of(run), **choices}
    standing = {k: v for k, v in content.items() if v is not None}
    return lineage.run_of(standing, run_id=run.run_id, revision=run.revision)


def _entry(
    connection: sa.Connection, before: Run, after: Run, action: str, who: str, why: str, book: OpenBook
) -> tuple[HistoryEntry, Sequence[HistoryEntry]]:
    """Write the entry of a change; return it and those before it."""
    entries = history.entries_of(connection, [before.run_id])[before.run_id]
    content, revision = lineage.replay(entries)
    new_content = {**lineage.content_of(after), **{name: content[name] for name in lineage.NEVER_DISPUTED}}
    changes = lineage.changes_between(content, new_content)
    if action == lineage.SETTLE:
        changes = _with_disputed(changes, new_content, entries)
    if not changes:
        raise InvalidRecord(f"Nothing about {before.code} would change.", "Give a new value.", before.code)
    entry = history.make_entry(
        run_id=before.run_id,
        revision=revision + 1,
        action=action,
        who=who,
        at=book.clock(),
        why=why,
        changed=changes,
        after=new_content,
        parents=lineage.heads_of(entries),
        book_id=book_id_of(connection),
    )
    history.append(connection, [entry])
    return entry, entries


def _with_disputed(
    changes: tuple[Change, ...], content: Mapping[str, Any], entries: Sequence[HistoryEntry]
) -> tuple[Change, ...]:
    """Return the changes with every disputed field set anew, so that the dispute ends in any case."""
    named = {c.field: c for c in changes}
    for field in lineage.disputes(entries):
        named.setdefault(field, Change(field=field, old=content.get(field), new=content.get(field)))
    return tuple(named[field] for field in sorted(named))


def _write(
    connection: sa.Connection,
    run_key: int,
    run: Run,
    prepared: Prepared,
    has_conflict: bool,
    encodings: Encodings,
) -> None:
    number = parse_code(run.code or "")
    placed = recording.Placed(
        run=run, code_number=number[0] if number else 0, prepared=prepared, has_conflict=has_conflict
    )
    recording.update_run(connection, run_key, placed, encodings)

"""What a set of history entries says a run is: pure functions, no database.

The history of a run is a set of entries, each naming the entries it followed on. Two books may both add to
it; merging is the union of the sets. Everything here is a function of the set, so a merge gives the same
content whichever way round, however often and in whatever steps it is done.

Rules
    entry_id    SHA-256 over the canonical JSON of the entry, parents included.
    order       every entry after its parents; entries that know nothing of each other by moment, then by
                entry_id.
    content     the first addition, then each change in that order, field by field: two people who changed
                different fields both have their way; of one field changed twice unknowingly the later change
                stands. An addition says nothing of a field that it leaves out.
    conflict    such a field, while its values differ and no later entry that knew of both has set it again.
    revision    the highest revision of an addition (1 unless it was imported with more), plus one per further
                entry.
Fields are those of the portable form, one level deep ("conditions.components", "outcome.isolated_yield_pct").
"""

from __future__ import annotations

import hashlib
import heapq
import json
from collections.abc import Iterable, Mapping, Sequence
from typing import Any
from uuid import UUID

from kb.errors import InvalidRecord
from kb.record.portable import run_from_dict, run_to_dict
from kb.record.run import Run
from kb.store.values import Change, Claim, HistoryEntry

ADD, AMEND, WITHDRAW, REINSTATE, SETTLE = "add", "amend", "withdraw", "reinstate", "settle"

NOT_CONTENT = ("sidepath_run", "run_id", "revision")
"""Keys of the portable form that are not what the chemist recorded."""

EMPTY = {"note": ""}
"""What a field says that was left empty, where that is neither None nor a list; elsewhere an empty text was given."""

NEVER_DISPUTED = ("code", "recorded_at")
"""Fields that the store gave: the least value stands, nobody is asked."""

Content = dict[str, Any]


def canonical(value: Any) -> str:
    """Return the one JSON text of a value: sorted keys, no spaces, UTF-8 as it is."""
    return json.dumps(value, sort_keys=True, ensure_ascii=False, separators=(",", ":"), allow_nan=False)


def content_of(run: Run) -> Content:
    """Return what the chemist recorded, field by field; what is not recorded is left out.

    Raises:
        InvalidRecord: a value that no book can keep (see `kb.record.portable`).
    """
    flat: Content = {}
    for key, value in run_to_dict(run).items():
        inner = {f"{key}.{k}": v for k, v in value.items()} if isinstance(value, dict) else {key: value}
        flat.update((k, v) for k, v in inner.items() if v not in (None, [], EMPTY.get(k)) and k not in NOT_CONTENT)
    run_of(flat, run_id=run.run_id, revision=run.revision)
    return json.loads(canonical(flat))


def run_of(content: Mapping[str, Any], *, run_id: UUID, revision: int) -> Run:
    """Return the run of a content."""
    nested: dict[str, Any] = {"run_id": str(run_id), "revision": revision}
    for key, value in content.items():
        outer, _, inner = key.partition(".")
        if inner:
            nested.setdefault(outer, {})[inner] = value
        else:
            nested[outer] = value
    return run_from_dict(nested)


def changes_between(before: Mapping[str, Any], after: Mapping[str, Any]) -> tuple[Change, ...]:
    """Return the fields that differ, in alphabetical order."""
    return tuple(
        Change(field=name, old=before.get(name), new=after.get(name))
        for name in sorted({*before, *after})
        if before.get(name) != after.get(name)
    )


def entry_id_of(entry: HistoryEntry) -> str:
    """Return the SHA-256 (hex) that names an entry by what it says."""
    said = {
        "run": entry.run_id.hex,
        "revision": entry.revision,
        "action": entry.action,
        "who": entry.who,
        "at": entry.at.isoformat(),
        "why": entry.why,
        "changed": [[c.field, c.old, c.new] for c in entry.changed],
        "after": dict(entry.after),
        "parents": sorted(entry.parents),
        "book": entry.book_id.hex,
    }
    return hashlib.sha256(canonical(said).encode()).hexdigest()


def next_chain(previous: str, entry_id: str) -> str:
    """Return the SHA-256 (hex) that ties an entry to all that the book's history held before it."""
    return hashlib.sha256(f"{previous}{entry_id}".encode()).hexdigest()


def in_order(entries: Iterable[HistoryEntry]) -> list[HistoryEntry]:
    """Return the entries of one run, each after its parents, otherwise by moment and entry_id."""
    known = {e.entry_id: e for e in entries}
    waiting_for = {i: {p for p in e.parents if p in known} for i, e in known.items()}
    children: dict[str, list[str]] = {}
    for child, parents in waiting_for.items():
        for parent in parents:
            children.setdefault(parent, []).append(child)
    ready = [(known[i].at, i) for i, parents in waiting_for.items() if not parents]
    heapq.heapify(ready)
    ordered = []
    while ready:
        _, entry_id = heapq.heappop(ready)
        ordered.append(known[entry_id])
        for child in children.get(entry_id, ()):
            waiting_for[child].discard(entry_id)
            if not waiting_for[child]:
                heapq.heappush(ready, (known[child].at, child))
    return ordered


def heads_of(entries: Iterable[HistoryEntry]) -> tuple[str, ...]:
    """Return the entries that no other followed on, sorted; a new entry names them all as its parents."""
    entries = list(entries)
    followed = {parent for e in entries for parent in e.parents}
    return tuple(sorted(e.entry_id for e in entries if e.entry_id not in followed))


def written_by(entry: HistoryEntry) -> Content:
    """Return the fields that an entry set (None = emptied)."""
    return dict(entry.after) if entry.action == ADD else {c.field: c.new for c in entry.changed}


def replay(entries: Sequence[HistoryEntry]) -> tuple[Content, int]:
    """Return the standing content and the revision of one run.

    Raises:
        InvalidRecord: no addition among the entries.
    """
    ordered = in_order(entries)
    roots = [e for e in ordered if e.action == ADD]
    if not roots:
        raise InvalidRecord("A run's history has no beginning.", "Run `sidepath verify`.")
    content: Content = {}
    for entry in ordered:
        content.update(written_by(entry))
    for name in NEVER_DISPUTED:
        content[name] = min(r.after[name] for r in roots)
    standing = {k: v for k, v in content.items() if v is not None}
    return standing, max(r.revision for r in roots) + len(ordered) - 1


def disputes(entries: Sequence[HistoryEntry]) -> dict[str, tuple[Claim, ...]]:
    """Return the disputed fields with the values claimed, the standing one first; usually empty."""
    if len(entries) < 2 or (sum(not e.parents for e in entries) == 1 and _is_one_line(entries)):
        return {}
    ordered = in_order(entries)
    ancestors: dict[str, set[str]] = {}
    for entry in ordered:
        known = [p for p in entry.parents if p in ancestors]
        ancestors[entry.entry_id] = set(known).union(*(ancestors[p] for p in known))
    writers: dict[str, list[HistoryEntry]] = {}
    for entry in ordered:
        for name in written_by(entry):
            writers.setdefault(name, []).append(entry)
    found: dict[str, tuple[Claim, ...]] = {}
    for name, wrote in sorted(writers.items()):
        if name in NEVER_DISPUTED:
            continue
        last = [w for w in wrote if not any(w.entry_id in ancestors[o.entry_id] for o in wrote)]
        claims: dict[str, Claim] = {}
        for entry in sorted(last, key=ordered.index, reverse=True):
            value = written_by(entry).get(name)
            claims.setdefault(
                canonical(value), Claim(value=value, who=entry.who, at=entry.at, entry_id=entry.entry_id)
            )
        if len(claims) > 1:
            found[name] = tuple(claims.values())
    return found


def _is_one_line(entries: Sequence[HistoryEntry]) -> bool:
    """Return True when no two entries followed on the same one, so that nobody worked unknowingly."""
    parents = [p for e in entries for p in e.parents]
    return len(parents) == len(set(parents)) and all(len(e.parents) <= 1 for e in entries)

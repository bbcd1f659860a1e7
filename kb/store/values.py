"""What the store hands out besides runs: history, conflicts, pages, reports, house rules, drafts, checks.

Frozen values only, no SQL; so that rows and sessions never leave this floor. Moments are aware and in UTC.
"""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping
from dataclasses import asdict, dataclass, field
from typing import Any, Protocol
from uuid import UUID

from kb.record.run import Run
from kb.vocabulary import Severity


@dataclass(frozen=True, slots=True, kw_only=True)
class Change:
    """One field of a run, before and after, as portable JSON values (None = not recorded)."""

    field: str
    old: Any
    new: Any


@dataclass(frozen=True, slots=True, kw_only=True)
class HistoryEntry:
    """What was done to a run once.

    Attributes:
        seq: place in this book's history.
        entry_id: SHA-256 of the entry and its parents; the same in every book.
        run_id: of which run.
        revision: the run's revision after it, where it was made.
        action: add, amend, withdraw, reinstate or settle.
        who, at, why: initials, UTC moment, reason ("" for an addition).
        changed: fields with old and new value; empty for an addition.
        after: the whole content after it, field by field.
        parents: entries that it followed on; more than one after a merge.
        book_id: the book in which it was made.
        received_at: when a merge brought it here; None = made here.
    """

    seq: int
    entry_id: str
    run_id: UUID
    revision: int
    action: str
    who: str
    at: dt.datetime
    why: str
    changed: tuple[Change, ...]
    after: Mapping[str, Any]
    parents: tuple[str, ...]
    book_id: UUID
    received_at: dt.datetime | None = None

    def as_dict(self) -> dict[str, Any]:
        """Return the entry as JSON values."""
        return {
            "seq": self.seq,
            "revision": self.revision,
            "action": self.action,
            "who": self.who,
            "at": self.at.isoformat(),
            "why": self.why,
            "changed": [{"field": c.field, "from": c.old, "to": c.new} for c in self.changed],
            "entry_id": self.entry_id,
            "parents": list(self.parents),
            "received_at": self.received_at.isoformat() if self.received_at else None,
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class Claim:
    """One of the values that a disputed field was given."""

    value: Any
    who: str
    at: dt.datetime
    entry_id: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Conflict:
    """A field that two people changed without knowing of each other.

    Attributes:
        code, run_id: which run.
        field: dotted name ("outcome.isolated_yield_pct").
        claims: the values given; the first one stands until somebody settles it.
    """

    code: str
    run_id: UUID
    field: str
    claims: tuple[Claim, ...]

    def as_dict(self) -> dict[str, Any]:
        """Return the contract's JSON object."""
        return {
            "run": self.code,
            "run_id": str(self.run_id),
            "field": self.field,
            "stands": self.claims[0].value,
            "claims": [{"value": c.value, "who": c.who, "at": c.at.isoformat()} for c in self.claims],
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class Page:
    """One page of runs, and how many there are in all."""

    total: int
    page: int
    size: int
    items: tuple[Run, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class AddReport:
    """What became of many runs.

    Attributes:
        stored: new runs, each with a code now.
        duplicate: runs that were there already, by UUID; left as they were.
        stopped: the user stopped it; what was stored stays.
    """

    stored: int
    duplicate: int
    stopped: bool


class Encoded(Protocol):
    """What the search index keeps of a structure; made by the encoder that a store is opened with."""

    @property
    def mol_binary(self) -> bytes | None:
        """Return the molecule in the toolkit's binary form."""

    @property
    def augmented(self) -> bytes | None:
        """Return the packed augmented-atom screen."""

    @property
    def pattern(self) -> bytes | None:
        """Return the packed pattern screen."""

    @property
    def morgan(self) -> bytes | None:
        """Return the packed Morgan fingerprint."""


@dataclass(frozen=True, slots=True, kw_only=True)
class StoredStructure:
    """One structure as the index reads it; blobs are None where no encoder was at hand."""

    structure_id: int
    smiles: str
    mol_binary: bytes | None = None
    augmented: bytes | None = None
    pattern: bytes | None = None
    morgan: bytes | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class WordHit:
    """A run whose words match; `score` is higher for a better match (BM25)."""

    run_id: UUID
    code: str
    score: float


@dataclass(frozen=True, slots=True, kw_only=True)
class HouseRule:
    """A liability that this group wrote down.

    Attributes:
        title, why: one line; plain words.
        motif: SMARTS of what is in danger; "" = any substrate.
        when: condition predicate, in the words of the liability catalogue.
        severity: controlled word.
        author: initials.
        source: runs or reference behind it.
        rule_id, created_at: given by the store.
        retired_at, retired_by, retired_why: None = in force.
    """

    title: str
    motif: str
    when: str
    severity: Severity
    why: str
    author: str
    source: str = ""
    rule_id: str = ""
    created_at: dt.datetime | None = None
    retired_at: dt.datetime | None = None
    retired_by: str | None = None
    retired_why: str | None = None

    @property
    def is_retired(self) -> bool:
        """Return True when the rule is no longer in force."""
        return self.retired_at is not None


@dataclass(frozen=True, slots=True, kw_only=True)
class Acknowledgement:
    """Somebody saw a finding and went on.

    Attributes:
        finding_id: the finding's rule id.
        about: run UUID, or the text of a plan.
        who, why, at: initials, reason, UTC moment.
    """

    finding_id: str
    about: str
    who: str
    why: str
    at: dt.datetime
    acknowledgement_id: UUID


@dataclass(frozen=True, slots=True, kw_only=True)
class Draft:
    """An entry form as it was last left; `content` is whatever JSON values the form keeps."""

    draft_id: str
    updated_at: dt.datetime
    content: Mapping[str, Any] = field(default_factory=dict)


@dataclass(frozen=True, slots=True, kw_only=True)
class Event:
    """Something that was done to the book as a whole.

    Attributes:
        at: UTC moment.
        who: initials; "" where nobody was named (making, migrating).
        action: made, migrated or merged.
        detail: a plain sentence.
    """

    at: dt.datetime
    who: str
    action: str
    detail: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Check:
    """One check of `verify`: its name, whether it held, and a plain sentence."""

    name: str
    ok: bool
    detail: str

    def as_dict(self) -> dict[str, Any]:
        """Return the contract's JSON object."""
        return asdict(self)


@dataclass(frozen=True, slots=True, kw_only=True)
class MergeReport:
    """What a merge did.

    Attributes:
        added: runs that were not here before.
        same: runs that had nothing new.
        updated: runs that were here and got new history.
        conflicts: fields for a person to settle, of all runs that both books hold now.
        renamed: (old code, new code) of runs whose code was in use on both sides.
        house_rules, acknowledgements, attachments: how many of each came along.
        stopped: the user stopped it; run it again to go on.
    """

    added: int
    same: int
    updated: int
    conflicts: tuple[Conflict, ...] = ()
    renamed: tuple[tuple[str, str], ...] = ()
    house_rules: int = 0
    acknowledgements: int = 0
    attachments: int = 0
    stopped: bool = False

    def as_dict(self) -> dict[str, Any]:
        """Return the contract's JSON object."""
        return {
            **asdict(self),
            "conflicts": [c.as_dict() for c in self.conflicts],
            "renamed": [*self.renamed],
        }

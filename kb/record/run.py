"""A run: one experiment as carried out, with who and when.

Nothing here is ever deleted: a run is amended or withdrawn, and its history is kept by the store.
"""

from __future__ import annotations

import datetime as dt
from dataclasses import dataclass, field
from uuid import UUID, uuid4

from kb.errors import InvalidRecord
from kb.record.conditions import Conditions
from kb.record.outcome import Outcome
from kb.record.plan import Plan
from kb.showing import ShowsItself
from kb.vocabulary import Verdict


@dataclass(frozen=True, slots=True, kw_only=True)
class Attachment:
    """A file kept by its SHA-256 (hex), with the name it came under."""

    name: str
    sha256: str
    size_bytes: int


@dataclass(frozen=True, slots=True, kw_only=True)
class Run(ShowsItself):
    """One experiment.

    Attributes:
        scheme: reaction SMILES as entered.
        conditions, outcome: see their classes.
        verdict: the chemist's word; None = not given.
        note: free text, kept to the letter, never interpreted.
        by: initials of who ran it.
        date: day it was run; None = not recorded.
        reference: notebook reference.
        project, series: words that gather runs.
        run_id: UUID, the identity when books are merged.
        code: short code that people say aloud; given by the store, None before.
        recorded_at: UTC moment of entry; given by the store, None before.
        revision: 1 at first, one more for each amendment.
        withdrawn_why: reason; None = stands.
        attachments: files kept with it.
    """

    scheme: str
    conditions: Conditions = field(default_factory=Conditions)
    outcome: Outcome = field(default_factory=Outcome)
    verdict: Verdict | None = None
    note: str = ""
    by: str | None = None
    date: dt.date | None = None
    reference: str | None = None
    project: str | None = None
    series: str | None = None
    run_id: UUID = field(default_factory=uuid4)
    code: str | None = None
    recorded_at: dt.datetime | None = None
    revision: int = 1
    withdrawn_why: str | None = None
    attachments: tuple[Attachment, ...] = ()

    def __post_init__(self) -> None:
        if not self.scheme.strip():
            raise InvalidRecord("The run has no scheme.", "Give a reaction SMILES or a substrate.")

    @property
    def is_withdrawn(self) -> bool:
        """Return True when the run was withdrawn."""
        return self.withdrawn_why is not None

    @property
    def plan(self) -> Plan:
        """Return what was planned, the outcome left out."""
        return Plan(scheme=self.scheme, conditions=self.conditions, project=self.project)

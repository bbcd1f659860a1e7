"""What the terminal interface needs of a record book: one protocol, and values that only screens ask for.

Screens and widgets know this file, never `kb.book` itself; `desk.py` is the only place that meets the real
book, and the tests put a small book of their own behind the same protocol. All calls may be slow and are
made from worker threads only. Every method raises `SidepathError` with a sentence and a hint when it cannot
answer. Shares are 0..1, yields percent, temperatures degC.
"""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any, Protocol

from kb.chem.facts import Reading
from kb.progress import Progress
from kb.record.assessment import Assessment, Estimate
from kb.record.component import Component, SolventPart
from kb.record.plan import Plan
from kb.record.run import Run
from kb.vocabulary import Role

if TYPE_CHECKING:
    from kb.audit.calibration import Calibration
    from kb.audit.coverage import Coverage
    from kb.audit.recurrence_values import Proposal, Recurrence
    from kb.audit.replay_report import ReplayReport
    from kb.audit.tally import Tally
    from kb.errors import SidepathError
    from kb.route.entries import Ledger
    from kb.route.sequence import Route


@dataclass(frozen=True, slots=True, kw_only=True)
class Offer:
    """One catalogue name that fits what was typed; `note` says why ("also called ...")."""

    name: str
    note: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class RunQuery:
    """Which page of the runs to show.

    Attributes:
        words: text that the run must hold; "" = all.
        verdict, failed: controlled words; "" = any.
        sort: "date", "code" or "yield"; newest or largest first unless `is_ascending`.
        with_withdrawn: also the withdrawn ones.
        offset, limit: page [runs].
    """

    words: str = ""
    verdict: str = ""
    failed: str = ""
    sort: str = "date"
    is_ascending: bool = False
    with_withdrawn: bool = False
    offset: int = 0
    limit: int = 100


@dataclass(frozen=True, slots=True, kw_only=True)
class RunPage:
    """A page of runs; `total` counts all pages."""

    total: int
    runs: tuple[Run, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class FindQuery:
    """What is looked for, as typed; "" = not asked.

    Attributes:
        substructure: SMARTS or SMILES. similar: SMILES. transformation: reaction SMILES or SMARTS.
        at_least: lowest similarity 0..1 for `similar`.
        role: substrate, product, reagent or any.
        page, limit: 1-based page and its size [runs].
    """

    substructure: str = ""
    similar: str = ""
    at_least: str = ""
    transformation: str = ""
    role: str = "any"
    words: str = ""
    solvent: str = ""
    base: str = ""
    temp_from: str = ""
    temp_to: str = ""
    failed: str = ""
    verdict: str = ""
    carbon_class: str = ""
    leaving_group: str = ""
    since: str = ""
    page: int = 1
    limit: int = 24


@dataclass(frozen=True, slots=True, kw_only=True)
class FindHit:
    """One run that matched.

    Attributes:
        smiles: the component that matched; "" when no structure was asked.
        atoms: matched atoms, counted in `smiles`.
    """

    run: Run
    score: float | None = None
    smiles: str = ""
    atoms: tuple[int, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class FindPage:
    """A page of hits; `elapsed_ms` is the book's own time, `notes` are sentences to show with it."""

    total: int
    hits: tuple[FindHit, ...] = ()
    elapsed_ms: float | None = None
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class HistoryLine:
    """One change of a run, oldest first; `what` is plain words with old and new values."""

    when: dt.datetime | None
    who: str
    what: str
    why: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class DraftLine:
    """One saved draft: key, first words, when it was last saved (UTC)."""

    key: str
    title: str
    saved_at: dt.datetime | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Imagined:
    """A route reckoned with what was typed over it; `errors` are of edits that could not be applied, by their names."""

    ledger: Ledger
    errors: Mapping[str, SidepathError] = field(default_factory=dict)


class BookPort(Protocol):
    """One open record book."""

    @property
    def place(self) -> str:
        """Return where the book is, for showing."""
        ...

    @property
    def is_read_only(self) -> bool:
        """Return True when nothing can be written."""
        ...

    def count(self) -> int:
        """Return how many runs stand in the book."""
        ...

    def read_scheme(self, text: str) -> Reading:
        """Read a scheme, a substrate or a name; a bad one comes back with `ok` False and the reason."""
        ...

    def scheme_text(self, text: str) -> str:
        """Return the reaction SMILES that a scheme or a catalogue name stands for."""
        ...

    def resolve_component(self, text: str, role: Role) -> Component:
        """Return a component from "NAME" or "NAME=EQUIV"."""
        ...

    def resolve_solvent(self, text: str) -> SolventPart:
        """Return a solvent from "NAME" or "NAME:PARTS"."""
        ...

    def lookup(self, text: str, kind: str) -> Sequence[Offer]:
        """Return catalogue names that complete the text ("solvent" or "reagent"), best first."""
        ...

    def check(self, plan: Plan, *, top: int = 8) -> Assessment:
        """Return everything known about a plan."""
        ...

    def what_if(self, plan: Plan, temperatures_c: Sequence[float]) -> Sequence[tuple[float, Estimate]]:
        """Return the estimate at other temperatures [degC]."""
        ...

    def page(self, query: RunQuery) -> RunPage:
        """Return a page of runs."""
        ...

    def find(self, query: FindQuery) -> FindPage:
        """Return a page of what matches."""
        ...

    def get(self, code: str) -> Run:
        """Return one run."""
        ...

    def history(self, code: str) -> Sequence[HistoryLine]:
        """Return who changed a run, when and why."""
        ...

    def add(self, run: Run, who: str) -> Run:
        """Store a run; return it with its code."""
        ...

    def remarks(self, run: Run) -> Sequence[str]:
        """Return what does not add up in a run, a sentence each."""
        ...

    def amend(self, code: str, changes: Mapping[str, Any], who: str, why: str, revision: int) -> Run:
        """Change fields of a run, old values kept; refused when it is no longer at `revision`."""
        ...

    def withdraw(self, code: str, why: str, who: str) -> Run:
        """Withdraw a run; it stays in the history."""
        ...

    def failure_modes(self) -> Sequence[tuple[str, str]]:
        """Return the controlled words for failures with their meanings."""
        ...

    def save_draft(self, key: str, data: Mapping[str, Any]) -> None:
        """Keep a half-filled form."""
        ...

    def load_draft(self, key: str) -> dict[str, Any] | None:
        """Return a kept form, None when there is none."""
        ...

    def list_drafts(self) -> Sequence[DraftLine]:
        """Return the kept forms, newest first."""
        ...

    def delete_draft(self, key: str) -> None:
        """Forget a kept form; one that is not there is no error."""
        ...

    def recurring(self, progress: Progress) -> Recurrence:
        """Return what keeps going wrong; `Cancelled` when progress asked to stop."""
        ...

    def tally(self, progress: Progress) -> Tally:
        """Return the failures counted by quarter, mode and class; `Cancelled` when progress asked to stop."""
        ...

    def replay(self, progress: Progress) -> ReplayReport:
        """Return each run checked against the record of its morning; a part of them when progress asked to stop."""
        ...

    def coverage(self, progress: Progress) -> Coverage:
        """Return what the record covers; `Cancelled` when progress asked to stop."""
        ...

    def calibration(self, progress: Progress) -> Calibration:
        """Return how well estimates hold; of what was done when progress asked to stop."""
        ...

    def adopt(self, proposal: Proposal, title: str, why: str, who: str) -> str:
        """Adopt a proposed house rule under a title and a reason; return its id."""
        ...

    def markdown(self, audit: object) -> str:
        """Return an audit as Markdown to hand round."""
        ...

    def open_route(self, path: str) -> Route:
        """Return the route of a file with its yields looked up; `Cancelled` when the job's progress asked to stop."""
        ...

    def imagine_route(self, route: Route, edits: Mapping[str, str]) -> Imagined:
        """Return a route reckoned with what was typed over it; names of edits are those of `tui.route_state`."""
        ...

    def route_example(self) -> str:
        """Return the file of the shipped route, which only the demo book can answer."""
        ...

    def recent_routes(self) -> Sequence[str]:
        """Return the route files that were opened lately, newest first."""
        ...

    def remember_route(self, path: str) -> None:
        """Put a route file at the head of that list."""
        ...

    def save_page(self, thing: object, path: str) -> str:
        """Write a page, HTML or Markdown by its ending, to a new file; return where it is."""
        ...

    def close(self) -> None:
        """Let go of the book."""
        ...


class Opener(Protocol):
    """How books are opened; the real one is `tui.opening.DeskOpener`."""

    def open(self, place: str | None) -> BookPort:
        """Open the book at a place (None = the default one)."""
        ...

    def create(self, place: str | None) -> BookPort:
        """Make a new book and open it."""
        ...

    def demo(self, progress: Progress) -> BookPort:
        """Build the demo book where it is not there yet, and open it."""
        ...

    def default_place(self) -> str:
        """Return where the default book is or would be."""
        ...

"""The desk: the real record book behind `tui.ports`, which alone, with `opening`, meets `kb.book`.

One Book serves one thread at a time, so the desk keeps one per lane (checking, finding, looking, writing) with a
lock each: a draft is saved while a search runs, and a check never waits for a page of runs. All of
`kb.book` is imported on first use, from a worker thread, so that the first paint waits for nothing. Long work
reports to the job that it is done for (`tui.jobs.current_progress`).
"""

from __future__ import annotations

import threading
from collections.abc import Callable, Iterator, Mapping, Sequence
from contextlib import AbstractContextManager, contextmanager
from dataclasses import replace
from typing import TYPE_CHECKING, Any

from kb.chem.facts import Reading
from kb.errors import RecordNotFound
from kb.plain import plain
from kb.record.assessment import Assessment, Estimate
from kb.record.component import Component, SolventPart
from kb.record.failure_modes import failure_modes
from kb.record.plan import Plan
from kb.record.run import Run
from kb.vocabulary import Role
from tui.desk_route import RouteRecord
from tui.desk_whole import WholeRecord
from tui.jobs import current_progress
from tui.ports import (
    DraftLine,
    FindHit,
    FindPage,
    FindQuery,
    HistoryLine,
    Offer,
    RunPage,
    RunQuery,
)

if TYPE_CHECKING:
    from kb.assess.record_view import RecordView
    from kb.book import Book

ROLE_KEYS = {Role.REAGENT: "reagents", Role.BASE: "bases", Role.ACID: "acids", Role.ADDITIVE: "additives"}


class Lane:
    """One Book for one kind of work, opened when first needed."""

    def __init__(self, opening: Callable[[], Book]) -> None:
        self._opening = opening
        self._lock = threading.Lock()
        self._book: Book | None = None

    @contextmanager
    def book(self) -> Iterator[Book]:
        """Lend the book to the calling thread."""
        with self._lock:
            if self._book is None:
                self._book = self._opening()
            yield self._book

    def close(self) -> None:
        """Let go of the book."""
        with self._lock:
            if self._book is not None:
                self._book.close()
                self._book = None


class Desk(WholeRecord, RouteRecord):
    """A record book as the screens see it; keeps to `BookPort`."""

    def __init__(self, place: str | None, read_only: bool = False) -> None:
        def opening() -> Book:
            from kb.book import open_book

            return open_book(place, read_only=read_only)

        self._checking, self._finding = Lane(opening), Lane(opening)
        self._looking, self._writing = Lane(opening), Lane(opening)
        with self._looking.book() as book:
            self._place = book.path
            self._read_only = book.is_read_only
        super().__init__(self._place, self._looking.book, self._writing.book)

    @property
    def place(self) -> str:
        """Return where the book is, for showing."""
        return self._place

    @property
    def is_read_only(self) -> bool:
        """Return True when nothing can be written."""
        return self._read_only

    def _lend_for_routes(self) -> AbstractContextManager[Book]:
        return self._checking.book()

    def _look(self) -> AbstractContextManager[Book]:
        return self._looking.book()

    def count(self) -> int:
        """Return how many runs stand in the book."""
        with self._look() as book:
            return book.count()

    # what needs no book

    def read_scheme(self, text: str) -> Reading:
        """Read a scheme."""
        from kb.book import read_scheme

        return read_scheme(text)

    def scheme_text(self, text: str) -> str:
        """Return the scheme that a text or a name stands for."""
        from kb.book import scheme_from_argument

        return scheme_from_argument(text)

    def resolve_component(self, text: str, role: Role) -> Component:
        """Return a component from "NAME" or "NAME=EQUIV"."""
        from kb.book import conditions_from_words

        return conditions_from_words({ROLE_KEYS[role]: [text]}).components[0]

    def resolve_solvent(self, text: str) -> SolventPart:
        """Return a solvent from "NAME" or "NAME:PARTS"."""
        from kb.book import conditions_from_words

        return conditions_from_words({"solvents": [text]}).solvents[0]

    def lookup(self, text: str, kind: str) -> Sequence[Offer]:
        """Return catalogue names that begin with the text, then those near it; none when it is a name already."""
        from kb.book import complete_material, lookup_material

        found = lookup_material(text, kind)
        if found["match"] is not None:
            return ()
        begun = [
            Offer(name=one["name"], note="" if one["name"] == one["entry"] else f"for {one['entry']}")
            for one in complete_material(text, kind)
        ]
        names = {offer.name for offer in begun}
        return (*begun, *(Offer(name=o["name"]) for o in found["offers"] if o["name"] not in names))

    def failure_modes(self) -> Sequence[tuple[str, str]]:
        """Return the controlled words for failures with their meanings."""
        return tuple((mode.word, mode.meaning) for mode in failure_modes())

    # checking

    def check(self, plan: Plan, *, top: int = 8) -> Assessment:
        """Return everything known about a plan."""
        with self._checking.book() as book, _view_of(book).heeding(current_progress()):
            return book.check(plan, top=top)

    def what_if(self, plan: Plan, temperatures_c: Sequence[float]) -> Sequence[tuple[float, Estimate]]:
        """Return the estimate at other temperatures [degC]."""
        with self._checking.book() as book, _view_of(book).heeding(current_progress()):
            return book.what_if(plan, temperatures_c)

    # looking

    def page(self, query: RunQuery) -> RunPage:
        """Return a page of runs; words, verdicts and failures are searched for."""
        if query.words or query.verdict or query.failed:
            return self._page_found(query)
        with self._look() as book:
            if not query.is_ascending:
                page = book.page(query.offset, query.limit, query.sort, query.with_withdrawn)
                return RunPage(total=page.total, runs=tuple(page.items))
            total = book.page(0, 1, query.sort, query.with_withdrawn).total
            last = max(total - query.offset, 0)
            first = max(last - query.limit, 0)
            runs: list[Run] = []
            for offset in range(first - first % query.limit, last, query.limit):
                runs.extend(book.page(offset, query.limit, query.sort, query.with_withdrawn).items)
            start = first % query.limit
            return RunPage(total=total, runs=tuple(reversed(runs[start : start + last - first])))

    def _page_found(self, query: RunQuery) -> RunPage:
        from kb.book import criteria_from_words

        orders = {"date": ("newest", "oldest"), "code": ("code", "code"), "yield": ("best", "best")}
        criteria = criteria_from_words(
            words=query.words,
            verdict=query.verdict,
            failed=query.failed,
            limit=query.limit,
            page=query.offset // query.limit + 1,
        )
        order = type(criteria.order)(orders[query.sort][query.is_ascending])
        with self._finding.book() as book:
            if query.words and not query.offset:
                try:
                    return RunPage(total=1, runs=(book.get(query.words),))
                except RecordNotFound:
                    pass
            found = book.finder().find(replace(criteria, order=order), progress=current_progress())
            return RunPage(total=found.total, runs=tuple(book.get(item.run) for item in found.items))

    def find(self, query: FindQuery) -> FindPage:
        """Return a page of what matches."""
        from kb.book import criteria_from_words

        words = {name: getattr(query, name) for name in FindQuery.__slots__}
        at_least = words.pop("at_least")
        if at_least:
            from kb.quantity import parse_number

            words["at_least"] = parse_number(at_least, "similarity", "Write a number such as 0.6.")
        criteria = criteria_from_words(**words)
        with self._finding.book() as book:
            found = book.finder().find(criteria, progress=current_progress())
            hits = tuple(
                FindHit(
                    run=book.get(item.run),
                    score=item.score,
                    smiles=item.matched.smiles if item.matched else "",
                    atoms=item.matched.atoms if item.matched else (),
                )
                for item in found.items
            )
        notes = (*found.notes, *(() if found.complete else ("The search was stopped; there may be more.",)))
        return FindPage(total=found.total, hits=hits, elapsed_ms=found.elapsed_ms, notes=notes)

    def get(self, code: str) -> Run:
        """Return one run."""
        with self._look() as book:
            return book.get(code)

    def history(self, code: str) -> Sequence[HistoryLine]:
        """Return who changed a run, when and why."""
        with self._look() as book:
            entries = book.history(code)
        return tuple(
            HistoryLine(when=e.at, who=e.who, what=_change_words(e.action, e.changed), why=e.why) for e in entries
        )

    # writing

    def add(self, run: Run, who: str) -> Run:
        """Store a run; return it with its code."""
        with self._writing.book() as book:
            return book.add(run, who)

    def remarks(self, run: Run) -> Sequence[str]:
        """Return what does not add up in a run, a sentence each."""
        with self._look() as book:
            return tuple(f"{finding.title}. {finding.why}" for finding in book.remarks(run))

    def amend(self, code: str, changes: Mapping[str, Any], who: str, why: str, revision: int) -> Run:
        """Change fields of a run, old values kept."""
        with self._writing.book() as book:
            return book.amend(code, changes, who=who, why=why, revision=revision)

    def withdraw(self, code: str, why: str, who: str) -> Run:
        """Withdraw a run."""
        with self._writing.book() as book:
            return book.withdraw(code, who=who, why=why)

    def save_draft(self, key: str, data: Mapping[str, Any]) -> None:
        """Keep a half-filled form."""
        with self._writing.book() as book:
            book.store.drafts.save(key, data)

    def load_draft(self, key: str) -> dict[str, Any] | None:
        """Return a kept form, None when there is none."""
        with self._writing.book() as book:
            draft = book.store.drafts.find(key)
        return dict(draft.content) if draft else None

    def list_drafts(self) -> Sequence[DraftLine]:
        """Return the kept forms, newest first."""
        with self._writing.book() as book:
            drafts = book.store.drafts.list()
        return tuple(
            DraftLine(key=d.draft_id, title=str(d.content.get("scheme", "")), saved_at=d.updated_at) for d in drafts
        )

    def delete_draft(self, key: str) -> None:
        """Forget a kept form."""
        with self._writing.book() as book:
            book.store.drafts.discard(key)

    def close(self) -> None:
        """Let go of the book in every lane."""
        for lane in (self._checking, self._finding, self._looking, self._writing):
            lane.close()


def _view_of(book: Book) -> RecordView:
    """Return what judgement reads of a book; reading it anew takes seconds in a large one, so that is told."""
    current_progress().advance(0, None, "reading the runs")
    view = book.view()
    current_progress().advance(0, None, "")
    return view


def load_chemistry() -> None:
    """Load RDKit, NumPy and the catalogue, in one thread.

    Two threads that load NumPy at once, one of them through RDKit, fail with "cannot load module more than
    once" (seen with NumPy 2); so whatever workers need is loaded before the first of them can be asked.
    """
    from kb.book import lookup_material, read_scheme
    from kb.logs import tame_rdkit
    from tui.drawings import scheme_drawing

    tame_rdkit()
    scheme_drawing("C")
    read_scheme("CBr")
    lookup_material("DMF", "solvent")


def _change_words(action: str, changed: Sequence[Any]) -> str:
    """Return "amended note: 'old' to 'new'" in plain words, long values cut."""
    past = {"add": "recorded", "amend": "amended", "withdraw": "withdrew", "reinstate": "reinstated"}
    parts = [f"{c.field.replace('_', ' ')}: {_brief(c.old)} → {_brief(c.new)}" for c in changed]
    return " ".join([past.get(str(action), str(action)), "; ".join(parts)]).strip()


def _brief(value: object) -> str:
    text = "nothing" if value in (None, "", (), [], {}) else plain(str(value))
    return text if len(text) <= 60 else text[:59] + "…"

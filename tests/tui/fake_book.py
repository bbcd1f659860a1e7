"""A small record book for the interface's tests: answers at once, remembers, can be told to fail.

Its answers are invented and stand for nothing but themselves; the real book is tested elsewhere. It keeps to
`tui.ports.BookPort`, so that a screen that works here asks nothing that the real book cannot answer.
What it answers stands in `fake_runs.py`, `fake_answers.py` and `fake_audits.py`.
"""

from __future__ import annotations

import datetime as dt
import threading
import time
from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import Any

from kb.chem.facts import Reading
from kb.errors import NameUnknown, QueryError, RecordNotFound, SidepathError, StoreBusy, StoreMissing
from kb.progress import Progress
from kb.record.assessment import Assessment, Estimate
from kb.record.component import Component, SolventPart
from kb.record.finding import Interval
from kb.record.plan import Plan
from kb.record.run import Run
from kb.vocabulary import Fate, Role
from tests.tui.fake_answers import a_reading, an_assessment
from tests.tui.fake_audits import FakeAudits
from tests.tui.fake_routes import RouteAnswers
from tests.tui.fake_runs import AZIDE_SCHEME, MESYLATE, NAMES, NASTY, a_run
from tui.ports import BookPort, DraftLine, FindHit, FindPage, FindQuery, HistoryLine, Offer, RunPage, RunQuery

__all__ = ["AZIDE_SCHEME", "MESYLATE", "NASTY", "FakeBook", "FakeOpener", "a_run"]


class FakeBook(FakeAudits, RouteAnswers):
    """Runs in a dictionary; `delay_s` slows every check, `broken` makes the named calls fail."""

    def __init__(self, runs: int = 12, read_only: bool = False, delay_s: float = 0.0) -> None:
        super().__init__()
        self.runs: dict[str, Run] = {f"R-{n:04d}": a_run(n) for n in range(1, runs + 1)}
        self.drafts: dict[str, dict[str, Any]] = {}
        self.changes: dict[str, list[HistoryLine]] = {}
        self.broken: dict[str, BaseException] = {}
        self.delay_s = delay_s
        self.gate: threading.Event | None = None
        self.checked: list[Plan] = []
        self.is_closed = False
        self._read_only = read_only

    @property
    def place(self) -> str:
        return "group.sidepath"

    @property
    def is_read_only(self) -> bool:
        return self._read_only

    def _maybe_fail(self, call: str) -> None:
        if call in self.broken:
            raise self.broken[call]

    def count(self) -> int:
        self._maybe_fail("count")
        return len(self.runs)

    def scheme_text(self, text: str) -> str:
        self._maybe_fail("scheme_text")
        if text == "2-bromobutane":
            return "CCC(C)Br"
        return text

    def read_scheme(self, text: str) -> Reading:
        self._maybe_fail("read_scheme")
        return a_reading(text)

    def resolve_component(self, text: str, role: Role) -> Component:
        name, _, equiv = text.partition("=")
        if name.strip() not in NAMES:
            raise NameUnknown(f"No material is called {name.strip()!r}.", "Did you mean NaN3?", name)
        return Component(
            role=role, name=name.strip(), smiles=NAMES[name.strip()][0], equiv=float(equiv) if equiv else None
        )

    def resolve_solvent(self, text: str) -> SolventPart:
        name, _, parts = text.partition(":")
        if name.strip() not in NAMES:
            raise NameUnknown(f"No solvent is called {name.strip()!r}.", "Did you mean DMF?", name)
        return SolventPart(
            name=name.strip(), smiles=NAMES[name.strip()][0], parts=float(parts) if parts else None
        )

    def lookup(self, text: str, kind: str) -> Sequence[Offer]:
        self._maybe_fail("lookup")
        return [
            Offer(name=name)
            for name, (_, of_kind) in NAMES.items()
            if of_kind == kind and name.casefold().startswith(text.casefold())
        ]

    def check(self, plan: Plan, *, top: int = 8) -> Assessment:
        self._maybe_fail("check")
        if self.gate is not None:
            self.gate.wait(60)
        if self.delay_s:
            time.sleep(self.delay_s)
        self.checked.append(plan)
        return an_assessment(plan, list(self.runs))

    def what_if(self, plan: Plan, temperatures_c: Sequence[float]) -> Sequence[tuple[float, Estimate]]:
        self._maybe_fail("what_if")
        return [
            (
                t,
                Estimate(
                    fates=(
                        (
                            Fate.SUBSTITUTION,
                            Interval(mean=0.95 - t / 400, low=0.8 - t / 400, high=1 - t / 400),
                        ),
                        (Fate.ELIMINATION, Interval(mean=0.05 + t / 400, low=t / 400, high=0.2 + t / 400)),
                    )
                ),
            )
            for t in temperatures_c
        ]

    def page(self, query: RunQuery) -> RunPage:
        self._maybe_fail("page")
        runs = [r for r in self.runs.values() if query.with_withdrawn or not r.is_withdrawn]
        runs = [r for r in runs if query.words.casefold() in (r.note + r.scheme + (r.code or "")).casefold()]
        if query.verdict:
            runs = [r for r in runs if r.verdict == query.verdict]
        if query.failed:
            runs = [r for r in runs if any(f.mode == query.failed for f in r.outcome.failures)]
        keys: dict[str, Any] = {
            "code": lambda r: r.code,
            "date": lambda r: r.date or dt.date.min,
            "yield": lambda r: r.outcome.yield_pct or -1.0,
        }
        runs.sort(key=keys[query.sort], reverse=not query.is_ascending)
        return RunPage(total=len(runs), runs=tuple(runs[query.offset : query.offset + query.limit]))

    def find(self, query: FindQuery) -> FindPage:
        self._maybe_fail("find")
        if query.substructure == "C(":
            raise QueryError("'C(' is no SMARTS.", "Check the brackets.", query.substructure)
        runs = [
            r for r in self.runs.values() if not query.words or query.words.casefold() in r.note.casefold()
        ]
        if query.verdict:
            runs = [r for r in runs if r.verdict == query.verdict]
        start = (query.page - 1) * query.limit
        atoms = (2, 3, 4, 5, 6) if query.substructure else ()
        hits = tuple(
            FindHit(run=r, score=0.8, smiles=MESYLATE if atoms else "", atoms=atoms)
            for r in runs[start : start + query.limit]
        )
        return FindPage(total=len(runs), hits=hits, elapsed_ms=1.5)

    def get(self, code: str) -> Run:
        self._maybe_fail("get")
        if code not in self.runs:
            raise RecordNotFound(f"No run is called {code}.", "Look at the list of runs.", code)
        return self.runs[code]

    def history(self, code: str) -> Sequence[HistoryLine]:
        self._maybe_fail("history")
        first = HistoryLine(when=dt.datetime(2026, 1, 2, 9, 30, tzinfo=dt.UTC), who="JM", what="recorded")
        return [first, *self.changes.get(code, [])]

    def add(self, run: Run, who: str) -> Run:
        self._maybe_fail("add")
        if self._read_only:
            raise SidepathError("The book is read only.", "Open it for writing.")
        stored = replace(run, code=f"R-{len(self.runs) + 1:04d}", by=run.by or who)
        self.runs[stored.code or ""] = stored
        return stored

    def amend(self, code: str, changes: Mapping[str, Any], who: str, why: str, revision: int) -> Run:
        self._maybe_fail("amend")
        old = self.get(code)
        self.runs[code] = replace(old, revision=old.revision + 1, **changes)
        line = HistoryLine(when=None, who=who, what="amended " + ", ".join(sorted(changes)), why=why)
        self.changes.setdefault(code, []).append(line)
        return self.runs[code]

    def remarks(self, run: Run) -> Sequence[str]:
        return ["The shares add up to 112 %."] if sum(run.outcome.split.values()) > 1.1 else []

    def withdraw(self, code: str, why: str, who: str) -> Run:
        self._maybe_fail("withdraw")
        self.runs[code] = replace(self.get(code), withdrawn_why=why)
        return self.runs[code]

    def failure_modes(self) -> Sequence[tuple[str, str]]:
        return [
            ("elimination", "alkene formed where substitution was wanted"),
            ("group-loss", "a labile group elsewhere was lost"),
            ("no-reaction", "starting material came back"),
        ]

    def save_draft(self, key: str, data: Mapping[str, Any]) -> None:
        self._maybe_fail("save_draft")
        self.drafts[key] = dict(data)

    def load_draft(self, key: str) -> dict[str, Any] | None:
        return dict(self.drafts[key]) if key in self.drafts else None

    def list_drafts(self) -> Sequence[DraftLine]:
        self._maybe_fail("list_drafts")
        return [DraftLine(key=k, title=str(v.get("scheme", ""))) for k, v in self.drafts.items()]

    def delete_draft(self, key: str) -> None:
        self.drafts.pop(key, None)

    def close(self) -> None:
        self.is_closed = True


class FakeOpener:
    """Opens the one book it was given; None stands for a default place without a book."""

    def __init__(self, book: FakeBook | None = None, error: SidepathError | None = None) -> None:
        self.book = book
        self.error = error
        self.asked: list[str] = []

    def open(self, place: str | None) -> BookPort:
        self.asked.append(f"open {place}")
        if self.error is not None:
            raise self.error
        if place == "busy.sidepath":
            raise StoreBusy("The book busy.sidepath is held by another writer.", "Try again in a moment.")
        if self.book is None:
            raise StoreMissing(
                f"There is no book at {place or self.default_place()}.", "Make one, or open another."
            )
        return self.book

    def create(self, place: str | None) -> BookPort:
        self.asked.append(f"create {place}")
        self.book, self.error = FakeBook(runs=0), None
        return self.book

    def demo(self, progress: Progress) -> BookPort:
        self.asked.append("demo")
        for done in range(3):
            progress.advance(done, 3, "building")
        self.book, self.error = FakeBook(), None
        return self.book

    def default_place(self) -> str:
        return "book.sidepath"

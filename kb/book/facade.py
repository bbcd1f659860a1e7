"""The book: the one object that a front end opens.

It owns wiring only: it hands the store its chemistry, keeps one view and one search index in step with the store, and
passes questions down. One Book serves one thread at a time; threads that work side by side open their own.
"""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping, Sequence
from pathlib import Path
from types import TracebackType
from typing import TYPE_CHECKING, Any

from kb.book.pages import teach_notebooks
from kb.logs import tame_rdkit
from kb.progress import Progress, Silent
from kb.record.assessment import Assessment, Estimate
from kb.record.finding import Finding
from kb.record.plan import Plan
from kb.record.run import Run

if TYPE_CHECKING:
    from kb.assess.house_rules import RuleTrial
    from kb.assess.record_view import RecordView
    from kb.audit.replay_report import ReplayReport
    from kb.exchange.loading import LoadReport
    from kb.search.criteria import Criteria
    from kb.search.finder import Finder, FindResult
    from kb.store.moving import Moved
    from kb.store.store import Store
    from kb.store.values import Check, Conflict, HistoryEntry, HouseRule, MergeReport, Page


def open_book(
    path_or_url: str | Path | None = None,
    create: bool = False,
    read_only: bool = False,
    wait_s: float | None = None,
) -> Book:
    """Open a record book, to be used as a context manager.

    Args:
        path_or_url: SQLite file, or URL such as postgresql://host/name; None = the default place in the user's data
            directory.
        create: make a new one; refuses to overwrite.
        read_only: never write; several may read while one writes.
        wait_s: how long to wait for another writer [s]; None = the store's own patience.

    Raises:
        StoreMissing: there is none and `create` is False.
        StoreExists: there is one and `create` is True.
        SchemaTooNew, SchemaBehind, StoreDamaged, StoreRefused: as their names say.
    """
    from kb import paths
    from kb.book.chemistry import store_options
    from kb.store.store import Store

    address = str(path_or_url) if path_or_url is not None else str(paths.default_book())
    options = store_options() | ({} if wait_s is None else {"wait_s": wait_s})
    if create:
        return Book(Store.create(address, **options))
    return Book(Store.open(address, read_only=read_only, **options))


class Book:
    """One record book; see `open_book`."""

    def __init__(self, store: Store) -> None:
        self.store = store
        self._view: tuple[object, RecordView] | None = None
        self._finder: Finder | None = None
        teach_notebooks()

    def __enter__(self) -> Book:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()

    def close(self) -> None:
        """Let go of the file or the server."""
        self.store.close()

    @property
    def path(self) -> str:
        """Return where the book is, for showing."""
        return str(self.store.book.address)

    @property
    def is_read_only(self) -> bool:
        """Return True when the book was opened for reading."""
        return self.store.book.read_only

    def count(self) -> int:
        """Return how many runs stand."""
        return self.store.count()

    def check(self, plan: Plan, *, top: int = 5, at_date: dt.date | None = None) -> Assessment:
        """Check a planned step.

        Args:
            plan: scheme and conditions.
            top: how many precedents to list.
            at_date: leave later and undated runs out; None = all runs.
        """
        tame_rdkit()
        from kb.assess.acknowledged import note_acknowledged, plan_key
        from kb.assess.assessment import assess
        from kb.store.derivation import account_of_plan

        account = account_of_plan(plan)
        view = self.view().until(at_date)
        rest = self.finder().tanimoto_of_runs(account.facts.substrate, view.table.codes)
        found = assess(plan, view, self.store.house_rules.list(), rest, top, account)
        return note_acknowledged(found, self.store.acknowledgements.list(plan_key(plan)))

    def acknowledge(self, plan: Plan, finding_id: str, *, who: str, why: str) -> None:
        """Keep who saw a finding of a plan and goes on, and why; the finding is told as before.

        Raises:
            RecordNotFound: the plan has no finding of that id.
        """
        from kb.assess.acknowledged import plan_key
        from kb.errors import RecordNotFound

        known = [f.rule_id for f in self.check(plan, top=0).findings]
        if finding_id not in known:
            hint = f"It has: {', '.join(dict.fromkeys(known))}." if known else "It has none."
            raise RecordNotFound(f"This plan has no finding {finding_id[:60]!r}.", hint, finding_id)
        self.store.acknowledgements.add(finding_id, plan_key(plan), who, why)

    def what_if(self, plan: Plan, temperatures_c: Sequence[float]) -> tuple[tuple[float, Estimate], ...]:
        """Return the estimate at each of some temperatures [degC], all else as planned."""
        import dataclasses

        from kb.quantity import Temperature

        answers = []
        for t in temperatures_c:
            temperature = Temperature(text=f"{t:g} °C", start_c=t, end_c=t)
            changed = dataclasses.replace(plan.conditions, temperature=temperature)
            assessment = self.check(dataclasses.replace(plan, conditions=changed), top=0)
            answers.append((t, assessment.estimate))
        return tuple(answers)

    def replay(self, since: dt.date | None = None, progress: Progress | None = None) -> ReplayReport:
        """Check each run against what stood in the book that morning; see `kb.book.whole.replay_book`."""
        from kb.book.whole import replay_book

        return replay_book(self, since, progress)

    def find(
        self, criteria: Criteria, deadline_s: float | None = None, progress: Progress | None = None
    ) -> FindResult:
        """Find runs; with a deadline [s], or where progress is cancelled, the answer may be partial and says so."""
        tame_rdkit()
        return self.finder().find(criteria, deadline_s=deadline_s, progress=progress)

    def add(self, run: Run, who: str) -> Run:
        """Record a run and return it with its code; it is on disk when this returns."""
        tame_rdkit()
        return self.store.add(run, who)

    def get(self, code: str) -> Run:
        """Return a run by code or UUID, withdrawn ones included.

        Raises:
            RecordNotFound: no run answers to it.
        """
        return self.store.get(code)

    def amend(self, code: str, changes: Mapping[str, Any], *, who: str, why: str, revision: int | None = None) -> Run:
        """Change fields of a run; old values stay in the history.

        Args:
            code: of the run.
            changes: field of Run to new value.
            who, why: kept in the history.
            revision: the revision that the change was made on; None = whatever stands.

        Raises:
            RecordConflict: somebody changed it since that revision.
        """
        tame_rdkit()
        return self.store.amend(code, changes, who=who, why=why, expected_revision=revision)

    def withdraw(self, code: str, *, who: str, why: str) -> Run:
        """Withdraw a run; it stays readable but no longer speaks."""
        tame_rdkit()
        return self.store.withdraw(code, who=who, why=why)

    def reinstate(self, code: str, *, who: str, why: str) -> Run:
        """Take a withdrawal back."""
        tame_rdkit()
        return self.store.reinstate(code, why, who)

    def conflicts(self) -> tuple[Conflict, ...]:
        """Return what merged books say differently and nobody has settled yet, by code."""
        return self.store.conflicts()

    def settle(self, code: str, choices: Mapping[str, Any], *, who: str, why: str) -> Run:
        """Settle a run's conflicts: disputed field to the value that shall stand; those left out stand as they do."""
        tame_rdkit()
        return self.store.settle(code, choices, who, why)

    def history(self, code: str) -> tuple[HistoryEntry, ...]:
        """Return what was done to a run, oldest first."""
        return tuple(self.store.history(code))

    def page(
        self, offset: int = 0, limit: int = 50, sort: str = "date", withdrawn: bool = False, descending: bool = True
    ) -> Page:
        """Return one page of runs, newest or highest first.

        Args:
            offset, limit: the page is the one of `limit` runs that holds number `offset`, counted from 0.
            sort: code, date, recorded, yield, verdict, project or by.
            withdrawn: also the withdrawn ones.
            descending: False = oldest or lowest first.
        """
        from kb.store.runs import RunFilter, Sort

        return self.store.page(
            RunFilter(with_withdrawn=withdrawn),
            sort=Sort(sort),
            descending=descending,
            page=offset // limit + 1,
            size=limit,
        )

    def remarks(self, run: Run, wanted_code: str | None = None) -> tuple[Finding, ...]:
        """Return what does not add up in a run, for telling whoever just recorded it; see `kb.book.remarks`."""
        from kb.book.remarks import remarks_on

        return remarks_on(run, wanted_code)

    def known(self, runs: Sequence[Run]) -> tuple[Run, ...]:
        """Return, as they stand in the book, those of the runs that are in it already (by UUID)."""
        return self.store.get_many([run.run_id for run in runs])

    def reading_words(self, run: Run) -> str:
        """Return what a run's scheme was read as: "substitution at secondary, ring, loses mesylate"."""
        from kb.book.remarks import reading_words

        return reading_words(run)

    def rules(self) -> tuple[HouseRule, ...]:
        """Return the house rules, retired ones included."""
        return self.store.house_rules.list(with_retired=True)

    def rule(self, rule_id: str) -> HouseRule:
        """Return one house rule."""
        return self.store.house_rules.get(rule_id)

    def add_rule(self, rule: HouseRule) -> HouseRule:
        """Adopt a house rule and return it with its id; refused where its motif or condition cannot be used."""
        from kb.assess.house_rules import check_rule

        check_rule(rule)
        return self.store.house_rules.add(rule)

    def retire_rule(self, rule_id: str, *, who: str, why: str) -> None:
        """Retire a house rule; it is kept with the reason."""
        self.store.house_rules.retire(rule_id, who=who, why=why)

    def try_rule(self, rule: HouseRule) -> RuleTrial:
        """Try a rule on every standing run."""
        tame_rdkit()
        from kb.assess.house_rules import check_rule, try_rule

        check_rule(rule)
        return try_rule(rule, self.view())

    def verify(self, progress: Progress | None = None) -> tuple[Check, ...]:
        """Check the book from the file up to the derived facts."""
        tame_rdkit()
        from kb.store.checking import verify

        return tuple(verify(self.store, progress or Silent()))

    def merge(self, other: str | Path, *, who: str, progress: Progress | None = None) -> MergeReport:
        """Take in another book; doing it twice, or the other way round, comes to the same."""
        tame_rdkit()
        from kb.store.merging import merge

        return merge(self.store, str(other), who=who, progress=progress or Silent())

    def import_file(
        self,
        path: Path,
        *,
        who: str,
        dry_run: bool = False,
        rejects: Path | None = None,
        mapping: Mapping[str, Any] | None = None,
        sheet: str | None = None,
        progress: Progress | None = None,
    ) -> LoadReport:
        """Take runs in from a file; run again, nothing is doubled. See `kb.exchange.loading.load_file`."""
        tame_rdkit()
        from kb.exchange.loading import load_file

        return load_file(
            path,
            self.store,
            who=who,
            progress=progress,
            dry_run=dry_run,
            rejects=rejects,
            mapping=mapping,
            sheet=sheet,
        )

    def export_file(self, path: Path, progress: Progress | None = None) -> int:
        """Write every standing and withdrawn run to a file, by its ending; return how many."""
        from kb.exchange.exporting import export_file
        from kb.store.runs import RunFilter

        every = RunFilter(with_withdrawn=True)
        return export_file(self.store.iter_runs(every), path, progress, total=self.store.count(every))

    def backup(self, target: Path, keep: int | None = None) -> Path:
        """Copy the book while others may be writing, verify the copy, and return where it is.

        Args:
            target: a file that is not there yet, or a folder for dated copies.
            keep: copies of this book that a folder keeps; None = the store's own number.
        """
        from kb.store.safekeeping import backup

        return backup(self.store, target) if keep is None else backup(self.store, target, keep=keep)

    def move(self, target: str, *, who: str, progress: Progress | None = None) -> Moved:
        """Carry the whole book over to a file or a database where nothing is yet; this book is left as it is.

        Raises:
            StoreExists: something is there.
        """
        from kb.store.moving import move

        return move(self.store, target, who=who, progress=progress)

    def history_as_dicts(self, code: str) -> list[dict[str, Any]]:
        """Return the history as plain values, oldest first."""
        return [entry.as_dict() for entry in self.history(code)]

    def one_line(self, code: str) -> tuple[str, str, str]:
        """Return (date, verdict, what happened) of a run in short words, for lists."""
        run = self.get(code)
        best = max(run.outcome.split.items(), key=lambda pair: pair[1], default=None)
        outcome = f"{best[0]} {100 * best[1]:.0f} %" if best else "no split"
        names = [c.name for c in run.conditions.components] + [s.name for s in run.conditions.solvents]
        when = run.date.isoformat() if run.date else ""
        return when, str(run.verdict or ""), f"{outcome}; {', '.join(names)}"

    def changes_from_words(self, code: str, words: Sequence[str]) -> dict[str, Any]:
        """Turn "FIELD=VALUE" texts into changes for `amend`; see `kb.book.amend_words`."""
        from kb.book.amend_words import changes_from_words

        return changes_from_words(self.get(code), words)

    def view(self) -> RecordView:
        """Return the columns that judgement reads, rebuilt when the book has changed."""
        tame_rdkit()
        version = self.store.data_version()
        if self._view is None or self._view[0] != version:
            from kb.assess.record_view import build_view

            self._view = (version, build_view(self.store, self.finder().runs_with_motif))
        return self._view[1]

    def view_at(self, version: int) -> RecordView | None:
        """Return the columns that were read at a state of the book, None where those at hand are of another."""
        return self._view[1] if self._view is not None and self._view[0] == version else None

    def finder(self) -> Finder:
        """Return the search over this book, following its changes."""
        if self._finder is None:
            from kb.search.finder import Finder

            self._finder = Finder(self.store)
        return self._finder

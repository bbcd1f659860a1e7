"""What judgement reads of the book: columns, runs, profiles and motif hits, kept until the book changes.

It owns caching and nothing else, so that the rules of judgement can be tested on a view made by hand. Whatever
follows from a row itself (its profile, its run, its molecule) is kept once for a view and all views cut from it; what
depends on which runs may speak is kept in `memory`, per view. One view serves one thread.
"""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable, Collection, Iterable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, field
from functools import cached_property
from typing import TYPE_CHECKING, Any, Protocol
from uuid import UUID

import numpy as np
from numpy.typing import NDArray

from kb.assess.distinct import distinct
from kb.assess.table import FactTable, build_table, with_profiles
from kb.errors import Cancelled
from kb.materials.profile import ConditionProfile
from kb.progress import Progress, Silent
from kb.record.run import Run

if TYPE_CHECKING:
    from kb.store.failings import Failings
    from kb.store.store import Store

_UNASKED, _UNKNOWN = -2, -1
_CANNOT_TELL = {True: 1, False: 0, None: _UNKNOWN}

Predicate = Callable[[ConditionProfile], bool | None]


class RunSource(Protocol):
    """Where whole runs come from. One with a method `many` (codes to runs) is asked for several at a time."""

    def get(self, code: str) -> Run:
        """Return the run of a code."""
        ...


class _StoreRuns:
    """Whole runs out of a store."""

    def __init__(self, store: Store, ids: dict[str, UUID]) -> None:
        self._store = store
        self._ids = ids

    def get(self, code: str) -> Run:
        return self._store.get(self._ids[code])

    def many(self, codes: Sequence[str]) -> Sequence[Run]:
        return self._store.get_many(self._ids[code] for code in codes)


@dataclass
class _Kept:
    """What follows from rows themselves, shared by a view and its cuts."""

    source: RunSource
    profiles: dict[str, ConditionProfile] = field(default_factory=dict)
    runs: dict[str, Run] = field(default_factory=dict)
    mols: dict[str, Any] = field(default_factory=dict)
    truth: dict[object, NDArray[np.int8]] = field(default_factory=dict)
    known: dict[object, Any] = field(default_factory=dict)
    progress: Progress = field(default_factory=Silent)


def build_view(store: Store, motif_search: Callable[[str], Collection[str]] | None = None) -> RecordView:
    """Read a store's columns into a view.

    Args:
        store: to read.
        motif_search: SMARTS to the codes of runs that hold it on their left side; None = look one by one.

    Raises:
        IndexStale: facts were made by another recipe.
    """
    from kb.store.failings import failings_by_run

    columns = store.derived_columns()
    failings = failings_by_run(store)
    codes = list(columns["code"])
    search = None
    if motif_search is not None:
        row_of = {code: row for row, code in enumerate(codes)}
        ask = motif_search

        def search(smarts: str) -> NDArray[np.intp]:
            return np.array(sorted(row_of[c] for c in ask(smarts) if c in row_of), dtype=np.intp)

    ids = dict(zip(codes, columns["run_id"], strict=True))
    failed = [failings.get(int(key), ()) for key in columns["run_key"]]
    return RecordView(build_table(columns), None, failed, _StoreRuns(store, ids), search)


class RecordView:
    """The standing runs of one book at one moment, optionally only some of them."""

    def __init__(
        self,
        table: FactTable,
        profiles_json: Sequence[str] | None,
        failures: Sequence[Failings],
        source: RunSource,
        motif_search: Callable[[str], NDArray[np.intp]] | None = None,
        cut_from: RecordView | None = None,
    ) -> None:
        """Hold the columns.

        Args:
            table: n runs.
            profiles_json: profile of each (n); None = those of the table.
            failures: (mode, motif SMARTS or None) pairs of each run (n).
            source: of whole runs.
            motif_search: SMARTS to row numbers, through an index; None = look through the substrates one by one.
            cut_from: the view whose rows these are some of; what follows from the rows is shared with it.
        """
        self.table = table if profiles_json is None else with_profiles(table, profiles_json)
        self.failures = failures
        self._motif_search = motif_search
        self._kept: _Kept = _Kept(source) if cut_from is None else cut_from._kept
        self._motif_rows: dict[str, NDArray[np.intp]] = {}
        self.memory: dict[object, Any] = {}

    @property
    def known(self) -> dict[object, Any]:
        """Return a place to keep what follows from rows themselves, shared with every view cut from this one."""
        return self._kept.known

    @contextmanager
    def heeding(self, progress: Progress) -> Iterator[None]:
        """Let whoever reads this view, or one cut from it, be stopped: a reading then raises `Cancelled`.

        Every judgement reads, again and again; so the rules of judgement need not know that they can be stopped, and
        what was worked out so far is kept.
        """
        before, self._kept.progress = self._kept.progress, progress
        try:
            yield
        finally:
            self._kept.progress = before

    def _heed(self) -> None:
        if self._kept.progress.cancelled():
            raise Cancelled("The check was stopped.", "Check again to go on.")

    def until(self, date: dt.date | None) -> RecordView:
        """Return a view of the runs dated up to `date`; runs without a date are left out. None = this view."""
        if date is None:
            return self
        return self.only(self.dated_until(date))

    def dated_until(self, date: dt.date) -> NDArray[np.bool_]:
        """Return which runs are dated up to `date` (n); runs without a date are not."""
        return (self.table.date > 0) & (self.table.date <= date.toordinal())

    def only(self, keep: NDArray[np.bool_]) -> RecordView:
        """Return a view in which only the runs of a mask (n) speak."""
        where = np.flatnonzero(keep)
        place = np.full(len(self.table), -1, dtype=np.intp)
        place[where] = np.arange(len(where))

        def search(smarts: str) -> NDArray[np.intp]:
            rows = place[self.rows_with_motif(smarts)]
            return rows[rows >= 0]

        failures = [self.failures[int(i)] for i in where]
        return RecordView(self.table.rows(where), None, failures, self._kept.source, search, self)

    def profile(self, row: int) -> ConditionProfile:
        """Return the condition profile of a row."""
        return self.profile_of_code(int(self.table.profile[row]))

    def profile_of_code(self, code: int) -> ConditionProfile:
        """Return a condition profile by its code in the table."""
        text = self.table.profiles[code]
        if text not in self._kept.profiles:
            from kb.store.derivation import profile_from_json

            self._kept.profiles[text] = profile_from_json(text)
        return self._kept.profiles[text]

    def told(self, name: object, predicate: Predicate, rows: NDArray[np.intp] | Sequence[int]) -> NDArray[np.int8]:
        """Return what a condition line says of each of some rows: 1 true, 0 false, -1 cannot tell.

        Args:
            name: of the line; its answers are kept under it, once per distinct profile.
            predicate: the line.
            rows: row numbers.
        """
        self._heed()
        if name not in self._kept.truth:
            self._kept.truth[name] = np.full(len(self.table.profiles), _UNASKED, dtype=np.int8)
        answers = self._kept.truth[name]
        codes = self.table.profile[np.asarray(rows, dtype=np.intp)]
        for code in distinct(codes[answers[codes] == _UNASKED]):
            answers[code] = _CANNOT_TELL[predicate(self.profile_of_code(int(code)))]
        return answers[codes]

    def run(self, row: int) -> Run:
        """Return the whole run of a row."""
        code = self.table.codes[row]
        if code not in self._kept.runs:
            self._kept.runs[code] = self._kept.source.get(code)
        return self._kept.runs[code]

    def fetch(self, rows: Iterable[int]) -> None:
        """Read the whole runs of some rows in one go, so that `run` need not ask for each."""
        self._heed()
        wanted = [c for c in (self.table.codes[row] for row in rows) if c not in self._kept.runs]
        many = getattr(self._kept.source, "many", None)
        if many is not None and len(wanted) > 1:
            self._kept.runs.update({run.code: run for run in many(wanted) if run.code is not None})

    def mol(self, smiles: str) -> Any:
        """Return the RDKit molecule of a SMILES, kept; None where it cannot be read."""
        if smiles not in self._kept.mols:
            from rdkit import Chem

            self._kept.mols[smiles] = Chem.MolFromSmiles(smiles) if smiles else None
        return self._kept.mols[smiles]

    def rows_with_motif(self, smarts: str) -> NDArray[np.intp]:
        """Return the rows whose substrate (or another organic partner, with an index) holds the motif, ascending."""
        self._heed()
        if smarts not in self._motif_rows:
            if self._motif_search is not None:
                self._motif_rows[smarts] = self._motif_search(smarts)
            else:
                self._motif_rows[smarts] = self._look_through(smarts)
        return self._motif_rows[smarts]

    @cached_property
    def modes(self) -> tuple[str, ...]:
        """Return the failure modes met in this view, sorted."""
        return tuple(sorted(self._rows_of_mode))

    def failed_in(self, mode: str) -> NDArray[np.bool_]:
        """Return which rows failed in a mode (n)."""
        failed = np.zeros(len(self.table), dtype=bool)
        failed[self._rows_of_mode.get(mode, [])] = True
        return failed

    @cached_property
    def has_failure(self) -> NDArray[np.bool_]:
        """Return which rows name a failure mode (n)."""
        return np.fromiter((bool(pairs) for pairs in self.failures), dtype=bool, count=len(self.table))

    @cached_property
    def _rows_of_mode(self) -> dict[str, list[int]]:
        rows: dict[str, list[int]] = {}
        for row, pairs in enumerate(self.failures):
            for mode in {mode for mode, _ in pairs}:
                rows.setdefault(mode, []).append(row)
        return rows

    def _look_through(self, smarts: str) -> NDArray[np.intp]:
        from rdkit import Chem

        query = Chem.MolFromSmarts(smarts)
        if query is None:
            return np.zeros(0, dtype=np.intp)
        hits = {s: (m := self.mol(s)) is not None and m.HasSubstructMatch(query) for s in set(self.table.substrate)}
        return np.flatnonzero([hits[s] for s in self.table.substrate])

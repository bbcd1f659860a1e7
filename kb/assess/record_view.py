"""What judgement reads of the book: columns, runs, profiles and motif hits, kept until the book changes.

It owns caching and nothing else, so that the rules of judgement can be tested on a view made by hand. One view serves
one thread.
"""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable, Collection
from functools import cached_property
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from kb.assess.table import FactTable, build_table
from kb.materials.profile import ConditionProfile
from kb.record.run import Run
from kb.store.failings import failings_by_run
from kb.store.store import Store


class RunSource(Protocol):
    """Where whole runs come from."""

    def get(self, code: str) -> Run:
        """Return the run of a code."""
        ...


def build_view(store: Store, motif_search: Callable[[str], Collection[str]] | None = None) -> RecordView:
    """Read a store's columns into a view.

    Args:
        store: to read.
        motif_search: SMARTS to the codes of runs that hold it on their left side; None = look one by one.

    Raises:
        IndexStale: facts were made by another recipe.
    """
    columns = store.derived_columns()
    failings = failings_by_run(store)
    codes = list(columns["code"])
    search = None
    if motif_search is not None:
        row_of = {code: row for row, code in enumerate(codes)}
        ask = motif_search

        def search(smarts: str) -> NDArray[np.intp]:
            return np.array(sorted(row_of[c] for c in ask(smarts) if c in row_of), dtype=np.intp)

    return RecordView(
        build_table(columns),
        list(columns["profile_json"]),
        [failings.get(int(key), ()) for key in columns["run_key"]],
        store,
        search,
    )


class RecordView:
    """The standing runs of one book at one moment, optionally only those up to a date."""

    def __init__(
        self,
        table: FactTable,
        profiles_json: list[str],
        failures: list[tuple[tuple[str, str | None], ...]],
        source: RunSource,
        motif_search: Callable[[str], NDArray[np.intp]] | None = None,
    ) -> None:
        """Hold the columns.

        Args:
            table: n runs.
            profiles_json: profile of each (n).
            failures: (mode, motif SMARTS or None) pairs of each run (n).
            source: of whole runs.
            motif_search: SMARTS to row numbers, through an index; None = look through the substrates one by one.
        """
        self.table = table
        self._profiles_json = profiles_json
        self.failures = failures
        self._source = source
        self._motif_search = motif_search
        self._profiles: dict[int, ConditionProfile] = {}
        self._runs: dict[int, Run] = {}
        self._mols: dict[str, Any] = {}
        self._motif_rows: dict[str, NDArray[np.intp]] = {}
        self.memory: dict[object, Any] = {}

    def until(self, date: dt.date | None) -> RecordView:
        """Return a view of the runs dated up to `date`; runs without a date are left out. None = this view."""
        if date is None:
            return self
        keep = (self.table.date > 0) & (self.table.date <= date.toordinal())
        where = np.flatnonzero(keep)
        place = {int(old): new for new, old in enumerate(where)}

        def search(smarts: str) -> NDArray[np.intp]:
            return np.array([place[int(r)] for r in self.rows_with_motif(smarts) if int(r) in place], dtype=np.intp)

        return RecordView(
            self.table.rows(keep),
            [self._profiles_json[i] for i in where],
            [self.failures[i] for i in where],
            self._source,
            search,
        )

    def profile(self, row: int) -> ConditionProfile:
        """Return the condition profile of a row."""
        if row not in self._profiles:
            from kb.store.derivation import profile_from_json

            self._profiles[row] = profile_from_json(self._profiles_json[row])
        return self._profiles[row]

    def run(self, row: int) -> Run:
        """Return the whole run of a row."""
        if row not in self._runs:
            self._runs[row] = self._source.get(self.table.codes[row])
        return self._runs[row]

    def mol(self, smiles: str) -> Any:
        """Return the RDKit molecule of a SMILES, kept; None where it cannot be read."""
        if smiles not in self._mols:
            from rdkit import Chem

            self._mols[smiles] = Chem.MolFromSmiles(smiles) if smiles else None
        return self._mols[smiles]

    def rows_with_motif(self, smarts: str) -> NDArray[np.intp]:
        """Return the rows whose substrate (or another organic partner, with an index) holds the motif."""
        if smarts not in self._motif_rows:
            if self._motif_search is not None:
                self._motif_rows[smarts] = self._motif_search(smarts)
            else:
                self._motif_rows[smarts] = self._look_through(smarts)
        return self._motif_rows[smarts]

    @cached_property
    def modes(self) -> tuple[str, ...]:
        """Return the failure modes met in this view, sorted."""
        return tuple(sorted({mode for pairs in self.failures for mode, _ in pairs}))

    def failed_in(self, mode: str) -> NDArray[np.bool_]:
        """Return which rows failed in a mode (n)."""
        return np.array([any(m == mode for m, _ in pairs) for pairs in self.failures], dtype=bool)

    def _look_through(self, smarts: str) -> NDArray[np.intp]:
        from rdkit import Chem

        query = Chem.MolFromSmarts(smarts)
        if query is None:
            return np.zeros(0, dtype=np.intp)
        hits = {s: (m := self.mol(s)) is not None and m.HasSubstructMatch(query) for s in set(self.table.substrate)}
        return np.flatnonzero([hits[s] for s in self.table.substrate])

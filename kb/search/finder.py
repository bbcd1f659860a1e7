"""The one object that answers what is asked of a record: structures, transformations, words and conditions together.

It keeps the record in memory (`live.py`) and follows the book before each answer. Cheap conditions are
tried first, so that structures are compared only where everything else fits. A deadline, or a user who
stops, gives an honest partial answer (`complete` False): every run that is listed fits, others may too. For
that reason a `none_of` whose inside was not decided lists nothing rather than too much.
"""

from __future__ import annotations

import time
from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING

import numpy as np

from kb.progress import Progress
from kb.search.conditions import narrow_by_conditions
from kb.search.criteria import Criteria, Order
from kb.search.live import LiveRecord
from kb.search.result import FindItem, FindResult
from kb.store.searching import substrate_fingerprints
from kb.vocabulary import Role

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from kb.search.matching import Deadline
    from kb.search.motifs import MotifSearch
    from kb.search.part import Part
    from kb.store.store import Store


class Finder:
    """Search over one open book; threads may share it, each answer waits for the one before.

    Args:
        store: the book.
        threads: for graph matches; None = all cores.
    """

    def __init__(self, store: Store, threads: int | None = None) -> None:
        self.store = store
        self.live = LiveRecord(store, threads)
        self._motif_search: tuple[int, MotifSearch] | None = None
        self._substrates: _Substrates | None = None

    def find(
        self, criteria: Criteria, deadline_s: float | None = None, progress: Progress | None = None
    ) -> FindResult:
        """Return one page of the runs that fit.

        Args:
            criteria: what is asked.
            deadline_s: when to stop with what was found [s]; None = never.
            progress: told how far it is, asked whether to stop.

        Raises:
            QueryError: a part that cannot be searched; the sentence says which and why.
            IndexStale: the book's structures were encoded by another recipe.
        """
        began = time.perf_counter()
        with self.live.lock:
            self.live.follow()
            answer = _Answer(self.live, deadline_s, progress)
            rows = answer.ordered(answer.runs(criteria, self.live.columns.alive.copy()), criteria)
            first = (criteria.page - 1) * criteria.limit
            items = answer.items(rows[first : first + criteria.limit].tolist())
        return FindResult(
            total=len(rows),
            page=criteria.page,
            items=items,
            elapsed_ms=(time.perf_counter() - began) * 1000,
            complete=answer.complete,
            notes=tuple(dict.fromkeys((*answer.notes, *answer.why_partial()))),
        )

    def runs_with_motif(self, smarts: str, role: Role | None = None) -> frozenset[str]:
        """Return the codes of the standing runs in which a structure of the left side holds a motif.

        Args:
            smarts: the motif.
            role: only structures of that role; None = substrate and reagents, products left out.

        Raises:
            QueryError: the motif cannot be searched.
        """
        roles = [role] if role is not None else [Role.SUBSTRATE, Role.REAGENT]
        with self.live.lock:
            if not self.live.has_index:
                return self._motifs().codes(smarts, roles)
            self.live.follow()
            answer = _Answer(self.live, None, None)
            either = tuple(Criteria(substructure=smarts, role=one) for one in roles)
            mask = answer.runs(Criteria(any_of=either), self.live.columns.alive.copy())
            return frozenset(self.live.columns.codes[row] for row in np.flatnonzero(mask).tolist())

    def prepare_motifs(self, many: Iterable[str], progress: Progress | None = None) -> None:
        """Look for many motifs at once before each is asked for (`runs_with_motif`), which is many times as fast."""
        with self.live.lock:
            if not self.live.has_index:
                self._motifs().prepare(many, progress)

    def _motifs(self) -> MotifSearch:
        """Return the search for motifs at the book's present state."""
        from kb.search.motifs import MotifSearch

        version = self.store.data_version()
        if self._motif_search is None or self._motif_search[0] != version:
            made = MotifSearch(self.store.book, self.store.book.deriving.recipe)
            self._motif_search = (version, made)
        return self._motif_search[1]

    def tanimoto_of_runs(self, smiles: str | None, codes: Sequence[str]) -> NDArray[np.float64] | None:
        """Return the similarity of each run's substrate to a structure, in the order of the codes.

        Args:
            smiles: the structure; None = there is none to compare.
            codes: of standing runs.

        Returns:
            (n,) 0..1, NaN where a run has no substrate that could be encoded; None where `smiles` cannot be
            read.
        """
        from rdkit import Chem

        from kb.chem.fingerprint import pack_morgan, tanimoto_to_each

        mol = Chem.MolFromSmiles(smiles) if smiles else None
        if mol is None:
            return None
        substrates = self._substrates_now()
        scores = np.append(tanimoto_to_each(pack_morgan(mol), substrates.packed), np.nan)
        return scores[substrates.rows_of(codes)]

    def _substrates_now(self) -> _Substrates:
        """Return the fingerprints of the substrates at the book's present state."""
        version = self.store.data_version()
        if self._substrates is None or self._substrates.version != version:
            book = self.store.book
            self._substrates = _Substrates(version, *substrate_fingerprints(book, book.deriving.recipe))
        return self._substrates


class _Substrates:
    """Fingerprints of the distinct substrates, and which run has which.

    Args:
        version: of the book when they were read.
        places: (code, structure id) of runs. ids: of the fingerprints, ascending. packed: fingerprints.
    """

    def __init__(self, version: int, places: Sequence[tuple[str, int]], ids: Sequence[int], packed: bytes) -> None:
        self.version = version
        self.packed = packed
        row_of = {structure_id: row for row, structure_id in enumerate(ids)}
        self._row_of_code = {code: row_of[i] for code, i in places if i in row_of}
        self._rows: tuple[Sequence[str], NDArray[np.intp]] | None = None

    def rows_of(self, codes: Sequence[str]) -> NDArray[np.intp]:
        """Return the fingerprint of each run, -1 where there is none; kept for the sequence last asked about.

        A view asks with the same codes at every check; looking a hundred thousand of them up again would hold
        everybody else up.
        """
        if self._rows is None or self._rows[0] is not codes:
            found = self._row_of_code
            self._rows = (codes, np.fromiter((found.get(c, -1) for c in codes), np.intp, len(codes)))
        return self._rows[1]


class _Answer:
    """One question being answered."""

    def __init__(self, live: LiveRecord, deadline_s: float | None, progress: Progress | None) -> None:
        self.live = live
        self.complete = True
        self.notes: list[str] = []
        self._parts: list[Part] = []
        self._deadline_s = deadline_s
        self._progress = progress
        self._began = time.monotonic()
        self._deadline: Deadline | None = None

    def runs(self, criteria: Criteria, mask: NDArray[np.bool_]) -> NDArray[np.bool_]:
        """Return the rows of `mask` that satisfy the criteria, nested ones included."""
        if criteria.asks_for_facts:
            self.live.need_fresh_facts()
        parts = self._structure_parts(criteria)
        mask = narrow_by_conditions(criteria, mask, self.live, self.notes)
        nested = sorted(criteria.all_of, key=lambda inner: inner.asks_for_structure)
        for inner in nested:
            mask = self.runs(inner, mask)
        for part in parts:
            mask = part.narrow(mask, self.deadline)
            self.complete &= part.complete
        if criteria.any_of:
            either = np.zeros_like(mask)
            for inner in criteria.any_of:
                either |= self.runs(inner, mask)
            mask = either
        for inner in criteria.none_of:
            shown = len(self._parts)
            was_complete, self.complete = self.complete, True
            without = mask & ~self.runs(inner, mask)
            mask = without if self.complete else np.zeros_like(mask)
            self.complete &= was_complete
            del self._parts[shown:]  # what a run does not hold cannot be drawn
        return mask

    @property
    def deadline(self) -> Deadline:
        """Return when to stop, counted from the question."""
        if self._deadline is None:
            from kb.search.matching import Deadline

            left_s = None
            if self._deadline_s is not None:
                left_s = self._deadline_s - (time.monotonic() - self._began)
            self._deadline = Deadline(left_s, self._progress)
        return self._deadline

    def why_partial(self) -> tuple[str, ...]:
        """Return the sentence that says why the answer is partial; () for a whole one."""
        if self.complete:
            return ()
        if self.deadline.progress.cancelled():
            return ("The search was stopped: what is listed fits, other runs may too.",)
        if self.deadline.has_passed():
            return ("The search stopped at its deadline: what is listed fits, other runs may too.",)
        return ("Some structures were too tangled to compare in time: runs that hold them may fit too.",)

    def ordered(self, mask: NDArray[np.bool_], criteria: Criteria) -> NDArray[np.intp]:
        """Return the rows in the order asked for; ties by newest, then by code."""
        rows = np.flatnonzero(mask)
        columns = self.live.columns
        newest = (-columns.code_number[rows], -columns.date[rows])
        order = criteria.order
        if order is Order.CODE:
            keys: tuple[NDArray[np.int64] | NDArray[np.float32], ...] = (columns.code_number[rows],)
        elif order is Order.OLDEST:
            undated = columns.date[rows] == 0
            keys = (columns.code_number[rows], columns.date[rows], undated)
        else:
            scores = self._scores() if order is Order.BEST else None
            keys = newest if scores is None else (*newest, -scores[rows])
        return rows[np.lexsort(keys)]

    def items(self, rows: list[int]) -> tuple[FindItem, ...]:
        """Return some runs of the answer, with where they matched."""
        if self._parts:
            columns = self.live.columns
            ends = [np.searchsorted(columns.place_row, (row, row + 1)) for row in rows]
            shown = [int(i) for low, high in ends for i in columns.place_structure[low:high]]
            self.live.fetch_smiles(list(dict.fromkeys(shown)))
        return tuple(self._item(row) for row in rows)

    def _item(self, row: int) -> FindItem:
        matched = next((found for part in self._parts if (found := part.where(row)) is not None), None)
        scores = self._scores()
        return FindItem(
            run=self.live.columns.codes[row],
            score=round(float(scores[row]), 4) if scores is not None else None,
            matched=matched,
        )

    def _scores(self) -> NDArray[np.float32] | None:
        """Return the similarity of every run; None where none was asked for."""
        from kb.search.structures import SimilarPart

        similar = [part.scores() for part in self._parts if isinstance(part, SimilarPart)]
        if not similar:
            return None
        best: NDArray[np.float32] = np.maximum.reduce(similar)
        return best

    def _structure_parts(self, criteria: Criteria) -> list[Part]:
        own = (
            criteria.substructure,
            criteria.similar,
            criteria.exact,
            criteria.at_centre,
            criteria.transformation,
        )
        if all(part is None for part in own):
            return []
        from kb.search.asking import parts_of

        parts = parts_of(criteria, self.live, self.live.index(self._progress))
        self._parts += parts
        return parts


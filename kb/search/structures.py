"""Parts of a search that ask for a structure anywhere in a run: holding a query, being one, being similar to one."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from rdkit import Chem

from kb.chem.query import StructureQuery, find_match
from kb.search.columns import role_code
from kb.search.part import Part
from kb.search.result import MatchedAt
from kb.vocabulary import Role

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from kb.search.index import StructureIndex
    from kb.search.live import LiveRecord
    from kb.search.matching import Deadline


class SubstructurePart(Part):
    """A structure of the run holds the query."""

    def __init__(
        self, live: LiveRecord, index: StructureIndex, role: Role | None, query: StructureQuery
    ) -> None:
        super().__init__(live, index, role)
        self.query = query

    def narrow(self, mask: NDArray[np.bool_], deadline: Deadline) -> NDArray[np.bool_]:
        """Return the rows of `mask` that satisfy this part."""
        self.hits = self.structures_with(self.query, self.wanted_structures(mask, self.role), deadline)
        return self.runs_with(self.hits, mask, self.role)

    def atoms_in(self, structure: int) -> tuple[int, ...]:
        """Return the matched atoms in a structure that fits."""
        return find_match(self.query, self.index.molecules.get(structure)) or ()


class ExactPart(Part):
    """A structure of the run is the one asked for, as drawn or standardised."""

    def __init__(
        self,
        live: LiveRecord,
        index: StructureIndex,
        role: Role | None,
        drawings: tuple[Chem.Mol, ...],
        with_stereo: bool,
    ) -> None:
        super().__init__(live, index, role)
        self.drawings = drawings
        self.with_stereo = with_stereo

    def narrow(self, mask: NDArray[np.bool_], deadline: Deadline) -> NDArray[np.bool_]:
        """Return the rows of `mask` that satisfy this part."""
        for mol in self.drawings:
            self.hits[self.index.exact(mol, with_stereo=self.with_stereo)] = True
        return self.runs_with(self.hits, mask, self.role)

    def atoms_in(self, structure: int) -> tuple[int, ...]:
        """Return the matched atoms in a structure that fits: all of them."""
        return tuple(range(self.index.molecules.get(structure).GetNumAtoms()))


class SimilarPart(Part):
    """A structure of the run is similar enough to the one asked for."""

    def __init__(
        self, live: LiveRecord, index: StructureIndex, role: Role | None, mol: Chem.Mol, at_least: float
    ) -> None:
        super().__init__(live, index, role)
        self.mol = mol
        self.at_least = at_least
        self._scores: NDArray[np.float32] = np.zeros(0, np.float32)
        self._by_run: NDArray[np.float32] = np.zeros(0, np.float32)

    def narrow(self, mask: NDArray[np.bool_], deadline: Deadline) -> NDArray[np.bool_]:
        """Return the rows of `mask` that satisfy this part."""
        similar = self.index.similar(self.mol, limit=None, at_least=self.at_least)
        self._scores = np.zeros(len(self.index), np.float32)
        self._scores[similar.rows] = similar.scores
        self.hits[similar.rows] = True
        found = self.runs_with(self.hits, mask, self.role)
        columns, rows = self.live.columns, self.live.place_rows
        chosen = (rows >= 0) & self.hits[rows]
        if self.role is not None:
            chosen &= columns.place_role == role_code(self.role)
        self._by_run = np.zeros(len(columns), np.float32)
        np.maximum.at(self._by_run, columns.place_row[chosen], self._scores[rows[chosen]])
        return found

    def score(self, row: int) -> float | None:
        """Return the similarity of a run."""
        return float(self._by_run[row]) if row < len(self._by_run) else None

    def scores(self) -> NDArray[np.float32]:
        """Return the similarity of every run (n,), 0 where it does not fit."""
        return self._by_run

    def where(self, row: int) -> MatchedAt | None:
        """Return the most similar place of a run."""
        places = [p for p in self.places(row) if self.live.place_rows[p] >= 0]
        if not places or not self._by_run[row]:
            return None
        return self.matched(max(places, key=lambda p: self._scores[self.live.place_rows[p]]), ())

"""A structure part of a search: what narrows a mask of runs by the structures that stand in them.

Structures stand in runs at places (`RunColumns.place_*`); a run fits when one place of the right role does. A part
looks only at structures that the mask still needs, and can say afterwards where it matched in one run.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from typing import TYPE_CHECKING

import numpy as np

from kb.search.columns import ROLES, role_code
from kb.search.result import MatchedAt
from kb.vocabulary import Role

if TYPE_CHECKING:
    from collections.abc import Iterator

    from numpy.typing import NDArray

    from kb.chem.query import StructureQuery
    from kb.search.index import StructureIndex
    from kb.search.live import LiveRecord
    from kb.search.matching import Deadline


class Part(ABC):
    """One structure question.

    Args:
        live: the record, its index loaded.
        index: the structure index.
        role: role that the structure must have; None = any.

    Attributes:
        complete: everything was decided.
    """

    def __init__(self, live: LiveRecord, index: StructureIndex, role: Role | None) -> None:
        self.live = live
        self.index = index
        self.role = role
        self.complete = True
        self.hits: NDArray[np.bool_] = np.zeros(len(index), bool)

    @abstractmethod
    def narrow(self, mask: NDArray[np.bool_], deadline: Deadline) -> NDArray[np.bool_]:
        """Return the rows of `mask` that satisfy this part."""

    def score(self, row: int) -> float | None:
        """Return the similarity of a run; None where this part has none."""
        return None

    def where(self, row: int) -> MatchedAt | None:
        """Return where this part sits in a run that fits; None where it does not."""
        for place in self.places(row):
            structure = int(self.live.place_rows[place])
            if structure >= 0 and self.hits[structure]:
                return self.matched(place, self.atoms_in(structure))
        return None

    def atoms_in(self, structure: int) -> tuple[int, ...]:
        """Return the matched atoms in a structure that fits."""
        return ()

    def places(self, row: int) -> Iterator[int]:
        """Yield the places of a run that have the right role, substrate first."""
        columns = self.live.columns
        low, high = np.searchsorted(columns.place_row, (row, row + 1))
        found = [p for p in range(low, high) if self.role is None or columns.place_role[p] == role_code(self.role)]
        substrate = role_code(Role.SUBSTRATE)
        return iter(sorted(found, key=lambda p: (columns.place_role[p] != substrate, p)))

    def matched(self, place: int, atoms: tuple[int, ...]) -> MatchedAt:
        """Return a place as the answer shows it."""
        columns = self.live.columns
        structure_id = int(columns.place_structure[place])
        return MatchedAt(
            component=int(columns.place_position[place]),
            role=ROLES[columns.place_role[place]],
            smiles=self.live.smiles(structure_id),
            atoms=atoms,
        )

    def wanted_structures(self, mask: NDArray[np.bool_], role: Role | None) -> NDArray[np.bool_]:
        """Return which structures stand in a run of the mask in that role (n structures)."""
        columns = self.live.columns
        chosen = mask[columns.place_row]
        if role is not None:
            chosen &= columns.place_role == role_code(role)
        rows = self.live.place_rows[chosen]
        wanted = np.zeros(len(self.index), bool)
        wanted[rows[rows >= 0]] = True
        return wanted

    def runs_with(
        self, hits: NDArray[np.bool_], mask: NDArray[np.bool_], role: Role | None
    ) -> NDArray[np.bool_]:
        """Return the rows of `mask` in which a hit stands in that role."""
        columns = self.live.columns
        rows = self.live.place_rows
        chosen = (rows >= 0) & hits[rows]
        if role is not None:
            chosen &= columns.place_role == role_code(role)
        found = np.zeros(len(columns), bool)
        found[columns.place_row[chosen]] = True
        return found & mask

    def structures_with(
        self, query: StructureQuery, wanted: NDArray[np.bool_], deadline: Deadline
    ) -> NDArray[np.bool_]:
        """Return which of the wanted structures hold a query (n structures)."""
        matched = self.index.substructure(query, only=wanted, deadline=deadline)
        self.complete &= matched.complete
        hits = np.zeros(len(self.index), bool)
        hits[matched.rows] = True
        return hits

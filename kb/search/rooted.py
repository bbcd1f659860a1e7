"""Parts of a search that ask what is at the reacting centre: an environment there, or what changed there.

The centre of a run is an atom of its substrate, counted in the substrate's canonical SMILES as the derived
facts have it; matches are made in that molecule, so that numbers need no translation.
"""

from __future__ import annotations

from functools import lru_cache
from typing import TYPE_CHECKING

import numpy as np
from rdkit import Chem

from kb.chem.query import ROOT_MAP, StructureQuery, find_match, parse_query
from kb.search.columns import leaving_code, role_code
from kb.search.part import Part
from kb.search.result import MatchedAt
from kb.search.transformation import Transformation, product_holds
from kb.vocabulary import LeavingGroup, Role

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from kb.search.index import StructureIndex
    from kb.search.live import LiveRecord
    from kb.search.matching import Deadline


class CentrePart(Part):
    """The substrate holds the query with its root at the reacting centre."""

    def __init__(self, live: LiveRecord, index: StructureIndex, query: StructureQuery) -> None:
        super().__init__(live, index, Role.SUBSTRATE)
        self.query = query
        self._found: dict[int, tuple[int, ...]] = {}

    def narrow(self, mask: NDArray[np.bool_], deadline: Deadline) -> NDArray[np.bool_]:
        """Return the rows of `mask` that satisfy this part."""
        columns = self.live.columns
        mask = mask & (columns.centre_atom >= 0)
        rows, _ = self.index.screen(self.query, self.wanted_structures(mask, Role.SUBSTRATE))
        possible = np.zeros(len(self.index), bool)
        possible[rows] = True
        known: dict[tuple[str, int], tuple[int, ...] | None] = {}
        found = np.zeros(len(columns), bool)
        for row in np.flatnonzero(self.runs_with(possible, mask, Role.SUBSTRATE)).tolist():
            if deadline.has_passed():
                self.complete = False
                break
            key = (columns.substrates[row] or "", int(columns.centre_atom[row]))
            if key not in known:
                known[key] = self._match(*key, deadline)
            atoms = known[key]
            if atoms is not None and self.accepts(row, atoms):
                found[row] = True
                self._found[row] = atoms
        return found

    def accepts(self, row: int, atoms: tuple[int, ...]) -> bool:
        """Return whether a run whose substrate matches fits in everything else too."""
        return True

    def where(self, row: int) -> MatchedAt | None:
        """Return where this part sits in a run that fits; atoms are counted in the substrate's canonical SMILES."""
        if row not in self._found:
            return None
        columns = self.live.columns
        place = next(self.places(row), None)
        position = int(columns.place_position[place]) if place is not None else 0
        return MatchedAt(
            component=position,
            role=str(Role.SUBSTRATE),
            smiles=columns.substrates[row] or "",
            atoms=self._found[row],
        )

    def _match(self, smiles: str, centre: int, deadline: Deadline) -> tuple[int, ...] | None:
        mol = _molecule(smiles)
        if mol is None or centre >= mol.GetNumAtoms():
            return None
        try:
            return find_match(self.query, mol, root_atom=centre, deadline_at=deadline.at)
        except TimeoutError:
            self.complete = False
            return None


class TransformationPart(CentrePart):
    """What changed at the centre is what the transformation says."""

    def __init__(self, live: LiveRecord, index: StructureIndex, transformation: Transformation) -> None:
        super().__init__(live, index, transformation.left or _any_centre())
        self.transformation = transformation
        self._products: NDArray[np.bool_] = np.zeros(len(index), bool)

    def narrow(self, mask: NDArray[np.bool_], deadline: Deadline) -> NDArray[np.bool_]:
        """Return the rows of `mask` that satisfy this part."""
        columns = self.live.columns
        groups = self.transformation.leaving_groups
        if groups is not None:
            codes = [leaving_code(LeavingGroup(group)) for group in sorted(groups)]
            mask = mask & np.isin(columns.leaving_group, codes)
        if self.transformation.right:
            wanted = self.wanted_structures(mask, Role.PRODUCT)
            for right in self.transformation.right:
                self._products |= self.structures_with(right, wanted, deadline)
            mask = self.runs_with(self._products, mask, Role.PRODUCT)
        return super().narrow(mask, deadline)

    def accepts(self, row: int, atoms: tuple[int, ...]) -> bool:
        """Return whether a product holds the right side where the centre went."""
        if not self.transformation.right:
            return True
        columns = self.live.columns
        substrate = _molecule(columns.substrates[row] or "")
        if substrate is None:
            return False
        low, high = np.searchsorted(columns.place_row, (row, row + 1))
        for place in range(low, high):
            structure = int(self.live.place_rows[place])
            if columns.place_role[place] != role_code(Role.PRODUCT) or structure < 0:
                continue
            if self._products[structure] and product_holds(
                self.transformation,
                substrate,
                int(columns.centre_atom[row]),
                self.index.molecules.get(structure),
            ):
                return True
        return False


@lru_cache(maxsize=4096)
def _molecule(smiles: str) -> Chem.Mol | None:
    return Chem.MolFromSmiles(smiles) if smiles else None


def _any_centre() -> StructureQuery:
    return parse_query(f"[*:{ROOT_MAP}]")

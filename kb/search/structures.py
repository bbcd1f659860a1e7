"""Structure parts of a search as masks over the runs, and where in a page's runs they sit.

Each part (substructure, exact, similar, at the centre, transformation) is a `Part`: it narrows a mask of
runs by looking only at structures that the mask still needs, and can say afterwards where it matched in one
run. Structures stand in runs at places (`RunColumns.place_*`); a run fits when one place of the right role
does.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from functools import lru_cache
from typing import TYPE_CHECKING

import numpy as np
from rdkit import Chem

from kb.chem.query import ROOT_MAP, StructureQuery, find_match, parse_query, query_of_fragment
from kb.chem.structure import standardise
from kb.errors import QueryError, StructureError
from kb.search.columns import ROLES, leaving_code, role_code
from kb.search.result import MatchedAt
from kb.search.transformation import Transformation, parse_transformation, product_holds
from kb.vocabulary import LeavingGroup, Role

if TYPE_CHECKING:
    from collections.abc import Iterator

    from numpy.typing import NDArray

    from kb.search.criteria import Criteria
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
            smiles=self.live.smiles([structure_id])[structure_id],
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

    def _structures_with(
        self, query: StructureQuery, wanted: NDArray[np.bool_], deadline: Deadline
    ) -> NDArray[np.bool_]:
        matched = self.index.substructure(query, only=wanted, deadline=deadline)
        self.complete &= matched.complete
        hits = np.zeros(len(self.index), bool)
        hits[matched.rows] = True
        return hits


class SubstructurePart(Part):
    """A structure of the run holds the query."""

    def __init__(
        self, live: LiveRecord, index: StructureIndex, role: Role | None, query: StructureQuery
    ) -> None:
        super().__init__(live, index, role)
        self.query = query

    def narrow(self, mask: NDArray[np.bool_], deadline: Deadline) -> NDArray[np.bool_]:
        """Return the rows of `mask` that satisfy this part."""
        self.hits = self._structures_with(self.query, self.wanted_structures(mask, self.role), deadline)
        return self.runs_with(self.hits, mask, self.role)

    def atoms_in(self, structure: int) -> tuple[int, ...]:
        """Return the matched atoms in a structure that fits."""
        return find_match(self.query, self.index.molecules.get(structure)) or ()


class ExactPart(Part):
    """A structure of the run is the one asked for."""

    def __init__(
        self, live: LiveRecord, index: StructureIndex, role: Role | None, mol: Chem.Mol, with_stereo: bool
    ) -> None:
        super().__init__(live, index, role)
        self.mol = mol
        self.with_stereo = with_stereo

    def narrow(self, mask: NDArray[np.bool_], deadline: Deadline) -> NDArray[np.bool_]:
        """Return the rows of `mask` that satisfy this part."""
        self.hits[self.index.exact(self.mol, with_stereo=self.with_stereo)] = True
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
                self._products |= self._structures_with(right, wanted, deadline)
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


def parts_of(criteria: Criteria, live: LiveRecord, index: StructureIndex) -> list[Part]:
    """Return the structure parts of criteria, nested ones left out, cheapest first.

    Raises:
        QueryError: a part that cannot be searched.
    """
    parts: list[Part] = []
    role = criteria.role
    with_stereo = not criteria.ignore_stereo
    if criteria.exact is not None:
        parts.append(ExactPart(live, index, role, _structure(criteria.exact), with_stereo))
    if criteria.similar is not None:
        parts.append(SimilarPart(live, index, role, _structure(criteria.similar), criteria.at_least))
    if criteria.substructure is not None:
        query = parse_query(criteria.substructure, ignore_stereo=criteria.ignore_stereo)
        parts.append(SubstructurePart(live, index, role, query))
    if criteria.transformation is not None:
        parts.append(TransformationPart(live, index, parse_transformation(criteria.transformation)))
    if criteria.at_centre is not None:
        query = parse_query(criteria.at_centre, ignore_stereo=criteria.ignore_stereo)
        parts.append(CentrePart(live, index, query if query.root is not None else _rooted_at_first(query)))
    return parts


@lru_cache(maxsize=4096)
def _molecule(smiles: str) -> Chem.Mol | None:
    return Chem.MolFromSmiles(smiles) if smiles else None


def _structure(text: str) -> Chem.Mol:
    """Return the standardised structure that is asked for."""
    try:
        return standardise(text).mol
    except StructureError as problem:
        raise QueryError(problem.message, problem.hint, problem.value) from problem


def _rooted_at_first(query: StructureQuery) -> StructureQuery:
    mol = Chem.RWMol(query.mol)
    mol.GetAtomWithIdx(0).SetAtomMapNum(ROOT_MAP)
    rooted = query_of_fragment(mol.GetMol(), query.text)
    return StructureQuery(
        text=query.text, mol=rooted.mol, uses_stereo=query.uses_stereo, root=0, is_loose=query.is_loose
    )


def _any_centre() -> StructureQuery:
    return parse_query(f"[*:{ROOT_MAP}]")

"""A view of the record that outlives the program: what a check reads of a book, as it is kept in the cache folder.

It owns what is kept and how a view is made of it again; which state of which book it belongs to is the caller's key.
Columns, screens and fingerprints are kept; whole runs and molecules are not, they are read from the book when a check
comes to need some. A view made of this answers as one that was read from the store does (a test compares them).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from rdkit import Chem

from kb.assess.record_view import RecordView
from kb.assess.table import FactTable
from kb.chem.fingerprint import pack_morgan, tanimoto_to_each
from kb.chem.query import find_match, parse_query
from kb.chem.screens_keys import MORGAN_BITS
from kb.record.run import Run
from kb.search.screening import Screens, is_of_this_revision

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from kb.store.failings import Failings
    from kb.store.glance import Glance


@dataclass(frozen=True, slots=True, kw_only=True)
class KeptView:
    """What a check reads of a book with n standing runs and m structures on their left sides.

    Attributes:
        table: facts and outcomes (n).
        failures: (mode, motif) pairs of each run (n).
        run_keys: how the book calls each run (n) int64.
        structure_ids: how the book calls each structure (m) int64; screens: theirs (m).
        morgan: fingerprints of those structures (m), packed one behind the other.
        substrate: which structure is the substrate of each run (n) int32, -1 = none.
        place_structure, place_row: which structure stands on the left side of which run (places) int32.
    """

    table: FactTable
    failures: Sequence[Failings]
    run_keys: NDArray[np.int64]
    structure_ids: NDArray[np.int64]
    screens: Screens
    morgan: bytes
    substrate: NDArray[np.int32]
    place_structure: NDArray[np.int32]
    place_row: NDArray[np.int32]

    def view(self, look: Glance) -> RecordView:
        """Return the view; runs and molecules come from a look at the book in the state that this was made of."""
        return RecordView(self.table, None, self.failures, _Runs(self, look), _Motifs(self, look).rows)

    def tanimoto(self, smiles: str | None) -> NDArray[np.float64] | None:
        """Return the similarity of each run's substrate to a structure (n), as `Finder.tanimoto_of_runs` does."""
        mol = Chem.MolFromSmiles(smiles) if smiles else None
        if mol is None:
            return None
        scores = np.append(tanimoto_to_each(pack_morgan(mol), self.morgan), np.nan)
        return np.asarray(scores[self.substrate], np.float64)


def keepable_view(view: RecordView, look: Glance, recipe: str) -> KeptView | None:
    """Return what to keep of a view, or None where view and look are not of the same runs and recipe.

    Args:
        view: of all standing runs, as read from the store.
        look: at the same book.
        recipe: what must have encoded its structures.
    """
    keys, codes = look.standing_runs()
    if tuple(codes) != view.table.codes:
        return None
    ids, augmented, morgan = look.left_structures(recipe)
    if ids is None or len(morgan) != len(ids) * MORGAN_BITS // 8 or not is_of_this_revision(augmented):
        return None
    run_keys, structure_ids = np.array(keys, np.int64), np.array(ids, np.int64)
    screens = Screens(len(ids))
    screens.append(augmented)
    of_run, of_structure, is_substrate = look.left_places()
    row, number = np.searchsorted(run_keys, of_run), np.searchsorted(structure_ids, of_structure)
    stands = (run_keys[np.minimum(row, len(keys) - 1)] == of_run) if keys else np.zeros(len(row), bool)
    known = (structure_ids[np.minimum(number, len(ids) - 1)] == of_structure) if ids else np.zeros(len(row), bool)
    good = stands & known
    substrate = np.full(len(keys), -1, np.int32)
    chosen = good & np.array(is_substrate, bool)
    substrate[row[chosen]] = number[chosen]
    return KeptView(
        table=view.table,
        failures=view.failures,
        run_keys=run_keys,
        structure_ids=structure_ids,
        screens=screens,
        morgan=morgan,
        substrate=substrate,
        place_structure=number[good].astype(np.int32),
        place_row=row[good].astype(np.int32),
    )


class _Runs:
    """Whole runs, out of the book."""

    def __init__(self, kept: KeptView, look: Glance) -> None:
        self._kept = kept
        self._look = look
        self._row_of: dict[str, int] = {}

    def get(self, code: str) -> Run:
        """Return the run of a code."""
        return self.many([code])[0]

    def many(self, codes: Sequence[str]) -> Sequence[Run]:
        """Return the runs of some codes."""
        if not self._row_of:
            self._row_of = {code: row for row, code in enumerate(self._kept.table.codes)}
        return self._look.runs([int(self._kept.run_keys[self._row_of[code]]) for code in codes])


class _Motifs:
    """Which runs hold a motif on their left side: screens first, then the molecules that they leave."""

    def __init__(self, kept: KeptView, look: Glance) -> None:
        self._kept = kept
        self._look = look

    def rows(self, smarts: str) -> NDArray[np.intp]:
        """Return the rows of the runs that hold a motif, ascending.

        Raises:
            QueryError: the motif cannot be searched.
        """
        kept, query = self._kept, parse_query(smarts)
        possible = kept.screens.rows_that_may_match(query.mol)
        molecules = self._look.molecules(kept.structure_ids[possible].tolist())
        holds = np.zeros(len(kept.structure_ids), bool)
        for number in possible.tolist():
            binary = molecules.get(int(kept.structure_ids[number]))
            if binary is not None and find_match(query, Chem.Mol(binary)) is not None:  # type: ignore[call-overload]
                holds[number] = True
        has = np.zeros(len(kept.table), bool)
        has[kept.place_row[holds[kept.place_structure]]] = True
        return np.flatnonzero(has)

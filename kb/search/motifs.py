"""Which runs hold a motif, without loading the index: for a check, which asks for a few motifs and ends.

Reading all molecules and fingerprints of a large book takes longer than a check may. Here only the screens are read,
once for each state of the book, and then the molecules that a motif's screen leaves; these are kept, since an audit
asks for many motifs and most of them leave the same molecules.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np

from kb.chem.query import parse_query
from kb.chem.screens_keys import KEY_UNRULY
from kb.errors import IndexStale
from kb.search.matching import MoleculeStore
from kb.search.screening import Screens, is_of_this_revision
from kb.store.searching import codes_with, molecules_of, screens_of

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from kb.store.session import OpenBook
    from kb.vocabulary import Role


class MotifSearch:
    """The screens of a book at one moment.

    Args:
        book: the book.
        recipe: what must have encoded the structures; "" = whatever did.

    Raises:
        IndexStale: a structure was encoded by another recipe.
    """

    def __init__(self, book: OpenBook, recipe: str) -> None:
        self._book = book
        ids, packed = screens_of(book, recipe)
        if packed and not is_of_this_revision(packed):
            raise IndexStale(
                "Structures in the book were encoded by another recipe.", "Rebuild them: `sidepath migrate`."
            )
        self._ids = np.array(ids, np.int64)
        self._screens = Screens(len(ids))
        self._screens.append(packed)
        self._molecules = MoleculeStore()
        self._held = np.full(len(ids), -1, np.int64)

    def codes(self, smarts: str, roles: Sequence[Role]) -> frozenset[str]:
        """Return the codes of the standing runs in which a structure of some role holds a motif.

        Raises:
            QueryError: the motif cannot be searched.
        """
        query = parse_query(smarts)
        possible = self._screens.rows_that_may_match(query.mol)
        held = self._hold(possible)
        possible, held = possible[held >= 0], held[held >= 0]
        unruly = self._screens.has_bit(KEY_UNRULY)[possible]
        order = np.argsort(held)  # the store wants its rows ascending
        matched = self._molecules.match(query, held[order], unruly=unruly[order])
        hits = possible[np.isin(held, matched.rows)]
        return frozenset(codes_with(self._book, self._ids[hits].tolist(), [str(role) for role in roles]))

    def _hold(self, rows: NDArray[np.int64]) -> NDArray[np.int64]:
        """Return where the molecules of some rows are held, after reading those that are not yet; -1 = gone since."""
        new = rows[self._held[rows] < 0]
        read = molecules_of(self._book, self._ids[new].tolist())
        new = new[np.isin(self._ids[new], list(read))]
        self._held[new] = np.arange(len(new)) + len(self._molecules)
        self._molecules.append([read[structure_id] for structure_id in self._ids[new].tolist()])
        return self._held[rows]

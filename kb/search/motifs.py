"""Which runs hold a motif, without loading the index: for a check, which asks for a few motifs and ends.

Reading all molecules and fingerprints of a large book takes longer than a check may. Here only the screens are read,
once for each state of the book, and then the molecules that a motif's screen leaves.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np
from rdkit import Chem

from kb.chem.query import find_match, parse_query
from kb.errors import IndexStale
from kb.search.screening import Screens, is_of_this_revision
from kb.store.searching import codes_with, molecules_of, screens_of

if TYPE_CHECKING:
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

    def codes(self, smarts: str, roles: Sequence[Role]) -> frozenset[str]:
        """Return the codes of the standing runs in which a structure of some role holds a motif.

        Raises:
            QueryError: the motif cannot be searched.
        """
        query = parse_query(smarts)
        possible = self._ids[self._screens.rows_that_may_match(query.mol)].tolist()
        hits = [
            structure_id
            for structure_id, binary in molecules_of(self._book, possible).items()
            if find_match(query, Chem.Mol(binary)) is not None  # type: ignore[call-overload]
        ]
        return frozenset(codes_with(self._book, hits, [str(role) for role in roles]))

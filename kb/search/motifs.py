"""Which runs hold a motif, without loading the index: for a check, which asks for a few motifs and ends.

Reading all molecules and fingerprints of a large book takes longer than a check may. Here only the screens are read,
once for each state of the book, and then the molecules that a motif's screen leaves. Whoever will ask for many motifs,
as an audit does, says so first (`prepare`): unpacking a molecule costs more than ten comparisons.
"""

from __future__ import annotations

import contextlib
from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING

import numpy as np
from rdkit import Chem

from kb.chem.query import match_parameters, parse_query
from kb.chem.screens_keys import KEY_UNRULY
from kb.errors import IndexStale, QueryError
from kb.progress import Progress, Silent
from kb.search.matching import MoleculeStore
from kb.search.screening import Screens, is_of_this_revision
from kb.store.searching import codes_of_places, codes_with, molecules_of, screens_of

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from kb.store.session import OpenBook
    from kb.vocabulary import Role

_AT_ONCE = 2000
"""Molecules unpacked between two looks at the progress."""


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
        self._prepared: dict[str, NDArray[np.int64]] = {}
        self._codes_of: dict[tuple[str, ...], tuple[NDArray[np.int64], NDArray[np.object_]]] = {}
        self._held = np.full(len(ids), -1, np.int64)

    def codes(self, smarts: str, roles: Sequence[Role]) -> frozenset[str]:
        """Return the codes of the standing runs in which a structure of some role holds a motif.

        Raises:
            QueryError: the motif cannot be searched.
        """
        hits = self._prepared.get(smarts)
        if hits is None:
            return frozenset(codes_with(self._book, self._search(smarts), [str(role) for role in roles]))
        ids, codes = self._places(tuple(map(str, roles)))
        return frozenset(codes[np.isin(ids, hits)].tolist())

    def prepare(self, many: Iterable[str], progress: Progress | None = None) -> None:
        """Search many motifs at once, so that each molecule is unpacked once for all of them; stops where told.

        Motifs that cannot be searched, and loose ones, which may take long on one molecule, are left for `codes`.
        """
        progress = progress or Silent()
        queries = []
        for smarts in dict.fromkeys(many):
            with contextlib.suppress(QueryError):
                query = parse_query(smarts)
                if smarts not in self._prepared and not query.is_loose:
                    queries.append((smarts, query))
        possible = [self._screens.rows_that_may_match(query.mol) for _, query in queries]
        asked_of: dict[int, list[int]] = {}
        for number, rows in enumerate(possible):
            for row in rows.tolist():
                asked_of.setdefault(row, []).append(number)
        parameters = [match_parameters(query) for _, query in queries]
        hits: list[list[int]] = [[] for _ in queries]
        rows_left = sorted(asked_of)
        for start in range(0, len(rows_left), _AT_ONCE):
            if progress.cancelled():
                return
            progress.advance(start, len(rows_left), "structures looked through")
            part = rows_left[start : start + _AT_ONCE]
            binaries = molecules_of(self._book, self._ids[part].tolist())
            for row, structure_id in zip(part, self._ids[part].tolist(), strict=True):
                if structure_id not in binaries:
                    continue
                mol = Chem.Mol(binaries[structure_id])  # type: ignore[call-overload]
                for number in asked_of[row]:
                    if mol.HasSubstructMatch(queries[number][1].mol, parameters[number]):
                        hits[number].append(structure_id)
        for (smarts, _), found in zip(queries, hits, strict=True):
            self._prepared[smarts] = np.array(found, np.int64)

    def _search(self, smarts: str) -> list[int]:
        """Return the ids of the structures that hold one motif."""
        query = parse_query(smarts)
        possible = self._screens.rows_that_may_match(query.mol)
        held = self._hold(possible)
        possible, held = possible[held >= 0], held[held >= 0]
        unruly = self._screens.has_bit(KEY_UNRULY)[possible]
        order = np.argsort(held)  # the store wants its rows ascending
        matched = self._molecules.match(query, held[order], unruly=unruly[order])
        return [int(i) for i in self._ids[possible[np.isin(held, matched.rows)]]]

    def _places(self, roles: tuple[str, ...]) -> tuple[NDArray[np.int64], NDArray[np.object_]]:
        """Return structure ids and codes wherever a structure has one of some roles."""
        if roles not in self._codes_of:
            places = codes_of_places(self._book, roles)
            codes = np.empty(len(places), dtype=object)
            codes[:] = [code for _, code in places]
            self._codes_of[roles] = (np.array([i for i, _ in places], np.int64), codes)
        return self._codes_of[roles]

    def _hold(self, rows: NDArray[np.int64]) -> NDArray[np.int64]:
        """Return where the molecules of some rows are held, after reading those that are not yet; -1 = gone since."""
        new = rows[self._held[rows] < 0]
        read = molecules_of(self._book, self._ids[new].tolist())
        new = new[np.isin(self._ids[new], list(read))]
        self._held[new] = np.arange(len(new)) + len(self._molecules)
        self._molecules.append([read[structure_id] for structure_id in self._ids[new].tolist()])
        return self._held[rows]

"""The structure index: screens, fingerprints and molecules in memory, and the searches over them.

It knows structures by the book's `structure_id` and nothing of runs. Screens drop what cannot match, RDKit
decides on the rest; a screen never decides alone, except that it says no. It refuses blobs of another
recipe (`IndexStale`): `SCREEN_RECIPE` is what they must have been made by.

Memory beside the stored molecules: two sets of bit planes (`AUGMENTED_BITS`, `MORGAN_BITS`), an id of 8 bytes and a
bit count of 2 for each structure, 778 bytes in all.
"""

from __future__ import annotations

import threading
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from rdkit import Chem

from kb.chem.fingerprint import bits_of, pack_morgan
from kb.chem.query import StructureQuery
from kb.chem.screens import SCREEN_RECIPE, encode_mol
from kb.chem.screens_keys import AUGMENTED_BITS, KEY_UNRULY, MORGAN_BITS
from kb.errors import IndexStale
from kb.search.matching import Deadline, Matched, MoleculeStore
from kb.search.planes import BitPlanes, count_planes, counts_of, popcounts, rows_of
from kb.search.screening import Screens, is_of_this_revision

if TYPE_CHECKING:
    from numpy.typing import NDArray


@dataclass(frozen=True, slots=True)
class Similar:
    """Rows by falling similarity (k,) int64, and the Tanimoto coefficients (k,) float32."""

    rows: NDArray[np.int64]
    scores: NDArray[np.float32]


class StructureIndex:
    """All structures of a book, searchable.

    Args:
        reserve: structures to make room for at once.
        threads: for graph matches; None = all cores.
    """

    recipe = SCREEN_RECIPE

    def __init__(self, *, reserve: int = 0, threads: int | None = None) -> None:
        self.molecules = MoleculeStore(threads)
        self.screens = Screens(reserve)
        self._morgan = BitPlanes(MORGAN_BITS, reserve)
        self._ids = np.zeros(max(reserve, 1), np.int64)
        self._bit_counts = np.zeros(max(reserve, 1), np.uint16)
        self._is_ascending = True
        self._last_id = -1
        self._row_of: dict[int, int] = {}
        self._lock = threading.RLock()

    def __len__(self) -> int:
        return self.screens.n_rows

    @property
    def ids(self) -> NDArray[np.int64]:
        """Return the structure id of every row (n,) int64."""
        return self._ids[: len(self)]

    @property
    def nbytes(self) -> int:
        """Return the bytes that the index holds beyond the stored molecules."""
        return self.screens.nbytes + self._morgan.nbytes + len(self) * 10

    # Filling

    def append(
        self,
        ids: Sequence[int],
        binaries: Sequence[bytes],
        augmented: Sequence[bytes],
        morgan: Sequence[bytes],
    ) -> None:
        """Add structures by their blobs, in order.

        Raises:
            IndexStale: a blob has not the width or the revision of this recipe.
        """
        n = len(ids)
        if not n:
            return
        packed = [b"".join(part) for part in (augmented, morgan)]
        widths = (AUGMENTED_BITS, MORGAN_BITS)
        has_width = all(len(p) == n * width // 8 for p, width in zip(packed, widths, strict=True))
        if not has_width or not is_of_this_revision(packed[0]):
            raise IndexStale(
                "Structures in the book were encoded by another recipe.", "Rebuild them: `sidepath migrate`."
            )
        with self._lock:
            start = len(self)
            self._make_room(start + n)
            self._ids[start : start + n] = ids
            self._bit_counts[start : start + n] = popcounts(packed[1], MORGAN_BITS // 8)
            self.molecules.append(binaries)
            self._morgan.append(packed[1])
            self.screens.append(packed[0])
            added = self._ids[start : start + n]
            self._is_ascending &= int(added[0]) > self._last_id and bool((np.diff(added) > 0).all())
            self._last_id = int(added[-1])
            if not self._is_ascending:
                self._row_of = dict(zip(self.ids.tolist(), range(len(self)), strict=True))

    def append_smiles(self, ids: Sequence[int], smiles: Sequence[str]) -> None:
        """Encode and add structures that are in no book (tests, benchmarks)."""
        blobs = [encode_mol(Chem.MolFromSmiles(text)) for text in smiles]
        self.append(
            ids,
            [b.mol_binary for b in blobs],
            [b.augmented for b in blobs],
            [b.morgan for b in blobs],
        )

    def rows_of_ids(self, ids: NDArray[np.int64]) -> NDArray[np.int64]:
        """Return the row of every id, -1 where the index does not hold it."""
        if not self._is_ascending:
            return np.array([self._row_of.get(i, -1) for i in ids.tolist()], np.int64)
        if not len(self):
            return np.full(len(ids), -1, np.int64)
        at = np.minimum(np.searchsorted(self.ids, ids), len(self) - 1)
        return np.where(self.ids[at] == ids, at, -1)

    # Searching

    def screen(
        self, query: StructureQuery, only: NDArray[np.bool_] | None = None
    ) -> tuple[NDArray[np.int64], NDArray[np.bool_]]:
        """Return the rows that may match, ascending, and which of them are unruly.

        Args:
            query: the query.
            only: rows to consider (n,); None = all.
        """
        with self._lock:
            rows = self.screens.rows_that_may_match(query.mol, only)
            if not query.is_loose:
                return rows, np.zeros(len(rows), bool)
            return rows, self.screens.has_bit(KEY_UNRULY)[rows]

    def substructure(
        self,
        query: StructureQuery,
        *,
        only: NDArray[np.bool_] | None = None,
        deadline: Deadline | None = None,
    ) -> Matched:
        """Return the rows that hold a query, ascending.

        Args:
            query: the query.
            only: rows to consider (n,); None = all.
            deadline: when to stop with what was found so far.
        """
        rows, unruly = self.screen(query, only)
        return self.molecules.match(query, rows, unruly=unruly, deadline=deadline)

    def similar(
        self,
        mol: Chem.Mol,
        *,
        limit: int | None = 50,
        at_least: float = 0.0,
        only: NDArray[np.bool_] | None = None,
    ) -> Similar:
        """Return the most similar rows (Tanimoto over Morgan bits), ties by row.

        Args:
            mol: what to compare with.
            limit: most rows; None = all that are similar enough.
            at_least: lowest similarity, 0..1; rows that share nothing are never reported.
            only: rows to consider (n,); None = all.
        """
        scores = self.scores(mol)
        if only is not None:
            scores[: len(only)][~only] = 0
            scores[len(only) :] = 0
        floor = max(_floor_of_best(scores, limit), np.float32(at_least) - np.float32(1e-6))
        rows = np.flatnonzero((scores >= floor) & (scores > 0))
        rows = rows[np.argsort(-scores[rows], kind="stable")][:limit]
        return Similar(rows, scores[rows])

    def scores(self, mol: Chem.Mol) -> NDArray[np.float32]:
        """Return the Tanimoto similarity of every row to a molecule (n,) float32, 0..1.

        Bits in common are added up plane by plane for 64 rows at a time, which costs less for all rows than it
        would to bound them by their bit counts first.
        """
        with self._lock:
            wanted = bits_of(pack_morgan(mol))
            n = len(self)
            shared = counts_of(count_planes([self._morgan.plane(int(bit)) for bit in wanted]), n)
            union = self._bit_counts[:n] + np.uint16(len(wanted)) - shared
        return np.divide(shared, union, out=np.zeros(n, np.float32), where=union > 0, dtype=np.float32)

    def exact(self, mol: Chem.Mol, *, with_stereo: bool = True) -> NDArray[np.int64]:
        """Return the rows that are this structure, ascending.

        Args:
            mol: the structure.
            with_stereo: False = stereo marks do not count, on either side.
        """
        smiles = _identity(mol, with_stereo)
        blobs = encode_mol(mol)
        with self._lock:
            words = self._morgan.all_of(bits_of(blobs.morgan)) & self.screens.all_of(bits_of(blobs.augmented))
            rows = rows_of(words, len(self))
            rows = rows[self._bit_counts[rows] == len(bits_of(blobs.morgan))]
        same = [row for row in rows.tolist() if _identity(self.molecules.get(row), with_stereo) == smiles]
        return np.array(same, np.int64)

    def _make_room(self, n: int) -> None:
        if n > len(self._ids):
            room = max(n, len(self._ids) + len(self._ids) // 8)
            self._ids = np.concatenate((self._ids, np.zeros(room - len(self._ids), np.int64)))
            self._bit_counts = np.concatenate(
                (self._bit_counts, np.zeros(room - len(self._bit_counts), np.uint16))
            )


def _identity(mol: Chem.Mol, with_stereo: bool) -> str:
    """Return canonical SMILES, atom maps left out, stereo only where it counts; isotopes always count."""
    mol = Chem.Mol(mol)
    for atom in mol.GetAtoms():
        atom.SetAtomMapNum(0)
    if not with_stereo:
        Chem.RemoveStereochemistry(mol)
    return str(Chem.MolToSmiles(mol))


_GROUP = 64


def _floor_of_best(scores: NDArray[np.float32], limit: int | None) -> np.float32:
    """Return a score that at least `limit` rows reach, and few more: the limit-th best of group maxima."""
    groups = len(scores) // _GROUP
    if limit is None or limit < 1 or groups <= limit:
        return np.float32(0)
    best = scores[: groups * _GROUP].reshape(groups, _GROUP).max(axis=1)
    return np.float32(np.partition(best, groups - limit)[groups - limit])

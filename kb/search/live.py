"""The record in memory: columns of the runs and the structure index, kept in step with the book.

Asked before every answer, it compares the book's counter of changes with the one it last saw and reads only
what is new, whoever wrote it: runs by their history, structures by their ids, which only grow. Structures
are read when a search first needs them. It refuses structures of another recipe (`IndexStale`).
"""

from __future__ import annotations

import threading
from typing import TYPE_CHECKING

import numpy as np

from kb.errors import Cancelled, IndexStale
from kb.progress import Progress, Silent
from kb.search.columns import RunColumns
from kb.store.searching import iter_blobs, last_structure_id, read_runs, smiles_of, vocabulary

if TYPE_CHECKING:
    from collections.abc import Sequence

    from numpy.typing import NDArray

    from kb.search.index import StructureIndex
    from kb.store.store import Store


class LiveRecord:
    """What a finder looks at.

    Args:
        store: the book.
        threads: for graph matches; None = all cores.

    Attributes:
        columns: the runs.
        lock: held while anything here changes or is read.
    """

    def __init__(self, store: Store, threads: int | None = None) -> None:
        self.store = store
        self.columns = RunColumns()
        self.lock = threading.RLock()
        self._threads = threads
        self._index: StructureIndex | None = None
        self._index_version = -1
        self._version = -1
        self._checked_version = -1
        self._tip: int | None = None
        self._words: tuple[int, list[str]] = (-1, [])
        self._smiles: dict[int, str] = {}
        self._place_rows: NDArray[np.int64] = np.zeros(0, np.int64)

    def follow(self) -> None:
        """Take in what changed in the book since the last call."""
        with self.lock:
            if self.store.data_version() == self._version:
                return
            batch = read_runs(self.store.book, self._tip)
            self.columns.take_in(batch)
            self._version, self._tip = batch.version, batch.tip

    def need_fresh_facts(self) -> None:
        """Refuse to answer from facts that another recipe made.

        Raises:
            IndexStale: some standing runs were read by another recipe, or not at all.
        """
        deriving = self.store.book.deriving
        if deriving.derive is None:
            return
        if self._checked_version != self._version:
            stale = self.columns.count_stale(deriving.recipe)
            if stale:
                raise IndexStale(f"Runs read by another recipe: {stale}.", "Rebuild them: `sidepath migrate`.")
            self._checked_version = self._version

    @property
    def has_index(self) -> bool:
        """Return whether the structures have been read."""
        return self._index is not None

    def index(self, progress: Progress | None = None) -> StructureIndex:
        """Return the structure index, complete for the runs in `columns`.

        Raises:
            IndexStale: structures were encoded by another recipe.
            Cancelled: the user stopped the first load; the next call starts where it ended.
        """
        progress = progress or Silent()
        with self.lock:
            if self._index is None:
                from kb.search.index import StructureIndex

                room = last_structure_id(self.store.book)
                self._index = StructureIndex(reserve=room, threads=self._threads)
            index = self._index
            if self._index_version != self._version:
                after = int(index.ids[-1]) if len(index) else 0
                recipe = self.store.book.deriving.recipe
                for ids, *blobs in iter_blobs(self.store.book, recipe, after):
                    if progress.cancelled():
                        raise Cancelled("Reading the structures was stopped.", "Search again to go on.")
                    index.append(ids, *blobs)
                    progress.advance(len(index), None, "structures read")
                self._index_version = self._version
                self._place_rows = index.rows_of_ids(self.columns.place_structure)
            return index

    @property
    def place_rows(self) -> NDArray[np.int64]:
        """Return the index row of every place, -1 where the structure could not be encoded."""
        return self._place_rows

    def vocabulary(self) -> list[str]:
        """Return every word that the record holds, ascending, read again when the book changed."""
        if self._words[0] != self._version:
            self._words = (self._version, sorted(vocabulary(self.store.book)))
        return self._words[1]

    def smiles(self, structure_id: int) -> str:
        """Return the SMILES of a structure; those of a page are best fetched together first."""
        if structure_id not in self._smiles:
            self.fetch_smiles([structure_id])
        return self._smiles[structure_id]

    def fetch_smiles(self, structure_ids: Sequence[int]) -> None:
        """Read the SMILES of some structures in one go, in place of those read before."""
        self._smiles = smiles_of(self.store.book, structure_ids)

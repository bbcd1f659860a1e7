"""The augmented screens of many structures, and what a query leaves of them.

It evaluates the tree of "all of" and "one of" that a query asks (`kb.chem.screens_ask`) over bit planes, rarest part
first, so that the planes of common bits are seldom reached. It decides nothing: what it leaves may match, what it drops
cannot.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from kb.chem.screens_ask import AllOf, Ask
from kb.chem.screens_keys import AUGMENTED_BITS, AUGMENTED_REVISION
from kb.chem.screens_query import ask_of
from kb.search.planes import BitPlanes, popcounts, rows_of, words_of

if TYPE_CHECKING:
    from numpy.typing import NDArray
    from rdkit import Chem

_SAMPLE_WORDS = 64
"""Words of a plane that are counted to judge how rare its bit is: the first 4096 structures."""


def is_of_this_revision(packed: bytes) -> bool:
    """Return whether every one of some screens carries the revision of this program."""
    return bool((np.frombuffer(packed, np.uint8)[1 :: AUGMENTED_BITS // 8] == AUGMENTED_REVISION).all())


class Screens(BitPlanes):
    """Augmented screens by bit.

    Args:
        reserve: structures to make room for at once.
    """

    def __init__(self, reserve: int = 0) -> None:
        super().__init__(AUGMENTED_BITS, reserve)
        self._counted_rows = -1
        self._rarity: NDArray[np.int64] = np.zeros(AUGMENTED_BITS, np.int64)

    def rows_that_may_match(self, query: Chem.Mol, only: NDArray[np.bool_] | None = None) -> NDArray[np.int64]:
        """Return the rows that a query leaves, ascending.

        Args:
            query: the query, rings perceived.
            only: rows to consider (n,), rows beyond it left out; None = all.
        """
        words = self.all_of(())
        if only is not None:
            words &= words_of(np.pad(only, (0, self.n_rows - len(only))))
        self._narrow(words, ask_of(query))
        return rows_of(words, self.n_rows)

    def has_bit(self, bit: int) -> NDArray[np.bool_]:
        """Return which rows have a bit (n,)."""
        mask = np.zeros(self.n_rows, bool)
        mask[rows_of(self.plane(bit), self.n_rows)] = True
        return mask

    def _narrow(self, words: NDArray[np.uint64], ask: Ask) -> None:
        """Clear in `words` the rows that do not have what is asked, rarest first."""
        if isinstance(ask, int):
            words &= self.plane(ask)
            return
        if isinstance(ask, AllOf):
            for part in sorted(ask.parts, key=self._weight):
                self._narrow(words, part)
                if not words.any():
                    return
            return
        either = np.zeros_like(words)
        for part in ask.parts:
            branch = words.copy()
            self._narrow(branch, part)
            either |= branch
        words &= either

    def _weight(self, ask: Ask) -> float:
        """Return about how many rows satisfy a part, from a sample of each plane."""
        if isinstance(ask, int):
            return float(self._sampled()[ask])
        if not ask.parts:
            return float("inf")
        if isinstance(ask, AllOf):
            return min(self._weight(part) for part in ask.parts)
        return sum(self._weight(part) for part in ask.parts)

    def _sampled(self) -> NDArray[np.int64]:
        """Return how many rows of a sample have each bit; counted anew when rows were added."""
        if self._counted_rows != self.n_rows and self.n_rows:
            sample = np.stack([self.plane(bit)[:_SAMPLE_WORDS] for bit in range(AUGMENTED_BITS)])
            self._rarity = popcounts(sample.tobytes(), sample.shape[1] * 8).astype(np.int64)
            self._counted_rows = self.n_rows
        return self._rarity

"""How alike two flasks are, by the structures of the reagents in them.

It owns the comparison of sets of reagents (`ConditionProfile.reagents`): each reagent is paired with the most similar
one of the other set, by Tanimoto similarity of Morgan counts (radius 2), and the mean of these is the likeness. Classes
and strengths are compared elsewhere (`kernel.py`); this part tells two sulfonyl fluorides, or DBU and MTBD, apart. A
reagent without a structure is like itself only.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from functools import cached_property, lru_cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

ONE_EMPTY = 0.4
"""Likeness of a flask with reagents to one in which none were written down: between alike and different; judgement."""


class Flasks:
    """The sets of reagents met in a book, each once."""

    def __init__(self, sets: Sequence[frozenset[str]]) -> None:
        """Hold the sets, in the order of their codes."""
        self.sets = tuple(sets)

    def likeness_to(self, mine: Iterable[str]) -> NDArray[np.float64]:
        """Return the likeness (number of sets) of each set to one, 0..1; equal sets give 1."""
        own = sorted(mine)
        counts = self._counts
        if not own:
            return np.where(counts == 0, 1.0, ONE_EMPTY)
        if not len(self._names):
            return np.full(len(counts), ONE_EMPTY)
        table = np.stack([self._likeness_of_one(name) for name in own])
        filled = counts > 0
        starts = self._starts[filled]
        members = table[:, self._members]
        best_of_mine = np.maximum.reduceat(members, starts, axis=1).sum(axis=0)
        best_of_theirs = np.add.reduceat(members.max(axis=0), starts)
        result = np.full(len(counts), ONE_EMPTY)
        result[filled] = (best_of_mine + best_of_theirs) / (len(own) + counts[filled])
        return result

    def _likeness_of_one(self, name: str) -> NDArray[np.float64]:
        """Return the Tanimoto coefficient of each name's counts to those of one, as RDKit reckons it (tested)."""
        postings = self._postings
        shared = np.zeros(len(self._names))
        mine = _counts_of(name)
        for bit, count in mine.items():
            if bit in postings.place:
                places, counts = postings.of(bit)
                shared[places] += np.minimum(counts, count)
        either = sum(mine.values()) + postings.totals - shared
        alike = np.divide(shared, either, out=np.zeros(len(shared)), where=shared > 0)
        if name in self._place:
            alike[self._place[name]] = 1.0
        return alike

    @cached_property
    def _names(self) -> tuple[str, ...]:
        return tuple(sorted(set().union(*self.sets)))

    @cached_property
    def _place(self) -> dict[str, int]:
        return {name: place for place, name in enumerate(self._names)}

    @cached_property
    def _postings(self) -> _Postings:
        return _Postings([_counts_of(name) for name in self._names])

    @cached_property
    def _counts(self) -> NDArray[np.int64]:
        return np.array([len(s) for s in self.sets], dtype=np.int64)

    @cached_property
    def _starts(self) -> NDArray[np.int64]:
        """Return where each set begins in `_members`."""
        return np.concatenate([[0], np.cumsum(self._counts)[:-1]]).astype(np.int64)

    @cached_property
    def _members(self) -> NDArray[np.intp]:
        return np.array([self._place[name] for s in self.sets for name in sorted(s)], dtype=np.intp)


class _Postings:
    """For each bit of some fingerprints, which of them have it and how often: a set is compared by its bits alone.

    Going through twenty thousand fingerprints one by one takes fifty times as long.
    """

    def __init__(self, prints: Sequence[Mapping[int, int]]) -> None:
        bits = np.array([bit for p in prints for bit in p], dtype=np.uint64)
        counts = np.array([count for p in prints for count in p.values()], dtype=np.int32)
        places = np.repeat(np.arange(len(prints), dtype=np.int32), [len(p) for p in prints])
        order = np.argsort(bits, kind="stable")
        known, starts = np.unique(bits[order], return_index=True)
        self.place = {bit: place for place, bit in enumerate(known.tolist())}
        self.totals = np.array([sum(p.values()) for p in prints], dtype=np.float64)
        self._starts = [*starts.tolist(), len(bits)]
        self._places, self._counts = places[order], counts[order]

    def of(self, bit: int) -> tuple[NDArray[np.int32], NDArray[np.int32]]:
        """Return which fingerprints have a bit, and how often."""
        start, end = self._starts[self.place[bit]], self._starts[self.place[bit] + 1]
        return self._places[start:end], self._counts[start:end]


@lru_cache(maxsize=65536)
def _counts_of(name: str) -> Mapping[int, int]:
    """Return the Morgan counts of a SMILES by bit, empty for what is no structure."""
    from rdkit import Chem, rdBase

    with rdBase.BlockLogs():
        mol = Chem.MolFromSmiles(name)
    return {} if mol is None else _generator().GetCountFingerprint(mol).GetNonzeroElements()


@lru_cache(maxsize=1)
def _generator() -> Any:
    from rdkit.Chem import rdFingerprintGenerator

    return rdFingerprintGenerator.GetMorganGenerator(radius=2)

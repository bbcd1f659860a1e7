"""How alike two flasks are, by the structures of the reagents in them.

It owns the comparison of sets of reagents (`ConditionProfile.reagents`): each reagent is paired with the most similar
one of the other set, by Tanimoto similarity of Morgan counts (radius 2), and the mean of these is the likeness. Classes
and strengths are compared elsewhere (`kernel.py`); this part tells two sulfonyl fluorides, or DBU and MTBD, apart. A
reagent without a structure is like itself only.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
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
        from rdkit import DataStructs

        alike = np.zeros(len(self._names))
        mine = _fingerprint(name)
        if mine is not None:
            alike[self._drawn] = DataStructs.BulkTanimotoSimilarity(mine, self._prints)
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
    def _drawn(self) -> NDArray[np.intp]:
        return np.array([i for i, n in enumerate(self._names) if _fingerprint(n) is not None], dtype=np.intp)

    @cached_property
    def _prints(self) -> list[Any]:
        return [_fingerprint(self._names[i]) for i in self._drawn]

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


@lru_cache(maxsize=65536)
def _fingerprint(name: str) -> Any:
    """Return the fingerprint of a SMILES, None for what is no structure."""
    from rdkit import Chem, rdBase

    with rdBase.BlockLogs():
        mol = Chem.MolFromSmiles(name)
    return None if mol is None or not mol.GetNumAtoms() else _generator().GetCountFingerprint(mol)


@lru_cache(maxsize=1)
def _generator() -> Any:
    from rdkit.Chem import rdFingerprintGenerator

    return rdFingerprintGenerator.GetMorganGenerator(radius=2)

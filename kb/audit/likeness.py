"""Whole-molecule likeness of substrates, reckoned once for a whole walk over the record.

It owns the fingerprints of the distinct substrates of a view: a check asks the search index for them each time, which a
replay of every run cannot afford. The figures are the same (`kb.chem.fingerprint`; tested against the index).
"""

from __future__ import annotations

from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from kb.assess.record_view import RecordView


class SubstrateLikeness:
    """Tanimoto coefficients of one substrate to those of the first runs of some rows."""

    def __init__(self, view: RecordView, rows: NDArray[np.intp]) -> None:
        self._view = view
        self._rows = rows

    def to_first(self, substrate: str | None, count: int) -> NDArray[np.float64] | None:
        """Return the likeness to each of the first `count` rows (count,), NaN = not read; None without a substrate."""
        from kb.chem.fingerprint import pack_morgan, tanimoto_to_each

        mol = self._view.mol(substrate) if substrate else None
        if mol is None:
            return None
        packed, place = self._packed
        if not len(packed):
            return np.full(count, np.nan)
        alike = np.append(tanimoto_to_each(pack_morgan(mol), packed), np.nan)  # place -1 = not read
        return np.asarray(alike[place[:count]])

    @cached_property
    def _packed(self) -> tuple[bytes, NDArray[np.intp]]:
        """Return the fingerprints of the distinct substrates, and for each row where its own stands (-1 = not read)."""
        from kb.chem.fingerprint import pack_morgan

        substrates = [self._view.table.substrate[int(row)] for row in self._rows]
        packed: list[bytes] = []
        place_of: dict[str, int] = {"": -1}
        for smiles in substrates:
            if smiles not in place_of:
                mol = self._view.mol(smiles)
                place_of[smiles] = len(packed) if mol is not None else -1
                packed += [pack_morgan(mol)] if mol is not None else []
        return b"".join(packed), np.array([place_of[s] for s in substrates], dtype=np.intp)

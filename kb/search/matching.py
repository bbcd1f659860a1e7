"""The graph matches of a search: which of some structures really hold a query, within a time limit.

Owns the stored molecules. They are kept as RDKit binaries inside RDKit's own library object, so that a
match runs in C++ from binary to answer, on several threads, without Python in between (measured: threads
gain what processes would, without a second copy of the molecules). The library is handed the rows to look
at, a chunk at a time; between chunks the clock and the user's wish to stop are asked. A loose query against
a large polycycle, where one molecule could take seconds, goes through `find_match`, which looks at the
clock inside the match.
"""

from __future__ import annotations

import os
import threading
import time
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from rdkit import Chem
from rdkit.Chem import rdSubstructLibrary

from kb.chem.query import StructureQuery, find_match, match_parameters
from kb.chem.uninterrupted import uninterrupted
from kb.progress import Progress, Silent

if TYPE_CHECKING:
    from numpy.typing import NDArray

CHUNK_S = 0.05
"""What one uninterrupted chunk should take [s]; short enough for a user to feel heard."""
_FIRST_CHUNK = 256
_LARGEST_CHUNK = 50_000
_DENSE = 1.04
"""Rows spread over no more than this times their number are compared as one range: a list costs 5 % (measured)."""
_SINGLE_THREAD_ROWS = 24
"""Fewer rows than this are not worth waking a second thread (measured: about 0.1 ms)."""


@dataclass(frozen=True, slots=True)
class Matched:
    """Rows that match, ascending (k,) int64, and whether all candidates were decided."""

    rows: NDArray[np.int64]
    complete: bool


class Deadline:
    """A moment to stop at, and a user who may stop earlier.

    Args:
        seconds: from now; None = never.
        progress: asked whether to stop.
    """

    def __init__(self, seconds: float | None = None, progress: Progress | None = None) -> None:
        self.at = None if seconds is None else time.monotonic() + seconds
        self.progress = progress or Silent()

    def has_passed(self) -> bool:
        """Return True when it is time to stop, for either reason."""
        return (self.at is not None and time.monotonic() >= self.at) or self.progress.cancelled()


class MoleculeStore:
    """Molecules by row, and the matching of rows."""

    def __init__(self, threads: int | None = None) -> None:
        self.threads = threads or os.cpu_count() or 1
        self.binary_bytes = 0
        self._holder = rdSubstructLibrary.CachedMolHolder()
        self._library = rdSubstructLibrary.SubstructLibrary(self._holder)
        self._lock = threading.Lock()

    def __len__(self) -> int:
        return len(self._library)

    def append(self, binaries: Sequence[bytes]) -> None:
        """Add molecules, each an RDKit binary."""
        add = self._holder.AddBinary
        with self._lock:
            for binary in binaries:
                add(binary)  # type: ignore[arg-type]
            self.binary_bytes += sum(map(len, binaries))

    def get(self, row: int) -> Chem.Mol:
        """Return one molecule, unpacked."""
        return self._library.GetMol(int(row))

    def match(
        self,
        query: StructureQuery,
        rows: NDArray[np.int64],
        *,
        unruly: NDArray[np.bool_] | None = None,
        deadline: Deadline | None = None,
    ) -> Matched:
        """Return which of some rows hold the query.

        Args:
            query: the query.
            rows: candidates, ascending.
            unruly: by candidate, whether a loose query may take long on it; None = none of them.
            deadline: when to stop with what was found so far.
        """
        deadline = deadline or Deadline()
        slow: NDArray[np.int64] = rows[:0]
        if query.is_loose and unruly is not None and unruly.any():
            slow, rows = rows[unruly], rows[~unruly]
        found, complete = self._match_fast(query, rows, deadline)
        if len(slow):
            more, complete_slow = self._match_slowly(query, slow, deadline)
            found = np.sort(np.concatenate((found, more)))
            complete = complete and complete_slow
        return Matched(found, complete)

    def _match_fast(
        self, query: StructureQuery, rows: NDArray[np.int64], deadline: Deadline
    ) -> tuple[NDArray[np.int64], bool]:
        parameters = match_parameters(query)
        pieces: list[NDArray[np.int64]] = []
        at, size = 0, _FIRST_CHUNK
        while at < len(rows):
            if deadline.has_passed():
                break
            deadline.progress.advance(at, len(rows), "structures compared")
            chunk = rows[at : at + size]
            threads = self.threads if len(chunk) >= _SINGLE_THREAD_ROWS else 1
            began = time.perf_counter()
            hits = self._match_chunk(query.mol, chunk, parameters, threads)
            if hits is None:
                continue  # whoever listens for Ctrl-C has heard it; who goes on all the same gets the whole answer
            pieces.append(hits)
            at += len(chunk)
            took_s = max(time.perf_counter() - began, 1e-6)
            size = int(min(_LARGEST_CHUNK, max(16, len(chunk) * min(8.0, CHUNK_S / took_s))))
        found = np.sort(np.concatenate(pieces)) if pieces else np.empty(0, np.int64)
        return found, at >= len(rows)

    def _match_chunk(
        self, mol: Chem.Mol, chunk: NDArray[np.int64], parameters: Chem.SubstructMatchParameters, threads: int
    ) -> NDArray[np.int64] | None:
        """Return which rows of a chunk match, or None where RDKit was interrupted.

        Rows that lie close together are handed over as a range.
        """
        start, end = int(chunk[0]), int(chunk[-1]) + 1
        with self._lock, uninterrupted() as call:
            if end - start <= len(chunk) * _DENSE:
                self._library.SetSearchOrder([])
                hits = self._library.GetMatches(mol, start, end, parameters, threads, end - start)
            else:
                self._library.SetSearchOrder(chunk.tolist())
                hits = self._library.GetMatches(mol, parameters, threads, len(chunk))
        if call.was_interrupted:
            return None
        found = np.fromiter(hits, np.int64, len(hits))
        return found if end - start == len(chunk) else found[np.isin(found, chunk)]

    def _match_slowly(
        self, query: StructureQuery, rows: NDArray[np.int64], deadline: Deadline
    ) -> tuple[NDArray[np.int64], bool]:
        limit_s = SLOW_MATCH_S
        found: list[int] = []
        complete = True
        for row in rows.tolist():
            if deadline.has_passed():
                return np.array(found, np.int64), False
            until = time.monotonic() + limit_s
            if deadline.at is not None:
                until = min(until, deadline.at)
            try:
                if find_match(query, self.get(row), deadline_at=until) is not None:
                    found.append(row)
            except TimeoutError:
                complete = False
        return np.array(found, np.int64), complete


SLOW_MATCH_S = 2.0
"""What one unruly structure may take [s] before the answer counts as partial."""

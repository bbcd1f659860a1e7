"""Encoding many structures on all cores.

Processes, not threads: half of the time of an encoding is spent in Python, and RDKit's parser lets go of
the interpreter lock for nothing of it (measured: two threads are slower than one). New processes take a
second to start, so few structures are encoded where they are.
"""

from __future__ import annotations

import os
from collections.abc import Iterator, Sequence
from concurrent.futures import ProcessPoolExecutor
from multiprocessing import get_context

from rdkit import rdBase

from kb.chem.screens import StructureBlobs, encode_structure
from kb.errors import StructureError

CHUNK = 500
"""Structures handed to a process at a time."""
WORTH_A_POOL = 8000
"""Fewer are encoded sooner than processes have started (measured: about 250 microseconds each)."""


def encode_many(smiles: Sequence[str], processes: int | None = None) -> Iterator[StructureBlobs | None]:
    """Yield the blobs of structures in order; None for one that cannot be read.

    Args:
        smiles: one component each.
        processes: how many; None = one for each core, or none where that is not worth it.
    """
    if processes is None:
        processes = (os.cpu_count() or 1) if len(smiles) >= WORTH_A_POOL else 1
    chunks = [list(smiles[start : start + CHUNK]) for start in range(0, len(smiles), CHUNK)]
    if processes <= 1:
        for chunk in chunks:
            yield from map(_encode_or_none, chunk)
        return
    with ProcessPoolExecutor(processes, mp_context=get_context("spawn"), initializer=_be_quiet) as pool:
        for blobs in pool.map(_encode_chunk, chunks):
            yield from blobs


def _encode_chunk(smiles: list[str]) -> list[StructureBlobs | None]:
    return [_encode_or_none(text) for text in smiles]


def _encode_or_none(smiles: str) -> StructureBlobs | None:
    try:
        return encode_structure(smiles)
    except StructureError:
        return None


def _be_quiet() -> None:
    """Keep RDKit's complaints of a worker off the terminal; what could not be read is told by None."""
    rdBase.DisableLog("rdApp.*")

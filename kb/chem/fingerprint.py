"""Packed fingerprints: the bytes that are stored, and the Tanimoto coefficient between them.

Owns the packing (bit i is bit i % 8 of byte i // 8) and the making of Morgan fingerprints (radius 2, 2048 bits, no
chirality). It refuses to compare fingerprints of different lengths. Two empty fingerprints have a similarity of 0:
nothing in common is shown, nothing is claimed.
"""

from __future__ import annotations

from functools import cache
from typing import TYPE_CHECKING

import numpy as np
from rdkit import Chem, DataStructs

from kb.chem.screens_keys import MORGAN_BITS, MORGAN_RADIUS

if TYPE_CHECKING:
    from numpy.typing import NDArray
    from rdkit.Chem.rdFingerprintGenerator import FingerprintGenerator64


@cache
def morgan_generator() -> FingerprintGenerator64:
    """Return the one generator that every stored Morgan fingerprint comes from."""
    from rdkit.Chem import rdFingerprintGenerator  # loaded by those who fingerprint, not by those who read

    return rdFingerprintGenerator.GetMorganGenerator(radius=MORGAN_RADIUS, fpSize=MORGAN_BITS)


def pack_morgan(mol: Chem.Mol) -> bytes:
    """Return the Morgan fingerprint of a molecule, MORGAN_BITS / 8 bytes."""
    return DataStructs.BitVectToBinaryText(morgan_generator().GetFingerprint(mol))


def bits_of(packed: bytes) -> NDArray[np.intp]:
    """Return the numbers of the bits that are set, ascending (k,) intp."""
    return np.flatnonzero(np.unpackbits(np.frombuffer(packed, np.uint8), bitorder="little"))


def tanimoto(one: bytes, other: bytes) -> float:
    """Return the Tanimoto coefficient of two packed fingerprints, 0..1.

    Raises:
        ValueError: when the lengths differ, which no stored recipe allows.

    >>> tanimoto(bytes([0b1110]), bytes([0b0111]))
    0.5
    """
    if len(one) != len(other):
        raise ValueError(f"fingerprints of {len(one)} and {len(other)} bytes cannot be compared")
    a, b = int.from_bytes(one, "little"), int.from_bytes(other, "little")
    union = (a | b).bit_count()
    return (a & b).bit_count() / union if union else 0.0


def tanimoto_to_each(one: bytes, packed: bytes) -> NDArray[np.float64]:
    """Return the Tanimoto coefficient of one packed fingerprint to each of many (n,) float64.

    Args:
        one: as `pack_morgan` gives it.
        packed: n fingerprints of the same length, one behind the other.
    """
    rows = np.frombuffer(packed, "<u8").reshape(-1, len(one) // 8)
    query = np.frombuffer(one, "<u8")
    shared = _ones(rows & query)
    union = _ones(rows | query)
    return np.divide(shared, union, out=np.zeros(len(rows)), where=union > 0)


def _ones(words: NDArray[np.uint64]) -> NDArray[np.int64]:
    """Return how many bits are set in each row of words (n, w)."""
    if hasattr(np, "bitwise_count"):
        return np.bitwise_count(words).sum(axis=1, dtype=np.int64)
    return np.unpackbits(words.view(np.uint8), axis=1).sum(axis=1, dtype=np.int64)

"""Packed fingerprints: the bytes that are stored, and the numbers that a similarity needs.

Owns the Morgan recipe (radius 2, 2048 bits, no chirality), the packing (bit i is bit i % 8 of byte i // 8)
and the Tanimoto coefficient with its bounds. It refuses to compare fingerprints of different lengths. Two
empty fingerprints have a similarity of 0: nothing in common is shown, nothing is claimed.

Source of the bound: with a and b bits set, the intersection cannot exceed min(a, b), so the coefficient
cannot exceed min(a, b) / max(a, b) (arithmetic).
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

PATTERN_BITS = 2048
"""Width of RDKit's pattern fingerprint, which only comparisons use."""


@cache
def morgan_generator() -> FingerprintGenerator64:
    """Return the one generator that every stored Morgan fingerprint comes from."""
    from rdkit.Chem import rdFingerprintGenerator  # loaded by those who fingerprint, not by those who read

    return rdFingerprintGenerator.GetMorganGenerator(radius=MORGAN_RADIUS, fpSize=MORGAN_BITS)


def pack_morgan(mol: Chem.Mol) -> bytes:
    """Return the Morgan fingerprint of a molecule, MORGAN_BITS / 8 bytes."""
    return DataStructs.BitVectToBinaryText(morgan_generator().GetFingerprint(mol))


def pack_pattern(mol: Chem.Mol) -> bytes:
    """Return RDKit's pattern fingerprint of a molecule or query, PATTERN_BITS / 8 bytes.

    For a query only those bits are set that every match must have, lists and wildcards included.
    """
    return DataStructs.BitVectToBinaryText(Chem.PatternFingerprint(mol, PATTERN_BITS))


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


def popcount_bounds(bits_set: int, at_least: float) -> tuple[int, int]:
    """Return the fewest and the most bits that a fingerprint of that similarity can have.

    Args:
        bits_set: bits set in the query.
        at_least: wanted similarity, above 0 and up to 1.
    """
    low = int(np.ceil(bits_set * at_least - 1e-9))
    high = int(np.floor(bits_set / at_least + 1e-9))
    return low, high

"""The vocabulary of augmented-atom screens: what a structure sets and a query asks for, as bit numbers.

Both sides make their bits with the functions here, so that they cannot drift apart. A key is a plain tuple;
its bit is its BLAKE2b hash modulo the width, the same in every process and on every machine. It holds no
chemistry beyond the names of the parts and no RDKit objects.
"""

from __future__ import annotations

from functools import lru_cache
from hashlib import blake2b
from typing import TypeAlias

AUGMENTED_BITS = 2048
AUGMENTED_REVISION = 1
"""Raised whenever a structure sets other bits than before."""

SINGLE, DOUBLE, TRIPLE, AROMATIC, OTHER = 1, 2, 3, 4, 5
"""Bond codes in keys; OTHER is anything that a plain query bond cannot mean."""

MAX_NEIGHBOURS = 4
"""Largest sub-multiset: a saturated carbon is covered whole; more neighbours are covered by their parts."""
MAX_CYCLE = 14
"""Larger cycles have no bits: nobody asks for one, and fused systems have many."""
COUNT_STEPS = (2, 3, 4, 5, 6, 8, 10, 12, 16, 20)
BOND_COUNT_STEPS = (2, 3, 4, 6)

KEY_ANY_CYCLE = 0
"""Set by a structure whose cycles were not all enumerated; a query takes it for any cycle."""
KEY_UNRULY = 1
"""Set by a structure in which a loose query may search for long: many rings, or very large."""
_RESERVED = 2

AtomType: TypeAlias = tuple[int, bool]
"""Element number and aromaticity."""
TypedBond: TypeAlias = tuple[int, int, bool]
"""Bond code, then the type of the neighbour."""


@lru_cache(maxsize=65536)
def key_bit(key: tuple[object, ...]) -> int:
    """Return the bit number of a key."""
    digest = int.from_bytes(blake2b(repr(key).encode(), digest_size=8).digest(), "little")
    return _RESERVED + digest % (AUGMENTED_BITS - _RESERVED)


def key_types(centre: AtomType, neighbours: tuple[AtomType, ...]) -> int:
    """Return the bit for an atom with these neighbours (sorted), bond orders left out."""
    return key_bit(("a", centre, neighbours))


def key_bonds(centre: AtomType, neighbours: tuple[TypedBond, ...]) -> int:
    """Return the bit for an atom with these bonds (sorted)."""
    return key_bit(("b", centre, neighbours))


def key_attribute(what: str, value: int, centre: AtomType, neighbours: tuple[TypedBond, ...]) -> int:
    """Return the bit for an atom with these bonds (sorted) and one attribute.

    Args:
        what: "H" hydrogens, "X" total connections, "D" drawn connections, "q" charge.
        value: of that attribute; a charge of 0 has no bit.
    """
    return key_bit((what, value, centre, neighbours))


def key_ring_atom(centre: AtomType, smallest: int) -> int:
    """Return the bit for an atom in any ring (0), in a smallest ring of that size (3..), or in none (-1)."""
    return key_bit(("r", centre, smallest))


def key_ring_bond(kind: tuple[AtomType, int, AtomType], in_ring: bool) -> int:
    """Return the bit for a bond of that kind (see `bond_kind`) that is, or is not, in a ring."""
    return key_bit(("rb", kind, in_ring))


def key_count(what: tuple[object, ...], step: int) -> int:
    """Return the bit for at least `step` of an atom type, of an element ("Z", number), or of a bond kind."""
    return key_bit(("n", what, step))


def key_cycle(size: int, make_up: tuple[object, ...] = ()) -> int:
    """Return the bit for a cycle of that size with these atoms.

    Args:
        size: atoms in the cycle.
        make_up: sorted atom types, or sorted element numbers, or () for any atoms.
    """
    return key_bit(("c", size, make_up))


def bond_kind(one: AtomType, order: int, other: AtomType) -> tuple[AtomType, int, AtomType]:
    """Return a bond as the one tuple that both directions share."""
    return (one, order, other) if one <= other else (other, order, one)

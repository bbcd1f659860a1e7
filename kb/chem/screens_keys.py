"""The vocabulary of augmented-atom screens: what a structure sets and a query asks for, as bit numbers.

Both sides make their bits with the functions here, so that they cannot drift apart. A key is a plain tuple;
its bit is its BLAKE2b hash modulo the width, the same in every process and on every machine. It holds no
chemistry beyond the names of the parts and no RDKit objects.
"""

from __future__ import annotations

from functools import lru_cache
from hashlib import blake2b
from typing import TypeAlias

AUGMENTED_BITS = 4096
AUGMENTED_REVISION = 2
"""Raised (1 to 255) whenever a structure sets other bits than before; each screen carries it in its second byte."""
AUGMENTED_RECIPE = f"augmented-{AUGMENTED_REVISION}-{AUGMENTED_BITS}"
"""Name and parameters of these screens; RDKit, which perceives what they are made from, is named beside it."""
MORGAN_RADIUS = 2
MORGAN_BITS = 2048
MORGAN_RECIPE = f"morgan-r{MORGAN_RADIUS}-{MORGAN_BITS}"
BLOBS_RECIPE = f"{AUGMENTED_RECIPE} {MORGAN_RECIPE}"
"""What a book stores beside a structure, for whoever names a recipe without loading RDKit."""

SINGLE, DOUBLE, TRIPLE, AROMATIC, OTHER = 1, 2, 3, 4, 5
"""Bond codes in keys; OTHER is anything that a plain query bond cannot mean."""

MAX_NEIGHBOURS = 4
"""Largest sub-multiset: a saturated carbon is covered whole; more neighbours are covered by their parts."""
MAX_CYCLE = 10
"""Larger cycles have no bits: ten atoms go round two fused six-rings; beyond that there are many."""
MAX_PAIR_BONDS = 3
"""Other bonds of each atom of a bonded pair: a tert-butyl beside an oxygen is covered whole."""
COUNT_STEPS = (2, 3, 4, 5, 6, 8, 10, 12, 16, 20)
BOND_COUNT_STEPS = (2, 3, 4, 6)

KEY_ANY_CYCLE = 0
"""Set by a structure whose cycles were not all enumerated; a query takes it for any cycle."""
KEY_UNRULY = 1
"""Set by a structure in which a loose query may search for long: many rings, or very large."""
REVISION_MASK = AUGMENTED_REVISION << 8
"""Set by every structure, so that a screen of another revision is known by itself."""
_RESERVED = 16
NOT_IN_RING = -1
"""Smallest ring of an atom that is in none."""

AtomType: TypeAlias = tuple[int, bool]
"""Element number and aromaticity."""
TypedBond: TypeAlias = tuple[int, int, bool]
"""Bond code, then the type of the neighbour."""
ReachingBond: TypeAlias = tuple[int, int, bool, int]
"""Bond code, the type of the neighbour, and the total connections of that neighbour."""
Linked: TypeAlias = tuple[AtomType, str, int]
"""One atom of a bonded pair with one attribute ("H" or "X") and its value."""
Half: TypeAlias = tuple[AtomType, tuple[TypedBond, ...]]
"""One atom of a bonded pair with some of its other bonds (sorted)."""


Bits: TypeAlias = tuple[int, ...]
"""The bit numbers of one key: two for short keys, which many queries ask for alone, one for long ones."""


@lru_cache(maxsize=65536)
def key_bits(key: tuple[object, ...], n_bits: int = 1) -> Bits:
    """Return the bit numbers of a key, distinct keys sharing a bit only by chance.

    Args:
        key: plain tuple.
        n_bits: how many bits it sets, up to 4.
    """
    digest = blake2b(repr(key).encode(), digest_size=16).digest()
    return tuple(
        _RESERVED + int.from_bytes(digest[4 * n : 4 * n + 4], "little") % (AUGMENTED_BITS - _RESERVED)
        for n in range(n_bits)
    )


def key_types(centre: AtomType, neighbours: tuple[AtomType, ...]) -> Bits:
    """Return the bits for an atom with these neighbours (sorted), bond orders left out."""
    return key_bits(("a", centre, neighbours), 2 if len(neighbours) < 2 else 1)


def key_bonds(centre: AtomType, bonds: tuple[TypedBond, ...]) -> Bits:
    """Return the bits for an atom with these bonds (sorted)."""
    return key_bits(("b", centre, bonds), 2 if len(bonds) < 2 else 1)


def key_attribute(what: str, value: int, centre: AtomType, bonds: tuple[TypedBond, ...]) -> Bits:
    """Return the bits for an atom with these bonds (sorted) and one attribute.

    Args:
        what: "H" hydrogens, "X" total connections, "D" drawn connections, "q" charge.
        value: of that attribute; a charge of 0 has no bit.
        centre, bonds: as for `key_bonds`.
    """
    return key_bits((what, value, centre, bonds), 2 if len(bonds) < 2 else 1)


def key_any_atom(what: str, value: int) -> Bits:
    """Return the bits for any atom with one attribute: as for `key_attribute`, or "r", its smallest ring (0: any)."""
    return key_bits(("any", what, value), 2)


def key_any_bond(order: int, in_ring: bool | None) -> Bits:
    """Return the bits for a bond of that order between any atoms, in a ring or not; None = either."""
    return key_bits(("any bond", order, in_ring), 2)


def key_reach(centre: AtomType, bonds: tuple[ReachingBond, ...]) -> Bits:
    """Return the bits for an atom with these bonds (sorted), the connections of each neighbour known."""
    return key_bits(("x", centre, bonds), 2 if len(bonds) < 2 else 1)


def key_link(one: Linked, order: int, other: Linked) -> Bits:
    """Return the bits for two bonded atoms, of each of which one attribute is known."""
    return key_bits(("l", *((one, order, other) if one <= other else (other, order, one))))


def key_pair(one: Half, order: int, other: Half) -> Bits:
    """Return the bit for two bonded atoms, each with some of its other bonds."""
    return key_bits(("p", *((one, order, other) if one <= other else (other, order, one))))


def key_ring_atom(centre: AtomType, smallest: int) -> Bits:
    """Return the bits for an atom in any ring (0), in a smallest ring of that size (3..), or NOT_IN_RING."""
    return key_bits(("r", centre, smallest), 2)


def key_ring_bond(kind: tuple[AtomType, int, AtomType], in_ring: bool) -> Bits:
    """Return the bits for a bond of that kind (see `bond_kind`) that is, or is not, in a ring."""
    return key_bits(("rb", kind, in_ring), 2)


def key_count(what: tuple[object, ...], step: int) -> Bits:
    """Return the bits for at least `step` atoms of a type, of an element ("Z", n), of any (), or bonds of a kind."""
    return key_bits(("n", what, step), 2)


def key_cycle(size: int, make_up: tuple[object, ...] = ()) -> Bits:
    """Return the bits for a cycle of that size with these atoms.

    Args:
        size: atoms in the cycle, up to MAX_CYCLE.
        make_up: sorted atom types, or sorted element numbers, or () for any atoms.
    """
    return key_bits(("c", size, make_up), 2)


def bond_kind(one: AtomType, order: int, other: AtomType) -> tuple[AtomType, int, AtomType]:
    """Return a bond as the one tuple that both directions share."""
    return (one, order, other) if one <= other else (other, order, one)

"""The bits of the parts of a structure, worked out once and remembered: environments, bonded pairs, counts, cycles.

A structure is handed to this file in small integers ("codes"), because looking up a tuple of integers is
what the time of an import goes into. Codes: a type is element << 1 | aromatic; a spoke is type << 4 | order
<< 1 | in ring; a far spoke is (type << 4 | connections) << 3 | order. Nothing here decides what a code
means for a query: the keys of `screens_keys.py` do.
"""

from __future__ import annotations

import threading
from collections.abc import Iterable
from itertools import combinations

from kb.chem.screens_keys import (
    BOND_COUNT_STEPS,
    COUNT_STEPS,
    MAX_NEIGHBOURS,
    MAX_PAIR_BONDS,
    NOT_IN_RING,
    AtomType,
    Bits,
    TypedBond,
    bond_kind,
    key_any_atom,
    key_any_bond,
    key_attribute,
    key_bonds,
    key_count,
    key_cycle,
    key_link,
    key_pair,
    key_reach,
    key_ring_atom,
    key_ring_bond,
    key_types,
)

MEMO_LIMIT = 120_000
"""Masks remembered before starting anew, about 80 MB; a million drug-like structures need some ten thousands."""


class Core:
    """An atom with its hydrogens and bonds.

    Attributes:
        kind: its type. hydrogens: all of them, drawn ones included. connections: all neighbours.
        bonds: (order, type of neighbour) sorted. rings: for each of them, whether it is a ring bond.
        parts: every sub-multiset of the bonds, up to MAX_PAIR_BONDS less one bond each, by the bond left out.
    """

    __slots__ = ("bonds", "connections", "hydrogens", "kind", "rings", "without")

    def __init__(self, type_code: int, hydrogens: int, spokes: Iterable[int]) -> None:
        self.kind = type_of(type_code)
        found = sorted((code >> 1 & 7, *type_of(code >> 4), bool(code & 1)) for code in spokes)
        self.bonds: tuple[TypedBond, ...] = tuple((order, z, a) for order, z, a, _ in found)
        self.rings = tuple(in_ring for *_, in_ring in found)
        self.connections = hydrogens + len(found)
        self.hydrogens = hydrogens + sum(1 for _, element, _ in self.bonds if element == 1)
        self.without: dict[TypedBond, tuple[tuple[TypedBond, ...], ...]] = {}

    def others(self, bond: TypedBond) -> tuple[tuple[TypedBond, ...], ...]:
        """Return every sub-multiset of the bonds but one, up to MAX_PAIR_BONDS, the empty one included."""
        found = self.without.get(bond)
        if found is None:
            rest = list(self.bonds)
            rest.remove(bond)
            sizes = range(min(MAX_PAIR_BONDS, len(rest)) + 1)
            found = tuple({part for size in sizes for part in combinations(rest, size)})
            self.without[bond] = found
        return found


class Memo:
    """What has been worked out so far. A full one is dropped whole; whoever still uses it is not disturbed."""

    def __init__(self) -> None:
        self.core_of: dict[tuple[int, ...], int] = {}
        self.cores: list[Core] = []
        self.masks: dict[tuple[int, ...], int] = {}
        self._lock = threading.Lock()

    def number(self, key: tuple[int, ...]) -> int:
        """Return the number of a core: (type, hydrogens, *spokes), spokes sorted."""
        with self._lock:
            self.cores.append(Core(key[0], key[1], key[2:]))
            number = len(self.cores) - 1
            self.core_of[key] = number
            return number

    def atom(self, key: tuple[int, int, int]) -> int:
        """Work out and remember the mask of (core, charge, smallest ring)."""
        core, charge, smallest = self.cores[key[0]], key[1], key[2]
        bits = [*key_ring_atom(core.kind, smallest)]
        if smallest != NOT_IN_RING:
            bits += key_ring_atom(core.kind, 0)
            bits += key_any_atom("r", 0)
        bits += key_any_atom("r", smallest)
        for (order, z, a), in_ring in zip(core.bonds, core.rings, strict=True):
            bits += key_ring_bond(bond_kind(core.kind, order, (z, a)), in_ring)
            bits += key_any_bond(order, in_ring)
            bits += key_any_bond(order, None)
        asked = [("H", core.hydrogens), ("X", core.connections), ("D", len(core.bonds))]
        if charge:
            asked.append(("q", charge))
        for what, value in asked:
            bits += key_any_atom(what, value)
        for size in range(min(MAX_NEIGHBOURS, len(core.bonds)) + 1):
            for chosen in set(combinations(core.bonds, size)):
                bits += key_types(core.kind, tuple(sorted((z, a) for _, z, a in chosen)))
                bits += key_bonds(core.kind, chosen)
                for what, value in asked:
                    bits += key_attribute(what, value, core.kind, chosen)
        return self._keep(key, bits)

    def pair(self, key: tuple[int, int, int, int]) -> int:
        """Work out and remember the mask of two bonded cores: (one, other, order, 1)."""
        one, other, order = self.cores[key[0]], self.cores[key[1]], key[2]
        bits: list[int] = []
        for what, value in (("H", one.hydrogens), ("X", one.connections)):
            for further, number in (("H", other.hydrogens), ("X", other.connections)):
                bits += key_link((one.kind, what, value), order, (other.kind, further, number))
        for part in one.others((order, *other.kind)):
            for rest in other.others((order, *one.kind)):
                if part and rest:
                    bits += key_pair((one.kind, part), order, (other.kind, rest))
        return self._keep(key, bits)

    def reach(self, key: tuple[int, ...]) -> int:
        """Work out and remember the mask of an atom with the connections of its neighbours: (-2, type, *far)."""
        kind = type_of(key[1])
        bonds = sorted((code & 7, *type_of(code >> 7), code >> 3 & 15) for code in key[2:])
        bits: list[int] = []
        for size in range(2, min(MAX_NEIGHBOURS, len(bonds)) + 1):
            for chosen in set(combinations(bonds, size)):
                bits += key_reach(kind, chosen)
        return self._keep(key, bits)

    def count(self, key: tuple[int, int, int]) -> int:
        """Work out and remember the mask of that many of a thing.

        Args:
            key: (-3, type, number) for atoms of a type, (-4, element, number) of an element, (-5, 0,
            number) of any,
                (-6, kind, number) for bonds of a kind, which is (type << 12 | type) << 4 | order.
        """
        what, code, number = key
        steps = BOND_COUNT_STEPS if what == BOND_COUNT else COUNT_STEPS
        thing: tuple[object, ...] = ()
        if what == TYPE_COUNT:
            thing = type_of(code)
        elif what == ELEMENT_COUNT:
            thing = ("Z", code)
        elif what == BOND_COUNT:
            thing = bond_kind(type_of(code >> 16), code & 15, type_of(code >> 4 & 4095))
        return self._keep(key, [bit for step in steps if step <= number for bit in key_count(thing, step)])

    def cycle(self, key: tuple[int, ...]) -> int:
        """Work out and remember the mask of a cycle: (-1, *type codes), sorted."""
        make_up = tuple(sorted(type_of(code) for code in key[1:]))
        elements = tuple(sorted(element for element, _ in make_up))
        size = len(make_up)
        return self._keep(key, (*key_cycle(size), *key_cycle(size, elements), *key_cycle(size, make_up)))

    def _keep(self, key: tuple[int, ...], bits: Iterable[int] | Bits) -> int:
        mask = 0
        for bit in bits:
            mask |= 1 << bit
        self.masks[key] = mask
        return mask


CYCLE, REACH, TYPE_COUNT, ELEMENT_COUNT, ANY_COUNT, BOND_COUNT = -1, -2, -3, -4, -5, -6
"""First numbers of the keys of a memo that are no cores."""


def type_of(code: int) -> AtomType:
    """Return the atom type that a code stands for."""
    return code >> 1, bool(code & 1)


_memo = Memo()


def current_memo() -> Memo:
    """Return the memo to use for one structure."""
    global _memo
    if len(_memo.masks) > MEMO_LIMIT:
        _memo = Memo()
    return _memo

"""What a query says about its atoms and bonds, in plain values.

RDKit shows a query only as text: `DescribeQuery` prints the tree of tests, `GetSmarts` the recursive parts.
This file reads both into alternatives (`Trait`) that screens and cost estimates can use. It understands
what it lists and treats everything else (negations, ranges, hybridisation, anything new) as "says nothing":
a trait may say less than the query, never more. So whoever relies on traits can lose speed but no hit.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass, replace
from typing import TypeAlias

from rdkit import Chem

from kb.chem.screens_keys import AROMATIC, DOUBLE, SINGLE, TRIPLE, AtomType

MAX_ALTERNATIVES = 16
"""Alternatives kept for one atom; beyond that the atom says nothing."""
NEVER_AROMATIC = frozenset((1, 9, 17, 35, 53))
"""Hydrogen and halogens: `[#17]` need not be tried as aromatic."""

_LEAF = re.compile(r"(\w+) (-?\d+) (!?=) val")
_ANY_NUMBER = -1
"""What RDKit prints for `[R]`: in some number of rings."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Trait:
    """One way in which an atom can satisfy the query. None = this alternative does not say.

    Attributes:
        element: atomic number.
        aromatic: aromatic or aliphatic.
        hydrogens: all hydrogens, drawn or not.
        connections, degree: all neighbours, and those drawn.
        charge: formal charge.
        in_ring: member of any ring.
        smallest_ring: size of its smallest ring.
        inner: recursive queries that must match at this atom.
    """

    element: int | None = None
    aromatic: bool | None = None
    hydrogens: int | None = None
    connections: int | None = None
    degree: int | None = None
    charge: int | None = None
    in_ring: bool | None = None
    smallest_ring: int | None = None
    inner: tuple[str, ...] = ()

    @property
    def types(self) -> tuple[AtomType, ...]:
        """Return the atom types that it admits; () = any."""
        if self.element is None:
            return ()
        if self.aromatic is not None:
            return ((self.element, self.aromatic),)
        if self.element in NEVER_AROMATIC:
            return ((self.element, False),)
        return ((self.element, False), (self.element, True))


ANY = Trait()
_SCALARS = (
    "element",
    "aromatic",
    "hydrogens",
    "connections",
    "degree",
    "charge",
    "in_ring",
    "smallest_ring",
)


@dataclass(frozen=True, slots=True, kw_only=True)
class BondTrait:
    """What a query bond says.

    Attributes:
        orders: bond codes that it admits; None = it does not say.
        in_ring: as drawn in the query; None = it does not say.
    """

    orders: frozenset[int] | None = None
    in_ring: bool | None = None


def traits_of(atom: Chem.Atom) -> tuple[Trait, ...]:
    """Return the alternatives of a query atom, at least one; `ANY` alone = it says nothing."""
    if not atom.HasQuery():
        element = atom.GetAtomicNum()
        if element == 0:
            return (ANY,)
        charge = atom.GetFormalCharge()
        return (Trait(element=element, charge=charge or None),)
    tree = _parse_tree(atom.DescribeQuery())
    inner = iter(_recursive_parts(atom.GetSmarts(), tree))
    alternatives = _alternatives(tree, inner)
    return tuple(dict.fromkeys(alternatives)) if alternatives and ANY not in alternatives else (ANY,)


def recursive_texts(atom: Chem.Atom) -> list[str]:
    """Return the SMARTS of every `$(...)` of an atom, negated ones included."""
    return [text for _, text in _recursive(atom.GetSmarts())] if atom.HasQuery() else []


def types_of(traits: tuple[Trait, ...]) -> tuple[AtomType, ...]:
    """Return every atom type that a query atom admits, sorted; () = any."""
    found: set[AtomType] = set()
    for trait in traits:
        if not trait.types:
            return ()
        found.update(trait.types)
    return tuple(sorted(found))


# ------------------------------------------------------------------------------------------ atoms


@dataclass(slots=True)
class _Node:
    text: str
    children: list[_Node]


def _parse_tree(description: str) -> _Node:
    """Turn RDKit's indented description into a tree; a child is indented two blanks more."""
    root = _Node("", [])
    path = [root]
    for line in description.splitlines():
        text = line.lstrip(" ")
        if not text:
            continue
        depth = (len(line) - len(text)) // 2
        node = _Node(text.rstrip(), [])
        del path[depth + 1 :]
        path[-1].children.append(node)
        path.append(node)
    return root.children[0] if len(root.children) == 1 else root


def _is_recursive(node: _Node) -> bool:
    return node.text.startswith("RecursiveStructure")


def _walk(node: _Node) -> list[_Node]:
    return [node] + [below for child in node.children for below in _walk(child)]


def _recursive_parts(smarts: str, tree: _Node) -> list[str | None]:
    """Return the text of each `$(...)` in the order of the tree; None where the two do not tally."""
    wanted = ["not in" not in node.text for node in _walk(tree) if _is_recursive(node)]
    parts = _recursive(smarts)
    if [positive for positive, _ in parts] != wanted:
        return [None] * len(wanted)
    return [text if positive else None for positive, text in parts]


def _recursive(smarts: str) -> list[tuple[bool, str]]:
    """Return (is not negated, text) of every outermost `$(...)`, in order."""
    parts: list[tuple[bool, str]] = []
    at = 0
    while (start := smarts.find("$(", at)) >= 0:
        depth, end = 1, start + 2
        while end < len(smarts) and depth:
            depth += {"(": 1, ")": -1}.get(smarts[end], 0)
            end += 1
        parts.append((not smarts[:start].endswith("!"), smarts[start + 2 : end - 1]))
        at = end
    return parts


_Parts: TypeAlias = Iterator[str | None]


def _alternatives(node: _Node, inner: _Parts) -> list[Trait]:
    if _is_recursive(node):
        text = next(inner, None)
        return [Trait(inner=(text,)) if text else ANY]
    if node.text == "AtomAnd":
        found = [ANY]
        for child in node.children:
            found = _both(found, _alternatives(child, inner))
        return found
    if node.text == "AtomOr":
        either = [trait for child in node.children for trait in _alternatives(child, inner)]
        return either if len(either) <= MAX_ALTERNATIVES and ANY not in either else [ANY]
    for child in node.children:  # keep the recursive parts in step, though nothing is taken from them
        _alternatives(child, inner)
    return [_leaf(node.text)]


def _both(left: list[Trait], right: list[Trait]) -> list[Trait]:
    """Return all pairings that do not contradict each other; too many, and the more telling side alone."""
    if len(left) * len(right) > MAX_ALTERNATIVES:
        return min(left, right, key=lambda side: (any(t.element is None for t in side), len(side)))
    pairs = [merged for one in left for other in right if (merged := _merge(one, other)) is not None]
    return pairs or [ANY]


def _merge(one: Trait, other: Trait) -> Trait | None:
    changes: dict[str, object] = {}
    for name in _SCALARS:
        a, b = getattr(one, name), getattr(other, name)
        if a is None:
            if b is not None:
                changes[name] = b
        elif b is not None and a != b:
            return None
    return replace(one, **changes, inner=one.inner + other.inner)  # type: ignore[arg-type]


def _leaf(text: str) -> Trait:
    match = _LEAF.fullmatch(text)
    if match is None:
        return ANY
    name, number, equal = match[1], int(match[2]), match[3] == "="
    if not equal:
        return Trait(in_ring=False) if (name, number) in _NOT_RING else ANY
    if name == "AtomType":
        return Trait(element=number % 1000, aromatic=number >= 1000)
    if name in ("AtomIsAromatic", "AtomIsAliphatic"):
        return Trait(aromatic=(name == "AtomIsAromatic") == bool(number))
    if name == "AtomInNRings":
        return Trait(in_ring=number != 0)
    if name == "AtomInRing":
        return Trait(in_ring=bool(number))
    if name == "AtomRingBondCount":
        return Trait(in_ring=True) if number > 0 else ANY
    if name == "AtomMinRingSize":
        return Trait(smallest_ring=number, in_ring=True) if number > 0 else ANY
    field = _NUMBERS.get(name)
    return Trait(**{field: number}) if field else ANY  # type: ignore[arg-type]


_NOT_RING = frozenset((("AtomInNRings", _ANY_NUMBER), ("AtomInRing", 1)))
_NUMBERS = {
    "AtomAtomicNum": "element",
    "AtomHCount": "hydrogens",
    "AtomTotalDegree": "connections",
    "AtomExplicitDegree": "degree",
    "AtomFormalCharge": "charge",
}


# ------------------------------------------------------------------------------------------ bonds

_ORDERS = {1: SINGLE, 2: DOUBLE, 3: TRIPLE, 12: AROMATIC}
_NAMED_ORDERS = {
    "SingleOrAromaticBond": frozenset((SINGLE, AROMATIC)),
    "DoubleOrAromaticBond": frozenset((DOUBLE, AROMATIC)),
    "SingleOrDoubleBond": frozenset((SINGLE, DOUBLE)),
    "SingleOrDoubleOrAromaticBond": frozenset((SINGLE, DOUBLE, AROMATIC)),
}


def bond_trait(bond: Chem.Bond) -> BondTrait:
    """Return what a query bond says."""
    if not bond.HasQuery():
        code = _ORDERS.get(int(bond.GetBondType()))
        return BondTrait(orders=frozenset((code,)) if code else None)
    return _bond_node(_parse_tree(bond.DescribeQuery()))


def _bond_node(node: _Node) -> BondTrait:
    if node.text == "BondAnd":
        orders: frozenset[int] | None = None
        in_ring: bool | None = None
        for part in map(_bond_node, node.children):
            if part.orders is not None:
                orders = part.orders if orders is None else orders & part.orders
            in_ring = part.in_ring if part.in_ring is not None else in_ring
        return BondTrait(orders=orders or None, in_ring=in_ring)
    if node.text == "BondOr":
        parts = [_bond_node(child) for child in node.children]
        rings = {part.in_ring for part in parts}
        if any(part.orders is None for part in parts):
            return BondTrait(in_ring=rings.pop() if len(rings) == 1 else None)
        return BondTrait(
            orders=frozenset(code for part in parts for code in part.orders or ()),
            in_ring=rings.pop() if len(rings) == 1 else None,
        )
    match = _LEAF.fullmatch(node.text)
    if match is None:
        return BondTrait()
    name, number, equal = match[1], int(match[2]), match[3] == "="
    if name == "BondInRing":
        return BondTrait(in_ring=bool(number) == equal)
    if not equal:
        return BondTrait()
    if name == "BondOrder":
        code = _ORDERS.get(number)
        return BondTrait(orders=frozenset((code,)) if code else None)
    return BondTrait(orders=_NAMED_ORDERS.get(name))

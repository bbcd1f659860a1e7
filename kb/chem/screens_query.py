"""What a query asks of the screens: the bits, and alternatives of bits, that every match must have set.

It only reads `query_traits.py` and speaks in the keys of `screens_keys.py`. The answer is a tree of "all
of" and "one of" over bit numbers, since a list such as `[Cl,Br,I]` is one bit or another, never none.
Conservative by construction: an atom or bond that does not say what it is asks for nothing, a list asks for
one of its members, a negation for nothing, a positive `$()` for what its own query asks. Alternatives are
multiplied out up to MAX_CHOICES; where there are more, the least telling neighbour is left out, which asks
for less.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator
from itertools import combinations, product
from typing import TypeAlias, TypeVar

from rdkit import Chem

from kb.chem.query_traits import BondTrait, Trait, bond_trait, traits_of, types_of
from kb.chem.screens_ask import NOTHING, AllOf, Ask, OneOf, all_of, flatten, one_of
from kb.chem.screens_keys import (
    AROMATIC,
    BOND_COUNT_STEPS,
    COUNT_STEPS,
    KEY_ANY_CYCLE,
    MAX_CYCLE,
    MAX_NEIGHBOURS,
    MAX_PAIR_BONDS,
    NOT_IN_RING,
    AtomType,
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
from kb.chem.screens_rings import HiddenRings, small_cycles

MAX_CHOICES = 48
"""Combinations of alternatives tried around one atom."""
MAX_CONNECTIONS = 15
"""Connections of a neighbour that structures keep apart; more are not asked for."""
MAX_MAKE_UPS = 32
"""Different make-ups of one ring that are asked for; more, and its size alone is."""
MAX_DEPTH = 6
"""Depth of recursive queries that is followed; deeper parts ask for nothing."""


_T = TypeVar("_T")


def ask_of(mol: Chem.Mol, depth: int = 0) -> AllOf:
    """Return what a query asks of the augmented screen.

    Args:
        mol: the query, rings perceived.
        depth: of recursion so far.
    """
    traits = [traits_of(atom) for atom in mol.GetAtoms()]
    rings = [tuple(ring) for ring in mol.GetRingInfo().AtomRings()]
    in_ring = {atom for ring in rings for atom in ring}
    bonds = _bonds(mol, rings)
    asks: list[Ask] = []
    for atom, alternatives in enumerate(traits):
        around = [(bond, traits[other]) for bond, other in bonds[atom]]
        asks.append(one_of(_star(trait, around, atom in in_ring, depth) for trait in alternatives))
    for atom, joined in enumerate(bonds):
        for bond, other in joined:
            if other > atom:
                asks += _bonded(atom, other, bond, traits, bonds)
    try:
        cycles = small_cycles(mol, tuple(rings))
    except HiddenRings:
        cycles = None
    asks += [_cycle(ring, traits) for ring in (rings if cycles is None else cycles) if len(ring) <= MAX_CYCLE]
    asks += _counts(traits, bonds)
    return AllOf(tuple(flatten(asks)))


# ------------------------------------------------------------------------------------------- stars

_Around: TypeAlias = list[tuple[BondTrait, tuple[Trait, ...]]]
"""The bonds of an atom, each with the alternatives of its other end."""


def _star(trait: Trait, around: _Around, is_ring_atom: bool, depth: int) -> Ask:
    """Return what one alternative of an atom asks, its neighbours included."""
    asks: list[Ask] = [_inner(text, depth) for text in trait.inner]
    choices = []
    for centre in trait.types:
        parts = [_by_type(centre, around), _by_bond(centre, trait, around), _by_reach(centre, around)]
        if trait.smallest_ring is not None:
            parts.append(all_of(key_ring_atom(centre, trait.smallest_ring)))
        elif is_ring_atom or trait.in_ring:
            parts.append(all_of(key_ring_atom(centre, 0)))
        elif trait.in_ring is False:
            parts.append(all_of(key_ring_atom(centre, NOT_IN_RING)))
        choices.append(all_of(parts))
    asks.append(one_of(choices) if choices else _any_star(trait, is_ring_atom))
    return all_of(asks)


def _any_star(trait: Trait, is_ring_atom: bool) -> Ask:
    """Return what an alternative asks that does not say its element."""
    bits = [bit for what, value in _attributes(trait) if what != "q" or value for bit in key_any_atom(what, value)]
    if trait.smallest_ring is not None:
        bits += key_any_atom("r", trait.smallest_ring)
    elif is_ring_atom or trait.in_ring:
        bits += key_any_atom("r", 0)
    elif trait.in_ring is False:
        bits += key_any_atom("r", NOT_IN_RING)
    return all_of(bits)


def _inner(text: str, depth: int) -> Ask:
    if depth >= MAX_DEPTH:
        return NOTHING
    inner = Chem.MolFromSmarts(text)
    if inner is None:
        return NOTHING
    inner.UpdatePropertyCache(strict=False)
    Chem.GetSymmSSSR(inner)
    return ask_of(inner, depth + 1)


def _by_type(centre: AtomType, around: _Around) -> Ask:
    options = [list(types) for _, other in around if (types := types_of(other))]
    return one_of(
        all_of(bit for part in _parts(chosen) for bit in key_types(centre, part)) for chosen in _choices(options)
    )


def _by_bond(centre: AtomType, trait: Trait, around: _Around) -> Ask:
    options = [found for bond, other in around if (found := _typed_bonds(centre, bond, types_of(other)))]
    asked = [(what, value) for what, value in _attributes(trait) if what != "q" or value]
    return one_of(
        all_of(
            bit
            for part in _parts(chosen)
            for bits in (key_bonds(centre, part), *(key_attribute(what, value, centre, part) for what, value in asked))
            for bit in bits
        )
        for chosen in _choices(options)
    )


def _by_reach(centre: AtomType, around: _Around) -> Ask:
    """Return what the connections of the neighbours ask; two of them at least must be known."""
    options = []
    for bond, other in around:
        known = [t.connections for t in other]
        if all(number is not None and number <= MAX_CONNECTIONS for number in known):
            found = [
                (*typed, trait.connections)
                for trait in other
                for typed in _typed_bonds(centre, bond, trait.types)
                if trait.connections is not None
            ]
            if found:
                options.append(found)
    if len(options) < 2:
        return NOTHING
    return one_of(
        all_of(bit for part in _parts(chosen) if len(part) > 1 for bit in key_reach(centre, part))
        for chosen in _choices(options)
    )


def _attributes(trait: Trait) -> list[tuple[str, int]]:
    named = (("H", trait.hydrogens), ("X", trait.connections), ("D", trait.degree), ("q", trait.charge))
    return [(what, value) for what, value in named if value is not None]


def _typed_bonds(centre: AtomType, bond: BondTrait, types: tuple[AtomType, ...]) -> list[TypedBond]:
    """Return every (order, neighbour) that a bond admits; [] = it does not say.

    An aromatic bond joins aromatic atoms in every sanitised structure, so a plain query bond at an aliphatic
    end is a single bond.
    """
    if bond.orders is None or not types:
        return []
    return [
        (order, *neighbour)
        for neighbour in types
        for order in sorted(bond.orders)
        if order != AROMATIC or (centre[1] and neighbour[1])
    ]


def _choices(options: list[list[_T]]) -> set[tuple[_T, ...]]:
    """Return the sorted multisets that pick one option each, the widest left out until there are few."""
    options = sorted(options, key=len)
    while options and _size(options) > MAX_CHOICES:
        options.pop()
    return {tuple(sorted(chosen)) for chosen in product(*options)}  # type: ignore[type-var]


def _size(options: list[list[_T]]) -> int:
    size = 1
    for option in options:
        size *= len(option)
    return size


def _parts(chosen: tuple[_T, ...], most: int = MAX_NEIGHBOURS) -> Iterator[tuple[_T, ...]]:
    """Yield every sub-multiset that structures set bits for; the smaller ones guard against shared bits."""
    for size in range(min(most, len(chosen)), -1, -1):
        yield from set(combinations(chosen, size))


# ------------------------------------------------------------------------------------ rings, counts

_Bonds: TypeAlias = list[list[tuple[BondTrait, int]]]


def _bonds(mol: Chem.Mol, rings: list[tuple[int, ...]]) -> _Bonds:
    """Return (what the bond says, other end) for every atom; a bond of a query ring is in a ring."""
    cyclic = {frozenset(pair) for ring in rings for pair in zip(ring, (*ring[1:], ring[0]), strict=True)}
    bonds: _Bonds = [[] for _ in range(mol.GetNumAtoms())]
    for bond in mol.GetBonds():
        i, j = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()
        said = bond_trait(bond)
        if frozenset((i, j)) in cyclic:
            said = BondTrait(orders=said.orders, in_ring=True)
        bonds[i].append((said, j))
        bonds[j].append((said, i))
    return bonds


def _bonded(
    atom: int, other: int, bond: BondTrait, traits: list[tuple[Trait, ...]], bonds: _Bonds
) -> Iterator[Ask]:
    """Yield what a bond asks: its ring membership, what is known of both ends, and their other neighbours."""
    if bond.orders is None:
        return
    yield one_of(all_of(key_any_bond(order, bond.in_ring)) for order in sorted(bond.orders))
    ends = [(one, two) for one in traits[atom] for two in traits[other]]
    if not all(one.types and two.types for one, two in ends) or len(ends) > MAX_CHOICES:
        return
    joined = [
        (one, end, order, (element, aromatic), two)
        for one, two in ends
        for end in one.types
        for order, element, aromatic in _typed_bonds(end, bond, two.types)
    ]
    if bond.in_ring is not None:
        yield one_of(
            all_of(key_ring_bond(bond_kind(end, order, far), bool(bond.in_ring)))
            for _, end, order, far, _ in joined
        )
    links = [
        all_of(
            bit
            for what, value in _attributes(one)
            for further, number in _attributes(two)
            if what in _LINKED and further in _LINKED
            for bit in key_link((end, what, value), order, (far, further, number))
        )
        for one, end, order, far, two in joined
    ]
    yield one_of(links)
    kinds = dict.fromkeys((end, order, far) for _, end, order, far, _ in joined)
    yield one_of(
        _pair(end, order, far, _others(end, bonds[atom], other, traits), _others(far, bonds[other], atom, traits))
        for end, order, far in kinds
    )


_LINKED = ("H", "X")


def _others(
    centre: AtomType, around: list[tuple[BondTrait, int]], but: int, traits: list[tuple[Trait, ...]]
) -> list[list[TypedBond]]:
    """Return the options of every bond of an atom but one."""
    return [
        found
        for bond, far in around
        if far != but and (found := _typed_bonds(centre, bond, types_of(traits[far])))
    ]


def _pair(
    one: AtomType, order: int, other: AtomType, ones: list[list[TypedBond]], others: list[list[TypedBond]]
) -> Ask:
    near, far = _choices(ones), _choices(others)
    if len(near) * len(far) > MAX_CHOICES:
        return NOTHING
    return one_of(
        all_of(
            bit
            for part in _parts(chosen, MAX_PAIR_BONDS)
            for rest in _parts(further, MAX_PAIR_BONDS)
            if part and rest
            for bit in key_pair((one, part), order, (other, rest))
        )
        for chosen in near
        for further in far
    )


def _cycle(ring: tuple[int, ...], traits: list[tuple[Trait, ...]]) -> Ask:
    """Return what a ring of the query asks: a cycle of its size and, where that is known, its make-up."""
    asks: list[Ask] = [all_of(key_cycle(len(ring)))]
    options = [types_of(traits[atom]) for atom in ring]
    if all(options):
        by_type = _make_ups([list(types) for types in options])
        by_element = _make_ups([sorted({element for element, _ in types}) for types in options])
        for found in (by_type, by_element):
            asks.append(one_of(all_of(key_cycle(len(ring), make_up)) for make_up in found))
    return OneOf((KEY_ANY_CYCLE, all_of(asks)))


def _make_ups(options: list[list[_T]]) -> set[tuple[_T, ...]]:
    """Return the sorted multisets that pick one option for each atom; empty = too many."""
    found: set[tuple[_T, ...]] = {()}
    for option in options:
        found = {tuple(sorted((*some, one))) for some in found for one in option}  # type: ignore[type-var]
        if len(found) > MAX_MAKE_UPS:
            return set()
    return found


def _counts(traits: list[tuple[Trait, ...]], bonds: _Bonds) -> Iterator[Ask]:
    """Yield how many atoms, of a type or element or any, and bonds of a kind, any match must have."""
    types = [types_of(alternatives) for alternatives in traits]
    certain = [found[0] if len(found) == 1 else None for found in types]
    elements = [found[0][0] if found and len({z for z, _ in found}) == 1 else None for found in types]
    things: list[tuple[tuple[object, ...], int]] = [((), len(traits))]
    things += Counter(t for t in certain if t is not None).items()
    things += [(("Z", z), number) for z, number in Counter(z for z in elements if z is not None).items()]
    for thing, number in things:
        yield from (bit for step in COUNT_STEPS if step <= number for bit in key_count(thing, step))
    kinds: Counter[tuple[AtomType, int, AtomType]] = Counter()
    for atom, around in enumerate(bonds):
        for bond, other in around:
            one, end = certain[atom], certain[other]
            if other > atom and one is not None and end is not None:
                found = _typed_bonds(one, bond, (end,))
                if len(found) == 1:
                    kinds[bond_kind(one, found[0][0], end)] += 1
    for kind, number in kinds.items():
        yield from (bit for step in BOND_COUNT_STEPS if step <= number for bit in key_count(kind, step))

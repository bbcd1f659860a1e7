"""Augmented-atom screens: the bits that let a query drop nearly every structure before any graph match.

Owns what a *structure* sets; what a *query* may ask for is `screens_query.py`, and both speak in the keys
of `screens_keys.py`. A screen is a promise in one direction only: whatever a query asks for is set by every
structure that it matches. A bit too many in a structure costs time, a bit too few would lose a hit, so every
doubt on this side sets more bits.

A structure sets, for each atom: its type (element and aromaticity) with every sub-multiset of up to four
neighbours, by type alone and with bond orders, the latter also together with the atom's hydrogens,
connections and charge; its ring membership and smallest ring. It sets bonds with ring membership; how many
atoms of a type, of an element and bonds of a kind there are, up to a few; and which cycles there are with
their make-up.

Stored beside it: RDKit's pattern fingerprint and the Morgan fingerprint. `SCREEN_RECIPE` names all of it with
the version of RDKit; screens of another recipe are rebuilt, never searched.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import combinations
from typing import TYPE_CHECKING, TypeAlias

import numpy as np
from rdkit import Chem, rdBase

from kb.chem.fingerprint import MORGAN_RECIPE, PATTERN_RECIPE, pack_morgan, pack_pattern
from kb.chem.screens_keys import (
    AROMATIC,
    AUGMENTED_BITS,
    AUGMENTED_REVISION,
    BOND_COUNT_STEPS,
    COUNT_STEPS,
    DOUBLE,
    KEY_ANY_CYCLE,
    KEY_UNRULY,
    MAX_NEIGHBOURS,
    OTHER,
    SINGLE,
    TRIPLE,
    AtomType,
    bond_kind,
    key_attribute,
    key_bonds,
    key_count,
    key_cycle,
    key_ring_atom,
    key_ring_bond,
    key_types,
)
from kb.chem.screens_rings import NO_RINGS, RingFacts, find_rings
from kb.errors import StructureError

if TYPE_CHECKING:
    from collections.abc import Iterable

SCREEN_RECIPE = (
    f"augmented-{AUGMENTED_REVISION}-{AUGMENTED_BITS};{PATTERN_RECIPE};{MORGAN_RECIPE};rdkit-{rdBase.rdkitVersion}"
)
"""What made the blobs: kinds, parameters, versions. Stored with them, compared before they are searched."""

ANYTHING = (1 << AUGMENTED_BITS) - 1
"""The screen of a structure that no query may drop."""

UNRULY_RINGS = 8
UNRULY_ATOMS = 150
"""Beyond either, a loose query may search one structure for seconds (judgement after trials)."""
_MATRIX_ATOMS = 400
"""Above this an adjacency matrix costs more than a walk over the bonds."""
_MEMO_LIMIT = 200_000
"""Entries before a memo is emptied; a million drug-like structures need far fewer."""
_ORDER_CODES = {1.0: SINGLE, 2.0: DOUBLE, 3.0: TRIPLE, 1.5: AROMATIC}


@dataclass(frozen=True, slots=True, kw_only=True)
class StructureBlobs:
    """What is stored beside one structure, made by `SCREEN_RECIPE`.

    Attributes:
        mol_binary: RDKit's binary of the molecule, atoms in the order of the SMILES it came from.
        augmented, pattern, morgan: packed, bit i is bit i % 8 of byte i // 8.
    """

    mol_binary: bytes
    augmented: bytes
    pattern: bytes
    morgan: bytes


def encode_structure(smiles: str) -> StructureBlobs:
    """Return the screens of one structure.

    Args:
        smiles: SMILES of one component; its atom order is kept.

    Raises:
        StructureError: when RDKit cannot read it.
    """
    mol = Chem.MolFromSmiles(smiles)
    if mol is None:
        raise StructureError(f"{smiles[:80]!r} is no readable structure.", "Correct the SMILES.", smiles)
    return encode_mol(mol)


def encode_mol(mol: Chem.Mol) -> StructureBlobs:
    """Return the screens of a sanitised molecule, its atoms kept in their order."""
    return StructureBlobs(
        mol_binary=mol.ToBinary(int(Chem.PropertyPickleOptions.NoProps)),
        augmented=augmented_mask(mol).to_bytes(AUGMENTED_BITS // 8, "little"),
        pattern=pack_pattern(mol),
        morgan=pack_morgan(mol),
    )


def augmented_mask(mol: Chem.Mol) -> int:
    """Return the augmented-atom screen of a molecule as one integer of AUGMENTED_BITS bits.

    Environments repeat heavily between structures, so the bits of each are hashed once and remembered; what
    is left to do for a structure is to gather its environments and join integers.
    """
    n_atoms = mol.GetNumAtoms()
    types: list[AtomType] = []
    attributes: list[tuple[int, int]] = []
    for atom in map(mol.GetAtomWithIdx, range(n_atoms)):
        types.append((atom.GetAtomicNum(), atom.GetIsAromatic()))
        attributes.append((atom.GetTotalNumHs(), atom.GetFormalCharge()))
    rings = find_rings(mol, types) if mol.GetRingInfo().NumRings() else NO_RINGS
    ring_bonds = rings.bonds
    neighbours: list[list[_Spoke]] = [[] for _ in range(n_atoms)]
    kinds: dict[tuple[AtomType, int, AtomType], int] = {}
    for i, j, order in _bond_list(mol, n_atoms):
        one, other = types[i], types[j]
        if order == AROMATIC and not (one[1] and other[1]):
            return ANYTHING  # no sanitised molecule looks so, and queries rely on that
        in_ring = (i, j) in ring_bonds
        neighbours[i].append((order, other, in_ring))
        neighbours[j].append((order, one, in_ring))
        kind = (one, order, other) if one <= other else (other, order, one)
        kinds[kind] = kinds.get(kind, 0) + 1
    mask = 0
    known = _MASKS.get
    counts: dict[AtomType, int] = {}
    for atom_type, attribute, around in zip(types, attributes, neighbours, strict=True):
        around.sort()
        key = (atom_type, attribute, *around)
        found = known(key)
        mask |= _remember(key, _atom_mask(atom_type, attribute, around)) if found is None else found
        counts[atom_type] = counts.get(atom_type, 0) + 1
    for what, number in (*counts.items(), *kinds.items()):
        if number > 1:
            count = (what, number)
            found = known(count)
            mask |= _remember(count, _count_mask(what, number)) if found is None else found
    return mask | _element_mask(counts) | _ring_mask(rings, types)


_Spoke: TypeAlias = tuple[int, AtomType, bool]
"""Bond code, type of the neighbour, and whether the bond is in a ring."""

_MASKS: dict[tuple[object, ...], int] = {}


def _remember(key: tuple[object, ...], mask: int) -> int:
    if len(_MASKS) >= _MEMO_LIMIT:
        _MASKS.clear()
    _MASKS[key] = mask
    return mask


def _mask_of(bits: Iterable[int]) -> int:
    mask = 0
    for bit in bits:
        mask |= 1 << bit
    return mask


def _atom_mask(centre: AtomType, attribute: tuple[int, int], spokes: list[_Spoke]) -> int:
    """Return the bits of one atom with its bonds."""
    drawn_hydrogens = sum(1 for _, (element, _), _ in spokes if element == 1)
    hydrogens, charge = attribute
    asked = [("H", hydrogens + drawn_hydrogens), ("X", hydrogens + len(spokes)), ("D", len(spokes))]
    if charge:
        asked.append(("q", charge))
    around = sorted((order, *neighbour) for order, neighbour, _ in spokes)
    bits = {key_ring_bond(bond_kind(centre, order, other), in_ring) for order, other, in_ring in spokes}
    for size in range(min(MAX_NEIGHBOURS, len(around)) + 1):
        for chosen in set(combinations(around, size)):
            bits.add(key_types(centre, tuple(sorted((z, a) for _, z, a in chosen))))
            bits.add(key_bonds(centre, chosen))
            bits.update(key_attribute(what, value, centre, chosen) for what, value in asked)
    return _mask_of(bits)


def _count_mask(what: tuple[object, ...], number: int) -> int:
    steps = COUNT_STEPS if len(what) == 2 else BOND_COUNT_STEPS
    return _mask_of(key_count(what, step) for step in steps if step <= number)


def _element_mask(counts: dict[AtomType, int]) -> int:
    """Return the bits for how many atoms of an element there are, aromatic or not."""
    totals: dict[int, int] = {}
    for (element, _), number in counts.items():
        totals[element] = totals.get(element, 0) + number
    mask = 0
    for element, number in totals.items():
        if number > 1:
            key = ("Z", element, number)
            found = _MASKS.get(key)
            mask |= _remember(key, _count_mask(("Z", element), number)) if found is None else found
    return mask


def _ring_mask(rings: RingFacts, types: list[AtomType]) -> int:
    """Return the bits for ring atoms and cycles."""
    mask = 0
    known = _MASKS.get
    for key in {(*types[atom], size) for atom, size in rings.smallest.items()}:
        found = known(key)
        if found is None:
            centre = key[:2]
            found = _remember(key, _mask_of((key_ring_atom(centre, 0), key_ring_atom(centre, key[2]))))
        mask |= found
    for centre in {t for atom, t in enumerate(types) if atom not in rings.smallest}:
        key = (*centre, -1)
        found = known(key)
        mask |= _remember(key, _mask_of((key_ring_atom(centre, -1),))) if found is None else found
    for cycle in rings.cycles:
        found = known(cycle)
        mask |= _remember(cycle, _cycle_mask(*cycle)) if found is None else found
    if rings.any_cycle:
        mask |= 1 << KEY_ANY_CYCLE
    if rings.any_cycle or rings.rank > UNRULY_RINGS or len(types) > UNRULY_ATOMS:
        mask |= 1 << KEY_UNRULY
    return mask


def _cycle_mask(size: int, make_up: tuple[AtomType, ...]) -> int:
    elements = tuple(sorted(z for z, _ in make_up))
    return _mask_of((key_cycle(size), key_cycle(size, elements), key_cycle(size, make_up)))


def _bond_list(mol: Chem.Mol, n_atoms: int) -> list[tuple[int, int, int]]:
    """Return (lower atom, higher atom, bond code) of every bond, by the quickest way that loses none."""
    n_bonds = mol.GetNumBonds()
    if 0 < n_atoms <= _MATRIX_ATOMS:
        orders = Chem.GetAdjacencyMatrix(mol, useBO=True).ravel()
        where = np.flatnonzero(orders)
        if len(where) == 2 * n_bonds:  # bonds of order zero do not show in the matrix
            return [
                (at // n_atoms, at % n_atoms, _ORDER_CODES.get(value, OTHER))
                for at, value in zip(where.tolist(), orders[where].tolist(), strict=True)
                if at // n_atoms < at % n_atoms
            ]
    bonds = []
    for bond in mol.GetBonds():
        i, j = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()
        bonds.append((min(i, j), max(i, j), _ORDER_CODES.get(bond.GetBondTypeAsDouble(), OTHER)))
    return bonds

"""Augmented-atom screens: the bits that let a query drop nearly every structure before any graph match.

Owns what a *structure* sets; what a *query* may ask for is `screens_query.py`, and both speak in the keys
of `screens_keys.py`. A screen is a promise in one direction only: whatever a query asks for is set by every
structure that it matches. A bit too many in a structure costs time, a bit too few would lose a hit, so every
doubt on this side sets more bits.

A structure sets, for each atom: its type (element and aromaticity) with every sub-multiset of up to four
neighbours, by type alone, with bond orders, and with the neighbours' connections; the second also together
with the atom's hydrogens, connections and charge; its ring membership and smallest ring. For each bond:
ring membership, hydrogens and connections of both ends, and both ends with their other neighbours. And how
many atoms of a type, of an element and bonds of a kind there are, up to a few, and which small cycles with
their make-up.

Stored beside it: the molecule and its Morgan fingerprint. RDKit's pattern fingerprint is not stored: beside
these screens it dropped next to nothing more, and it cost half of an import (tests/speed has the figures).
`SCREEN_RECIPE` names all of it with the version of RDKit; screens of another recipe are rebuilt, never
searched.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from rdkit import Chem, rdBase

from kb.chem.fingerprint import pack_morgan
from kb.chem.screens_keys import (
    AROMATIC,
    AUGMENTED_BITS,
    BLOBS_RECIPE,
    DOUBLE,
    KEY_ANY_CYCLE,
    KEY_UNRULY,
    NOT_IN_RING,
    OTHER,
    REVISION_MASK,
    SINGLE,
    TRIPLE,
)
from kb.chem.screens_masks import (
    ANY_COUNT,
    BOND_COUNT,
    CYCLE,
    ELEMENT_COUNT,
    REACH,
    TYPE_COUNT,
    Memo,
    current_memo,
)
from kb.chem.screens_rings import HiddenRings, small_cycles
from kb.errors import StructureError

SCREEN_RECIPE = f"{BLOBS_RECIPE} rdkit/{rdBase.rdkitVersion}"
"""What made the blobs: kinds, parameters, versions. Stored with them, compared before they are searched."""

ANYTHING = ((1 << AUGMENTED_BITS) - 1) & ~0xFF00 | REVISION_MASK
"""The screen of a structure that no query may drop."""

UNRULY_RINGS = 8
UNRULY_ATOMS = 150
"""Beyond either, a loose query may search one structure for seconds (judgement after trials)."""
_MATRIX_ATOMS = 400
"""Above this an adjacency matrix costs more than a walk over the bonds."""
_ORDER_CODES = {1.0: SINGLE, 2.0: DOUBLE, 3.0: TRIPLE, 1.5: AROMATIC}


@dataclass(frozen=True, slots=True, kw_only=True)
class StructureBlobs:
    """What is stored beside one structure, made by `SCREEN_RECIPE`.

    Attributes:
        mol_binary: RDKit's binary of the molecule, atoms in the order of the SMILES it came from.
        augmented, morgan: packed, bit i is bit i % 8 of byte i // 8.
        pattern: None; RDKit's pattern fingerprint is not part of this recipe.
    """

    mol_binary: bytes
    augmented: bytes
    morgan: bytes
    pattern: None = None


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
        mol_binary=mol.ToBinary(_NO_PROPERTIES),
        augmented=augmented_mask(mol).to_bytes(AUGMENTED_BITS // 8, "little"),
        morgan=pack_morgan(mol),
    )


_NO_PROPERTIES = int(Chem.PropertyPickleOptions.NoProps)


def augmented_mask(mol: Chem.Mol) -> int:
    """Return the augmented-atom screen of a molecule as one integer of AUGMENTED_BITS bits.

    Environments repeat heavily between structures, so the bits of each are hashed once and remembered; what
    is left to do for a structure is to gather its environments, as small integers, and to join masks.
    """
    n_atoms = mol.GetNumAtoms()
    types: list[int] = []
    hydrogens: list[int] = []
    charges: list[int] = []
    for atom in map(mol.GetAtomWithIdx, range(n_atoms)):
        types.append(atom.GetAtomicNum() << 1 | atom.GetIsAromatic())
        hydrogens.append(atom.GetTotalNumHs())
        charges.append(atom.GetFormalCharge())
    atom_rings = mol.GetRingInfo().AtomRings()
    ring_sets = [0] * n_atoms
    smallest = [NOT_IN_RING] * n_atoms
    for number, ring in enumerate(sorted(atom_rings, key=len, reverse=True)):
        size, member = len(ring), 1 << number
        for at in ring:
            ring_sets[at] |= member
            smallest[at] = size
    bonds = _bond_list(mol, n_atoms)
    around: list[list[int]] = [[] for _ in range(n_atoms)]
    kinds: dict[int, int] = {}
    for i, j, order in bonds:
        one, other = types[i], types[j]
        if order == AROMATIC and not one & other & 1:
            return ANYTHING  # no sanitised molecule looks so, and queries rely on that
        spoke = order << 1 | (ring_sets[i] & ring_sets[j] != 0)
        around[i].append(other << 4 | spoke)
        around[j].append(one << 4 | spoke)
        kind = (one << 12 | other if one < other else other << 12 | one) << 4 | order
        kinds[kind] = kinds.get(kind, 0) + 1
    memo = current_memo()
    known = memo.masks.get
    core_of = memo.core_of.get
    mask = REVISION_MASK
    cores: list[int] = []
    connections: list[int] = []
    for kind, count, charge, size, spokes in zip(types, hydrogens, charges, smallest, around, strict=True):
        spokes.sort()
        key = (kind, count, *spokes)
        core = core_of(key)
        if core is None:
            core = memo.number(key)
        cores.append(core)
        connections.append(count + len(spokes))
        place = (core, charge, size)
        found = known(place)
        mask |= memo.atom(place) if found is None else found
    reaching: list[list[int]] = [[] for _ in range(n_atoms)]
    pairs = set()
    for i, j, order in bonds:
        one, other = cores[i], cores[j]
        pairs.add((one, other, order, 1) if one < other else (other, one, order, 1))
        reaching[i].append((types[j] << 4 | connections[j] & 15) << 3 | order)
        reaching[j].append((types[i] << 4 | connections[i] & 15) << 3 | order)
    for pair in pairs:
        found = known(pair)
        mask |= memo.pair(pair) if found is None else found
    for kind, spokes in zip(types, reaching, strict=True):
        if len(spokes) > 1:
            spokes.sort()
            far = (REACH, kind, *spokes)
            found = known(far)
            mask |= memo.reach(far) if found is None else found
    mask |= _counts(memo, types, kinds)
    try:
        mask |= _cycles(memo, mol, atom_rings, types)
    except HiddenRings:
        return ANYTHING
    if len(atom_rings) > UNRULY_RINGS or n_atoms > UNRULY_ATOMS:
        mask |= 1 << KEY_UNRULY
    return mask


def _counts(memo: Memo, types: list[int], kinds: dict[int, int]) -> int:
    """Return the bits for how many atoms and bonds of each kind there are."""
    by_type: dict[int, int] = {}
    for code in types:
        by_type[code] = by_type.get(code, 0) + 1
    by_element: dict[int, int] = {}
    for code, number in by_type.items():
        by_element[code >> 1] = by_element.get(code >> 1, 0) + number
    keys = [(ANY_COUNT, 0, min(len(types), 32))]
    keys += [(TYPE_COUNT, code, number) for code, number in by_type.items() if number > 1]
    keys += [(ELEMENT_COUNT, element, number) for element, number in by_element.items() if number > 1]
    keys += [(BOND_COUNT, kind, number) for kind, number in kinds.items() if number > 1]
    mask = 0
    for key in keys:
        found = memo.masks.get(key)
        mask |= memo.count(key) if found is None else found
    return mask


def _cycles(memo: Memo, mol: Chem.Mol, atom_rings: tuple[tuple[int, ...], ...], types: list[int]) -> int:
    """Return the bits for the cycles of a molecule."""
    cycles = small_cycles(mol, atom_rings)
    if cycles is None:
        return 1 << KEY_ANY_CYCLE | 1 << KEY_UNRULY
    mask = 0
    for cycle in cycles:
        key = (CYCLE, *sorted([types[at] for at in cycle]))
        found = memo.masks.get(key)
        mask |= memo.cycle(key) if found is None else found
    return mask


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

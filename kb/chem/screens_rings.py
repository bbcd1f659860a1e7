"""Which cycles a molecule has, and which atoms and bonds are in rings, for the screens.

A query ring must be found in every structure that holds such a cycle, whether or not it is one of the
smallest rings: cyclohexane matches norbornane, whose smallest rings are two five-membered ones. Every cycle
is a sum (symmetric difference of bonds) of rings of a basis, so all sums within each fused system are taken;
sums that are no simple cycle only add a bit too many. Where that is too much work, or RDKit's rings are no
full basis, the molecule is said to have any cycle.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import combinations

from rdkit import Chem

from kb.chem.screens_keys import MAX_CYCLE, AtomType

MAX_SUMMED_RINGS = 6
"""Rings of one fused system whose sums are all enumerated (63 at most)."""


@dataclass(frozen=True, slots=True, kw_only=True)
class RingFacts:
    """What the screens need to know of the rings.

    Attributes:
        smallest: atom to the size of its smallest ring; atoms outside rings are missing.
        bonds: (lower atom, higher atom) of every bond in a ring.
        cycles: (size, sorted atom types) of every cycle up to MAX_CYCLE atoms.
        any_cycle: the list of cycles may be short, so no query may rely on it.
        rank: independent rings in all.
    """

    smallest: dict[int, int]
    bonds: frozenset[tuple[int, int]]
    cycles: frozenset[tuple[int, tuple[AtomType, ...]]]
    any_cycle: bool
    rank: int


NO_RINGS = RingFacts(smallest={}, bonds=frozenset(), cycles=frozenset(), any_cycle=False, rank=0)


def find_rings(mol: Chem.Mol, types: list[AtomType]) -> RingFacts:
    """Return the ring facts of a molecule whose rings RDKit has perceived.

    Args:
        mol: the molecule.
        types: its atom types, by atom number.
    """
    info = mol.GetRingInfo()
    atom_rings = info.AtomRings()
    if not atom_rings:
        return NO_RINGS
    bond_rings = info.BondRings()
    smallest: dict[int, int] = {}
    bonds = set()
    for ring in atom_rings:
        size = len(ring)
        before = ring[-1]
        for atom in ring:
            if size < smallest.get(atom, 1 << 30):
                smallest[atom] = size
            bonds.add((atom, before) if atom < before else (before, atom))
            before = atom
    systems = _fused_systems(bond_rings)
    cycles = set()
    rank = 0
    any_cycle = False
    for system in systems:
        if len(system) == 1:
            rank += 1
            ring = atom_rings[system[0]]
            if len(ring) <= MAX_CYCLE:
                cycles.add((len(ring), tuple(sorted([types[a] for a in ring]))))
            continue
        rank += _rank([bond_rings[r] for r in system])
        if len(system) > MAX_SUMMED_RINGS:
            any_cycle = True
            continue
        cycles |= _sums(mol, [bond_rings[r] for r in system], types)
    if rank != mol.GetNumBonds() - mol.GetNumAtoms() + len(Chem.GetMolFrags(mol)):
        any_cycle = True
    return RingFacts(
        smallest=smallest,
        bonds=frozenset(bonds),
        cycles=frozenset(cycles),
        any_cycle=any_cycle,
        rank=rank,
    )


def _fused_systems(bond_rings: tuple[tuple[int, ...], ...]) -> list[list[int]]:
    """Group ring numbers by shared bonds; a spiro atom shares no bond, so no cycle runs through both."""
    if len(bond_rings) == 1:
        return [[0]]
    systems: list[tuple[set[int], list[int]]] = []
    for number, ring in enumerate(bond_rings):
        bonds = set(ring)
        members = [number]
        apart = []
        for other_bonds, other_members in systems:
            if bonds.isdisjoint(other_bonds):
                apart.append((other_bonds, other_members))
            else:
                bonds |= other_bonds
                members += other_members
        systems = [*apart, (bonds, members)]
    return [members for _, members in systems]


def _rank(rings: list[tuple[int, ...]]) -> int:
    """Return how many rings are independent, over sums of bonds."""
    basis: dict[int, int] = {}
    for ring in rings:
        row = sum(1 << b for b in ring)
        while row:
            lead = row.bit_length()
            if lead not in basis:
                basis[lead] = row
                break
            row ^= basis[lead]
    return len(basis)


def _sums(
    mol: Chem.Mol, rings: list[tuple[int, ...]], types: list[AtomType]
) -> set[tuple[int, tuple[AtomType, ...]]]:
    """Return size and atom types of every sum of the rings."""
    ends = {}
    for number in {b for ring in rings for b in ring}:
        bond = mol.GetBondWithIdx(number)
        ends[number] = (bond.GetBeginAtomIdx(), bond.GetEndAtomIdx())
    sets = [frozenset(ring) for ring in rings]
    found = set()
    for size in range(1, len(sets) + 1):
        for chosen in combinations(sets, size):
            bonds: frozenset[int] = frozenset()
            for ring in chosen:
                bonds ^= ring
            if 3 <= len(bonds) <= MAX_CYCLE:
                atoms = {a for b in bonds for a in ends[b]}
                found.add((len(bonds), tuple(sorted([types[a] for a in atoms]))))
    return found

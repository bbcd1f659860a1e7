"""Which cycles a molecule has, for the screens.

A query ring must be found in every structure that holds such a cycle, whether or not it is one of the
smallest rings: cyclohexane matches norbornane, whose smallest rings are two five-membered ones. Every cycle
is a sum (symmetric difference of bonds) of rings of a basis, so sums within each fused system are taken;
sums that are no simple cycle only add a bit too many. Cycles beyond MAX_CYCLE atoms have no bits and are
left out. Where the sums are too many the molecule is said to have any cycle. Where RDKit's rings are no
full basis (it leaves bonds to metals out of its rings, a query does not) nothing may be said of its rings:
`HiddenRings`.

The usual case is quick: rings that share one bond at most, in no circle of rings, add up to cycles of
size a + b - 2 and more, which is beyond MAX_CYCLE unless the rings are small.
"""

from __future__ import annotations

from itertools import combinations
from typing import TypeAlias

from rdkit import Chem

from kb.chem.screens_keys import MAX_CYCLE

MAX_SUMMED_RINGS = 6
"""Rings of one fused system whose sums are all enumerated (63 at most)."""
_MANY_RINGS = 12
"""Beyond this the quick test of all pairs is not worth making."""

Cycle: TypeAlias = tuple[int, ...]
"""The atoms of a cycle, in no order."""


class HiddenRings(Exception):
    """The molecule has cycles that RDKit's rings do not account for."""


def small_cycles(mol: Chem.Mol, atom_rings: tuple[Cycle, ...]) -> list[Cycle] | None:
    """Return every cycle of MAX_CYCLE atoms or fewer (perhaps a few sums that are none); None = it may have any.

    Args:
        mol: the molecule, rings perceived.
        atom_rings: its rings by atoms.

    Raises:
        HiddenRings: the rings do not account for every cycle.
    """
    if len(atom_rings) < _rings_expected(mol):
        raise HiddenRings
    if not atom_rings:
        return []
    rings = [ring for ring in atom_rings if len(ring) <= MAX_CYCLE]
    if len(atom_rings) == 1:
        return rings
    if len(atom_rings) <= _MANY_RINGS:
        fused = _simple_fusions(atom_rings)
        if fused is not None:
            return rings + fused
    return _all_sums(mol)


def _simple_fusions(atom_rings: tuple[Cycle, ...]) -> list[Cycle] | None:
    """Return the small cycles round two rings where rings share one bond at most, in no circle; None otherwise."""
    sets = [set(ring) for ring in atom_rings]
    group = list(range(len(sets)))
    found: list[Cycle] = []
    fused = False
    for a, b in combinations(range(len(sets)), 2):
        one, other = sets[a], sets[b]
        if one.isdisjoint(other):
            continue
        shared = len(one & other)
        if shared == 1:
            continue
        if shared > 2 or group[a] == group[b]:
            return None
        fused = True
        old, new = group[b], group[a]
        group = [new if g == old else g for g in group]
        if len(one) + len(other) - 2 <= MAX_CYCLE:
            found.append(tuple(one | other))
    if fused and sum(sorted(map(len, sets))[:3]) - 4 <= MAX_CYCLE and len(sets) > 2:
        return None
    return found


def _all_sums(mol: Chem.Mol) -> list[Cycle] | None:
    bond_rings = mol.GetRingInfo().BondRings()
    systems = _fused_systems(bond_rings)
    if sum(map(_rank, systems)) != _rings_expected(mol):
        raise HiddenRings
    if any(len(system) > MAX_SUMMED_RINGS for system in systems):
        return None
    return list(set().union(*(_sums(mol, system) for system in systems)))


def _rings_expected(mol: Chem.Mol) -> int:
    """Return how many independent rings the bonds make."""
    return mol.GetNumBonds() - mol.GetNumAtoms() + len(Chem.GetMolFrags(mol))


def _fused_systems(bond_rings: tuple[tuple[int, ...], ...]) -> list[list[frozenset[int]]]:
    """Group rings by shared bonds; a spiro atom shares no bond, so no cycle runs through both."""
    systems: list[tuple[frozenset[int], list[frozenset[int]]]] = []
    for ring in map(frozenset, bond_rings):
        bonds, members = ring, [ring]
        apart = []
        for other_bonds, other_members in systems:
            if bonds.isdisjoint(other_bonds):
                apart.append((other_bonds, other_members))
            else:
                bonds |= other_bonds
                members += other_members
        systems = [*apart, (bonds, members)]
    return [members for _, members in systems]


def _rank(rings: list[frozenset[int]]) -> int:
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


def _sums(mol: Chem.Mol, rings: list[frozenset[int]]) -> set[Cycle]:
    """Return the atoms of every small sum of the rings."""
    found = set()
    for size in range(1, len(rings) + 1):
        for chosen in combinations(rings, size):
            bonds: frozenset[int] = frozenset()
            for ring in chosen:
                bonds ^= ring
            if 3 <= len(bonds) <= MAX_CYCLE:
                ends = [mol.GetBondWithIdx(b) for b in bonds]
                atoms = {b.GetBeginAtomIdx() for b in ends} | {b.GetEndAtomIdx() for b in ends}
                found.add(tuple(sorted(atoms)))
    return found

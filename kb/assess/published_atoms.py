"""Plain questions about an atom and its groups, as the published models ask them.

It owns words for groups and bridgehead bookkeeping; it changes no molecule. All molecules are sanitised, hydrogens
implicit. A bridgehead is judged by rings below eight members that share more than one bond.
"""

from __future__ import annotations

from rdkit import Chem

HALOGENS = frozenset({9, 17, 35, 53})
_SIZES = ("methyl", "n-alkyl", "sec-alkyl", "tert-alkyl")


def size_word(mol: Chem.Mol, atom: int, seen_from: int) -> str:
    """Return how a group acts on an alkene in the making, seen from its carrier (words of SIZES)."""
    group = mol.GetAtomWithIdx(atom)
    if group.GetAtomicNum() in HALOGENS:
        return "halogen"
    if group.GetAtomicNum() != 6:
        return "carbonyl" if is_acceptor(group) else "hetero"
    if group.GetIsAromatic():
        return "poor aryl" if _is_poor(mol, atom) else "aryl"
    for bond in group.GetBonds():
        if bond.GetBondTypeAsDouble() >= 2:
            other = bond.GetOtherAtom(group)
            if other.GetAtomicNum() in (7, 8, 16):
                return "carbonyl"
            return "vinyl" if bond.GetBondTypeAsDouble() == 2 else "alkynyl"
    heavy = sum(n.GetIdx() != seen_from for n in group.GetNeighbors())
    return _SIZES[min(heavy, 3)]


def _is_poor(mol: Chem.Mol, atom: int) -> bool:
    """Return whether an acceptor stands ortho or para on a benzene ring seen from one of its carbons."""
    for ring in mol.GetRingInfo().AtomRings():
        if atom not in ring or len(ring) != 6 or not all(mol.GetAtomWithIdx(i).GetAtomicNum() == 6 for i in ring):
            continue
        place = ring.index(atom)
        for step in (1, 3, 5):
            carbon = mol.GetAtomWithIdx(ring[(place + step) % 6])
            for group in carbon.GetNeighbors():
                if group.GetIdx() in ring:
                    continue
                is_nitrile = group.GetAtomicNum() == 6 and any(
                    b.GetBondTypeAsDouble() == 3 and b.GetOtherAtom(group).GetAtomicNum() == 7 for b in group.GetBonds()
                )
                if is_nitrile or (is_acceptor(group) and any(n.GetAtomicNum() == 8 for n in group.GetNeighbors())):
                    return True
    return False


def is_sp3_carbon(atom: Chem.Atom) -> bool:
    """Return whether an atom is a carbon with single bonds only."""
    return (
        atom.GetAtomicNum() == 6
        and not atom.GetIsAromatic()
        and all(b.GetBondTypeAsDouble() == 1 for b in atom.GetBonds())
    )


def is_acceptor(atom: Chem.Atom) -> bool:
    """Return whether a heteroatom draws electrons: nitro, sulfone, sulfoxide, phosphoryl, onium."""
    if atom.GetFormalCharge() > 0:
        return True
    return atom.GetAtomicNum() in (15, 16) and any(b.GetBondTypeAsDouble() == 2 for b in atom.GetBonds())


def is_bridgehead(mol: Chem.Mol, atom: int) -> bool:
    """Return whether two small rings through the atom share more than one bond."""
    rings = [set(r) for r in mol.GetRingInfo().AtomRings() if atom in r and len(r) < 8]
    ring_bonds = sum(b.IsInRing() for b in mol.GetAtomWithIdx(atom).GetBonds())
    if ring_bonds < 3:
        return False
    return any(len(a & b) > 2 for i, a in enumerate(rings) for b in rings[i + 1 :])


def breaks_bredt(mol: Chem.Mol, one: int, other: int) -> bool:
    """Return whether a double bond there would sit at a small bridgehead or in a ring of three."""
    info = mol.GetRingInfo()
    if any(len(r) == 3 and one in r and other in r for r in info.AtomRings()):
        return True
    return any(is_bridgehead(mol, a) and mol.GetBondBetweenAtoms(one, other).IsInRing() for a in (one, other))


def count_carbons(mol: Chem.Mol, atom: int, away: int) -> int:
    """Return how many carbon neighbours an atom has besides `away`."""
    return sum(n.GetAtomicNum() == 6 and n.GetIdx() != away for n in mol.GetAtomWithIdx(atom).GetNeighbors())

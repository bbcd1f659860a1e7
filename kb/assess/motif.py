"""The motif of a failure: which atoms were lost, and how much around them is needed to tell it from survivors.

It owns the generalisation. Atoms of the substrate that no longer stand in what was found are the lost ones; the motif
is their smallest surrounding (radius 0, 1, 2 bonds) that still matches the failed substrate and does not match the
substrates that survived conditions at least as forcing. Where no radius excludes them the narrowest motif is returned
and marked: the record contradicts itself there.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import Any

MAX_RADIUS = 2
MCS_SECONDS = 1
_MATCHES = 64


@dataclass(frozen=True, slots=True, kw_only=True)
class Motif:
    """A generalised environment.

    Attributes:
        smarts: of the motif.
        atoms: its atoms in the failed substrate.
        radius: bonds around the lost atoms that it reaches.
        is_contradicted: survivors hold it all the same.
    """

    smarts: str
    atoms: tuple[int, ...]
    radius: int
    is_contradicted: bool


@lru_cache(maxsize=65536)
def lost_atoms_of(substrate_smiles: str, found_smiles: str) -> frozenset[int]:
    """Return `lost_atoms` of two SMILES, kept; empty where either cannot be read."""
    from rdkit import Chem, rdBase

    with rdBase.BlockLogs():
        substrate, found = Chem.MolFromSmiles(substrate_smiles), Chem.MolFromSmiles(found_smiles)
    return lost_atoms(substrate, found) if substrate is not None and found is not None else frozenset()


def lost_atoms(substrate: Any, found: Any) -> frozenset[int]:
    """Return the substrate's atoms that the found product no longer has.

    Where what was found is a part of the substrate, as after the loss of most groups, that part is the answer; where it
    fits in several ways, one that leaves the lost atoms in one piece. Otherwise a maximum common substructure decides.

    Args:
        substrate, found: RDKit molecules.

    Returns:
        Atom numbers of the substrate; empty where nothing was lost or the two share too little to say (under half).
    """
    every = frozenset(range(substrate.GetNumAtoms()))
    if found.GetNumAtoms() < len(every):
        matches = substrate.GetSubstructMatches(found, uniquify=True, maxMatches=_MATCHES)
        if matches and found.GetNumAtoms() * 2 >= len(every):
            rests = sorted((every - frozenset(match) for match in matches), key=sorted)
            return min(rests, key=lambda rest: _pieces(substrate, rest))
    return _by_common_part(substrate, found, every)


def _by_common_part(substrate: Any, found: Any, every: frozenset[int]) -> frozenset[int]:
    from rdkit import Chem
    from rdkit.Chem import rdFMCS

    from kb.chem.uninterrupted import uninterrupted

    with uninterrupted():
        common = rdFMCS.FindMCS(
            [substrate, found],
            timeout=MCS_SECONDS,
            ringMatchesRingOnly=True,
            completeRingsOnly=True,
            bondCompare=rdFMCS.BondCompare.CompareOrder,
        )
    if common.numAtoms * 2 < min(substrate.GetNumAtoms(), found.GetNumAtoms()):
        return frozenset()
    return every - frozenset(substrate.GetSubstructMatch(Chem.MolFromSmarts(common.smartsString)))


def _pieces(mol: Any, atoms: frozenset[int]) -> int:
    """Return in how many connected pieces some atoms lie."""
    left, pieces = set(atoms), 0
    while left:
        pieces += 1
        stack = [left.pop()]
        while stack:
            for n in mol.GetAtomWithIdx(stack.pop()).GetNeighbors():
                if n.GetIdx() in left:
                    left.remove(n.GetIdx())
                    stack.append(n.GetIdx())
    return pieces


def generalise(substrate: Any, lost: frozenset[int], survivors: Sequence[Any] | Callable[[str], bool]) -> Motif | None:
    """Return the smallest environment of the lost atoms that excludes the survivors; None where nothing was lost.

    Args:
        substrate: RDKit molecule.
        lost: its lost atoms.
        survivors: molecules that came through, or a callable that says whether any of them holds a SMARTS.
    """
    from rdkit import Chem

    if not lost:
        return None
    motif: Motif | None = None
    for radius in range(MAX_RADIUS + 1):
        atoms = surrounding(substrate, lost, radius)
        smarts = write_motif(substrate, atoms)
        query = Chem.MolFromSmarts(smarts)
        if query is None:
            continue
        held = survivors(smarts) if callable(survivors) else any(s.HasSubstructMatch(query) for s in survivors)
        motif = Motif(smarts=smarts, atoms=tuple(sorted(atoms)), radius=radius, is_contradicted=held)
        if not held:
            return motif
    return motif


def surrounding(mol: Any, lost: frozenset[int], radius: int) -> set[int]:
    """Return the lost atoms, the atoms they were bonded to, and what lies within `radius` bonds of these."""
    around = set(lost) | {n.GetIdx() for a in lost for n in mol.GetAtomWithIdx(a).GetNeighbors()}
    for _ in range(radius):
        around |= {n.GetIdx() for a in around for n in mol.GetAtomWithIdx(a).GetNeighbors()}
    return around


def write_motif(mol: Any, atoms: set[int]) -> str:
    """Write a fragment as SMARTS: element, aromaticity and, inside the fragment, the count of hydrogens."""
    from rdkit import Chem

    symbols = []
    for atom in mol.GetAtoms():
        symbol = atom.GetSymbol().lower() if atom.GetIsAromatic() else atom.GetSymbol()
        hydrogens = f"H{atom.GetTotalNumHs()}" if all(n.GetIdx() in atoms for n in atom.GetNeighbors()) else ""
        charge = {0: ""}.get(atom.GetFormalCharge(), f"{atom.GetFormalCharge():+d}")
        symbols.append(f"[{symbol}{hydrogens}{charge}]")
    return str(
        Chem.MolFragmentToSmiles(mol, sorted(atoms), atomSymbols=symbols, isomericSmiles=False, allBondsExplicit=True)
    )

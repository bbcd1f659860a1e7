"""The motif of a failure: which atoms were lost, and how much around them is needed to tell it from survivors.

It owns the generalisation. Atoms of the substrate that no longer stand in what was found are the lost ones; the motif
is their smallest surrounding (radius 0, 1, 2 bonds) that still matches the failed substrate and does not match the
substrates that survived conditions at least as forcing. Where no radius excludes them the narrowest motif is returned
and marked: the record contradicts itself there.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

MAX_RADIUS = 2
MCS_SECONDS = 1


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


def lost_atoms(substrate: Any, found: Any) -> frozenset[int]:
    """Return the substrate's atoms that the found product no longer has.

    Args:
        substrate, found: RDKit molecules.

    Returns:
        Atom numbers of the substrate; empty where nothing was lost or the two share too little to say (under half).
    """
    from rdkit import Chem
    from rdkit.Chem import rdFMCS

    common = rdFMCS.FindMCS(
        [substrate, found],
        timeout=MCS_SECONDS,
        ringMatchesRingOnly=True,
        completeRingsOnly=True,
        bondCompare=rdFMCS.BondCompare.CompareOrder,
    )
    if common.numAtoms * 2 < min(substrate.GetNumAtoms(), found.GetNumAtoms()):
        return frozenset()
    kept = substrate.GetSubstructMatch(Chem.MolFromSmarts(common.smartsString))
    return frozenset(range(substrate.GetNumAtoms())) - frozenset(kept)


def generalise(substrate: Any, lost: frozenset[int], survivors: Sequence[Any]) -> Motif | None:
    """Return the smallest environment of the lost atoms that excludes the survivors; None where nothing was lost."""
    from rdkit import Chem

    if not lost:
        return None
    motif: Motif | None = None
    around = set(lost) | {n.GetIdx() for a in lost for n in substrate.GetAtomWithIdx(a).GetNeighbors()}
    for radius in range(MAX_RADIUS + 1):
        if radius:
            around |= {n.GetIdx() for a in around for n in substrate.GetAtomWithIdx(a).GetNeighbors()}
        smarts = _smarts(substrate, around)
        query = Chem.MolFromSmarts(smarts)
        if query is None:
            continue
        excludes = not any(s.HasSubstructMatch(query) for s in survivors)
        motif = Motif(smarts=smarts, atoms=tuple(sorted(around)), radius=radius, is_contradicted=not excludes)
        if excludes:
            return motif
    return motif


def _smarts(mol: Any, atoms: set[int]) -> str:
    """Write a fragment as SMARTS: element, aromaticity and, inside the lost part, the count of hydrogens."""
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

"""What the chemist means to lose: instances of a motif that the intended product no longer has.

It owns the bookkeeping between a motif in the substrate and in the stated product. It decides nothing
about conditions. Where the product keeps fewer copies than the substrate, the copies whose surroundings
are found again in the product are the ones that should survive; copies at the reading's centre go first.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass

from rdkit import Chem, rdBase

from kb.assess.liability_rule import Match, Rule
from kb.chem.facts import Reading
from kb.vocabulary import Confidence

ENVIRONMENT_BONDS = 4
"""Bonds around a motif that are compared to recognise a copy in the product: a judgement."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Place:
    """An instance of a motif in one fragment."""

    component: int | None
    mol: Chem.Mol
    match: Match


def stated_product(reading: Reading) -> str | None:
    """Return the product side of the scheme, None where none is stated or it cannot be read."""
    parts = reading.scheme.split()[:1]
    sides = parts[0].split(">") if parts else []
    if len(sides) == 3 and sides[2]:
        return sides[2]
    if reading.confidence is Confidence.MATCHED and reading.possible:
        return reading.possible[0].product
    return None


def read_product(smiles: str | None) -> Chem.Mol | None:
    """Return the product as a molecule without atom maps, None where there is none to read."""
    if not smiles:
        return None
    with rdBase.BlockLogs():
        mol = Chem.MolFromSmiles(smiles)
    if mol is not None:
        for atom in mol.GetAtoms():
            atom.SetAtomMapNum(0)
    return mol


def surviving(rule: Rule, places: Sequence[Place], product: Chem.Mol | None, reading: Reading) -> tuple[Place, ...]:
    """Return the instances that the product should still have.

    Args:
        rule: its motif is looked for in the product.
        places: every instance on the left side.
        product: None = no product stated, so everything should survive.
        reading: its centres tell which copy is meant to react.

    Returns:
        The places that a loss would be a loss of, in the order given.
    """
    if product is None:
        return tuple(places)
    kept = rule.matches(product)
    if len(kept) >= len(places):
        return tuple(places)
    if not kept:
        return ()
    wanted = Counter(_surroundings(product, match) for match in kept)
    at_centre = {(c.component, i) for c in reading.centres for i in (c.atom, c.leaving_atom) if i is not None}
    ranked = sorted(
        range(len(places)),
        key=lambda i: any((places[i].component, a) in at_centre for a in places[i].match.atoms),
    )
    stay: set[int] = set()
    for index in ranked:
        seen = _surroundings(places[index].mol, places[index].match)
        if wanted[seen] > 0:
            wanted[seen] -= 1
            stay.add(index)
    for index in ranked:
        if len(stay) < len(kept):
            stay.add(index)
    return tuple(place for index, place in enumerate(places) if index in stay)


def same_structure(side_product: str, product: Chem.Mol | None) -> bool:
    """Return True where a side product is the stated product, configuration aside."""
    if product is None:
        return False
    stated = {Chem.MolToSmiles(p, isomericSmiles=False) for p in Chem.GetMolFrags(product, asMols=True)}
    mol = Chem.MolFromSmiles(side_product)
    if mol is None:
        return False
    parts = [Chem.MolToSmiles(p, isomericSmiles=False) for p in Chem.GetMolFrags(mol, asMols=True)]
    return max(parts, key=len) in stated


def _surroundings(mol: Chem.Mol, match: Match) -> str:
    """Return a SMILES of what lies within a few bonds of the core, for comparison only."""
    near = set(match.core)
    for _ in range(ENVIRONMENT_BONDS):
        near |= {n.GetIdx() for i in tuple(near) for n in mol.GetAtomWithIdx(i).GetNeighbors()}
    plain = Chem.Mol(mol)
    for atom in plain.GetAtoms():
        atom.SetAtomMapNum(0)
    return Chem.MolFragmentToSmiles(plain, sorted(near), isomericSmiles=False)

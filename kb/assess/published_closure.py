"""Where the substrate attacks itself: which of its atoms could close a ring on the centre, and whether it can reach.

It owns the reading of the structure: the attacking group, the size of the ring, the side it stands on in a ring that
is there already, and how far the base in the flask takes its proton. Rates are `kb.physorg.closure`. An atom that the
scheme names is taken as it stands; otherwise amines, and acids that the base turns into anions, are looked for.
"""

from __future__ import annotations

import itertools
from collections.abc import Sequence

from rdkit import Chem

from kb.assess.published_atoms import size_word
from kb.assess.published_centre import face_of
from kb.physorg.step import Closure

LARGEST = 7
LEAST_IONISED = -6.0
"""log10 of the part without its proton from which an acid that nobody named is asked; judged."""
_ACIDS = {
    "alcohol": ("alkoxide", 15.9),
    "phenol": ("phenoxide", 10.0),
    "thiol": ("thiolate", 10.5),
    "carboxylic_acid": ("carboxylate", 4.8),
}
"""Acid to (anion, rough pKa in water; compilations, from memory)."""


def find_closure(
    mol: Chem.Mol, centre: int, leaving: int, base_pkah: float | None, named: tuple[int, str] | None = None
) -> Closure | None:
    """Return the attack on the centre from within its own molecule, None where there is none.

    Args:
        mol: sanitised, hydrogens implicit.
        centre, leaving: atoms of the bond that breaks.
        base_pkah: of the strongest base in the flask; None = none.
        named: (atom, reagent class) that the scheme says attacks; None = not said.
    """
    if named is not None:
        word, ionised = _as_attacker(_word(mol, named[0]) or named[1], base_pkah)
        return _close(mol, centre, leaving, named[0], word, ionised, is_asked=True)
    found = []
    for atom in mol.GetAtoms():
        kind = _word(mol, atom.GetIdx())
        if kind is None or atom.GetIdx() == leaving or (not atom.GetTotalNumHs() and atom.GetFormalCharge() >= 0):
            continue
        word, ionised = _as_attacker(kind, base_pkah)
        if word in _ACIDS or ionised < LEAST_IONISED:
            continue
        closure = _close(mol, centre, leaving, atom.GetIdx(), word, ionised, is_asked=False)
        if closure is not None and closure.ring_size <= LARGEST and not closure.is_bridging:
            found.append(closure)
    order = (5, 6, 3, 7, 4)  # of the amines (H. Freundlich, G. Salomon; memory)
    return min(found, key=lambda c: order.index(c.ring_size), default=None)


def _close(
    mol: Chem.Mol, centre: int, leaving: int, attacker: int, word: str, ionised: float, is_asked: bool
) -> Closure | None:
    path = Chem.GetShortestPath(mol, centre, attacker)
    if len(path) < 3 or leaving in path:
        return None
    bonds = [mol.GetBondBetweenAtoms(a, b) for a, b in itertools.pairwise(path)]
    rigid = [b for b in bonds if b.IsInRing() and not b.GetIsAromatic()]
    return Closure(
        ring_size=len(path),
        nucleophile=word,
        is_aligned=_is_aligned(mol, path, leaving),
        is_bridging=len(rigid) > 1,
        ionised_log10=ionised,
        is_asked=is_asked,
    )


def _is_aligned(mol: Chem.Mol, path: Sequence[int], leaving: int) -> bool | None:
    """Return whether the attacker can stand behind the leaving group where both hang on one ring; None = not drawn."""
    centre, beside, towards = path[0], path[1], path[2]
    bond = mol.GetBondBetweenAtoms(centre, beside)
    ring = next((r for r in mol.GetRingInfo().AtomRings() if centre in r and beside in r and leaving not in r), None)
    if ring is None or bond.GetIsAromatic() or towards in ring or len(path) > 5:
        return True
    full = Chem.AddHs(mol)
    leaves, attacks = face_of(full, centre, leaving, ring), face_of(full, beside, towards, ring)
    return None if leaves is None or attacks is None else leaves != attacks


def _as_attacker(kind: str, base_pkah: float | None) -> tuple[str, float]:
    """Return (class that it acts as, log10 of the part without its proton)."""
    if kind not in _ACIDS or base_pkah is None:
        return kind, 0.0
    anion, pka = _ACIDS[kind]
    ionised = min(0.0, base_pkah - pka)
    return (anion, ionised) if ionised >= LEAST_IONISED else (kind, 0.0)


def _word(mol: Chem.Mol, index: int) -> str | None:
    """Return the class of an atom that could attack, None for those that are not asked."""
    atom = mol.GetAtomWithIdx(index)
    number, charge = atom.GetAtomicNum(), atom.GetFormalCharge()
    if number not in (7, 8, 16) or charge > 0 or atom.GetIsAromatic():
        return None
    if any(b.GetBondTypeAsDouble() != 1 for b in atom.GetBonds()):
        return None
    kinds = [size_word(mol, n.GetIdx(), index) for n in atom.GetNeighbors()]
    if any(n.GetAtomicNum() != 6 for n in atom.GetNeighbors()):
        return None
    if number == 7:
        if "carbonyl" in kinds or charge < 0:
            return None
        return "aromatic_amine" if "aryl" in kinds else _AMINES.get(len(kinds))
    if len(kinds) != 1:
        return None
    acid = "thiol" if number == 16 else {"carbonyl": "carboxylic_acid", "aryl": "phenol"}.get(kinds[0], "alcohol")
    return _ACIDS[acid][0] if charge < 0 else acid


_AMINES = {1: "primary_amine", 2: "secondary_amine", 3: "tertiary_amine"}

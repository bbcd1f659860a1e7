"""Named structural conditions that a SMARTS says badly: bridgeheads, drawn configuration, trans neighbours.

It owns the tests that a rule's `where` lines name, each on one or two mapped atoms of a match. They
read ring systems and the configuration as drawn; they know nothing of conditions, except the alkyl
parts of alcohols and alkoxides in the flask.

    where = ["1 not bridgehead", "1 trans 2", "4 foreign alkyl"]
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

from rdkit import Chem

from kb.errors import QueryError
from kb.materials.profile import ConditionProfile

LARGEST_BREDT_SUM = 8
"""Bridging atoms x + y + z of a bicycle up to which a double bond or planar cation at the bridgehead is
barred here. Source: Fawcett, Chem. Rev. 1950, 47, 219 puts the limit of isolable bridgehead alkenes at
S = 9 (memory); a judgement for cages."""

SMALL_BRIDGEHEAD_SUM = 5
"""Up to this sum (norbornyl and smaller) ionisation fails too. Source: Bartlett & Knox, J. Am. Chem.
Soc. 1939, 61, 3184 (memory)."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Where:
    """One structural condition of a rule.

    Attributes:
        atom_map: the mapped motif atom that is tested.
        word: what must hold, a key of WORDS.
        other_map: second mapped atom, for words on two atoms.
        is_negated: the condition must not hold.
    """

    atom_map: int
    word: str
    other_map: int | None = None
    is_negated: bool = False


def parse_where(text: str) -> Where:
    """Parse "1 not bridgehead" or "1 trans 2".

    Raises:
        QueryError: where the line names no atom map or no known condition.
    """
    parts = text.split()
    is_negated = "not" in parts[1:2]
    words = parts[2:] if is_negated else parts[1:]
    other = int(words.pop()) if words and words[-1].isdigit() else None
    word = " ".join(words)
    if not parts or not parts[0].isdigit() or word not in WORDS:
        raise QueryError(
            f"The structural condition '{text[:60]}' cannot be read.",
            f"Write an atom map and one of: {', '.join(sorted(WORDS))}.",
            text,
        )
    return Where(atom_map=int(parts[0]), word=word, other_map=other, is_negated=is_negated)


def holds(where: Where, mol: Chem.Mol, atoms: Mapping[int, int], profile: ConditionProfile | None) -> bool:
    """Return True where the condition holds on the mapped atoms (map number to atom index)."""
    first = atoms[where.atom_map]
    second = atoms[where.other_map] if where.other_map is not None else -1
    return WORDS[where.word](mol, first, second, profile) is not where.is_negated


def bridging_sum(mol: Chem.Mol, atom: int) -> int | None:
    """Return x + y + z of the smallest bicycle that has `atom` as a bridgehead, None where it is none.

    Two rings that share a bond only are fused, and the atoms they share are no bridgeheads.
    """
    from rdkit.Chem import rdMolDescriptors  # loaded where a rule asks

    heads: list[int] = []
    rdMolDescriptors.CalcNumBridgeheadAtoms(mol, heads)  # type: ignore[arg-type]
    if atom not in heads:
        return None
    rings = [set(r) for r in mol.GetRingInfo().AtomRings() if atom in r]
    sums = [len(a | b) - 2 for i, a in enumerate(rings) for b in rings[i + 1 :] if len(a & b) >= 3]
    return min(sums, default=None)


def _bridgehead(mol: Chem.Mol, atom: int, _: int, __: ConditionProfile | None) -> bool:
    if not mol.GetAtomWithIdx(atom).IsInRing():
        return False
    size = bridging_sum(mol, atom)
    return size is not None and size <= LARGEST_BREDT_SUM


def _small_bridgehead(mol: Chem.Mol, atom: int, _: int, __: ConditionProfile | None) -> bool:
    if not mol.GetAtomWithIdx(atom).IsInRing():
        return False
    size = bridging_sum(mol, atom)
    return size is not None and size <= SMALL_BRIDGEHEAD_SUM


def _fixed_bridgehead(mol: Chem.Mol, atom: int, other: int, profile: ConditionProfile | None) -> bool:
    """Return True for a bridgehead that stays one when a bond of it moves to `other`, which stands outside its cage."""
    bond = mol.GetBondBetweenAtoms(atom, other)
    return _bridgehead(mol, atom, other, profile) and not bond.IsInRing()


def _stereocentre(mol: Chem.Mol, atom: int, _: int, __: ConditionProfile | None) -> bool:
    return mol.GetAtomWithIdx(atom).GetChiralTag() != Chem.ChiralType.CHI_UNSPECIFIED


def _trans(mol: Chem.Mol, first: int, second: int, _: ConditionProfile | None) -> bool:
    faces = _faces(mol, first, second)
    return faces is not None and faces[0] != faces[1]


def _cis(mol: Chem.Mol, first: int, second: int, _: ConditionProfile | None) -> bool:
    faces = _faces(mol, first, second)
    return faces is not None and faces[0] == faces[1]


def _faces(mol: Chem.Mol, first: int, second: int) -> tuple[bool, bool] | None:
    """Return the face of the outer substituent at two atoms of one ring, None where it is not drawn.

    Hydrogens are made explicit so that every centre has four written neighbours; the ring is walked in
    one direction, and each centre's parity of (before, after, substituent, other) gives the face.
    """
    ring = next((r for r in mol.GetRingInfo().AtomRings() if first in r and second in r), None)
    if ring is None:
        return None
    full = Chem.AddHs(mol)
    faces = []
    for atom_index in (first, second):
        atom = full.GetAtomWithIdx(atom_index)
        if atom.GetChiralTag() == Chem.ChiralType.CHI_UNSPECIFIED:
            return None
        place = ring.index(atom_index)
        before, after = ring[place - 1], ring[(place + 1) % len(ring)]
        outer = [n for n in atom.GetNeighbors() if n.GetIdx() not in (before, after)]
        if len(outer) != 2:
            return None
        outer.sort(key=lambda n: n.GetAtomicNum() == 1)
        if outer[0].GetAtomicNum() == 1 or outer[1].GetAtomicNum() != 1:
            return None
        wanted = [before, after, outer[0].GetIdx(), outer[1].GetIdx()]
        written = [b.GetOtherAtomIdx(atom_index) for b in atom.GetBonds()]
        is_even = _parity([written.index(i) for i in wanted])
        faces.append((atom.GetChiralTag() == Chem.ChiralType.CHI_TETRAHEDRAL_CW) is is_even)
    return faces[0], faces[1]


def _parity(order: list[int]) -> bool:
    """Return True for an even permutation."""
    swaps = sum(1 for i in range(len(order)) for j in range(i) if order[j] > order[i])
    return swaps % 2 == 0


def _foreign_alkyl(mol: Chem.Mol, atom: int, _: int, profile: ConditionProfile | None) -> bool:
    """Return True where alkoxides or alcohols in the flask all carry another alkyl than this ester's."""
    if profile is None:
        return True
    if not profile.solvent_alkoxy:
        return False
    alcohol = _alcohol_of(mol, atom)
    return alcohol is None or any(_canonical(a) != alcohol for a in profile.solvent_alkoxy)


def _alcohol_of(mol: Chem.Mol, alkyl: int) -> str | None:
    """Return the alcohol behind an ester's O-alkyl carbon, None for a lactone."""
    oxygen = next(
        (n for n in mol.GetAtomWithIdx(alkyl).GetNeighbors() if n.GetAtomicNum() == 8 and n.GetDegree() == 2),
        None,
    )
    if oxygen is None:
        return None
    acyl = next(n for n in oxygen.GetNeighbors() if n.GetIdx() != alkyl)
    bond = mol.GetBondBetweenAtoms(oxygen.GetIdx(), acyl.GetIdx())
    if bond.IsInRing():
        return None
    cut = Chem.FragmentOnBonds(mol, [bond.GetIdx()], addDummies=False)
    part = next(p for p in Chem.GetMolFrags(cut) if alkyl in p)
    plain = Chem.RWMol(cut)
    for index in sorted(set(range(cut.GetNumAtoms())) - set(part), reverse=True):
        plain.RemoveAtom(index)
    for each in plain.GetAtoms():
        each.SetAtomMapNum(0)
    return _canonical(Chem.MolToSmiles(plain))


def _canonical(smiles: str) -> str:
    mol = Chem.MolFromSmiles(smiles)
    return Chem.MolToSmiles(mol, isomericSmiles=False) if mol is not None else smiles


WORDS: dict[str, Callable[[Chem.Mol, int, int, ConditionProfile | None], bool]] = {
    "bridgehead": _bridgehead,
    "small bridgehead": _small_bridgehead,
    "fixed bridgehead": _fixed_bridgehead,
    "stereocentre": _stereocentre,
    "trans": _trans,
    "cis": _cis,
    "foreign alkyl": _foreign_alkyl,
}
"""Condition word to its test."""

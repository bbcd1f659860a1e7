"""What a centre turns into: its cation, the cation after a shift, the alkenes with their geometry.

It owns the edits of the molecule. Atom numbers are kept through every edit, so that the caller can go on counting;
configuration is claimed nowhere but at the new double bond. What cannot exist (a broken valence) is left out.
"""

from __future__ import annotations

from collections.abc import Sequence

from rdkit import Chem, rdBase

from kb.assess.published_atoms import HALOGENS, size_word
from kb.physorg.step import Alkene


def list_alkenes(mol: Chem.Mol, centre: int, here: int, leaving: int | None) -> tuple[Alkene, ...]:
    """Return the alkenes that loss of a hydrogen from `here` gives, E and Z apart; empty where none can exist."""
    product = without_leaving_group(mol, centre, leaving)
    bond = product.GetBondBetweenAtoms(centre, here)
    bond.SetBondType(Chem.BondType.DOUBLE)
    for index in (centre, here):
        product.GetAtomWithIdx(index).SetChiralTag(Chem.ChiralType.CHI_UNSPECIFIED)
        product.GetAtomWithIdx(index).SetNoImplicit(False)
        product.GetAtomWithIdx(index).SetNumExplicitHs(0)
        product.GetAtomWithIdx(index).SetFormalCharge(0)
    plain = product.GetMol()
    if not _settle(plain):
        return ()
    sides = [_ends(plain, centre, here), _ends(plain, here, centre)]
    # trans-Cyclooctene is strained by some 40 kJ/mol over cis (common knowledge); up to ten members cis leads.
    in_small_ring = any(len(r) <= 10 and centre in r and here in r for r in plain.GetRingInfo().AtomRings())
    if in_small_ring or any(not _differ(plain, side) for side in sides):
        return (Alkene(label=_largest_part(plain, centre)),)
    found = []
    for is_cis in (False, True):
        drawn = Chem.RWMol(plain)
        double = drawn.GetBondBetweenAtoms(centre, here)
        near, far = sides[0][0], sides[1][0]
        begin, end = (near, far) if double.GetBeginAtomIdx() == centre else (far, near)
        double.SetStereoAtoms(begin, end)
        double.SetStereo(Chem.BondStereo.STEREOCIS if is_cis else Chem.BondStereo.STEREOTRANS)
        isomer = Chem.MolFromSmiles(_largest_part(drawn.GetMol(), centre))
        label = Chem.MolToSmiles(isomer)
        word = next(
            (str(b.GetStereo())[-1] for b in isomer.GetBonds() if b.GetStereo() > Chem.BondStereo.STEREOANY),
            "",
        )
        pairs = _cis_pairs(plain, centre, here, sides, is_cis)
        found.append(Alkene(label=label, geometry=word if word in "EZ" else "", cis_pairs=pairs))
    return tuple(found)


def _ends(mol: Chem.Mol, atom: int, away: int) -> list[int]:
    """Return heavy neighbours of an alkene end, the other end left out."""
    return [n.GetIdx() for n in mol.GetAtomWithIdx(atom).GetNeighbors() if n.GetIdx() != away]


def _differ(mol: Chem.Mol, side: Sequence[int]) -> bool:
    """Return whether the two groups of an alkene end differ (a group and a hydrogen do)."""
    if len(side) != 2:
        return len(side) == 1
    ranks = list(Chem.CanonicalRankAtoms(mol, breakTies=False))
    return ranks[side[0]] != ranks[side[1]]


def _cis_pairs(
    mol: Chem.Mol, centre: int, here: int, sides: Sequence[Sequence[int]], is_cis: bool
) -> tuple[tuple[str, str], ...]:
    near = [size_word(mol, k, centre) for k in sides[0]] + [""] * (2 - len(sides[0]))
    far = [size_word(mol, k, here) for k in sides[1]] + [""] * (2 - len(sides[1]))
    if not is_cis:
        far.reverse()
    return tuple((a, b) for a, b in zip(near, far, strict=True) if a and b)


def shifted_cation(mol: Chem.Mol, centre: int, here: int, leaving: int | None, group: int | None) -> Chem.Mol | None:
    """Return the cation after a hydride (group None) or a group moved from `here` to the centre, or None."""
    cation = Chem.RWMol(cation_of(mol, centre, leaving))
    if group is not None:
        if cation.GetBondBetweenAtoms(centre, group) is not None:
            return None
        cation.RemoveBond(here, group)
        cation.AddBond(centre, group, Chem.BondType.SINGLE)
    origin, goal = cation.GetAtomWithIdx(centre), cation.GetAtomWithIdx(here)
    hydrogens = origin.GetTotalNumHs() + (1 if group is None else 0)
    left = goal.GetTotalNumHs() - (1 if group is None else 0)
    for atom, charge, count in ((origin, 0, hydrogens), (goal, 1, left)):
        atom.SetFormalCharge(charge)
        atom.SetNoImplicit(True)
        atom.SetNumExplicitHs(count)
        atom.SetChiralTag(Chem.ChiralType.CHI_UNSPECIFIED)
    result = cation.GetMol()
    return result if _settle(result) else None


def cation_of(mol: Chem.Mol, centre: int, leaving: int | None) -> Chem.Mol:
    """Return the molecule with its leaving group gone and a charge left; atom numbers are kept."""
    cation = without_leaving_group(mol, centre, leaving)
    atom = cation.GetAtomWithIdx(centre)
    count = mol.GetAtomWithIdx(centre).GetTotalNumHs()
    atom.SetFormalCharge(1)
    atom.SetNoImplicit(True)
    atom.SetNumExplicitHs(count)
    atom.SetChiralTag(Chem.ChiralType.CHI_UNSPECIFIED)
    result = cation.GetMol()
    _settle(result)
    return result


def without_leaving_group(mol: Chem.Mol, centre: int, leaving: int | None) -> Chem.RWMol:
    """Return the molecule with the bond to the leaving group cut; what left stays in it, numbers are kept."""
    cut = Chem.RWMol(mol)
    for atom in cut.GetAtoms():
        atom.SetAtomMapNum(0)
    if leaving is not None:
        cut.RemoveBond(centre, leaving)
        gone = cut.GetAtomWithIdx(leaving)
        gone.SetNoImplicit(True)
        if gone.GetFormalCharge() > 0:
            gone.SetFormalCharge(0)
        elif gone.GetAtomicNum() in HALOGENS or gone.GetAtomicNum() == 8:
            gone.SetFormalCharge(-1)
    return cut


def _settle(mol: Chem.Mol) -> bool:
    with rdBase.BlockLogs():
        try:
            Chem.SanitizeMol(mol)
        except (Chem.AtomValenceException, Chem.KekulizeException, Chem.AtomKekulizeException):
            return False
        Chem.AssignStereochemistry(mol, cleanIt=True, force=True)
    return True


def _largest_part(mol: Chem.Mol, atom: int) -> str:
    """Return SMILES of the fragment that holds an atom."""
    for part in Chem.GetMolFrags(mol):
        if atom in part:
            return Chem.MolFragmentToSmiles(mol, atomsToUse=list(part))
    return Chem.MolToSmiles(mol)

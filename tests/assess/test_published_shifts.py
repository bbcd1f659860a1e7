"""Shifts and alkenes in small bicyclic and strained skeletons: nothing is offered that cannot exist.

Bredt's rule is checked here by counting paths, apart from the ring bookkeeping of the code (J. Bredt 1924; a double
bond at a bridgehead wants eight atoms or more in the bridges, F. S. Fawcett, Chem. Rev. 1950, 47, 219; memory).
"""

from __future__ import annotations

import pytest
from rdkit import Chem

from kb.assess.published_centre import describe_centre
from kb.physorg.competition import compete
from kb.vocabulary import CarbonClass, Fate
from tests.assess.published_rows import a_step

SKELETONS = [
    "BrC1CC2CCC1C2", "CC1(Br)CC2CCC1C2", "BrCC1CC2CCC1C2", "BrC(C)C12CCC(CC1)C2", "BrCC12CCC(CC1)C2",
    "CC1(C)C2CCC1(C)C(Br)C2", "CC1(C)C2CCC(C2)C1Br", "BrC1C2CCC1CC2", "BrC1CC2CCC1CC2", "BrC1C2CC3CC(C2)CC1C3",
    "CC1(C)C2CCC(CBr)C1C2", "CC1(C)C2CC1CCC2(C)Br", "BrC(C)C1CC2CCC1C2", "BrC1CCC2CC1C2", "CC1(C)C(Br)C2CCC1C2",
    "CC(C)(Br)C1CC2CCC1C2", "BrC1CCC2(C)CC1CC2", "CC(Br)C1C2CC3CC(C2)CC1C3", "BrC1CC2CCC1(C)C2",
    "BrC1C2CCC(C2)C1c1ccccc1", "BrC1CC2CCC1O2", "BrC1CCC2CCCC1C2", "BrC(C)C1(C)CC2CCC1C2", "BrCC1(C)CC2CCC1C2",
]  # fmt: skip


def simple_paths(mol: Chem.Mol, start: int, goal: int, longest: int = 7) -> list[frozenset[int]]:
    found: list[frozenset[int]] = []

    def walk(path: list[int]) -> None:
        for neighbour in mol.GetAtomWithIdx(path[-1]).GetNeighbors():
            index = neighbour.GetIdx()
            if index == goal:
                found.append(frozenset(path[1:]))
            elif index not in path and len(path) < longest:
                walk([*path, index])

    walk([start])
    return found


def breaks_bredt(smiles: str) -> bool:
    """Return whether a double-bonded atom has three separate ways to another, six atoms or fewer between them."""
    mol = Chem.MolFromSmiles(smiles)
    for bond in mol.GetBonds():
        if bond.GetBondTypeAsDouble() != 2 or not bond.IsInRing():
            continue
        for end in (bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()):
            for other in range(mol.GetNumAtoms()):
                if other == end or mol.GetBondBetweenAtoms(end, other) is not None:
                    continue
                ways = simple_paths(mol, end, other)
                for i, a in enumerate(ways):
                    for j, b in enumerate(ways[i + 1 :], start=i + 1):
                        if not a & b and any(not (c & (a | b)) and len(a | b | c) <= 6 for c in ways[j + 1 :]):
                            return True
    return False


def test_the_check_itself_knows_a_forbidden_alkene() -> None:
    assert breaks_bredt("C1=C2CCC(C1)C2")
    assert not breaks_bredt("C1=CC2CCC1C2")
    assert not breaks_bredt("C1CCC2=C(C1)CCCC2")


@pytest.mark.parametrize("smiles", SKELETONS)
def test_no_alkene_and_no_shifted_cation_sits_at_a_small_bridgehead(smiles: str) -> None:
    mol = Chem.MolFromSmiles(smiles)
    centre, leaving = mol.GetSubstructMatch(Chem.MolFromSmarts("[CX4][Br]"))
    described = describe_centre(mol, centre, leaving)
    for cation in (described, *(s.cation for s in described.shifts)):
        assert cation is described or cation.carbon_class is not CarbonClass.BRIDGEHEAD
        for neighbour in cation.neighbours:
            for alkene in neighbour.alkenes:
                assert not breaks_bredt(alkene.label), alkene.label
    for alkene_share in compete(a_step(smiles, "Br", "solvent", "aq EtOH", 80.0)).alkenes:
        assert not breaks_bredt(alkene_share.label), alkene_share.label


@pytest.mark.parametrize("smiles", ["CC1(C)C2CCC(C2)C1Br", "BrC1CC2CC2C1", "CC1(C)C(Br)CC1(C)C", "CC1(C)CCCC1Br"])
def test_no_shift_makes_a_ring_of_three_or_four(smiles: str) -> None:
    mol = Chem.MolFromSmiles(smiles)
    centre, leaving = mol.GetSubstructMatch(Chem.MolFromSmarts("[CX4][Br]"))
    before = sum(len(r) < 5 for r in mol.GetRingInfo().AtomRings())
    for shift in describe_centre(mol, centre, leaving).shifts:
        after = Chem.MolFromSmiles(shift.cation.label)
        assert sum(len(r) < 5 for r in after.GetRingInfo().AtomRings()) <= before, shift.cation.label


def test_one_alkene_has_one_fate() -> None:
    # Bornyl: loss from C3 gives bornene with or without a hydride shift; it must not be split over two fates.
    result = compete(a_step("CC1(C)C2CCC1(C)C(Br)C2", "Br", "solvent", "aq EtOH", 80.0))
    lost = {label for c in result.channels if c.fate is Fate.ELIMINATION for label, _, _ in c.alkenes}
    moved = {
        label for c in result.channels if c.fate is Fate.REARRANGED and not c.is_capture for label, _, _ in c.alkenes
    }
    assert lost
    assert not (moved & lost) or moved - lost


def test_rings_up_to_ten_give_one_alkene() -> None:
    # trans-Cyclooctene lies some 40 kJ/mol above cis (common knowledge).
    alkenes = compete(a_step("BrC1CCCCCCC1", "Br", "NaOEt", "EtOH", 55.0)).alkenes
    assert len(alkenes) == 1

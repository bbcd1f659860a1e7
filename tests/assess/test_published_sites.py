"""Several like halogens: rates decide which goes first. Structures and outcomes are textbook ones."""

from __future__ import annotations

import pytest
from rdkit import Chem

from kb.assess.published_centre import describe_centre
from kb.assess.published_sites import fastest_site
from kb.physorg.step import Medium, StepFacts
from kb.vocabulary import CarbonClass, LeavingGroup

AZIDE = Medium(
    nucleophile="azide",
    solvent_kinds=frozenset({"polar-aprotic", "amide"}),
    temperature_c=60.0,
    acid="none",
)


def first_of(smiles: str, leaving: int, group: LeavingGroup = LeavingGroup.BROMIDE) -> StepFacts:
    mol = Chem.MolFromSmiles(smiles)
    centre = mol.GetAtomWithIdx(leaving).GetNeighbors()[0].GetIdx()
    step = StepFacts(centre=describe_centre(mol, centre, leaving), leaving_group=group, medium=AZIDE)
    return fastest_site(mol, leaving, step)


def test_of_a_secondary_and_a_primary_bromide_the_primary_one_goes_first_with_azide() -> None:
    # SN2 rates fall from primary to secondary (any textbook).
    assert first_of("CC(Br)CCCCBr", 2).centre.carbon_class is CarbonClass.PRIMARY


def test_an_activated_bromide_goes_before_a_plain_one() -> None:
    assert "benzylic" in first_of("BrCCCCc1ccc(CBr)cc1", 0).centre.activations


@pytest.mark.parametrize(
    ("smiles", "leaving", "why"),
    [
        ("BrCCCCBr", 0, "both ends are the same"),
        ("BrCCCCCl", 0, "another halogen is another leaving group"),
        ("BrCCCCc1ccc(Br)cc1", 0, "an aryl bromide does not compete"),
        ("CCCCBr", 4, "there is one only"),
    ],
)
def test_otherwise_the_step_stays_as_it_was_read(smiles: str, leaving: int, why: str) -> None:
    mol = Chem.MolFromSmiles(smiles)
    centre = mol.GetAtomWithIdx(leaving).GetNeighbors()[0].GetIdx()
    assert first_of(smiles, leaving).centre == describe_centre(mol, centre, leaving), why


def test_an_oxygen_leaving_group_is_not_looked_for_elsewhere() -> None:
    mol = Chem.MolFromSmiles("CS(=O)(=O)OC(C)CCCOS(C)(=O)=O")
    step = StepFacts(centre=describe_centre(mol, 5, 4), leaving_group=LeavingGroup.MESYLATE, medium=AZIDE)
    assert fastest_site(mol, 4, step) is step

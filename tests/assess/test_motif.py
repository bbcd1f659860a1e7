"""The motif of a failure, generalised from what was found. Structures are ordinary textbook ones."""

from __future__ import annotations

from rdkit import Chem

from kb.assess.motif import generalise, lost_atoms, lost_atoms_of


def mol(smiles: str) -> Chem.Mol:
    return Chem.MolFromSmiles(smiles)


ETHER = mol("CC(C)(C)OCCc1ccccc1")
ALCOHOL = mol("OCCc1ccccc1")


def test_the_lost_atoms_are_those_the_product_no_longer_has() -> None:
    lost = lost_atoms(ETHER, ALCOHOL)
    assert sorted(ETHER.GetAtomWithIdx(a).GetSymbol() for a in lost) == ["C", "C", "C", "C"]


def test_nothing_is_lost_from_a_substrate_that_came_back() -> None:
    assert lost_atoms(ETHER, ETHER) == frozenset()


def test_the_motif_is_the_smallest_that_leaves_the_survivors_out() -> None:
    motif = generalise(ETHER, lost_atoms(ETHER, ALCOHOL), [mol("COCCc1ccccc1"), mol("CC(C)OCCc1ccccc1")])
    assert motif is not None
    assert motif.radius == 0
    query = Chem.MolFromSmarts(motif.smarts)
    assert mol("CC(C)(C)OC1CCCCC1").HasSubstructMatch(query), "another tert-butyl ether is like it"
    assert not mol("COC1CCCCC1").HasSubstructMatch(query)


def test_a_survivor_next_door_makes_the_motif_grow() -> None:
    aryl = mol("CC(C)(C)Oc1ccccc1C")
    phenol = mol("Oc1ccccc1C")
    narrow = generalise(aryl, lost_atoms(aryl, phenol), [])
    wide = generalise(aryl, lost_atoms(aryl, phenol), [mol("CC(C)(C)OCCC")])
    assert narrow is not None and wide is not None
    assert wide.radius > narrow.radius
    assert not mol("CC(C)(C)OCCC").HasSubstructMatch(Chem.MolFromSmarts(wide.smarts))


def test_a_contradiction_is_marked_not_hidden() -> None:
    motif = generalise(ETHER, lost_atoms(ETHER, ALCOHOL), [ETHER])
    assert motif is not None
    assert motif.is_contradicted


def test_of_two_like_places_the_lost_atoms_are_taken_in_one_piece() -> None:
    both = mol("CC(C)(C)OCCCCOC(C)(C)C")
    lost = lost_atoms(both, mol("OCCCCOC(C)(C)C"))
    assert len(lost) == 4
    carbon = next(a for a in lost if both.GetAtomWithIdx(a).GetDegree() == 4)
    assert {n.GetIdx() for n in both.GetAtomWithIdx(carbon).GetNeighbors() if n.GetSymbol() == "C"} == lost - {carbon}


def test_what_is_no_part_of_the_substrate_is_compared_by_its_common_part() -> None:
    # A dioxolane opened to the ketone: the product has a new double bond, so it is no substructure.
    lost = lost_atoms_of("C1CCC2(CC1)OCCO2", "O=C1CCCCC1")
    assert len(lost) >= 3


def test_two_things_that_share_little_say_nothing() -> None:
    assert lost_atoms_of("CCCCCCBr", "c1ccncc1") == frozenset()
    assert lost_atoms_of("CCCCCCBr", "not a structure") == frozenset()


def test_a_part_that_fits_in_the_middle_too_is_taken_at_an_end() -> None:
    hexane = mol("CCCCCC")
    lost = sorted(lost_atoms(hexane, mol("CCCC")))
    assert lost[1] - lost[0] == 1

"""Structures that are in no table: their classes by common practice, and no claim where nothing can be said."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st
from rdkit import Chem

from kb.materials.class_names import REAGENT_CLASSES
from kb.materials.structural import PATTERNS, canonical_smiles, classify_structure


def test_every_pattern_is_valid_and_its_word_defined() -> None:
    assert [p.smarts for p in PATTERNS if Chem.MolFromSmarts(p.smarts) is None] == []
    assert {p.word for p in PATTERNS} - REAGENT_CLASSES.keys() == set()


@pytest.mark.parametrize(
    ("smiles", "has", "has_not", "nucleophile"),
    [
        ("NCCc1ccc(OC)cc1", {"primary_amine", "amine"}, {"secondary_amine"}, "good"),
        ("COC(=O)C1CCNCC1", {"secondary_amine", "ester"}, {"primary_amine"}, "good"),
        ("CC(C)(C)OC(=O)NCC1CCNC1", {"secondary_amine", "carbamate"}, {"primary_amine"}, "good"),
        ("CN(C)CCOc1ccccc1", {"tertiary_amine"}, {"secondary_amine"}, "weak"),
        ("Nc1ccc(F)cc1", {"primary_amine", "aromatic_amine"}, set(), "good"),
        ("CC(=O)Nc1ccccc1", {"amide"}, {"amine", "primary_amine", "secondary_amine"}, "none"),
        ("CS(=O)(=O)NCc1ccccc1", {"sulfonamide"}, {"amine"}, "weak"),
        ("Cc1ccncc1C", {"aromatic_amine_base"}, {"amine"}, "weak"),
        ("Cc1cc[nH]n1", {"azole"}, {"amine"}, "weak"),
        ("Oc1ccc(Cl)cc1", {"phenol"}, {"alcohol"}, "weak"),
        ("OCC1CCCC1", {"alcohol"}, {"phenol"}, "weak"),
        ("OC(=O)c1ccc(C)cc1", {"carboxylic_acid"}, {"alcohol", "phenol"}, "weak"),
        ("[O-]C(=O)c1ccc(C)cc1", {"carboxylate"}, {"carboxylic_acid"}, "good"),
        ("SCc1ccc(F)cc1", {"thiol"}, {"thioether"}, "good"),
        ("[S-]c1ccc(F)cc1", {"thiolate", "thiol"}, set(), "good"),
        ("[O-]c1ccc(F)cc1", {"phenoxide"}, {"alkoxide"}, "good"),
        ("[O-]CC1CCCC1", {"alkoxide"}, {"tertiary_alkoxide"}, "good"),
        ("CCC(C)(CC)[O-]", {"alkoxide", "tertiary_alkoxide"}, set(), "weak"),
        ("CCOC(=O)C(C)C(=O)OCC", {"active_methylene", "ester"}, set(), "none"),
        ("CCOC(=O)[C-](C)C(=O)OCC", {"stabilised_carbanion", "enolate"}, set(), "good"),
        ("[Li]CC(C)C", {"alkyllithium", "organolithium", "organometallic"}, set(), "good"),
        ("CC(C)C[Mg]Br", {"grignard", "organometallic"}, {"alkyl_halide"}, "good"),
        ("N#C[K]", {"cyanide"}, {"nitrile"}, "good"),
        ("CCCCCBr", {"alkyl_halide"}, {"activated_halide"}, "none"),
        ("CC(=O)CBr", {"activated_halide", "alkyl_halide", "ketone"}, set(), "none"),
        ("CC(C)C(=O)Cl", {"acyl_halide"}, {"alkyl_halide"}, "none"),
        ("CCS(=O)(=O)Cl", {"sulfonyl_chloride"}, {"alkyl_halide"}, "weak"),
        ("CCCOS(C)(=O)=O", {"alkyl_sulfonate"}, {"alkyl_triflate"}, "none"),
        ("CC1CO1", {"epoxide"}, set(), "none"),
        ("C=CC(=O)c1ccccc1", {"michael_acceptor", "ketone"}, {"aldehyde"}, "none"),
        ("CCP(CC)c1ccccc1", {"phosphine"}, set(), "good"),
        ("NOCc1ccccc1", {"hydroxylamine"}, {"primary_amine"}, "good"),
        ("CC(=N)N", {"amidine_base"}, {"guanidine_base"}, "weak"),
        ("C[N+](C)(C)CCO", {"quaternary_ammonium", "alcohol"}, {"ammonium_salt"}, "weak"),
        ("C[NH2+]CC", {"ammonium_salt"}, {"quaternary_ammonium"}, "none"),
        ("Cc1ccc(C(F)(F)F)cc1", {"inert_organic"}, set(), "none"),
        ("Cc1ccc([N+](=O)[O-])cc1", {"inert_organic"}, {"nitroalkane"}, "none"),
    ],
)
def test_a_structure_is_classified_by_its_groups(
    smiles: str, has: set[str], has_not: set[str], nucleophile: str
) -> None:
    facts = classify_structure(smiles)
    assert facts is not None
    assert has <= facts.classes
    assert not has_not & facts.classes
    assert facts.nucleophile == nucleophile
    assert facts.classes <= REAGENT_CLASSES.keys()


@pytest.mark.parametrize(
    ("smiles", "acidity"),
    [
        ("OC(=O)c1ccccc1C", "weak"),
        ("CCS(=O)(=O)O", "strong"),
        ("OC(=O)C(F)(F)C(F)(F)F", "strong"),
        ("N[C@@H](C)C(=O)O", "none"),  # an amino acid is its own salt
        ("Oc1ccccc1C", "none"),
        ("CCCC", "none"),
    ],
)
def test_acidity_follows_the_group(smiles: str, acidity: str) -> None:
    facts = classify_structure(smiles)
    assert facts is not None
    assert facts.acidity == acidity


@pytest.mark.parametrize("smiles", ["[U+4]", "[Xe]", "[CH3]", "not a structure", "", "C(C", "C" * 5000])
def test_nothing_is_claimed_where_nothing_can_be_said(smiles: str) -> None:
    assert classify_structure(smiles) is None


@pytest.mark.parametrize("smiles", ["NCCc1ccc(OC)cc1", "CC(C)(C)OC(=O)N1CCNCC1", "O=C(O)CS"])
@given(seed=st.integers(min_value=0, max_value=10_000))
def test_the_order_of_atoms_does_not_matter(smiles: str, seed: int) -> None:
    import random

    mol = Chem.MolFromSmiles(smiles)
    order = list(range(mol.GetNumAtoms()))
    random.Random(seed).shuffle(order)
    shuffled = Chem.MolToSmiles(Chem.RenumberAtoms(mol, order), canonical=False)
    assert classify_structure(shuffled) == classify_structure(smiles)


def test_canonical_smiles_drops_atom_maps_and_refuses_other_text() -> None:
    assert canonical_smiles("[CH3:7][CH2:8][OH:9]") == "CCO"
    assert canonical_smiles("OCC") == "CCO"
    assert canonical_smiles("ethanol please") is None
    assert canonical_smiles("") is None

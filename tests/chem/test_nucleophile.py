"""Which atoms can attack, in the words that the reagent catalogue uses."""

from __future__ import annotations

import pytest

from kb.chem.molgraph import molgraph_of
from kb.chem.nucleophile import find_nucleophile_sites
from kb.chem.structure import canonical_smiles
from kb.materials.class_names import REAGENT_CLASSES

BEST = [
    ("[N-]=[N+]=[N-]", "azide"),
    ("C[Si](C)(C)N=[N+]=[N-]", "azide"),
    ("[C-]#N", "cyanide"),
    ("C[Si](C)(C)C#N", "cyanide"),
    ("CC(C)(O)C#N", "cyanide"),
    ("CCN", "primary_amine"),
    ("CC[NH3+]", "primary_amine"),
    ("CCNCC", "secondary_amine"),
    ("CCN(CC)CC", "tertiary_amine"),
    ("N", "ammonia"),
    ("[NH4+]", "ammonia"),
    ("Nc1ccccc1", "aromatic_amine"),
    ("c1ccncc1", "aromatic_amine_base"),
    ("c1cnc[nH]1", "azole"),
    ("O=C1NC(=O)c2ccccc21", "imide"),
    ("CC(N)=O", "amide"),
    ("CS(N)(=O)=O", "sulfonamide"),
    ("O", "water"),
    ("[OH-]", "hydroxide"),
    ("CCO", "alcohol"),
    ("CC[O-]", "alkoxide"),
    ("Oc1ccccc1", "phenoxide"),
    ("CC(=O)[O-]", "carboxylate"),
    ("CC(=O)O", "carboxylate"),
    ("CCS", "thiolate"),
    ("CC(=O)[S-]", "thiocarboxylate"),
    ("NC(N)=S", "thiourea"),
    ("[S-]C#N", "thiocyanate"),
    ("CSC", "thioether"),
    ("CS(=O)[O-]", "sulfinate"),
    ("c1ccc(P(c2ccccc2)c2ccccc2)cc1", "phosphine"),
    ("CCOP(OCC)OCC", "phosphite"),
    ("[I-]", "iodide"),
    ("Br", "bromide"),
    ("COC(=O)CC(=O)OC", "active_methylene"),
    ("COC(=O)[CH-]C(=O)OC", "stabilised_carbanion"),
    ("CC(C)=O", "enolate"),
    ("C#CC", "acetylide"),
    ("C[Mg]Br", "grignard"),
    ("C[Li]", "alkyllithium"),
    ("OB(O)c1ccccc1", "boronic_acid"),
    ("CC(C)=NO", "oxime"),
    ("C=C(C)O[Si](C)(C)C", "silyl_enol_ether"),
]


@pytest.mark.parametrize(("smiles", "word"), BEST)
def test_the_most_willing_atom_of_a_nucleophile_has_its_class_word(smiles: str, word: str) -> None:
    assert find_nucleophile_sites(molgraph_of(canonical_smiles(smiles)))[0].word == word


def test_every_class_word_is_one_of_the_catalogue_or_named_as_an_extra() -> None:
    extras = {"aldehyde", "carbanion", "sulfonate", "organometallic", "amidine_base", "hydroxylamine"}
    words = {s.word for smiles, _ in BEST for s in find_nucleophile_sites(molgraph_of(canonical_smiles(smiles)))}
    assert words - set(REAGENT_CLASSES) <= extras


@pytest.mark.parametrize("smiles", ["CCCC", "c1ccccc1", "C[N+](C)(C)C", "[Na+]", "CC(F)(F)F"])
def test_what_has_no_pair_to_give_is_no_willing_nucleophile(smiles: str) -> None:
    sites = find_nucleophile_sites(molgraph_of(canonical_smiles(smiles)))
    assert all(s.rank < 10 for s in sites)


@pytest.mark.parametrize(
    ("smiles", "elements"),
    [("O=c1cccc[nH]1", {7, 8}), ("[S-]C#N", {16, 7}), ("[C-]#N", {6, 7}), ("O=N[O-]", {7, 8}), ("NC(N)=S", {7, 16})],
)
def test_both_ends_of_an_ambident_nucleophile_are_listed(smiles: str, elements: set[int]) -> None:
    graph = molgraph_of(canonical_smiles(smiles))
    assert elements <= {graph.elements[s.atom] for s in find_nucleophile_sites(graph)}

"""Groups that come off, the centre each names, what remains, and which conditions are taken for the cause.

Which promoter takes off which group is common practice of protecting groups.
"""

from __future__ import annotations

import pytest

from kb.chem.fates_loss import draw_loss, iter_losses
from kb.chem.labile import comes_off, find_labile_groups
from kb.chem.molgraph import molgraph_of
from kb.chem.promoters import Promoters
from kb.chem.structure import canonical_smiles

ACID, ALKALI, NOTHING = Promoters(strong_acid=True), Promoters(strong_base=True), Promoters()
HYDROGEN, FLUORIDE = Promoters(hydrogenation=True, metal_catalyst=True), Promoters(fluoride=True)

# substrate, group, remainder, promoters under which it counts as lost, and under which it does not
GROUPS = [
    ("CC(C)(C)OC(=O)NCC", "N-Boc", "NCC", [ACID, NOTHING], [ALKALI]),
    ("CC(C)(C)OC(=O)OCC", "O-Boc", "OCC", [ACID], [ALKALI]),
    ("CC(C)(C)OC(=O)CC", "tert-butyl ester", "OC(=O)CC", [ACID, NOTHING], [ALKALI]),
    ("CC(C)(C)OCC", "tert-butyl ether", "OCC", [ACID], [ALKALI]),
    ("CC(C)(C)NS(C)(=O)=O", "tert-butyl amide", "NS(C)(=O)=O", [ACID], [ALKALI]),
    ("c1ccc(C(OCC)(c2ccccc2)c2ccccc2)cc1", "trityl ether", "OCC", [ACID], [ALKALI]),
    ("CCOC1CCCCO1", "tetrahydropyranyl-type ether", "CCO", [ACID], [ALKALI]),
    ("CCOCOC", "alkoxymethyl ether", "CCO", [ACID], [ALKALI]),
    ("COc1ccc(COCC)cc1", "methoxybenzyl ether", "OCC", [ACID], [ALKALI]),
    ("CCO[Si](C)(C)C(C)(C)C", "silyl", "CCO", [ACID, FLUORIDE, ALKALI], [NOTHING]),
    ("CCOC(C)=O", "acetyl", "CCO", [ALKALI, ACID], [HYDROGEN]),
    ("CCNC(=O)C(F)(F)F", "trifluoroacetyl", "CCN", [ALKALI], [HYDROGEN]),
    ("CCNC(=O)OCc1ccccc1", "N-Cbz", "CCN", [ACID], [HYDROGEN, NOTHING]),
    ("CCOCc1ccccc1", "benzyl ether", "CCO", [ACID], [HYDROGEN, NOTHING]),
    ("O=C(NCC)OCC1c2ccccc2-c2ccccc21", "N-Fmoc", "NCC", [ALKALI], [HYDROGEN]),
    ("CC1(C)OCC(C)O1", "diol acetal", "CC(O)CO", [ACID], [ALKALI]),
    ("CC1(CC)OCCO1", "acetal", "CCC(C)=O", [ACID], [ALKALI]),
    ("COC(OC)CC", "acetal", "CCC=O", [ACID], [ALKALI]),
]


@pytest.mark.parametrize(("smiles", "name", "remainder", "lost_in", "kept_in"), GROUPS)
def test_a_labile_group_is_found_drawn_off_and_tied_to_what_takes_it(
    smiles: str, name: str, remainder: str, lost_in: list[Promoters], kept_in: list[Promoters]
) -> None:
    graph = molgraph_of(canonical_smiles(smiles))
    found = [
        g
        for g in find_labile_groups(graph)
        if g.name == name and draw_loss(graph, g) == canonical_smiles(remainder)
    ]
    assert found, [g.name for g in find_labile_groups(graph)]
    assert all(comes_off(found[0], p) for p in lost_in)
    assert not any(comes_off(found[0], p) for p in kept_in)
    assert found[0].carbon is not None and graph.elements[found[0].carbon] == 6


@pytest.mark.parametrize(
    ("smiles", "why"),
    [
        ("COC(=O)CC", "a methyl ester is saponified, no protecting group is lost"),
        ("CC(=O)NCC", "nor is an acetamide"),
        ("CCOCC", "nor a plain ether"),
        ("CCNCC", "nor a plain amine"),
        ("CS(=O)(=O)NCC", "nor a sulfonamide"),
    ],
)
def test_ordinary_groups_are_no_loss(smiles: str, why: str) -> None:
    graph = molgraph_of(canonical_smiles(smiles))
    assert not any(comes_off(g, p) for g in find_labile_groups(graph) for p in (ACID, ALKALI, NOTHING)), why


def test_losses_in_acid_leave_groups_of_other_kinds_alone() -> None:
    graph = molgraph_of(canonical_smiles("CC(C)(C)OC(=O)NCCOCCNC(=O)OCC1c2ccccc2-c2ccccc21"))
    acid = {p.note for p in iter_losses(graph, ACID)}
    assert any("Boc" in n for n in acid)
    alkali = {p.note for p in iter_losses(graph, ALKALI)}
    assert alkali and not any("Boc" in n for n in alkali)

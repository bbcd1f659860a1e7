"""Leaving groups, carbon classes and flags: tables of single structures.

Names and classes are common practice of the trade; the ladder of readiness is tested for its rank only.
"""

from __future__ import annotations

import pytest

from kb.chem.carbon import find_carbon_class, find_flags, is_bridgehead
from kb.chem.centre import find_leaving_sites
from kb.chem.molgraph import Molgraph, molgraph_of
from kb.chem.reading import read_scheme
from kb.chem.structure import canonical_smiles


def graph(smiles: str) -> Molgraph:
    """Return the graph of any SMILES."""
    return molgraph_of(canonical_smiles(smiles))


LEAVING = [
    ("CCF", "fluoride", "primary"),
    ("CCCl", "chloride", "primary"),
    ("CC(C)Br", "bromide", "secondary"),
    ("CI", "iodide", "methyl"),
    ("CC(C)(C)Cl", "chloride", "tertiary"),
    ("CCOS(C)(=O)=O", "mesylate", "primary"),
    ("CCOS(=O)(=O)c1ccc(C)cc1", "tosylate", "primary"),
    ("CCOS(=O)(=O)c1cccc(C)c1", "sulfonate", "primary"),
    ("CCOS(=O)(=O)c1ccc([N+](=O)[O-])cc1", "sulfonate", "primary"),
    ("CCOS(=O)(=O)C(F)(F)F", "triflate", "primary"),
    ("COS(=O)(=O)OC", "sulfate", "methyl"),
    ("CC1COS(=O)(=O)O1", "sulfate", "primary"),
    ("CCOP(=O)(OCC)OCC", "phosphate", "primary"),
    ("CC(=O)OCC=C", "carboxylate", "primary"),
    ("O=C1CCCO1", "carboxylate", "primary"),
    ("CCO", "hydroxyl", "primary"),
    ("COCc1ccccc1", "alkoxide", "primary"),
    ("C1CO1", "epoxide", "primary"),
    ("CC1(C)CO1", "epoxide", "primary"),
    ("C1CCO1", "alkoxide", "primary"),
    ("C[N+](C)(C)C", "ammonium", "methyl"),
    ("C[S+](C)C", "sulfonium", "methyl"),
    ("CC[N+]#N", "diazonium", "primary"),
    ("C=[N+]=[N-]", "diazonium", "methyl"),
    ("CC(C)(C)[N+](=O)[O-]", "nitro", "tertiary"),
    ("CCOC(=N)C(Cl)(Cl)Cl", "other", "primary"),
    ("BrC12CC3CC(CC(C3)C1)C2", "bromide", "bridgehead"),
    ("Clc1ccccc1", "chloride", "aryl"),
    ("C=CBr", "bromide", "vinyl"),
]


@pytest.mark.parametrize(("smiles", "group", "carbon_class"), LEAVING)
def test_the_readiest_leaving_group_has_its_word_and_its_carbon_its_class(
    smiles: str, group: str, carbon_class: str
) -> None:
    best = [s for s in find_leaving_sites(graph(smiles)) if str(s.group) == group]
    assert best, f"no {group} found in {smiles}"
    assert str(best[0].carbon_class) == carbon_class


def test_the_ladder_orders_leaving_groups_as_the_textbooks_do() -> None:
    ladder = ["CCOS(=O)(=O)C(F)(F)F", "CCI", "CCOS(C)(=O)=O", "CCBr", "CCCl", "CCO", "CCF", "CCOC"]
    ranks = [find_leaving_sites(graph(s))[0].rank for s in ladder]
    assert ranks[:5] == sorted(ranks[:5], reverse=True)
    assert max(ranks[5:]) < min(ranks[:5])


def test_a_protonated_amine_is_no_leaving_group_that_goes_unaided() -> None:
    assert not any(s.leaves_unaided for s in find_leaving_sites(graph("CC[NH3+]")))


@pytest.mark.parametrize(
    ("smiles", "expected", "why"),
    [
        ("C1CC2CCC1C2", 2, "norbornane has two"),
        ("C1CC2CCC1CC2", 2, "bicyclo[2.2.2]octane has two"),
        ("C1C2CC3CC1CC(C2)C3", 4, "adamantane has four"),
        ("C1CCC2CCCCC2C1", 0, "decalin is fused, not bridged"),
        ("C1CC2CC2C1", 0, "bicyclo[3.1.0]hexane is fused"),
        ("C12C3C4C1C5C2C3C45", 8, "every corner of cubane"),
        ("C1CCC2(CC1)CCCC2", 0, "a spiro atom is none"),
        ("CC1(C)C2CCC1(C)C(=O)C2", 2, "camphor"),
    ],
)
def test_bridgeheads_are_told_from_fused_and_spiro_atoms(smiles: str, expected: int, why: str) -> None:
    g = graph(smiles)
    assert sum(is_bridgehead(g, a) for a in range(len(g)) if g.elements[a] == 6) == expected, why


FLAGS = [
    ("C=CCBr", ["allylic"]),
    ("BrCc1ccccc1", ["benzylic"]),
    ("C#CCBr", ["propargylic"]),
    ("COC(=O)CBr", ["alpha-carbonyl"]),
    ("N#CCBr", ["alpha-carbonyl"]),
    ("COCCl", ["alpha-heteroatom"]),
    ("CC(C)CBr", ["beta-branched"]),
    ("CC(C)(C)CBr", ["beta-branched", "neopentyl"]),
    ("BrC1CCCCC1", ["ring"]),
    ("BrC1CCC1", ["ring", "small-ring"]),
    ("BrCCc1ccccc1", ["homobenzylic"]),
    ("CCCBr", []),
    ("C1CO1", []),
    ("Brc1ccccc1", ["ring"]),
    ("C=CBr", []),
]


@pytest.mark.parametrize(("smiles", "expected"), FLAGS)
def test_flags_say_what_stands_beside_the_centre(smiles: str, expected: list[str]) -> None:
    g = graph(smiles)
    site = find_leaving_sites(g)[0]
    assert [str(f) for f in find_flags(g, site.centre, site.leaving)] == expected


@pytest.mark.parametrize(
    ("smiles", "expected"), [("CBr", 0), ("CCBr", 3), ("CC(C)Br", 6), ("CC(C)(C)Br", 9), ("BrCc1ccccc1", 0)]
)
def test_beta_hydrogens_are_counted_on_sp3_neighbours(smiles: str, expected: int) -> None:
    centre = read_scheme(smiles).centre
    assert centre is not None and centre.beta_hydrogens == expected


def test_carbonyl_and_nitrile_carbons_have_no_class() -> None:
    for smiles in ("CC(C)=O", "CC#N"):
        g = graph(smiles)
        carbon = next(a for a in range(len(g)) if g.elements[a] == 6 and g.hydrogens[a] == 0)
        assert find_carbon_class(g, carbon) is None


def test_a_drawn_configuration_is_reported() -> None:
    drawn, flat = read_scheme("C[C@H](Br)CC").centre, read_scheme("CC(Br)CC").centre
    assert drawn is not None and drawn.is_stereocentre
    assert flat is not None and not flat.is_stereocentre

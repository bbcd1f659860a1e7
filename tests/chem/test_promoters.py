"""What the other components do, told from their structures."""

from __future__ import annotations

import pytest

from kb.chem.molgraph import molgraph_of
from kb.chem.promoters import Promoters, find_promoters
from kb.chem.structure import canonical_smiles

PPH3 = "c1ccc(P(c2ccccc2)c2ccccc2)cc1"


def promoters(*smiles: str) -> Promoters:
    """Return the promoters of a set of fragments."""
    return find_promoters([molgraph_of(canonical_smiles(s)) for s in smiles])


TABLE = [
    (["Cl"], {"strong_acid", "halogenating"}),
    (["OS(=O)(=O)O"], {"strong_acid"}),
    (["OC(=O)C(F)(F)F"], {"strong_acid"}),
    (["CC(=O)O"], {"weak_acid"}),
    (["[NH4+]", "[Cl-]"], set()),
    (["FB(F)F"], {"lewis_acid"}),
    (["[Al+3]", "[Cl-]"], {"lewis_acid"}),
    (["[OH-]", "[Na+]"], {"strong_base"}),
    (["CC(C)(C)[O-]", "[K+]"], {"strong_base"}),
    (["[H-]", "[Na+]"], {"strong_base"}),
    (["CC(C)[N-]C(C)C", "[Li+]"], {"strong_base"}),
    (["[Li]CCCC"], {"strong_base"}),
    (["O=C([O-])[O-]", "[K+]"], {"mild_base"}),
    (["CCN(CC)CC"], {"mild_base"}),
    (["[F-]", "[Cs+]"], {"fluoride"}),
    (["[H][H]", "[Pd]"], {"hydrogenation", "metal_catalyst"}),
    ([PPH3], set()),
    ([PPH3, "CCOC(=O)N=NC(=O)OCC"], {"mitsunobu"}),
    ([PPH3, "BrC(Br)(Br)Br"], {"halogenating"}),
    ([PPH3, "II"], {"halogenating"}),
    (["O=S(Cl)Cl"], {"halogenating"}),
    (["BrP(Br)Br"], {"halogenating"}),
    (["CS(=O)(=O)Cl"], {"sulfonylating"}),
    (["CS(=O)(=O)OS(C)(=O)=O"], {"sulfonylating"}),
    (["CC(=O)OCC", "CCCC", "[Na+]"], set()),
]


@pytest.mark.parametrize(("smiles", "expected"), TABLE)
def test_promoters_are_told_from_structures(smiles: list[str], expected: set[str]) -> None:
    found = promoters(*smiles)
    assert {name for name in Promoters.__dataclass_fields__ if getattr(found, name)} == expected


def test_a_strong_base_outweighs_a_weak_acid_but_not_a_strong_one() -> None:
    assert promoters("CC(=O)O").is_acidic
    assert not promoters("CC(=O)O", "[OH-]").is_acidic
    assert promoters("Cl", "[OH-]").is_acidic


@pytest.mark.parametrize("smiles", [["Cl"], ["O=S(Cl)Cl"], ["CS(=O)(=O)Cl"], [PPH3, "CCOC(=O)N=NC(=O)OCC"]])
def test_these_make_an_alcohol_leave(smiles: list[str]) -> None:
    assert promoters(*smiles).makes_hydroxyl_leave

"""A scheme keeps its sides, its fragments as typed, and the way back to the atoms of the entry."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st
from rdkit import Chem

from kb.chem.scheme import MAX_FRAGMENTS, parse_scheme
from kb.errors import StructureError


def test_the_left_side_counts_reactants_first_and_then_agents() -> None:
    scheme = parse_scheme("CCBr.[Na+]>CS(C)=O>CCO.[Br-]")
    assert [f.smiles for f in scheme.left] == ["CCBr", "[Na+]", "CS(C)=O"]
    assert [f.side for f in scheme.left] == ["reactant", "reactant", "agent"]
    assert [f.smiles for f in scheme.products] == ["CCO", "[Br-]"]


@pytest.mark.parametrize("text", ["CCBr", "CCBr>>", " CCBr >> "])
def test_structures_alone_are_reactants(text: str) -> None:
    scheme = parse_scheme(text)
    assert [f.smiles for f in scheme.reactants] == ["CCBr"]
    assert scheme.products == ()


def test_explicit_hydrogens_count_in_the_numbering_of_the_entry() -> None:
    (fragment,) = parse_scheme("[H]C([H])([H])[CH2:3]Br").reactants
    assert fragment.smiles == "CCBr"
    assert fragment.entered == (1, 4, 5)
    assert fragment.maps == (0, 3, 0)


def test_a_dative_arrow_is_no_reaction_arrow() -> None:
    assert len(parse_scheme("[NH3]->[Cu+2].CCBr>>CCN").reactants) == 2


def test_a_ring_closure_across_a_dot_is_one_fragment() -> None:
    (fragment,) = parse_scheme("C1CC.C1Br").reactants
    assert fragment.smiles == Chem.CanonSmiles("CCCCBr")


def test_a_cxsmiles_block_is_set_aside() -> None:
    assert parse_scheme("CCBr.N>>CCN |f:0.1|").smiles == "CCBr.N>>CCN"


@pytest.mark.parametrize(
    ("text", "said"),
    [
        (">>CC", "no reactants"),
        ("CC>>CC>>C", "arrows"),
        ("CC>C", "arrows"),
        ("CC..C", "empty place"),
        ("CC.C(C)(C)(C)(C)C", "valence"),
        (".".join(["C"] * (MAX_FRAGMENTS + 1)), "fragments"),
    ],
)
def test_a_scheme_that_does_not_add_up_is_refused_with_the_reason(text: str, said: str) -> None:
    with pytest.raises(StructureError, match=said):
        parse_scheme(text)


@given(st.permutations(range(10)))
def test_every_canonical_atom_leads_back_to_the_atom_that_was_typed(order: list[int]) -> None:
    mol = Chem.MolFromSmiles("C[C@H](Br)/C=C/C(=O)OCC")
    text = Chem.MolToSmiles(Chem.RenumberAtoms(mol, list(order)), canonical=False)
    (fragment,) = parse_scheme(text).reactants
    typed = Chem.MolFromSmiles(text)
    for canonical, entered in enumerate(fragment.entered):
        there = typed.GetAtomWithIdx(entered)
        assert there.GetAtomicNum() == fragment.graph.elements[canonical]
        assert there.GetTotalNumHs() == fragment.graph.hydrogens[canonical]
        assert there.GetDegree() == len(fragment.graph.neighbours[canonical])

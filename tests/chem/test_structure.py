"""Structures are understood or refused with a sentence, and identity is what the module text promises."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st
from rdkit import Chem
from rdkit.Chem import rdDepictor

from kb.chem.structure import (
    canonical_smiles,
    find_oddities,
    identity_key,
    make_visible,
    parse_molblock,
    parse_molecule,
    standardise,
)
from kb.errors import StructureError

SAME = [
    ("CC[N+](=O)[O-]", "CCN(=O)=O", "nitro has one drawing"),
    ("CN=[N+]=[N-]", "CN=N#N", "so has an azide"),
    ("C[S+](C)[O-]", "CS(C)=O", "and a sulfoxide"),
    ("[Na]OCC", "[Na+].[O-]CC", "a covalent alkoxide is drawn as ions"),
    ("[H]C([H])([H])Br", "CBr", "explicit hydrogens say nothing"),
    ("[CH3:1][Br:2]", "CBr", "maps are no part of a structure"),
    ("CCO.CBr", "CBr.CCO", "components have no order"),
    ("c1ccccc1", "C1=CC=CC=C1", "aromatic and Kekule drawings are the same"),
]
DIFFERENT = [
    ("C[C@H](Br)CC", "C[C@@H](Br)CC", "enantiomers"),
    ("C[C@H](Br)CC", "CC(Br)CC", "one enantiomer and the undefined drawing"),
    ("C/C=C/C", "C/C=C\\C", "E and Z"),
    ("NCC", "NCC.Cl", "a base and its hydrochloride"),
    ("CO", "[13CH3]O", "isotopes"),
    ("O=c1cccc[nH]1", "Oc1ccccn1", "tautomers: chemists draw the one they mean"),
]
REFUSED = [
    ("", "empty"),
    ("   ", "empty"),
    ("C(C)(C)(C)(C)C", "valence"),
    ("c1cccc1", "kekulize"),
    ("C1CC", "not valid SMILES"),
    ("CC\x1b[31mBr", "control characters"),
    ("CC\x00", "control characters"),
    ("ethyl bromide", "blank"),
    ("CCBr\tname", "blank"),
    ("CC\N{MINUS SIGN}C", "U+2212"),
    ("[R1]CC", "not valid SMILES"),
    ("x" * 70_000, "at most"),
]


@pytest.mark.parametrize(("first", "second", "why"), SAME)
def test_two_drawings_of_one_thing_share_an_identity_key(first: str, second: str, why: str) -> None:
    assert identity_key(first) == identity_key(second), why


@pytest.mark.parametrize(("first", "second", "why"), DIFFERENT)
def test_different_things_have_different_identity_keys(first: str, second: str, why: str) -> None:
    assert identity_key(first) != identity_key(second), why


@pytest.mark.parametrize(("first", "second"), [("NCC", "NCC.Cl"), ("C[C@H](Br)CC", "CC(Br)CC"), ("[NH3+]CC", "NCC")])
def test_the_flat_key_brings_salt_base_and_enantiomers_together(first: str, second: str) -> None:
    assert standardise(first).flat_key == standardise(second).flat_key


@pytest.mark.parametrize(("text", "said"), REFUSED)
def test_what_is_no_structure_is_refused_with_a_sentence_and_a_hint(text: str, said: str) -> None:
    with pytest.raises(StructureError) as caught:
        standardise(text)
    assert said in caught.value.message
    assert caught.value.hint
    assert "\x1b" not in str(caught.value) and "\x00" not in str(caught.value)


@pytest.mark.parametrize(
    ("smiles", "said"),
    [
        ("C[CH]C", "unpaired electron"),
        ("[13CH3]Br", "isotopically"),
        ("*CBr", "attachment point"),
        ("C[Mg]Br", "metal"),
        ("CCBr", ""),
    ],
)
def test_unusual_atoms_are_told_in_words(smiles: str, said: str) -> None:
    notes = find_oddities(parse_molecule(smiles))
    assert any(said in n for n in notes) if said else notes == ()


def test_salts_stay_components_and_stereo_stays() -> None:
    structure = standardise("C[C@H]([NH3+])c1ccccc1.[Cl-]")
    assert "." in structure.smiles
    assert "@" in structure.smiles


def test_canonical_smiles_drops_maps_and_changes_nothing_else() -> None:
    assert canonical_smiles("[CH3:5][C@H:2](Br)CC") == Chem.CanonSmiles("C[C@H](Br)CC")


@given(st.permutations(range(9)))
def test_the_identity_key_does_not_depend_on_the_order_of_atoms(order: list[int]) -> None:
    mol = Chem.MolFromSmiles("C[C@H](Br)/C=C/C(=O)OC")
    shuffled = Chem.MolToSmiles(Chem.RenumberAtoms(mol, list(order)), canonical=False)
    assert identity_key(shuffled) == identity_key("C[C@H](Br)/C=C/C(=O)OC")


@given(st.text(max_size=60))
def test_any_text_gives_a_structure_or_a_structure_error(text: str) -> None:
    try:
        assert standardise(text).heavy_atoms >= 0
    except StructureError as problem:
        assert problem.message.isprintable()


def test_a_molfile_is_read_with_its_wedges_and_without_its_coordinates() -> None:
    mol = Chem.MolFromSmiles("C[C@H](Br)CC")
    rdDepictor.Compute2DCoords(mol)
    for block in (Chem.MolToMolBlock(mol), Chem.MolToV3KMolBlock(mol)):
        assert standardise(block).identity_key == identity_key("C[C@H](Br)CC")


@pytest.mark.parametrize("block", ["", "nonsense\n\n\n", "\n\n\n  0  0  0  0  0  0  0  0  0  0999 V2000\nM  END\n"])
def test_a_block_that_is_no_molfile_is_refused(block: str) -> None:
    with pytest.raises(StructureError):
        parse_molblock(block)


def test_long_text_is_shortened_and_controls_are_written_out() -> None:
    assert make_visible("CC\x1b[2J") == "CC\\x1b[2J"
    assert make_visible("C" * 500).endswith("(500 characters)")

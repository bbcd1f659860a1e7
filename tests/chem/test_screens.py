"""Screens never lose a hit: brute force with RDKit's own match is the oracle, for tables and for random fragments."""

from __future__ import annotations

import random

import pytest
from hypothesis import given
from hypothesis import settings as hypothesis_settings
from hypothesis import strategies as st
from rdkit import Chem

from kb.chem.query import StructureQuery, parse_query
from kb.chem.screens import AUGMENTED_BITS, SCREEN_RECIPE, augmented_mask, encode_mol, encode_structure
from kb.chem.screens_ask import bits_in, holds
from kb.chem.screens_keys import KEY_ANY_CYCLE, KEY_UNRULY
from kb.chem.screens_pool import encode_many
from kb.chem.screens_query import ask_of
from kb.errors import StructureError
from tests.search.queries import ALL
from tests.search.structures import molecules, smiles


@pytest.fixture(scope="module")
def masks() -> list[int]:
    return [augmented_mask(mol) for mol in molecules()]


@pytest.mark.parametrize("kind", sorted({kind for kind, _ in ALL}))
def test_no_query_of_the_table_loses_a_hit(kind: str, masks: list[int]) -> None:
    some = range(0, len(masks), 3) if kind == "centre" else range(len(masks))
    structures = list(some) + [n for n in range(1400, len(masks)) if n not in some]
    lost = []
    for smarts in (smarts for k, smarts in ALL if k == kind):
        query = parse_query(smarts)
        ask = ask_of(query.mol)
        for n in structures:
            if not holds(ask, masks[n]) and molecules()[n].HasSubstructMatch(
                query.mol, useChirality=query.uses_stereo
            ):
                lost.append((smarts, smiles()[n]))
    assert lost == []


def test_the_screens_leave_little_to_compare(masks: list[int]) -> None:
    """A screen that lets everything through would pass the tests above."""
    kept = dict.fromkeys(("CC(C)(C)OC(=O)N", "[CX4;H0](C)(C)(C)Br", "[N+](C)(C)(C)C", "C1CC2CCC1C2", "C#C"), 0)
    for smarts in kept:
        mol = parse_query(smarts).mol
        ask = ask_of(mol)
        found = sum(holds(ask, mask) for mask in masks)
        hits = sum(m.HasSubstructMatch(mol) for m in molecules())
        kept[smarts] = found - hits
    assert all(wrong <= 0.02 * len(masks) for wrong in kept.values()), kept


_GENERAL = ("{}", "{}", "{}", "*", "[#{z}]", "[#{z},#9]", "[!#92]", "[{x};H{h}]", "[{x};X{c}]", "[{x};D{d}]")


def _fragment(mol: Chem.Mol, seed: int, size: int) -> str:
    """Return SMARTS of a random connected part of a molecule, some of its atoms and bonds made more general."""
    chance = random.Random(seed)
    chosen = [chance.randrange(mol.GetNumAtoms())]
    while len(chosen) < size:
        edge = {
            n.GetIdx() for a in chosen for n in mol.GetAtomWithIdx(a).GetNeighbors() if n.GetIdx() not in chosen
        }
        if not edge:
            break
        chosen.append(chance.choice(sorted(edge)))
    symbols = []
    for atom in mol.GetAtoms():
        letter = atom.GetSymbol() if atom.GetAtomicNum() else "*"
        letter = letter.lower() if atom.GetIsAromatic() else letter
        letter = f"#{atom.GetAtomicNum()}" if atom.GetAtomicNum() in (0, 1) else letter
        form = chance.choice(_GENERAL).replace("{}", "[{x}]")
        symbols.append(
            form.format(
                x=letter,
                z=atom.GetAtomicNum(),
                h=atom.GetTotalNumHs(True),
                c=atom.GetTotalDegree(),
                d=atom.GetDegree(),
            )
        )
    bonds = []
    for bond in mol.GetBonds():
        plain = bond.GetSmarts(allBondsExplicit=True) or "-"
        general = ["~", "@" if bond.IsInRing() else "!@", plain, plain, plain]
        bonds.append(chance.choice(general))
    return Chem.MolFragmentToSmiles(mol, chosen, atomSymbols=symbols, bondSymbols=bonds, canonical=False)


@given(
    which=st.integers(0, len(smiles()) - 1),
    other=st.integers(0, len(smiles()) - 1),
    seed=st.integers(0, 2**32),
    size=st.integers(1, 12),
)
@hypothesis_settings(max_examples=400)
def test_a_random_part_of_a_structure_is_never_screened_out(which: int, other: int, seed: int, size: int) -> None:
    query = Chem.MolFromSmarts(_fragment(molecules()[which], seed, size))
    if query is None:  # a few odd atoms have no SMARTS of their own
        return
    query.UpdatePropertyCache(strict=False)
    Chem.GetSymmSSSR(query)
    ask = ask_of(query)
    for structure in (molecules()[which], molecules()[other]):
        if structure.HasSubstructMatch(query):
            assert holds(ask, augmented_mask(structure)), Chem.MolToSmarts(query)


@given(which=st.integers(0, len(smiles()) - 1), seed=st.integers(0, 2**32))
@hypothesis_settings(max_examples=60)
def test_screens_do_not_depend_on_the_order_of_atoms(which: int, seed: int) -> None:
    mol = molecules()[which]
    order = list(range(mol.GetNumAtoms()))
    random.Random(seed).shuffle(order)
    assert augmented_mask(Chem.RenumberAtoms(mol, order)) == augmented_mask(mol)


def test_a_structure_satisfies_its_own_smiles_as_a_query() -> None:
    for text in ("CC(C)(C)OC(=O)NCCO", "c1ccc2[nH]ccc2c1", "C1CC2CCC1C2"):
        query: StructureQuery = parse_query(text)
        assert holds(ask_of(query.mol), augmented_mask(Chem.MolFromSmiles(text)))


def test_a_ring_query_finds_the_larger_ring_round_a_bridge() -> None:
    """The two smallest rings of norbornane are five-membered; the six-ring is their sum."""
    six = ask_of(parse_query("C1CCCCC1").mol)
    assert holds(six, augmented_mask(Chem.MolFromSmiles("C1CC2CCC1C2")))
    assert not holds(six, augmented_mask(Chem.MolFromSmiles("C1CCCC1C1CCCC1")))


def test_a_list_asks_for_one_of_its_members() -> None:
    halide = ask_of(parse_query("[CX4][Cl,Br]").mol)
    screens = {s: augmented_mask(Chem.MolFromSmiles(s)) for s in ("CCCl", "CCBr", "CCI", "Clc1ccccc1C")}
    assert [holds(halide, mask) for mask in screens.values()] == [True, True, False, False]


def test_negations_and_wildcards_ask_for_nothing() -> None:
    for smarts in ("*", "[!C]", "[!$(C=O)]", "[D{1-3}]", "[!R0]", "[!+]"):
        assert set(bits_in(ask_of(parse_query(smarts).mol))) == set(), smarts


def test_bonds_to_metals_do_not_hide_a_ring() -> None:
    """RDKit leaves dative bonds out of its rings, a query with any bond does not."""
    chelate = Chem.MolFromSmiles("C1CN->[Pt]<-N1")
    for smarts in ("*1~*~*~*~*1", "N1~[Pt]~N~C~C1", "C1~N~*~N~C1"):
        ring = parse_query(smarts)
        assert chelate.HasSubstructMatch(ring.mol)
        assert holds(ask_of(ring.mol), augmented_mask(chelate))


def test_large_cages_are_marked_as_unruly_and_as_having_any_cycle() -> None:
    cage = augmented_mask(molecules()[-1])
    assert cage >> KEY_UNRULY & 1
    assert cage >> KEY_ANY_CYCLE & 1
    assert not augmented_mask(Chem.MolFromSmiles("CCBr")) >> KEY_UNRULY & 1


def test_blobs_have_their_widths_and_a_recipe() -> None:
    blobs = encode_structure("CC(C)CCBr")
    assert len(blobs.augmented) == AUGMENTED_BITS // 8
    assert Chem.MolToSmiles(Chem.Mol(blobs.mol_binary)) == "CC(C)CCBr"
    assert blobs == encode_mol(Chem.MolFromSmiles("CC(C)CCBr"))
    assert "rdkit/" in SCREEN_RECIPE
    assert str(AUGMENTED_BITS) in SCREEN_RECIPE


def test_the_order_of_atoms_is_that_of_the_smiles() -> None:
    mol = Chem.Mol(encode_structure("BrCC(C)C").mol_binary)
    assert [a.GetSymbol() for a in mol.GetAtoms()] == ["Br", "C", "C", "C", "C"]


@pytest.mark.parametrize("processes", [1, 2])
def test_many_are_encoded_in_order_on_any_number_of_processes(processes: int) -> None:
    texts = [*smiles()[:600], "C1CC", *smiles()[600:700]]
    blobs = list(encode_many(texts, processes))
    assert blobs[600] is None
    assert [b for b in blobs if b is not None] == [encode_structure(s) for s in smiles()[:700]]


def test_what_is_no_structure_is_refused() -> None:
    with pytest.raises(StructureError):
        encode_structure("C1CC")

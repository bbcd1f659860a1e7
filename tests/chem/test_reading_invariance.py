"""A reading depends on the molecules, not on how they were written: atom order, fragment order, ring drawing."""

from __future__ import annotations

import random

import pytest
from hypothesis import given
from hypothesis import strategies as st
from rdkit import Chem

from kb.chem.reading import read_scheme

SCHEMES = [
    ("CC(Br)CC(=O)OC.Oc1ccccc1>>CC(Oc1ccccc1)CC(=O)OC", "substitution"),
    ("C[C@H](OS(C)(=O)=O)CCO.[N-]=[N+]=[N-]>>C[C@@H](N=[N+]=[N-])CCO", "substitution"),
    ("CC1CO1.CNC>>CC(O)CN(C)C", "substitution"),
    ("CC(C)C(C)O.Br>>CCC(C)(C)Br", "rearranged"),
    ("CCC(C)(Cl)c1ccccc1.CC[O-]>>C/C=C(\\C)c1ccccc1", "elimination"),
    ("C/C=C/CCl.CNC>>C=CC(C)N(C)C", "transposed"),
    ("CC(C)(C)OC(=O)N1CCC(Br)CC1.OC(=O)C(F)(F)F>>BrC1CCNCC1", "group-loss"),
    ("CC1=CCCCC1.Br>>CC1(Br)CCCCC1", "addition"),
    ("Cc1cnc[nH]1.CCI>>CCn1cnc(C)c1", "substitution"),
    ("COC(=O)c1ccccc1CBr.NCC>>CCN1Cc2ccccc2C1=O", "substitution"),
]


def numbered(side: str) -> list[Chem.Mol]:
    """Return the molecules of a side with every atom mapped, so that it can be known again."""
    mols, count = [], 0
    for token in side.split("."):
        mol = Chem.MolFromSmiles(token)
        for atom in mol.GetAtoms():
            count += 1
            atom.SetAtomMapNum(count)
        mols.append(mol)
    return mols


def rewritten(mols: list[Chem.Mol], shuffler: random.Random) -> str:
    """Return molecules as text with fragments and atoms in another order."""
    tokens = []
    for mol in mols:
        order = list(range(mol.GetNumAtoms()))
        shuffler.shuffle(order)
        tokens.append(Chem.MolToSmiles(Chem.RenumberAtoms(mol, order), canonical=False))
    shuffler.shuffle(tokens)
    return ".".join(tokens)


@pytest.mark.parametrize(("scheme", "fate"), SCHEMES)
@given(shuffler=st.randoms(use_true_random=False))
def test_the_same_atoms_are_found_however_the_scheme_is_written(
    scheme: str, fate: str, shuffler: random.Random
) -> None:
    left, right = scheme.split(">>")
    plain = read_scheme(f"{'.'.join(Chem.MolToSmiles(m) for m in numbered(left))}>>{right}", ignore_maps=True)
    other = read_scheme(f"{rewritten(numbered(left), shuffler)}>>{right}", ignore_maps=True)
    assert str(plain.fate) == str(other.fate) == fate
    for first, second in zip(plain.centres, other.centres, strict=True):
        assert first.atom_map is not None
        assert (first.atom_map, first.leaving_atom_map) == (second.atom_map, second.leaving_atom_map)
        assert (first.carbon_class, first.flags, first.beta_hydrogens) == (
            second.carbon_class,
            second.flags,
            second.beta_hydrogens,
        )
    assert plain.nucleophile is None or other.nucleophile is not None
    assert {(p.fate, p.product) for p in plain.possible} == {(p.fate, p.product) for p in other.possible}
    assert plain.substrate == other.substrate and plain.reason == other.reason


@pytest.mark.parametrize(("scheme", "fate"), SCHEMES)
def test_agents_and_reactants_give_the_same_fate(scheme: str, fate: str) -> None:
    left, right = scheme.split(">>")
    substrate, *others = left.split(".")
    moved = read_scheme(f"{substrate}>{'.'.join(others)}>{right}")
    assert str(moved.fate) == fate
    assert moved.centres == read_scheme(scheme).centres


@pytest.mark.parametrize(
    ("first", "second"),
    [
        ("BrCc1ccccc1.NC>>CNCc1ccccc1", "BrCC1=CC=CC=C1.NC>>CNCC1=CC=CC=C1"),
        ("CCBr.CC[NH3+].[Cl-]>>CCNCC", "CCBr.NCC>>CCNCC"),
        ("CCBr.[O-]c1ccccc1>>CCOc1ccccc1", "CCBr.Oc1ccccc1>>CCOc1ccccc1"),
        ("CCI.O=c1cccc[nH]1>>CCOc1ccccn1", "CCI.Oc1ccccn1>>CCOc1ccccn1"),
    ],
)
def test_drawings_of_one_thing_are_read_alike(first: str, second: str) -> None:
    a, b = read_scheme(first), read_scheme(second)
    assert (a.fate, a.confidence, a.centres) == (b.fate, b.confidence, b.centres)


def test_reading_twice_gives_the_same_value() -> None:
    for scheme, _ in SCHEMES:
        assert read_scheme(scheme) == read_scheme(scheme)

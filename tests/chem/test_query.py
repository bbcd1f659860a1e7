"""Queries are read as chemists mean them, and refused with a reason where they cannot be searched."""

from __future__ import annotations

import time

import pytest
from rdkit import Chem

from kb.chem.query import MAX_ATOMS, count_loose, find_match, parse_query
from kb.chem.query_traits import ANY, bond_trait, traits_of, types_of
from kb.errors import QueryError
from tests.search.queries import ALL

C60 = (
    "c12c3c4c5c1c1c6c7c2c2c8c3c3c9c4c4c%10c5c5c1c1c6c6c%11c7c2c2c7c8c3c3c8c9c4c4c9c%10c5c5c1c1c6c6c%11c2c2c7c3c3c8c4"
    "c4c9c5c1c1c6c2c3c41"
)
MOLFILE = """bromoethane
  by hand

  2  1  0  0  0  0  0  0  0  0999 V2000
    0.0000    0.0000    0.0000 C   0  0
    1.2000    0.0000    0.0000 Br  0  0
  1  2  1  0
M  END
"""
LIST_MOLFILE = """carbon halide, the halogen as an atom list
  by hand

  2  1  0  0  0  0  0  0  0  0999 V2000
    0.0000    0.0000    0.0000 C   0  0
    1.2000    0.0000    0.0000 L   0  0
  1  2  1  0
M  ALS   2  3 F Cl  Br  I   
M  END
"""


def holds(query: str, smiles: str, **options: bool) -> bool:
    return find_match(parse_query(query, **options), Chem.MolFromSmiles(smiles)) is not None


@pytest.mark.parametrize(
    ("query", "smiles", "expected", "why"),
    [
        ("CBr", "CCBr", True, "plain"),
        ("C1=CC=CC=C1", "Cc1ccccc1", True, "Kekule SMILES means the aromatic ring"),
        ("C1=CC=CC=C1Br", "Brc1ccccc1", True, "the same with a substituent"),
        ("C1CCCCC1", "c1ccccc1", False, "a saturated ring stays saturated"),
        ("[H]C([H])Br", "CCBr", True, "drawn hydrogens are counts"),
        ("[H]C([H])([H])Br", "CCBr", False, "three of them are a methyl"),
        ("C[C@H](Br)CC", "C[C@H](Br)CC", True, "stereo agrees"),
        ("C[C@H](Br)CC", "C[C@@H](Br)CC", False, "stereo counts when the query is marked"),
        ("CC(Br)CC", "C[C@@H](Br)CC", True, "an unmarked query does not ask for stereo"),
        ("C/C=C/Br", "C/C=C\\Br", False, "double-bond stereo counts too"),
        (MOLFILE, "CCBr", True, "a molfile"),
        (MOLFILE, "CCCl", False, "a molfile asks for its atoms"),
        (LIST_MOLFILE, "CCI", True, "an atom list in a molfile"),
        (LIST_MOLFILE, "CCF", False, "what is not on the list"),
    ],
)
def test_a_query_means_what_a_chemist_drew(query: str, smiles: str, expected: bool, why: str) -> None:
    assert holds(query, smiles) is expected, why


def test_stereo_can_be_left_out_of_account() -> None:
    assert holds("C[C@H](Br)CC", "C[C@@H](Br)CC", ignore_stereo=True)


def test_the_root_is_the_atom_with_map_one() -> None:
    assert parse_query("Br[CH2:1]c").root == 1
    assert parse_query("Br[CH2]c").root is None


def test_a_rooted_match_is_found_only_where_the_root_lies() -> None:
    query = parse_query("[C:1]Br")
    mol = Chem.MolFromSmiles("BrCCCCBr")
    assert find_match(query, mol, root_atom=1) == (1, 0)
    assert find_match(query, mol, root_atom=4) == (4, 5)
    assert find_match(query, mol, root_atom=2) is None


@pytest.mark.parametrize(
    ("query", "says"),
    [
        ("", "empty"),
        ("   ", "empty"),
        ("C1CC", "neither SMARTS nor SMILES"),
        ("not a query", "neither SMARTS nor SMILES"),
        ("[C;[N]]", "neither SMARTS nor SMILES"),
        ("C\x1b[31m", "control characters"),
        ("C-Br>>C-N", "transformation"),
        ("C" * (MAX_ATOMS + 1), "atoms"),
        ("[$(" * 7 + "C" + ")]" * 7, "deep"),
        ("".join(f"[$(C{'N' * (n % 3)})]" for n in range(70)), "recursive parts"),
        ("[$(*~*~*~*~*~*~*~*~*~*)]", "too open"),
        ("[!$(*~*~*~*~*~*~*~*~*~*)]", "too open"),
        ("M  END", "molfile"),
    ],
)
def test_what_cannot_be_searched_is_refused_with_the_reason(query: str, says: str) -> None:
    with pytest.raises(QueryError) as refusal:
        parse_query(query)
    assert says in refusal.value.message
    assert refusal.value.hint
    assert "\x1b" not in str(refusal.value)


def test_two_hundred_atoms_are_answered() -> None:
    chain = "C" * 200
    assert holds(chain, chain)
    assert not holds(chain, "C" * 150)


def test_every_query_of_the_test_table_is_accepted() -> None:
    refused = [smarts for _, smarts in ALL if parse_query(smarts).mol.GetNumAtoms() == 0]
    assert refused == []


def test_interchangeable_atoms_make_a_query_loose() -> None:
    assert parse_query("*~*~*~*~*~*~*~*~*~*~*").is_loose
    assert parse_query("C" * 12).is_loose
    assert not parse_query("CC(C)(C)OC(=O)N").is_loose
    assert count_loose(parse_query("[Cl,Br]C").mol) == 1


def test_a_match_that_runs_out_of_time_says_so_instead_of_guessing() -> None:
    ring = parse_query("*1" + "~*" * 44 + "~1")  # a 45-ring in C60: seconds, were it not for the clock
    with pytest.raises(TimeoutError):
        find_match(ring, Chem.MolFromSmiles(C60), deadline_at=time.monotonic() + 0.05)


@pytest.mark.parametrize(
    ("smarts", "types"),
    [
        ("C", ((6, False),)),
        ("c", ((6, True),)),
        ("[#6]", ((6, False), (6, True))),
        ("[Cl,Br]", ((17, False), (35, False))),
        ("[#17]", ((17, False),)),
        ("[C,c;R]", ((6, False), (6, True))),
        ("[C&N]", ()),
        ("*", ()),
        ("[!C]", ()),
        ("[C,!N]", ()),
        ("[!#6;N]", ((7, False),)),
        ("[$(C)]", ()),
    ],
)
def test_types_are_read_off_and_doubt_means_any(smarts: str, types: tuple[tuple[int, bool], ...]) -> None:
    assert types_of(traits_of(Chem.MolFromSmarts(smarts).GetAtomWithIdx(0))) == types


def test_numbers_of_an_atom_are_read_off() -> None:
    trait = traits_of(Chem.MolFromSmarts("[C;H2;X4;D2;+1;r5]").GetAtomWithIdx(0))[0]
    assert (trait.hydrogens, trait.connections, trait.degree, trait.charge) == (2, 4, 2, 1)
    assert (trait.in_ring, trait.smallest_ring) == (True, 5)
    assert traits_of(Chem.MolFromSmarts("[!H2;!R]").GetAtomWithIdx(0))[0].hydrogens is None
    assert traits_of(Chem.MolFromSmarts("[D{2-3}]").GetAtomWithIdx(0)) == (ANY,)


@pytest.mark.parametrize(
    ("smarts", "orders", "in_ring"),
    [
        ("CC", {1, 4}, None),
        ("C-C", {1}, None),
        ("C=C", {2}, None),
        ("c:c", {4}, None),
        ("C~C", None, None),
        ("C@C", None, True),
        ("C!@C", None, False),
        ("C-;!@C", {1}, False),
        ("C-,=C", {1, 2}, None),
        ("C!-C", None, None),
    ],
)
def test_bonds_are_read_off_and_doubt_means_any(
    smarts: str, orders: set[int] | None, in_ring: bool | None
) -> None:
    said = bond_trait(Chem.MolFromSmarts(smarts).GetBondWithIdx(0))
    assert said.orders == orders
    assert said.in_ring is in_ring

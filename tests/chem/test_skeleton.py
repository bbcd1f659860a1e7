"""The balance of atoms: sums are conserved, and the skeleton match agrees with RDKit's canonical text."""

from __future__ import annotations

import random

from hypothesis import given
from hypothesis import strategies as st
from rdkit import Chem

from kb.chem.molgraph import Molgraph, molgraph_of
from kb.chem.skeleton import Cut, Edit, Pool, target_of
from kb.chem.structure import canonical_smiles

MOLECULES = [
    "CCBr", "CC(C)Br", "CCCBr", "c1ccccc1CBr", "C1CCCCC1Br", "CC1CCCC1Br", "CCOC(=O)CBr", "NCCc1ccccc1",
    "O=c1cccc[nH]1", "Oc1ccccn1", "CC(=O)CC(C)=O", "CC(O)=CC(C)=O", "C1CC2CCC1C2", "C1CCC2CC2C1",
    "CC(C)(C)OC(=O)NCC", "CCN(C)C(=O)OC", "c1ccc2ccccc2c1", "C1=CC2=CC=CC2=C1", "N#CCCC#N", "C1CC1CC1CC1",
    "C1CCC1C1CCC1", "CC(C)CC(C)C", "CCC(C)C(C)C",
]  # fmt: skip


def bare_text(smiles: str) -> str:
    """Return RDKit's canonical text of the bare skeleton: elements and single bonds only."""
    mol = Chem.RWMol(Chem.MolFromSmiles(smiles))
    Chem.Kekulize(mol, clearAromaticFlags=True)
    for atom in mol.GetAtoms():
        atom.SetFormalCharge(0)
        atom.SetNumExplicitHs(0)
        atom.SetNoImplicit(True)
        atom.SetChiralTag(Chem.ChiralType.CHI_UNSPECIFIED)
    for bond in mol.GetBonds():
        bond.SetBondType(Chem.BondType.SINGLE)
        bond.SetStereo(Chem.BondStereo.STEREONONE)
    return str(Chem.MolToSmiles(mol))


def test_two_skeletons_have_one_hash_exactly_when_rdkit_writes_one_text() -> None:
    for first in MOLECULES:
        for second in MOLECULES:
            same = bare_text(first) == bare_text(second)
            hashes = [target_of(molgraph_of(canonical_smiles(s))).whole for s in (first, second)]
            assert (hashes[0] == hashes[1]) == same, (first, second)


def test_tautomers_salts_and_resonance_forms_share_skeleton_and_balance() -> None:
    for first, second in [
        ("O=c1cccc[nH]1", "Oc1ccccn1"),
        ("CC(=O)CC(C)=O", "CC(O)=CC(C)=O"),
        ("CCN", "CC[NH3+]"),
        ("CC(=O)O", "CC(=O)[O-]"),
        ("CN=[N+]=[N-]", "C[N-][N+]#N"),
    ]:
        a, b = (target_of(molgraph_of(canonical_smiles(s))) for s in (first, second))
        assert (a.whole, a.tally) == (b.whole, b.tally)


def test_a_redox_pair_differs_in_balance_by_two() -> None:
    for reduced, oxidised in [("CC(C)O", "CC(C)=O"), ("CC", "C=C"), ("CCO", "CC=O")]:
        a, b = (target_of(molgraph_of(canonical_smiles(s))) for s in (reduced, oxidised))
        assert a.tally.protons - b.tally.protons == 2
        assert a.whole == b.whole


def test_a_displacement_balances_and_the_wrong_regioisomer_does_not() -> None:
    halide, azide = molgraph_of(canonical_smiles("CC(Br)CC")), molgraph_of("[N-]=[N+]=[N-]")
    pool = Pool([halide, azide])
    bromine = halide.elements.index(35)
    (carbon,) = halide.neighbours[bromine]
    cut = Cut(carbon, bromine, frozenset({bromine}), -1)
    edit = Edit((0, 1), (cut,), ((carbon, pool.starts[1]),))
    for smiles, expected in [("CC(N=[N+]=[N-])CC", True), ("CCCCN=[N+]=[N-]", False)]:
        target = target_of(molgraph_of(canonical_smiles(smiles)))
        assert pool.makes(edit, target) is expected


@given(st.sampled_from(MOLECULES), st.randoms(use_true_random=False))
def test_the_hash_does_not_depend_on_the_numbering(smiles: str, shuffler: random.Random) -> None:
    mol = Chem.MolFromSmiles(smiles)
    order = list(range(mol.GetNumAtoms()))
    shuffler.shuffle(order)
    other = Chem.RenumberAtoms(mol, order)
    assert target_of(Molgraph("", other)) == target_of(Molgraph("", mol))

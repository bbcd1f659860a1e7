"""Structural conditions of rules: bridgeheads against known ring systems, faces against three dimensions.

Source of the bridgeheads: ring nomenclature (arithmetic on the name), limits as Fawcett 1950 (memory). Source of cis
and trans: the same molecule embedded by RDKit, read off its coordinates.
"""

from __future__ import annotations

import numpy as np
import pytest
from conditions_by_hand import a_profile
from rdkit import Chem
from rdkit.Chem import AllChem

from kb.assess.liability_structure import bridging_sum, holds, parse_where
from kb.errors import QueryError


@pytest.mark.parametrize(
    ("smiles", "atom", "expected", "why"),
    [
        ("ClC12CCC(CC1)C2", 1, 5, "bicyclo[2.2.1]"),
        ("ClC12CCC(CC1)CC2", 1, 6, "bicyclo[2.2.2]"),
        ("ClC12CC(C1)C2", 1, 3, "bicyclo[1.1.1]"),
        ("ClC12CCCC(CCC1)C2", 1, 7, "bicyclo[3.3.1]"),
        ("ClC12CCCC(CCC1)CCC2", 1, 9, "bicyclo[3.3.3]: a double bond there can be made"),
        ("BrC12CC3CC(CC(C3)C1)C2", 1, 7, "adamantane, smallest bicycle [3.3.1]"),
        ("ClC12CCCCC1CCCC2", 1, None, "decalin: fused"),
        ("ClC1CC2CCC1C2", 1, None, "norbornane, but not at its bridgehead"),
        ("C1CCC2(CC1)CCCC2", 3, None, "spiro"),
        ("CC1(Cl)CCCCC1", 1, None, "one ring"),
        ("CC(C)(C)Cl", 1, None, "no ring"),
    ],
)
def test_bridging_atoms_are_counted(smiles: str, atom: int, expected: int | None, why: str) -> None:
    assert bridging_sum(Chem.MolFromSmiles(smiles), atom) == expected, why


def hydrogen_of(full: Chem.Mol, atom: int) -> int:
    return next(n.GetIdx() for n in full.GetAtomWithIdx(atom).GetNeighbors() if n.GetAtomicNum() == 1)


RING_PAIRS = [
    "CC(C)[C@@H]1CC[C@@H](C)C[C@H]1Cl",
    "CC(C)[C@@H]1CC[C@@H](C)C[C@@H]1Cl",
    "C[C@@H]1CCCC[C@@H]1Cl",
    "C[C@@H]1CCCC[C@H]1Cl",
    "[C@H]1(Cl)CCCC[C@H]1C",
    "Cl[C@H]1CCCC[C@H]1C",
    "Cl[C@@H]1CCCC[C@H]1C",
]


@pytest.mark.parametrize("smiles", RING_PAIRS)
def test_cis_and_trans_as_drawn_are_those_of_the_embedded_molecule(smiles: str) -> None:
    mol = Chem.MolFromSmiles(smiles)
    query = Chem.MolFromSmarts("[CX4;R](-Cl)-[CX4;R]-[C;!R]")
    first, chlorine, second, outer = mol.GetSubstructMatch(query)
    full = Chem.AddHs(mol)
    assert AllChem.EmbedMolecule(full, randomSeed=7) == 0
    place = full.GetConformer().GetPositions()
    ring = next(r for r in mol.GetRingInfo().AtomRings() if first in r and second in r)
    points = place[list(ring)]
    normal = np.linalg.svd(points - points.mean(axis=0))[2][2]
    up = [
        (place[group] - place[hydrogen_of(full, centre)]) @ normal
        for centre, group in ((first, chlorine), (second, outer))
    ]
    sides = up[0] * up[1]
    where = {1: first, 2: second}
    assert holds(parse_where("1 trans 2"), mol, where, None) is bool(sides < 0)
    assert holds(parse_where("1 cis 2"), mol, where, None) is bool(sides > 0)


def test_an_undrawn_configuration_is_neither_cis_nor_trans() -> None:
    mol = Chem.MolFromSmiles("CC1CCCCC1Cl")
    for line in ("1 trans 2", "1 cis 2", "1 stereocentre"):
        assert not holds(parse_where(line), mol, {1: 6, 2: 1}, None)


@pytest.mark.parametrize(
    ("smiles", "alkyl", "alcohols", "expected"),
    [
        ("CCOC(C)=O", 1, "CCO", False),
        ("CCOC(C)=O", 1, "CO", True),
        ("CC(C)OC(C)=O", 1, "CC(C)O", False),
        ("[CH3:1][CH2:2][O:3][C:4](C)=O", 1, "CCO", False),
        ("C1CCOC1=O", 2, "CCO", True),
    ],
)
def test_an_ester_knows_its_own_alcohol(smiles: str, alkyl: int, alcohols: str, expected: bool) -> None:
    profile = a_profile(f"solvent_alkoxy={alcohols}")
    assert holds(parse_where("1 foreign alkyl"), Chem.MolFromSmiles(smiles), {1: alkyl}, profile) is expected


@pytest.mark.parametrize("line", ["", "bridgehead", "1 briddgehead", "x not bridgehead", "1"])
def test_a_structural_condition_that_cannot_be_read_is_refused(line: str) -> None:
    with pytest.raises(QueryError):
        parse_where(line)

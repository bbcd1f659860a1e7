"""Packed fingerprints agree with RDKit's own objects, the reference here, and stay within their bounds."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from rdkit import Chem, DataStructs

from kb.chem.fingerprint import (
    bits_of,
    morgan_generator,
    pack_morgan,
    tanimoto,
    tanimoto_to_each,
)
from kb.chem.screens_keys import MORGAN_BITS

SMILES = ("CCBr", "c1ccccc1CBr", "CC(C)(C)OC(=O)NCCO", "OS(=O)(=O)c1ccc(C)cc1", "C[C@H](Br)CC", "[Na+].[Cl-]")


@pytest.mark.parametrize("smiles", SMILES)
def test_packed_bits_are_the_bits_that_rdkit_sets(smiles: str) -> None:
    mol = Chem.MolFromSmiles(smiles)
    assert bits_of(pack_morgan(mol)).tolist() == list(morgan_generator().GetFingerprint(mol).GetOnBits())
    assert len(pack_morgan(mol)) == MORGAN_BITS // 8


def test_tanimoto_is_that_of_rdkit_for_every_pair() -> None:
    mols = [Chem.MolFromSmiles(s) for s in SMILES]
    for one in mols:
        for other in mols:
            want = DataStructs.TanimotoSimilarity(
                morgan_generator().GetFingerprint(one), morgan_generator().GetFingerprint(other)
            )
            assert tanimoto(pack_morgan(one), pack_morgan(other)) == pytest.approx(want)


def test_one_against_many_is_one_against_each(monkeypatch: pytest.MonkeyPatch) -> None:
    packed = [pack_morgan(Chem.MolFromSmiles(s)) for s in SMILES] + [bytes(MORGAN_BITS // 8)]
    want = [tanimoto(packed[0], other) for other in packed]
    assert tanimoto_to_each(packed[0], b"".join(packed)).tolist() == pytest.approx(want)
    monkeypatch.delattr(np, "bitwise_count", raising=False)  # numpy before 2.0
    assert tanimoto_to_each(packed[0], b"".join(packed)).tolist() == pytest.approx(want)


def test_two_empty_fingerprints_have_nothing_in_common() -> None:
    assert tanimoto(bytes(8), bytes(8)) == 0.0


def test_fingerprints_of_different_lengths_are_refused() -> None:
    with pytest.raises(ValueError, match="8 and 16"):
        tanimoto(bytes(8), bytes(16))


@given(one=st.binary(min_size=16, max_size=16), other=st.binary(min_size=16, max_size=16))
def test_tanimoto_is_symmetric_and_within_its_bounds(one: bytes, other: bytes) -> None:
    value = tanimoto(one, other)
    assert value == tanimoto(other, one)
    assert 0.0 <= value <= 1.0
    few, many = sorted((len(bits_of(one)), len(bits_of(other))))
    assert value <= few / many if many else value == 0.0

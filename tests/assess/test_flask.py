"""Likeness of flasks by structure. Which reagents are nearer is common practice; no digit is pinned."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from kb.assess.flask import ONE_EMPTY, Flasks

DBU, MTBD, BTPP = "C1CCC2=NCCCN2CC1", "CN1CCCN2CCCN=C12", "CC(C)(C)N=P(N1CCCC1)(N1CCCC1)N1CCCC1"
ARYL_CL, ARYL_NO2 = "O=S(=O)(F)c1ccc(Cl)cc1", "O=[N+]([O-])c1ccc(S(=O)(=O)F)cc1"
PERFLUORO = "O=S(=O)(F)C(F)(F)C(F)(F)C(F)(F)C(F)(F)F"
SETS = st.lists(st.frozensets(st.sampled_from([DBU, MTBD, ARYL_CL, PERFLUORO, "kryptofix", "[H-]"])), min_size=1)


def likeness(one: set[str], *others: set[str]) -> np.ndarray:
    return Flasks([frozenset(o) for o in others]).likeness_to(one)


@pytest.mark.parametrize(
    ("mine", "nearer", "farther", "why"),
    [
        ({ARYL_CL}, {ARYL_NO2}, {PERFLUORO}, "two aryl sulfonyl fluorides against a perfluoroalkyl one"),
        ({DBU}, {MTBD}, {BTPP}, "amidine and guanidine against a phosphazene"),
        ({DBU, ARYL_CL}, {DBU, ARYL_NO2}, {BTPP, ARYL_NO2}, "one reagent changed against two"),
    ],
)
def test_a_chemist_would_call_the_first_nearer(mine: set[str], nearer: set[str], farther: set[str], why: str) -> None:
    first, second = likeness(mine, nearer, farther)
    assert 1 > first > second, why


def test_the_same_flask_is_wholly_alike_whatever_stands_beside_it() -> None:
    assert likeness({DBU, ARYL_CL}, {ARYL_CL, DBU}, {DBU})[0] == pytest.approx(1)


def test_a_reagent_without_structure_is_like_itself_only() -> None:
    same, other = likeness({"kryptofix"}, {"kryptofix"}, {DBU})
    assert same == pytest.approx(1)
    assert other == 0


def test_an_empty_flask_is_neither_alike_nor_different() -> None:
    assert likeness(set(), set(), {DBU}).tolist() == [1.0, ONE_EMPTY]
    assert likeness({DBU}, set(), {DBU}).tolist() == [ONE_EMPTY, 1.0]
    assert likeness({DBU}, set()).tolist() == [ONE_EMPTY]


@given(SETS)
def test_likeness_is_symmetric_and_bounded_and_does_not_hang_on_company(sets: list[frozenset[str]]) -> None:
    together = np.array([Flasks(sets).likeness_to(one) for one in sets])
    assert np.allclose(together, together.T)
    assert ((together >= 0) & (together <= 1 + 1e-9)).all()
    alone = [float(Flasks([other]).likeness_to(sets[0])[0]) for other in sets]
    assert np.allclose(together[0], alone)


def test_likeness_of_single_reagents_is_that_of_rdkit() -> None:
    """Reference: RDKit's TanimotoSimilarity of Morgan counts, radius 2."""
    from rdkit import Chem, DataStructs
    from rdkit.Chem import rdFingerprintGenerator

    print_of = rdFingerprintGenerator.GetMorganGenerator(radius=2).GetCountFingerprint
    names = ["CCO", "CC(C)(C)[O-]", "C1CCNCC1", "OC(=O)c1ccccc1", "[C-]#N", "CCN(CC)CC"]
    for mine in ("CCCO", "CC(C)(C)[O-]", "Nc1ccccc1", "CCN(CC)C(C)C"):
        own = print_of(Chem.MolFromSmiles(mine))
        expected = [DataStructs.TanimotoSimilarity(own, print_of(Chem.MolFromSmiles(name))) for name in names]
        assert Flasks([frozenset({name}) for name in names]).likeness_to([mine]).tolist() == pytest.approx(expected)

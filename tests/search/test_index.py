"""The structure index answers as brute force does: substructures, similarity, identity, deadlines, stale blobs."""

from __future__ import annotations

import numpy as np
import pytest
from rdkit import Chem, DataStructs

from kb.chem.fingerprint import morgan_generator
from kb.chem.query import parse_query
from kb.chem.screens import encode_structure
from kb.errors import IndexStale
from kb.search.index import StructureIndex
from kb.search.matching import Deadline
from tests.search.queries import ALL
from tests.search.structures import an_index, molecules, smiles


@pytest.mark.parametrize("step", range(6))
def test_substructures_are_those_of_brute_force(step: int) -> None:
    for _, smarts in ALL[step::60]:
        query = parse_query(smarts)
        want = [
            n
            for n, mol in enumerate(molecules())
            if mol.HasSubstructMatch(query.mol, useChirality=query.uses_stereo)
        ]
        matched = an_index().substructure(query)
        assert matched.rows.tolist() == want, smarts
        assert matched.complete


def test_only_the_rows_asked_for_are_compared() -> None:
    query = parse_query("c1ccccc1")
    everywhere = an_index().substructure(query).rows
    only = np.zeros(len(an_index()), bool)
    only[everywhere[::3]] = True
    assert an_index().substructure(query, only=only).rows.tolist() == everywhere[::3].tolist()


@pytest.mark.parametrize("asked", ["CCOC(=O)CBr", "c1ccc2[nH]ccc2c1", "CC(C)(C)OC(=O)NCCO", "[Na+].[Cl-]"])
def test_similarity_is_that_of_rdkit_best_first(asked: str) -> None:
    mol = Chem.MolFromSmiles(asked)
    query = morgan_generator().GetFingerprint(mol)
    scores = np.array(
        DataStructs.BulkTanimotoSimilarity(query, [morgan_generator().GetFingerprint(m) for m in molecules()])
    )
    order = np.lexsort((np.arange(len(scores)), -scores.astype(np.float32)))
    top = an_index().similar(mol, limit=50)
    want = [n for n in order if scores[n] > 0][:50]
    assert top.rows.tolist() == want
    assert top.scores == pytest.approx(scores[want], abs=1e-6)
    enough = an_index().similar(mol, limit=None, at_least=0.3)
    assert sorted(enough.rows.tolist()) == np.flatnonzero(scores >= 0.3 - 1e-6).tolist()


def test_similarity_can_be_narrowed_to_some_rows() -> None:
    only = np.zeros(len(an_index()), bool)
    only[:200] = True
    found = an_index().similar(Chem.MolFromSmiles("CCOC(=O)CBr"), limit=20, only=only)
    assert len(found.rows)
    assert (found.rows < 200).all()


def test_identity_tells_enantiomers_isotopes_and_salts_apart() -> None:
    index = StructureIndex(threads=1)
    texts = ["C[C@H](Br)CC", "C[C@@H](Br)CC", "CC(Br)CC", "C[C@H](Br)C[13CH3]", "CCBr.[Na+]", "CCBr"]
    index.append_smiles(range(1, 7), texts)

    def found(text: str, with_stereo: bool) -> list[int]:
        return index.ids[index.exact(Chem.MolFromSmiles(text), with_stereo=with_stereo)].tolist()

    written_anew = Chem.MolToRandomSmilesVect(Chem.MolFromSmiles(texts[0]), 5, randomSeed=7)
    assert all(found(text, True) == [1] for text in written_anew)
    assert all(found(text, False) == [1, 2, 3] for text in written_anew)
    assert found("CCC(C)Br", True) == [3]
    assert found("CCBr", True) == [6]
    assert found("[CH3:7]CBr", True) == [6]


def test_ids_lead_to_rows_in_any_order() -> None:
    index = StructureIndex(threads=1)
    index.append_smiles([5, 9], ["CCBr", "CCCl"])
    index.append_smiles([7], ["CCI"])
    assert index.rows_of_ids(np.array([7, 5, 8, 9])).tolist() == [2, 0, -1, 1]
    assert index.substructure(parse_query("CI")).rows.tolist() == [2]


def test_structures_added_later_are_found_with_those_before() -> None:
    index = StructureIndex(threads=1)
    for start in range(0, 300, 7):
        index.append_smiles(range(start, min(start + 7, 300)), smiles()[start : min(start + 7, 300)])
    query = parse_query("c1ccccc1")
    want = [n for n in range(300) if molecules()[n].HasSubstructMatch(query.mol)]
    assert index.substructure(query).rows.tolist() == want


def test_an_empty_index_answers_nothing() -> None:
    index = StructureIndex(threads=1)
    assert index.substructure(parse_query("C")).rows.tolist() == []
    assert index.similar(Chem.MolFromSmiles("CCBr")).rows.tolist() == []
    assert index.exact(Chem.MolFromSmiles("CCBr")).tolist() == []
    assert index.rows_of_ids(np.array([1])).tolist() == [-1]


def test_two_threads_find_what_one_finds() -> None:
    index = StructureIndex(threads=2)
    index.append_smiles(range(len(smiles())), smiles())
    for smarts in ("c1ccccc1", "[CX4][Cl,Br,I]", "*"):
        query = parse_query(smarts)
        assert index.substructure(query).rows.tolist() == an_index().substructure(query).rows.tolist()


def test_a_passed_deadline_gives_no_wrong_rows_and_says_that_it_is_partial() -> None:
    matched = an_index().substructure(parse_query("c1ccccc1"), deadline=Deadline(0.0))
    assert not matched.complete
    assert matched.rows.tolist() == []


def test_a_catastrophic_query_stops_inside_one_molecule_and_says_so(monkeypatch: pytest.MonkeyPatch) -> None:
    """A 45-ring of anything in C60 would search for minutes; the rest is still answered."""
    monkeypatch.setattr("kb.search.matching.SLOW_MATCH_S", 0.05)
    ring = parse_query("*1" + "~*" * 44 + "~1")
    matched = an_index().substructure(ring)
    assert not matched.complete


def test_work_is_reported_and_can_be_stopped_between_chunks() -> None:
    told: list[tuple[int, int | None]] = []

    class StopsAfterOne:
        def advance(self, done: int, total: int | None, note: str = "") -> None:
            told.append((done, total))

        def cancelled(self) -> bool:
            return bool(told)

    matched = an_index().substructure(parse_query("*"), deadline=Deadline(None, StopsAfterOne()))
    assert told == [(0, len(an_index()))]
    assert not matched.complete
    assert 0 < len(matched.rows) < len(an_index())


def test_blobs_of_another_width_or_revision_are_refused() -> None:
    blobs = encode_structure("CCBr")
    index = StructureIndex(threads=1)
    with pytest.raises(IndexStale):
        index.append([1], [blobs.mol_binary], [blobs.augmented[:-8]], [blobs.morgan])
    other = blobs.augmented[:1] + bytes([blobs.augmented[1] + 1]) + blobs.augmented[2:]
    with pytest.raises(IndexStale):
        index.append([1], [blobs.mol_binary], [other], [blobs.morgan])
    assert len(index) == 0


def test_memory_beyond_the_molecules_is_below_what_was_promised() -> None:
    """900 bytes a structure is the promise for large books; small ones hold part of a block."""
    index = StructureIndex(threads=1, reserve=3 * 4096)
    n = 3 * 4096
    blobs = encode_structure("CCBr")
    index.append(range(n), [blobs.mol_binary] * n, [blobs.augmented] * n, [blobs.morgan] * n)
    tails = 4096 * (4096 + 2048) // 8
    assert (index.nbytes - tails) / n <= 900

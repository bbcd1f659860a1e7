"""Finding runs: every criterion alone and together, against a book of eight runs whose answers are known by hand."""

from __future__ import annotations

import datetime as dt
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from rdkit import Chem

from kb.chem.fingerprint import pack_morgan, tanimoto
from kb.errors import IndexStale, InvalidRecord, QueryError
from kb.search.criteria import Criteria, Order
from kb.search.finder import Finder
from kb.store.store import Store
from kb.vocabulary import CarbonClass, LeavingGroup, Role, Verdict
from tests.search.books import CHEMISTRY, ROWS, a_run_of, a_searchable_book


@pytest.fixture(scope="module")
def finder(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Finder]:
    with a_searchable_book(tmp_path_factory.mktemp("book")) as store:
        yield Finder(store, threads=1)


def found(finder: Finder, **criteria: Any) -> list[int]:
    """Return the numbers of the runs found, ascending."""
    return sorted(int(i.run[2:]) for i in finder.find(Criteria(limit=100, **criteria)).items)


@pytest.mark.parametrize(
    ("criteria", "expected", "why"),
    [
        ({}, [1, 2, 3, 4, 5, 6, 7, 8], "nothing asked: all that stand"),
        ({"substructure": "CBr"}, [1, 2, 3, 4, 6, 7], "any structure of the run"),
        ({"substructure": "CBr", "role": Role.PRODUCT}, [6], "only where the bromide survived"),
        ({"substructure": "[N-]=[N+]=[N-]", "role": Role.REAGENT}, [1, 2, 6], "the azide ion"),
        ({"substructure": "CC(C)(C)OC(=O)N", "role": Role.SUBSTRATE}, [4, 8], "tertiary carbamate"),
        ({"substructure": "C[C@H](Br)CC"}, [7], "stereo counts when it is drawn"),
        ({"substructure": "C[C@H](Br)CC", "ignore_stereo": True}, [2, 3, 7], "and can be left out"),
        ({"exact": "CCC(C)Br"}, [2, 3], "exact, racemate as drawn"),
        ({"exact": "C[C@H](Br)CC"}, [7], "exact, one enantiomer"),
        ({"exact": "C[C@@H](Br)CC"}, [], "exact, the other one"),
        ({"exact": "C[C@@H](Br)CC", "ignore_stereo": True}, [2, 3, 7], "exact but for stereo"),
        ({"exact": "Oc1ccccc1", "role": Role.SUBSTRATE}, [], "phenol was the nucleophile"),
        ({"exact": "[CH3:5]CC(C)Br"}, [2, 3], "maps and order of atoms do not matter"),
        ({"at_centre": "[CH2:1][Br]"}, [1, 4], "bromide at the centre, not elsewhere"),
        ({"at_centre": "[CH2:1]Cl"}, [6], "the chloride reacted"),
        ({"at_centre": "[CX4]c"}, [5], "the first atom is the root where none is marked"),
        ({"transformation": "C-Br>>C-N"}, [1, 2], "run 6 kept its bromide and made C-N elsewhere"),
        ({"transformation": "[C:1]-[Cl,Br]>>[C:1]-N"}, [1, 2, 6], "a list on the left"),
        ({"transformation": "C-Br>>C=C"}, [3], "elimination"),
        ({"transformation": "C-Br>>C-O"}, [4], "ether formation"),
        ({"transformation": "C-O>>C-O"}, [5], "the mesylate gave the acetate"),
        ({"transformation": "C-Br>>"}, [1, 2, 3, 4, 7], "an empty right side"),
        ({"transformation": ">>[C:1]-S"}, [7], "an empty left side"),
        ({"words": "emulsion"}, [2, 4], "a word begins a word of the note"),
        ({"words": '"emulsion at"'}, [2], "quotes hold words together"),
        ({"words": "emulsion slow"}, [4], "each word must occur"),
        ({"words": "DMSO"}, [2], "materials are words too"),
        ({"words": "emulshion"}, [2, 4], "a misspelt word is bent"),
        ({"words": "<b>gone</b>"}, [8], "markup is only text"),
        ({"solvent": "DMF"}, [1, 4, 5, 7], "by synonym"),
        ({"solvent": "thf"}, [6], "case does not matter"),
        ({"base": "K2CO3"}, [4], "base"),
        ({"base": "potassium tert-butoxide"}, [3], "base by another name"),
        ({"temp_from_c": 60}, [1, 3, 4], "from, included"),
        ({"temp_to_c": 22}, [5, 7, 8], "to, included; unknown temperature is left out"),
        ({"temp_from_c": 30, "temp_to_c": 70}, [1, 2], "between"),
        ({"failed": "elimination"}, [3], "failure mode"),
        ({"failed": "group loss"}, [8], "failure mode as people type it"),
        ({"verdict": Verdict.FAILED}, [3], "verdict"),
        ({"carbon_class": CarbonClass.SECONDARY}, [2, 3, 7], "carbon class"),
        ({"leaving_group": LeavingGroup.MESYLATE}, [5], "leaving group"),
        ({"since": dt.date(2025, 1, 4)}, [4, 5, 7, 8], "since; undated runs are left out"),
        ({"until": dt.date(2025, 1, 2)}, [1, 2], "until"),
        ({"project": "Azides"}, [1, 2, 6], "project, case apart"),
        ({"substructure": "CBr", "solvent": "DMF", "words": "emulsion"}, [4], "structure, condition and words"),
        ({"any_of": (Criteria(solvent="THF"), Criteria(words="alkene"))}, [3, 6], "or"),
        ({"solvent": "DMF", "none_of": (Criteria(substructure="c"),)}, [1], "and not"),
        (
            {"all_of": (Criteria(substructure="CBr"), Criteria(substructure="c", role=Role.PRODUCT))},
            [4, 7],
            "two structures",
        ),
    ],
)
def test_criteria_find_the_runs_that_fit(
    finder: Finder, criteria: dict[str, Any], expected: list[int], why: str
) -> None:
    assert found(finder, **criteria) == expected, why


def test_similarity_is_that_of_the_best_structure_and_sorts_the_answer(finder: Finder) -> None:
    asked = "CCC(C)Br"
    result = finder.find(Criteria(similar=asked, at_least=0.2, limit=100))
    query = pack_morgan(Chem.MolFromSmiles(asked))
    want = {}
    for number, row in enumerate(ROWS, start=1):
        mols = [Chem.MolFromSmiles(s) for side in row["scheme"].split(">>") for s in side.split(".")]
        want[f"R-{number:04d}"] = max(tanimoto(query, pack_morgan(mol)) for mol in mols)
    assert {i.run: i.score for i in result.items} == {
        run: pytest.approx(score, abs=1e-4) for run, score in want.items() if score >= 0.2
    }
    scores = [i.score for i in result.items]
    assert scores == sorted(scores, reverse=True)
    assert result.items[0].score == 1.0


def test_matched_atoms_are_the_atoms_of_the_component_shown(finder: Finder) -> None:
    for criteria in (
        Criteria(substructure="[CX4]Br", role=Role.SUBSTRATE),
        Criteria(at_centre="[C:1]Br"),
        Criteria(transformation="C-Br>>"),
    ):
        for item in finder.find(criteria).items:
            assert item.matched is not None
            mol = Chem.MolFromSmiles(item.matched.smiles)
            assert [mol.GetAtomWithIdx(a).GetSymbol() for a in item.matched.atoms] == ["C", "Br"]
            assert item.matched.role == "substrate"
            left = ROWS[int(item.run[2:]) - 1]["scheme"].split(">>")[0].split(".")
            drawn = Chem.MolFromSmiles(left[item.matched.component])
            assert drawn.GetNumAtoms() == mol.GetNumAtoms()


def test_pages_join_to_the_whole_answer(finder: Finder) -> None:
    whole = [i.run for i in finder.find(Criteria(limit=100)).items]
    pages = [finder.find(Criteria(limit=3, page=n)) for n in (1, 2, 3, 4)]
    assert [i.run for p in pages for i in p.items] == whole
    assert [len(p.items) for p in pages] == [3, 3, 2, 0]
    assert {p.total for p in pages} == {8}


def test_answers_are_sorted_as_asked(finder: Finder) -> None:
    def runs(order: Order) -> list[int]:
        return [int(i.run[2:]) for i in finder.find(Criteria(order=order)).items]

    assert runs(Order.NEWEST) == [8, 7, 5, 4, 3, 2, 1, 6]
    assert runs(Order.OLDEST) == [1, 2, 3, 4, 5, 7, 8, 6]
    assert runs(Order.CODE) == [1, 2, 3, 4, 5, 6, 7, 8]
    assert runs(Order.BEST) == runs(Order.NEWEST)


def test_what_was_bent_or_is_unknown_is_said(finder: Finder) -> None:
    assert "emulsion" in finder.find(Criteria(words="emulshion")).notes[0]
    assert "nowhere" in finder.find(Criteria(words="xylophone")).notes[0]
    unknown = finder.find(Criteria(solvent="DMFF"))
    assert unknown.total == 0
    assert "No run names a solvent" in unknown.notes[0]
    assert finder.find(Criteria(solvent="DMF")).notes == ()


@pytest.mark.parametrize(
    ("criteria", "error"),
    [
        ({"substructure": "C1CC"}, QueryError),
        ({"exact": "C1CC"}, QueryError),
        ({"similar": ""}, QueryError),
        ({"transformation": "C-Br"}, QueryError),
        ({"transformation": "CC>>CC-N"}, QueryError),
        ({"words": "???"}, QueryError),
        ({"failed": "bad luck"}, InvalidRecord),
    ],
)
def test_what_cannot_be_searched_is_refused(
    finder: Finder, criteria: dict[str, Any], error: type[Exception]
) -> None:
    with pytest.raises(error):
        finder.find(Criteria(**criteria))


def test_the_json_has_the_keys_of_the_contract(finder: Finder) -> None:
    answer = finder.find(Criteria(substructure="CBr", limit=1)).as_dict()
    assert {"total", "page", "items", "elapsed_ms"} <= answer.keys()
    assert {"run", "score", "matched"} == answer["items"][0].keys()
    assert {"component", "atoms"} <= answer["items"][0]["matched"].keys()


def test_a_passed_deadline_gives_a_partial_answer_that_says_so(finder: Finder) -> None:
    result = finder.find(Criteria(substructure="CBr"), deadline_s=0.0)
    assert not result.complete
    assert result.total == 0
    assert "deadline" in result.notes[-1]
    negated = finder.find(Criteria(none_of=(Criteria(substructure="CBr"),)), deadline_s=0.0)
    assert not negated.complete
    assert negated.total == 0, "an undecided negation must not claim runs"


def test_a_user_who_stops_gets_what_was_found(finder: Finder) -> None:
    class Stopped:
        def advance(self, done: int, total: int | None, note: str = "") -> None:
            pass

        def cancelled(self) -> bool:
            return True

    result = finder.find(Criteria(substructure="CBr"), progress=Stopped())
    assert not result.complete
    assert "stopped" in result.notes[-1]


def test_changes_by_another_are_followed(tmp_path: Path) -> None:
    with a_searchable_book(tmp_path) as mine:
        finder = Finder(mine, threads=1)
        assert found(finder, substructure="[Sn]") == []
        assert found(finder, substructure="CBr", role=Role.PRODUCT) == [6]
        with Store.open(tmp_path / "book.sidepath", **CHEMISTRY) as theirs:
            theirs.add(replace(a_run_of(ROWS[0]), scheme="CC[CH2:1][Sn](C)(C)C>>CC[CH2:1]I", note="tin"), "ZZ")
            theirs.withdraw("R-0006", "wrong bottle", "ZZ")
            theirs.amend("R-0001", {"note": "not so clean", "verdict": Verdict.PARTLY}, "ZZ", "looked again")
        assert found(finder, substructure="[Sn]") == [9]
        assert found(finder, words="tin") == [9]
        assert found(finder, substructure="CBr", role=Role.PRODUCT) == []
        assert found(finder, verdict=Verdict.PARTLY) == [1, 2]
        assert finder.find(Criteria()).total == 8


def test_an_amended_scheme_is_found_by_its_new_structure_only(tmp_path: Path) -> None:
    with a_searchable_book(tmp_path) as store:
        finder = Finder(store, threads=1)
        assert 1 in found(finder, substructure="CC(C)CCBr")
        store.amend("R-0001", {"scheme": "CC(C)C[CH2:1]I>>CC(C)C[CH2:1]O"}, "MK", "it was the iodide")
        assert 1 not in found(finder, substructure="CC(C)CCBr")
        assert found(finder, substructure="CI") == [1]


def test_structures_of_another_recipe_are_refused_not_searched(tmp_path: Path) -> None:
    with a_searchable_book(tmp_path):
        pass
    with Store.open(tmp_path / "book.sidepath", **{**CHEMISTRY, "recipe": "another"}) as store:
        with pytest.raises(IndexStale):
            Finder(store).find(Criteria(substructure="CBr"))
        for asked in ({"carbon_class": CarbonClass.PRIMARY}, {"temp_from_c": 20}, {"transformation": "C-Br>>C-N"}):
            with pytest.raises(IndexStale):
                Finder(store).find(Criteria(**asked))  # type: ignore[arg-type]
        assert Finder(store).find(Criteria(words="emulsion")).total == 2, "words need no screens"


def test_motifs_of_the_left_side_are_found_by_code(finder: Finder) -> None:
    assert finder.runs_with_motif("[N-]=[N+]=[N-]") == {"R-0001", "R-0002", "R-0006"}
    assert finder.runs_with_motif("N=[N+]=[N-]", Role.PRODUCT) == {"R-0001", "R-0002", "R-0006"}
    assert finder.runs_with_motif("c", Role.SUBSTRATE) == {"R-0005"}


def test_motifs_are_the_same_with_and_without_the_index(tmp_path: Path) -> None:
    motifs = ("c", "[CX4]Br", "CC(C)(C)OC(=O)N", "[N-]", "[Sn]", "*")
    with a_searchable_book(tmp_path) as store:
        loaded = Finder(store, threads=1)
        loaded.find(Criteria(substructure="C"))
        fresh = Finder(store, threads=1)
        assert loaded.live.has_index
        for motif in motifs:
            assert fresh.runs_with_motif(motif) == loaded.runs_with_motif(motif), motif
        assert not fresh.live.has_index
        store.add(replace(a_run_of(ROWS[0]), scheme="CC[CH2:1][Sn](C)(C)C>>CC[CH2:1]I"), "ZZ")
        store.withdraw("R-0004", "wrong bottle", "ZZ")
        assert fresh.runs_with_motif("[Sn]") == loaded.runs_with_motif("[Sn]") == {"R-0009"}
        assert fresh.runs_with_motif("CC(C)(C)OC(=O)N") == {"R-0008"}


def test_the_similarity_of_substrates_comes_in_the_order_of_the_codes(finder: Finder) -> None:
    codes = ["R-0003", "R-0001", "R-9999"]
    values = finder.tanimoto_of_runs("CCC(C)Br", codes)
    assert values is not None
    assert values[0] == 1.0
    assert 0 < values[1] < 1
    assert values[2] != values[2], "not a number for a code that is not there"
    assert finder.tanimoto_of_runs(None, codes) is None


def test_the_similarity_of_substrates_follows_the_book(finder: Finder) -> None:
    codes = ("R-0003", "R-0001")
    first = finder.tanimoto_of_runs("CCC(C)Br", codes)
    finder.store.withdraw("R-0003", "wrong bottle", "ZZ")
    second = finder.tanimoto_of_runs("CCC(C)Br", codes)
    assert first is not None and second is not None
    assert first[0] == 1.0
    assert second[0] != second[0], "a withdrawn run no longer speaks"
    assert second[1] == first[1]

"""Derived facts, structures and places: written with the run, loaded by column, rebuilt when the recipe changes."""

from __future__ import annotations

import hashlib
from collections.abc import Iterable
from typing import Any

import numpy as np
import pytest

from kb.errors import IndexStale, StoreError, StructureError
from kb.record.derived import DerivedFacts
from kb.record.outcome import Outcome, ProductSeen
from kb.record.run import Run
from kb.store.checking import verify
from kb.store.store import Store
from kb.vocabulary import Fate
from tests.engines import Books
from tests.factories import CHEMISTRY, a_book, a_run, stand_in_derive, stand_in_encode


def test_columns_hold_every_standing_run_with_its_facts(books: Books) -> None:
    with a_book(books, **CHEMISTRY) as store:
        kept = [store.add(a_run(scheme=f"C{'C' * n}Br>>C{'C' * n}O"), "MK") for n in range(4)]
        store.withdraw("2", "wrong flask", "MK")
        columns = store.derived_columns()
        standing = [kept[0], kept[2], kept[3]]
        facts = [stand_in_derive(run) for run in standing]
        assert list(columns["code"]) == [run.code for run in standing]
        assert list(columns["run_id"]) == [run.run_id for run in standing]
        assert list(columns["substrate"]) == [f.substrate for f in facts]
        assert columns["beta_hydrogens"].tolist() == [f.beta_hydrogens for f in facts]
        assert columns["temperature_c"].tolist() == [60.0] * 3
        assert np.isnan(columns["base_pkah"]).all()
        assert columns["protic"].tolist() == [-1, -1, -1]
        assert columns["isolated_yield_pct"].tolist() == [81.0] * 3
        assert columns["centre_bits"].dtype == np.uint64 and columns["centre_bits"].shape == (3, 4)
        assert columns["centre_bits"].tobytes() == b"".join(f.centre_bits or b"" for f in facts)
        assert columns["date_ordinal"].tolist() == [run.date.toordinal() for run in standing if run.date]
        assert {len(column) for column in columns.values()} == {3}


def test_shares_are_summed_by_fate_and_missing_ones_are_not_zero(books: Books) -> None:
    with a_book(books, **CHEMISTRY) as store:
        products = (
            ProductSeen(fate=Fate.ELIMINATION, share=0.25),
            ProductSeen(fate=Fate.ELIMINATION, share=0.25),
            ProductSeen(fate=Fate.UNREACTED, share=0.0),
            ProductSeen(fate=Fate.OTHER),
        )
        store.add(a_run(outcome=Outcome()), "MK")
        store.add(a_run(outcome=Outcome(products=products)), "MK")
        store.add(a_run(outcome=Outcome(products=products[:1])), "MK")
        store.withdraw("3", "twice", "MK")
        shares = store.derived_columns()["shares"]
        place = list(Fate).index
        assert shares.shape == (2, len(Fate))
        assert np.isnan(shares[0]).all()
        assert shares[1, place(Fate.ELIMINATION)] == 0.5
        assert shares[1, place(Fate.UNREACTED)] == 0.0
        assert np.isnan(shares[1, place(Fate.OTHER)]) and np.isnan(shares[1, place(Fate.SUBSTITUTION)])


def test_an_empty_book_gives_empty_columns(books: Books) -> None:
    with a_book(books, **CHEMISTRY) as store:
        columns = store.derived_columns()
        assert {len(column) for column in columns.values()} == {0}
        assert columns["centre_bits"].shape == (0, 4) and columns["shares"].shape == (0, len(Fate))
        assert list(store.structures()) == [] and len(store.places()["run_key"]) == 0


def test_structures_are_kept_once_with_what_the_index_wants(books: Books) -> None:
    with a_book(books, **CHEMISTRY) as store:
        store.add(a_run(scheme="CCBr.O>>CCO"), "MK")
        store.add(a_run(scheme="CCBr>>CCO"), "MK")
        (batch,) = store.structures()
        assert {s.smiles for s in batch} == {"CCBr", "O", "CCO"}
        for structure in batch:
            assert structure.augmented == stand_in_encode(structure.smiles).augmented
        places = store.places()
        smiles = {s.structure_id: s.smiles for s in batch}
        names = store.names()
        found = {
            (names[int(k)][1], str(r), int(p), smiles[int(s)])
            for k, r, p, s in zip(*(places[c] for c in ("run_key", "role", "position", "structure_id")), strict=True)
        }
        assert found == {
            ("R-0001", "substrate", 0, "CCBr"),
            ("R-0001", "reagent", 1, "O"),
            ("R-0001", "product", 0, "CCO"),
            ("R-0002", "substrate", 0, "CCBr"),
            ("R-0002", "product", 0, "CCO"),
        }
        last = max(s.structure_id for s in batch)
        store.add(a_run(scheme="CCI>>CCO"), "MK")
        assert [[s.smiles for s in more] for more in store.structures(after=last)] == [["CCI"]]


def test_batches_follow_one_another(books: Books) -> None:
    with a_book(books, **CHEMISTRY) as store:
        store.add_many([a_run(scheme=f"C{'C' * n}Br") for n in range(7)], "MK")
        ids = [[s.structure_id for s in batch] for batch in store.structures(batch=3)]
        assert [len(batch) for batch in ids] == [3, 3, 1]
        every = [one for batch in ids for one in batch]
        assert every == sorted(every)


def test_an_amendment_derives_anew(books: Books) -> None:
    with a_book(books, **CHEMISTRY) as store:
        run = store.add(a_run(scheme="CCBr>>CCO"), "MK")
        store.amend("1", {"scheme": "CCCBr>>CCCO"}, "MK", "one carbon more")
        assert list(store.derived_columns()["substrate"]) == ["CCCBr"]
        assert set(store.places([run.run_id])["position"]) == {0}
        assert len(store.places()["role"]) == 2


def test_only_missing_structures_are_encoded_and_before_the_lock(books: Books) -> None:
    encoded: list[str] = []
    with a_book(books) as watched:

        def encode(smiles: str) -> Any:
            encoded.append(smiles)
            with Store.open(books / "book.sidepath", wait_s=0.0) as other, other.book.writing():
                pass  # nobody holds the lock while chemistry is done
            return stand_in_encode(smiles)

        watched.close()
        with Store.open(books / "book.sidepath", **{**CHEMISTRY, "encode": encode}) as store:
            store.add(a_run(scheme="CCBr>>CCO"), "MK")
            store.add(a_run(scheme="CCI>>CCO"), "MK")
    assert sorted(encoded) == ["CCBr", "CCI", "CCO"]


def test_another_recipe_is_noticed_and_rebuilt(books: Books) -> None:
    def derive(run: Run) -> DerivedFacts:
        digest = hashlib.sha256(run.scheme.encode()).digest()
        return DerivedFacts(run_id=run.run_id, recipe="stand-in/2", confidence="inferred", centre_bits=digest)

    def dissect(run: Run) -> Iterable[tuple[str, int, str]]:
        return [("substrate", 0, run.scheme.lower())]

    later = {**CHEMISTRY, "derive": derive, "dissect": dissect, "recipe": "stand-in/2"}
    with a_book(books, **CHEMISTRY) as store:
        for n in range(5):
            store.add(a_run(scheme=f"{'C' * n}CBr"), "MK")
        runs = list(store.iter_runs())
    with Store.open(books / "book.sidepath", **later) as store:
        assert store.stale_count() == 5
        with pytest.raises(IndexStale):
            store.derived_columns()
        with pytest.raises(IndexStale):
            list(store.structures())
        assert {c.name for c in verify(store) if not c.ok} == {"facts", "structures"}
        assert store.rebuild(batch=2) == 5
        assert store.stale_count() == 0
        assert list(store.derived_columns()["confidence"]) == ["inferred"] * 5
        assert {s.smiles for batch in store.structures() for s in batch} == {r.scheme.lower() for r in runs}
        assert list(store.iter_runs()) == runs
        assert [c for c in verify(store, sample=None) if not c.ok] == []
        assert store.rebuild() == 0


def test_no_structure_id_is_ever_given_twice(books: Books) -> None:
    with a_book(books, **CHEMISTRY) as store:
        store.add(a_run(scheme="CCBr"), "MK")
        store.amend("1", {"scheme": "CCI"}, "MK", "typo")
        (before,) = store.structures()
        store.amend("1", {"scheme": "CCBr"}, "MK", "it was right")
        store.rebuild()
        store.add(a_run(scheme="CCCl"), "MK")
        (after,) = store.structures()
        old = {s.structure_id: s.smiles for s in before}
        assert all(old.get(s.structure_id, s.smiles) == s.smiles for s in after)


def test_runs_added_without_chemistry_are_stale_not_wrong(books: Books) -> None:
    with a_book(books) as store:
        store.add(a_run(), "MK")
        with pytest.raises(StoreError):
            store.rebuild()
    with Store.open(books / "book.sidepath", **CHEMISTRY) as store:
        with pytest.raises(IndexStale):
            store.derived_columns()
        assert store.rebuild() == 1
        assert len(store.derived_columns()["code"]) == 1


def test_a_run_whose_chemistry_cannot_be_read_is_kept_as_unresolved(books: Books) -> None:
    def refuse(_: object) -> Any:
        raise StructureError("no structure")

    broken = {"derive": refuse, "dissect": refuse, "encode": refuse, "recipe": "stand-in/1"}
    with a_book(books, **broken) as store:
        run = store.add(a_run(scheme="what was in the flask"), "MK")
        assert store.get("1") == run
        assert list(store.derived_columns()["confidence"]) == ["unresolved"]
        assert len(store.places()["role"]) == 0


def test_a_structure_that_cannot_be_encoded_has_no_blobs(books: Books) -> None:
    def encode(smiles: str) -> Any:
        if smiles == "CCO":
            raise StructureError("no structure")
        return stand_in_encode(smiles)

    with a_book(books, **{**CHEMISTRY, "encode": encode}) as store:
        store.add(a_run(scheme="CCBr>>CCO"), "MK")
        blobs = {s.smiles: s.morgan for batch in store.structures() for s in batch}
        assert blobs["CCO"] is None and blobs["CCBr"] is not None
        assert [c for c in verify(store, sample=None) if not c.ok] == []

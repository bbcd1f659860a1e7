"""Amending, withdrawing and the history of both: nothing is lost, nobody overwrites what they did not see."""

from __future__ import annotations

import datetime as dt
from dataclasses import replace

import pytest

from kb.errors import InvalidRecord, RecordConflict, RecordNotFound
from kb.quantity import Temperature
from kb.store.runs import RunFilter
from kb.store.values import Change
from tests.engines import Books
from tests.factories import START, a_book, a_run


def test_an_amendment_keeps_old_value_who_when_and_why(books: Books) -> None:
    with a_book(books) as store:
        first = store.add(a_run(note="yield read off the wrong flask"), "MK")
        amended = store.amend(
            "R-0001", {"note": "", "outcome.isolated_yield_pct": 18.0}, who="TB", why="read the balance again"
        )
        assert amended == replace(first, note="", outcome=replace(first.outcome, isolated_yield_pct=18.0), revision=2)
        assert store.get("R-0001") == amended
        added, changed = store.history("R-0001")
        assert (added.action, added.who, added.why, added.at) == ("add", "MK", "", START)
        assert (changed.action, changed.who, changed.why) == ("amend", "TB", "read the balance again")
        assert changed.at == START + dt.timedelta(minutes=1)
        assert changed.changed == (
            Change(field="note", old="yield read off the wrong flask", new=None),
            Change(field="outcome.isolated_yield_pct", old=81.0, new=18.0),
        )
        assert changed.revision == 2
        assert changed.parents == (added.entry_id,)
        assert added.after["note"] == "yield read off the wrong flask"


def test_whole_parts_can_be_replaced(books: Books) -> None:
    with a_book(books) as store:
        store.add(a_run(), "MK")
        warm = Temperature(text="40 °C", start_c=40.0, end_c=40.0)
        run = store.amend("1", {"conditions.temperature": warm, "date": None}, "MK", "looked it up")
        assert store.get("1").conditions.temperature == warm
        assert store.get("1").date is None
        edited = replace(run, conditions=replace(run.conditions, solvents=()), project="thiols")
        assert store.replace(edited, "MK", "solvent not recorded") == replace(edited, revision=3)
        assert [c.field for c in store.history("1")[-1].changed] == ["conditions.solvents", "project"]


def test_who_saw_an_older_revision_is_refused(books: Books) -> None:
    with a_book(books) as store:
        seen = store.add(a_run(), "MK")
        store.amend("1", {"note": "first"}, "TB", "typo", expected_revision=1)
        with pytest.raises(RecordConflict, match="revision 1"):
            store.amend("1", {"note": "second"}, "MK", "typo", expected_revision=1)
        with pytest.raises(RecordConflict):
            store.replace(replace(seen, note="second"), "MK", "typo")
        assert store.get("1").note == "first"
        assert len(store.history("1")) == 2


def test_a_withdrawn_run_is_left_out_but_stays(books: Books) -> None:
    with a_book(books) as store:
        store.add(a_run(), "MK")
        store.add(a_run(), "MK")
        gone = store.withdraw("1", "wrong bottle", "MK")
        assert gone.withdrawn_why == "wrong bottle"
        assert [run.code for run in store.iter_runs()] == ["R-0002"]
        assert [run.code for run in store.iter_runs(RunFilter(with_withdrawn=True))] == ["R-0001", "R-0002"]
        assert store.count() == 1
        assert store.get("1").is_withdrawn
        back = store.reinstate("1", "it was the right bottle", "TB")
        assert not back.is_withdrawn
        assert [e.action for e in store.history("1")] == ["add", "withdraw", "reinstate"]
        assert store.count() == 2


@pytest.mark.parametrize(
    ("changes", "who", "why"),
    [
        ({"note": "x"}, "MK", " "),
        ({"note": "x"}, "", "typo"),
        ({"note": "clean by NMR"}, "MK", "nothing changes"),
        ({}, "MK", "nothing changes"),
        ({"colour": "red"}, "MK", "typo"),
        ({"outcome.colour": "red"}, "MK", "typo"),
        ({"outcome.dr.x": "red"}, "MK", "typo"),
        ({"code": "R-0007"}, "MK", "typo"),
        ({"run_id": None}, "MK", "typo"),
        ({"withdrawn_why": "x"}, "MK", "typo"),
        ({"outcome.ee_pct": 120.0}, "MK", "typo"),
        ({"outcome.ee_pct": float("nan")}, "MK", "typo"),
        ({"scheme": " "}, "MK", "typo"),
        ({"note": "a\x00b"}, "MK", "typo"),
        ({"note": "x"}, "MK\x00", "typo"),
        ({"note": "x"}, "MK", "typo\ud800"),
        ({"note": 5}, "MK", "typo"),
    ],
)
def test_what_cannot_be_amended_is_refused_and_leaves_no_trace(
    books: Books, changes: dict[str, object], who: str, why: str
) -> None:
    with a_book(books) as store:
        before = store.add(a_run(), "MK")
        with pytest.raises(InvalidRecord):
            store.amend("1", changes, who, why)
        assert store.get("1") == before
        assert store.tip() == 1


def test_an_unknown_run_cannot_be_amended(books: Books) -> None:
    with a_book(books) as store, pytest.raises(RecordNotFound):
        store.amend("1", {"note": "x"}, "MK", "typo")


def test_what_changed_since_a_point_is_told(books: Books) -> None:
    with a_book(books) as store:
        one, two = store.add(a_run(), "MK"), store.add(a_run(), "MK")
        tip, changed = store.changed_since(0)
        assert (tip, set(changed)) == (2, {one.run_id, two.run_id})
        store.amend("2", {"note": "x"}, "MK", "typo")
        assert store.changed_since(tip) == (3, (two.run_id,))
        assert store.changed_since(3) == (3, ())


def test_a_change_made_meanwhile_is_built_upon(books: Books) -> None:
    """Somebody amends another field between the reading and the writing of an amendment: both stand."""
    with a_book(books) as store:
        store.add(a_run(), "MK")
        derive_calls = []

        def meddle(run: object) -> None:
            derive_calls.append(run)
            if len(derive_calls) == 1:
                with store.open(books / "book.sidepath") as other:
                    other.amend("1", {"project": "meddled"}, "TB", "meanwhile")

        import kb.store.amending as amending

        original = amending.lineage.content_of
        try:
            amending.lineage.content_of = lambda run: (meddle(run), original(run))[1]  # type: ignore[assignment]
            store.amend("1", {"note": "mine"}, "MK", "typo")
        finally:
            amending.lineage.content_of = original
        stands = store.get("1")
        assert (stands.note, stands.project, stands.revision) == ("mine", "meddled", 3)

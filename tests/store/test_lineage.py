"""What a set of history entries says a run is: worked examples, small enough to check by hand."""

from __future__ import annotations

import datetime as dt
import itertools
from typing import Any
from uuid import UUID

import pytest

from kb.errors import InvalidRecord
from kb.store import lineage
from kb.store.history import make_entry
from kb.store.values import Change, HistoryEntry
from tests.factories import START, a_run

RUN = UUID(int=7)


def entry(action: str, minute: int, *parents: HistoryEntry, revision: int = 2, **fields: Any) -> HistoryEntry:
    """Return an entry; for an addition `fields` are the content, otherwise (old, new) by field."""
    is_add = action == lineage.ADD
    return make_entry(
        run_id=RUN,
        revision=1 if is_add else revision,
        action=action,
        who="MK",
        at=START + dt.timedelta(minutes=minute),
        why="",
        changed=() if is_add else tuple(Change(field=f, old=o, new=n) for f, (o, n) in sorted(fields.items())),
        after={"code": "R-0001", "recorded_at": START.isoformat(), "scheme": "C", **fields} if is_add else {},
        parents=tuple(p.entry_id for p in parents),
        book_id=UUID(int=1),
    )


ROOT = entry("add", 0, note="a")
LEFT = entry("amend", 2, ROOT, note=("a", "left"))
RIGHT = entry("amend", 1, ROOT, note=("a", "right"))
OTHER = entry("amend", 1, ROOT, project=(None, "p"))


def note_of(*entries: HistoryEntry) -> Any:
    return lineage.replay(entries)[0].get("note")


def test_a_line_of_changes_is_replayed_in_order() -> None:
    later = entry("amend", -5, LEFT, note=("left", "last"))  # the clock was set back: parents decide, not moments
    for order in itertools.permutations([ROOT, LEFT, later]):
        assert note_of(*order) == "last"
        assert lineage.replay(order)[1] == 3
        assert lineage.disputes(order) == {}
        assert lineage.heads_of(order) == (later.entry_id,)


def test_of_two_unknowing_changes_the_later_stands_and_both_are_shown() -> None:
    for order in itertools.permutations([ROOT, LEFT, RIGHT, OTHER]):
        assert note_of(*order) == "left"
        content, revision = lineage.replay(order)
        assert (content["project"], revision) == ("p", 4)
        assert {f: [c.value for c in claims] for f, claims in lineage.disputes(order).items()} == {
            "note": ["left", "right"]
        }


def test_at_the_same_moment_the_identity_decides() -> None:
    one, two = entry("amend", 1, ROOT, note=("a", "x")), entry("amend", 1, ROOT, note=("a", "y"))
    assert note_of(ROOT, one, two) == note_of(ROOT, two, one) == max(
        (one, two), key=lambda e: e.entry_id
    ).changed[0].new  # fmt: skip


def test_who_knew_of_both_ends_the_dispute() -> None:
    settled = entry("settle", 3, LEFT, RIGHT, note=("left", "right"), revision=4)
    assert lineage.disputes([ROOT, LEFT, RIGHT, settled]) == {}
    assert note_of(ROOT, LEFT, RIGHT, settled) == "right"
    knew_one = entry("amend", 3, LEFT, note=("left", "third"))
    assert [c.value for c in lineage.disputes([ROOT, LEFT, RIGHT, knew_one])["note"]] == ["third", "right"]


def test_an_emptied_field_is_gone_and_can_be_disputed() -> None:
    emptied = entry("amend", 5, ROOT, note=("a", None))
    assert "note" not in lineage.replay([ROOT, emptied])[0]
    assert [c.value for c in lineage.disputes([ROOT, emptied, RIGHT])["note"]] == [None, "right"]


def test_a_run_added_twice_is_one_run_with_the_least_code() -> None:
    twin = entry("add", 9, note="a", code="R-0000", series="s")
    content, revision = lineage.replay([ROOT, twin])
    assert (content["code"], content["series"], revision) == ("R-0000", "s", 2)
    assert lineage.disputes([ROOT, twin]) == {}
    differing = entry("add", 9, note="b")
    assert [c.value for c in lineage.disputes([ROOT, differing])["note"]] == ["b", "a"]


def test_no_beginning_is_refused() -> None:
    with pytest.raises(InvalidRecord):
        lineage.replay([LEFT])


def test_every_word_of_an_entry_counts_in_its_hash() -> None:
    from dataclasses import replace

    assert lineage.entry_id_of(ROOT) == ROOT.entry_id
    for changed in (
        {"who": "TB"},
        {"why": "x"},
        {"at": START + dt.timedelta(seconds=1)},
        {"action": "amend"},
        {"revision": 5},
        {"after": {"scheme": "N"}},
        {"changed": (Change(field="note", old=1, new=2),)},
        {"parents": ("x",)},
        {"run_id": UUID(int=8)},
        {"book_id": UUID(int=8)},
    ):
        assert lineage.entry_id_of(replace(ROOT, **changed)) != ROOT.entry_id  # type: ignore[arg-type]
    for local in ({"seq": 9}, {"received_at": START}):
        assert lineage.entry_id_of(replace(ROOT, **local)) == ROOT.entry_id  # type: ignore[arg-type]


def test_content_is_flat_sparse_and_comes_back() -> None:
    run = a_run(series=None, note="")
    content = lineage.content_of(run)
    assert "series" not in content and "note" not in content
    assert content["outcome.isolated_yield_pct"] == 81.0
    assert lineage.run_of(content, run_id=run.run_id, revision=1) == run


@pytest.mark.parametrize("field", ["by", "reference", "project", "series", "withdrawn_why"])
def test_an_empty_text_that_was_given_is_content_and_an_empty_note_is_not(field: str) -> None:
    """A run that came with an empty text must read the same from its history as from its row."""
    run = a_run(note="", **{field: ""})
    content = lineage.content_of(run)
    assert "note" not in content
    assert lineage.run_of(content, run_id=run.run_id, revision=run.revision) == run

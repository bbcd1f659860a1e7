"""The Python contract: `from kb import open_book, Plan, Run, Criteria`, the methods of a book, frozen results."""

from __future__ import annotations

import dataclasses
import json
from pathlib import Path

import pytest

import kb
from kb import Criteria, Plan, Run, open_book
from kb.errors import RecordConflict, StoreExists, StoreMissing
from kb.record.conditions import Conditions

AZIDE = "CCC(C)Br.[Na+].[N-]=[N+]=[N-]>>CCC(C)N=[N+]=[N-]"


def test_a_scheme_is_read_without_a_book() -> None:
    reading = kb.read_scheme(AZIDE)
    assert (reading.ok, reading.fate) == (True, "substitution")
    assert kb.read_scheme("C1CC").ok is False
    _is_frozen_and_json(reading)


def test_a_book_is_a_context_that_records_gets_amends_and_withdraws(tmp_path: Path) -> None:
    place = tmp_path / "group.sidepath"
    with pytest.raises(StoreMissing):
        open_book(place)
    with open_book(place, create=True) as book:
        run = book.add(Run(scheme=AZIDE, conditions=Conditions(), note="first"), "AB")
        assert run.code is not None and book.get(run.code) == run
        changed = book.amend(run.code, {"note": "second"}, who="AB", why="typo")
        assert (changed.note, changed.revision) == ("second", 2)
        with pytest.raises(RecordConflict):
            book.amend(run.code, {"note": "third"}, who="CD", why="late", revision=1)
        assert book.withdraw(run.code, who="AB", why="wrong bottle").is_withdrawn
        assert book.count() == 0
    with pytest.raises(StoreExists):
        open_book(place, create=True)


def test_a_book_checks_finds_moves_and_verifies(demo_book: Path, tmp_path: Path) -> None:
    with open_book(str(demo_book), read_only=True) as book:
        assessment = book.check(Plan(scheme=AZIDE))
        assert assessment.findings and assessment.precedents
        _is_frozen_and_json(assessment)
        found = book.find(Criteria(substructure="C(=O)OC(C)(C)C", limit=5))
        assert found.total > 5
        _is_frozen_and_json(found)
        assert book.export_file(tmp_path / "all.jsonl") == book.count()
    few = tmp_path / "few.jsonl"
    few.write_text("".join((tmp_path / "all.jsonl").read_text().splitlines(keepends=True)[:12]))
    third = tmp_path / "third.sidepath"
    with open_book(third, create=True) as more:
        more.add(Run(scheme=AZIDE), "CD")
    with open_book(tmp_path / "other.sidepath", create=True) as other:
        report = other.import_file(few, who="AB")
        assert (report.read, report.stored) == (12, 12)
        _is_frozen_and_json(report)
        merged = other.merge(third, who="AB")
        assert (merged.added, other.count()) == (1, 13)
        _is_frozen_and_json(merged)
        assert all(check.ok for check in other.verify())


def test_names_come_when_they_are_asked_for() -> None:
    import kb.book

    for name in kb.__all__:
        assert getattr(kb, name)
    for name in kb.book.__all__:
        assert getattr(kb.book, name)
    with pytest.raises(AttributeError):
        kb.nonsense  # noqa: B018 - the access is the test


def _is_frozen_and_json(result: object) -> None:
    """Check that a result is a frozen dataclass whose `as_dict` is plain JSON."""
    assert dataclasses.is_dataclass(result)
    with pytest.raises(dataclasses.FrozenInstanceError):
        setattr(result, dataclasses.fields(result)[0].name, None)
    said = json.loads(json.dumps(result.as_dict(), allow_nan=False))  # type: ignore[attr-defined]
    assert isinstance(said, dict) and said

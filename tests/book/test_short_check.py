"""The short way of a check says what the long way says, for the book as it stands, or does not answer."""

from __future__ import annotations

import dataclasses
import datetime as dt
import json
import os
import shutil
import sqlite3
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from kb import kept
from kb.book import build_demo, open_book, plan_from_words
from kb.book.short_check import check_shortly, keep_for_next_time
from kb.progress import Silent
from kb.record.assessment import Assessment
from kb.record.plan import Plan
from kb.store.values import HouseRule
from kb.vocabulary import Severity

PLANS: tuple[dict[str, Any], ...] = (
    {"scheme": "CCCC(C)OS(C)(=O)=O", "reagents": ["NaN3"], "solvents": ["DMF"], "temperature": "60 C"},
    {"scheme": "CC(C)(C)OC(=O)NCCCBr", "bases": ["KOtBu"], "solvents": ["THF"], "temperature": "0 C"},
    {"scheme": "CC(C)(C)OC(=O)N1CC(COC(C)(C)C)C1>>CC(C)(C)OCC1CNC1", "acids": ["HCl"], "solvents": ["dioxane"]},
    {"scheme": "c1ccccc1", "reagents": ["NaN3"], "solvents": ["dichloromethane"]},
)
AZIDE = plan_from_words(PLANS[0])


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory) -> Path:
    place, _ = build_demo(str(tmp_path_factory.mktemp("demo") / "demo.sidepath"), Silent())
    with sqlite3.connect(place) as connection:
        connection.execute("PRAGMA wal_checkpoint(TRUNCATE)")
    return Path(place)


@pytest.fixture
def book(demo: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Iterator[Path]:
    """A copy of the demo book, and keeping allowed."""
    monkeypatch.setattr(kept, "_allowed", True)
    yield Path(shutil.copy(demo, tmp_path / "copy.sidepath"))


def long_way(book: Path, plan: Plan, keep: bool = True, **options: Any) -> Assessment:
    with open_book(book, read_only=True) as opened:
        answer = opened.check(plan, **options)
        if keep:
            assert keep_for_next_time(opened)
        return answer


def short_way(book: Path, plan: Plan, **options: Any) -> Assessment | None:
    return check_shortly(str(book), plan, wait_s=1.0, **options)


def as_text(answer: Assessment | None) -> str:
    assert answer is not None
    return json.dumps(answer.as_dict(), sort_keys=True, default=str)


@pytest.mark.parametrize("words", PLANS)
def test_both_ways_say_the_same(book: Path, words: dict[str, Any]) -> None:
    plan = plan_from_words(words)
    assert short_way(book, plan) is None
    expected = as_text(long_way(book, plan))
    assert as_text(short_way(book, plan)) == expected


def test_both_ways_say_the_same_of_an_earlier_day(book: Path) -> None:
    day = dt.date(2024, 1, 1)
    long_way(book, AZIDE)
    expected = long_way(book, AZIDE, keep=False, top=9, at_date=day)
    assert as_text(short_way(book, AZIDE, top=9, at_date=day)) == as_text(expected)


def test_a_house_rule_is_told_by_the_short_way_too(book: Path) -> None:
    rule = HouseRule(
        title="Never azide here", motif="COS(C)(=O)=O", when="reagent in (azide)", severity=Severity.SERIOUS,
        why="It was tried.", author="AB",
    )  # fmt: skip
    with open_book(book) as opened:
        opened.add_rule(rule)
    expected = as_text(long_way(book, AZIDE))
    assert "Never azide here" in expected
    assert as_text(short_way(book, AZIDE)) == expected


def test_whole_runs_are_read_alike(book: Path) -> None:
    from kb.store.glance import glance

    with open_book(book, read_only=True) as opened, glance(book, 1.0) as look:
        assert look is not None
        keys, codes = look.standing_runs()
        assert look.runs(keys) == [opened.get(code) for code in codes]
        assert look.house_rules() == opened.rules()
        assert look.version == opened.store.data_version()


def test_after_any_change_the_short_way_waits_for_the_long_one(book: Path) -> None:
    long_way(book, AZIDE)
    with open_book(book) as opened:
        assert short_way(book, AZIDE) is not None
        code = opened.page(limit=1).items[0].code
        assert code is not None
        opened.withdraw(code, who="AB", why="a test")
        assert short_way(book, AZIDE) is None
    assert short_way(book, AZIDE) is None
    expected = as_text(long_way(book, AZIDE))
    assert as_text(short_way(book, AZIDE)) == expected


def test_a_book_put_in_place_of_another_is_noticed(book: Path, demo: Path) -> None:
    long_way(book, AZIDE)
    shutil.copy(demo, book.with_name("other"))
    book.with_name("other").replace(book)
    assert short_way(book, AZIDE) is None


def test_an_edit_behind_the_programs_back_is_noticed(book: Path) -> None:
    long_way(book, AZIDE)
    with sqlite3.connect(book) as connection:
        connection.execute("UPDATE run SET isolated_yield_pct = 1")
    connection.close()
    assert short_way(book, AZIDE) is None


def test_columns_of_an_older_state_are_not_kept_for_a_newer_one(book: Path) -> None:
    with open_book(book, read_only=True) as reader:
        reader.check(AZIDE)
        with open_book(book) as writer:
            writer.add(dataclasses.replace(writer.get("R-0001"), run_id=__import__("uuid").uuid4(), code=None), "AB")
        assert not keep_for_next_time(reader)
    assert short_way(book, AZIDE) is None


@pytest.mark.parametrize("what", ["nothing there", "no book", "folder", "server", "memory"])
def test_what_is_no_book_is_left_to_the_long_way(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, what: str) -> None:
    monkeypatch.setattr(kept, "_allowed", True)
    place = tmp_path / "thing"
    if what == "no book":
        place.write_bytes(b"SQLite format 3\x00" + bytes(5000))
    elif what == "folder":
        place.mkdir()
    address = {"server": "postgresql+psycopg://nowhere/book", "memory": "sqlite://"}.get(what, str(place))
    assert check_shortly(address, AZIDE, wait_s=0.1) is None


def test_a_book_of_another_form_is_left_to_the_long_way(book: Path) -> None:
    with sqlite3.connect(book) as connection:
        connection.execute("UPDATE alembic_version SET version_num = '9999'")
    connection.close()
    assert short_way(book, AZIDE) is None


def test_the_short_way_loads_neither_sqlalchemy_nor_the_parser(book: Path) -> None:
    script = (
        "import sys\n"
        "from kb.cli import entry\n"
        "try:\n"
        "    entry.main(sys.argv[1:])\n"
        "finally:\n"
        "    print(sorted({'sqlalchemy', 'typer', 'pydantic', 'rapidfuzz'} & set(sys.modules)), file=sys.stderr)\n"
    )
    words = ["--book", str(book), "check", PLANS[0]["scheme"], "--with", "NaN3", "--solvent", "DMF", "--temp", "60 C"]
    root = str(Path(__file__).parents[2])
    answers = []
    for _ in range(2):
        done = subprocess.run(
            [sys.executable, "-c", script, *words],
            capture_output=True, text=True, check=False, env=os.environ | {"PYTHONPATH": root},
        )  # fmt: skip
        answers.append(done)
        assert done.returncode == 0, done.stderr
    assert answers[0].stdout == answers[1].stdout
    assert "sqlalchemy" in answers[0].stderr
    assert answers[1].stderr.strip() == "[]"

"""A caution is acknowledged with a name and a reason, and told as before. The mixture is invented, not to be tried."""

from __future__ import annotations

from pathlib import Path

import pytest

from kb.book import open_book
from tests.asking import ask, is_plain_refusal

AZIDE = ("check", "CCC(C)Br.[Na+].[N-]=[N+]=[N-]>>CCC(C)N=[N+]=[N-]", "--with", "NaN3=1.5", "--solvent", "DMF")
HERE = "hazard-azide-salt"


@pytest.fixture
def book(tmp_path: Path) -> Path:
    place = tmp_path / "book.sidepath"
    open_book(place, create=True).close()
    return place


def finding(book: Path, *words: str) -> dict[str, object]:
    said = ask(*AZIDE, *words, "--json", book=book).json
    return next(f for f in said["findings"] if f["id"] == HERE)


def test_an_acknowledged_caution_is_told_as_before_with_name_and_reason(book: Path) -> None:
    before = finding(book)
    assert before["acknowledged"] == []
    done = ask(*AZIDE, "--acknowledge", HERE, "--because", "behind a shield, <b>2 mmol</b>", "--as", "AB", book=book)
    assert done.status == 0
    for _ in range(2):  # the second time by the short way
        after = finding(book)
        assert after["severity"] == before["severity"] and after["title"] == before["title"]
        assert str(after["why"]).startswith(str(before["why"]))
        assert len(after["acknowledged"]) == 1  # type: ignore[arg-type]
        assert "AB, " in str(after["why"]) and "2 mmol" in str(after["why"])
        assert "holds all the same" in str(after["why"])


def test_another_scale_is_another_plan(book: Path) -> None:
    ask(*AZIDE, "--acknowledge", HERE, "--because", "small", "--as", "AB", book=book)
    assert finding(book)["acknowledged"] != []
    assert finding(book, "--scale", "2 mol")["acknowledged"] == []


@pytest.mark.parametrize(
    "words",
    [
        ("--acknowledge", HERE),
        ("--because", "no reason"),
        ("--acknowledge", "hazard-mercury", "--because", "not in this plan"),
    ],
)
def test_what_cannot_be_acknowledged_is_refused(book: Path, words: tuple[str, ...]) -> None:
    assert is_plain_refusal(ask(*AZIDE, *words, "--as", "AB", book=book))
    assert finding(book)["acknowledged"] == []

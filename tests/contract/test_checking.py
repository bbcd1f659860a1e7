"""`check` and `demo`: keys, order of findings, --fail-on, --at-date, --top, no book."""

from __future__ import annotations

from pathlib import Path

import pytest

from kb import paths
from kb.vocabulary import Fate, FindingKind, Severity
from tests.asking import ask, is_plain_refusal, widest
from tests.engines import Books

AZIDE = "CCC(C)Br.[Na+].[N-]=[N+]=[N-]>>CCC(C)N=[N+]=[N-]"
CONDITIONS = ("--with", "NaN3=1.5", "--solvent", "DMF", "--temp", "80C", "--time", "4 h", "--conc", "0.2 M")
ACID = "CC(C)(C)OC1CCN(C(=O)OC(C)(C)C)C1>>CC(C)(C)OC1CCNC1"
HOT_ACID = ("--acid", "HCl=10", "--solvent", "dioxane", "--temp", "50C")
INTERVAL = {"mean", "low", "high"}


def test_an_assessment_has_the_keys_of_the_contract(demo_book: Path) -> None:
    answer = ask("check", AZIDE, *CONDITIONS, "--json", book=demo_book)
    assert answer.status == 0
    said = answer.json
    assert set(said) >= {"plan", "reading", "findings", "estimate", "precedents", "advice"}
    assert said["findings"] and said["precedents"] and said["advice"]
    for finding in said["findings"]:
        assert set(finding) >= {
            *("id", "kind", "severity", "title", "why", "component", "atoms", "evidence", "side_product"),
            *("do_instead", "source"),
        }
        assert finding["kind"] in set(FindingKind) and finding["severity"] in set(Severity)
        if finding["evidence"] is not None:
            assert set(finding["evidence"]) >= {"lost", "survived", "runs", "chance"}
    estimate = said["estimate"]
    assert set(estimate) >= {"fates", "yield_pct", "level", "effective_precedents", "basis"}
    assert estimate["level"] == 0.8 and estimate["basis"] in {"record", "published", "both", "none"}
    assert set(estimate["fates"]) <= set(Fate)
    for interval in estimate["fates"].values():
        assert set(interval) == INTERVAL
        assert 0 <= interval["low"] <= interval["mean"] <= interval["high"] <= 1
    assert sum(i["mean"] for i in estimate["fates"].values()) == pytest.approx(1, abs=0.01)
    assert 0 <= estimate["yield_pct"]["low"] <= estimate["yield_pct"]["high"] <= 100
    for precedent in said["precedents"]:
        assert set(precedent) >= {"run", "similarity", "parts", "differs", "split", "yield_pct", "verdict"}
        assert 0 <= precedent["similarity"] <= 1 and set(precedent["split"]) <= set(Fate)
    for advice in said["advice"]:
        assert set(advice) >= {"change", "effect", "pairs", "basis", "why"}
        assert set(advice["effect"]) == INTERVAL


def test_findings_come_most_severe_first(demo_book: Path) -> None:
    said = ask("check", ACID, *HOT_ACID, "--json", book=demo_book).json
    ranks = [Severity(f["severity"]).rank for f in said["findings"]]
    assert ranks == sorted(ranks, reverse=True)
    first = said["findings"][0]
    assert first["severity"] == "serious" and first["atoms"] and first["evidence"]["runs"]


@pytest.mark.parametrize(
    ("least", "status"),
    [("note", 3), ("caution", 3), ("serious", 0)],
)
def test_fail_on_ends_with_3_when_a_finding_is_at_least_that_severe(demo_book: Path, least: str, status: int) -> None:
    answer = ask("check", AZIDE, *CONDITIONS, "--fail-on", least, "--json", book=demo_book)
    assert answer.status == status
    assert answer.json["findings"]


def test_top_says_how_many_precedents(demo_book: Path) -> None:
    for top in (0, 2):
        assert len(ask("check", AZIDE, "--top", str(top), "--json", book=demo_book).json["precedents"]) == top


def test_at_date_leaves_later_runs_out(demo_book: Path) -> None:
    early = ask("check", AZIDE, *CONDITIONS, "--at-date", "2024-03-01", "--json", book=demo_book).json
    late = ask("check", AZIDE, *CONDITIONS, "--at-date", "2099-01-01", "--json", book=demo_book).json
    never = ask("check", AZIDE, *CONDITIONS, "--at-date", "1999-01-01", "--json", book=demo_book).json
    codes = {p["run"] for p in early["precedents"]}
    for code in codes:
        assert ask("show", code, "--json", book=demo_book).json["date"] <= "2024-03-01"
    assert never["precedents"] == [] and never["estimate"]["basis"] == "published"
    assert early["estimate"]["effective_precedents"] < late["estimate"]["effective_precedents"]


def test_without_a_book_published_chemistry_answers_and_says_so() -> None:
    assert not paths.default_book().exists()
    answer = ask("check", ACID, "--acid", "HCl", "--temp", "50C", "--json")
    assert answer.status == 0
    assert "no record book" in answer.err
    assert answer.json["precedents"] == []
    assert answer.json["findings"][0]["severity"] == "serious"
    assert not paths.default_book().exists()


def test_a_book_that_was_named_must_be_there(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    missing = tmp_path / "missing.sidepath"
    answer = ask("check", AZIDE, "--json", book=missing)
    assert (answer.status, answer.error["code"]) == (4, "book-missing")
    monkeypatch.setenv("SIDEPATH_BOOK", str(missing))
    assert ask("check", AZIDE).status == 4
    assert not missing.exists()


def test_an_empty_book_answers_like_no_book(empty_book: Path | str) -> None:
    for scheme in (AZIDE, ACID, "CCBr"):
        answer = ask("check", scheme, "--acid", "TFA", "--temp", "rt", "--json", book=empty_book)
        assert answer.status == 0 and answer.json["precedents"] == []


@pytest.mark.parametrize("bad", ["C1CC>>CC", "C1CC", "CC>C", "CC(C)(C)(C)(C)C"])
def test_a_scheme_that_cannot_be_parsed_gets_no_assessment(demo_book: Path, bad: str) -> None:
    answer = ask("check", bad, "--json", book=demo_book)
    assert (answer.status, answer.error["code"]) == (1, "structure")
    assert ask("check", bad, book=demo_book).out == ""


def test_a_scheme_that_is_not_resolved_still_gets_what_its_mixture_deserves(demo_book: Path) -> None:
    answer = ask("check", "CCCC>>CCCO", "--with", "NaN3", "--acid", "HCl", "--json", book=demo_book)
    assert answer.status == 0
    assert answer.json["reading"]["confidence"] == "unresolved"
    assert any(f["kind"] == "caution" for f in answer.json["findings"])


def test_the_text_has_the_answer_first_severity_in_words_and_80_columns(demo_book: Path) -> None:
    text = ask("check", ACID, *HOT_ACID, book=demo_book).out
    assert widest(text) <= 80
    worry, expect, closest = (text.index(word) for word in ("WORRY ABOUT", "EXPECT", "CLOSEST IN THE RECORD"))
    assert worry < expect < closest
    assert "SERIOUS" in text and "In this book: lost in" in text
    assert "not permission" in text


def test_demo_builds_keeps_and_checks(demo_book: Path, tmp_path: Path) -> None:
    answer = ask("demo", book=demo_book)
    assert answer.status == 0
    assert "Using the demo book" in answer.err
    assert "SERIOUS" in answer.out and "survived in" in answer.out
    assert f"sidepath --book {demo_book} tui" in answer.out
    assert set(ask("demo", "--json", book=demo_book).json) >= {"plan", "findings"}


def test_demo_leaves_a_book_of_ones_own_alone(books: Books) -> None:
    place = books / "own.sidepath"
    assert ask("new", book=place).status == 0
    before = books.contents("own.sidepath")
    answer = ask("demo", book=place)
    assert answer.status == 4 and is_plain_refusal(answer)
    assert books.contents("own.sidepath") == before

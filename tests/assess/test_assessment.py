"""A whole check: order of findings, honest refusals, and what an empty book may say."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest

from kb.assess.assessment import assess, sort_findings
from kb.book import Book, open_book
from kb.book.plan_words import conditions_from_words, plan_from_words
from kb.record.finding import Evidence, Finding
from kb.record.outcome import Outcome, ProductSeen
from kb.record.run import Run
from kb.vocabulary import Basis, Fate, FindingKind, Severity

SN2 = {"reagents": "NaN3", "solvents": "DMF", "temperature": "60 °C"}


def finding(
    severity: Severity, kind: FindingKind = FindingKind.CAUTION, lost: int | None = None, **rest: object
) -> Finding:
    evidence = Evidence(lost=lost, survived=0) if lost is not None else None
    values = {"rule_id": "x", "kind": kind, "severity": severity, "title": "t", "why": "w", "evidence": evidence}
    return Finding(**(values | rest))  # type: ignore[arg-type]


def test_findings_come_most_severe_first_then_by_recorded_losses_then_by_kind() -> None:
    note = finding(Severity.NOTE)
    caution = finding(Severity.CAUTION)
    lost_twice = finding(Severity.CAUTION, FindingKind.RESEMBLANCE, lost=2)
    liability = finding(Severity.CAUTION, FindingKind.LIABILITY)
    serious, unsure = finding(Severity.SERIOUS), finding(Severity.SERIOUS, is_uncertain=True)
    order = [serious, unsure, lost_twice, liability, caution, note]
    assert list(sort_findings([note, caution, unsure, liability, lost_twice, serious])) == order


@pytest.fixture(scope="module")
def empty(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Book]:
    with open_book(tmp_path_factory.mktemp("empty") / "book.sidepath", create=True) as book:
        yield book


def test_an_empty_book_lets_published_rates_speak_and_says_so(empty: Book) -> None:
    estimate = empty.check(plan_from_words({"scheme": "CCC(C)Br", **SN2})).estimate
    assert estimate.basis is Basis.PUBLISHED
    assert estimate.effective_precedents == 0
    assert estimate.yield_pct is None
    assert estimate.half_life_h is not None
    assert "No run close enough" in estimate.note
    assert sum(interval.mean for _, interval in estimate.fates) == pytest.approx(1, abs=0.01)


@pytest.mark.parametrize(
    ("base", "solvent", "most"), [("NaOEt", "ethanol", "C/C=C/C"), ("KOtBu", "tert-butanol", "C=CCC")]
)
def test_the_alkenes_are_told_apart(empty: Book, base: str, solvent: str, most: str) -> None:
    # 2-Bromobutane: 19 % 1-butene with ethoxide, 53 % with tert-butoxide: H. C. Brown, I. Moritani, Y. Okamoto,
    # J. Am. Chem. Soc. 1956, 78, 2193 (memory).
    words = {"scheme": "CCC(C)Br>>CC=CC", "reagents": base, "solvents": solvent, "temperature": "70 °C"}
    estimate = empty.check(plan_from_words(words)).estimate
    assert estimate.alkenes[0][0] == most
    assert sum(share.mean for _, share in estimate.alkenes) == pytest.approx(1, abs=0.02)
    assert estimate.alkenes_in_words().startswith(f"Of the alkenes, by published rates: {most} ")


def test_where_one_alkene_or_hardly_any_forms_nothing_is_told_apart(empty: Book) -> None:
    for scheme, reagents in (("CCCBr>>CCCN=[N+]=[N-]", "NaN3"), ("CC(C)Br>>CC=C", "NaOEt")):
        plan = plan_from_words({"scheme": scheme, "reagents": reagents, "solvents": "ethanol", "temperature": "60 °C"})
        assert empty.check(plan).estimate.alkenes_in_words() == ""


@pytest.mark.parametrize("scheme", ["FC(F)(F)S(=O)(=O)OC12CCC(CC1)CC2", "O=S(=O)(OC12CC3CC(CC(C3)C1)C2)C(F)(F)F"])
def test_a_bridgehead_gets_the_published_reason_and_no_number(empty: Book, scheme: str) -> None:
    # P. D. Bartlett & L. H. Knox, J. Am. Chem. Soc. 1939, 61, 3184: no displacement from the back at a bridgehead.
    answer = empty.check(plan_from_words({"scheme": scheme, **SN2}))
    assert answer.estimate.fates == ()
    assert answer.estimate.yield_pct is None
    assert answer.estimate.basis is Basis.NONE
    assert "bridgehead" in answer.estimate.note.lower()
    assert any(f.severity is Severity.SERIOUS and "ridgehead" in f.title for f in answer.findings)


@pytest.mark.parametrize("scheme", ["no structure", "CCC(C", "CCCCCC"])
def test_a_scheme_that_cannot_be_read_still_gets_the_hazards_of_its_mixture(empty: Book, scheme: str) -> None:
    answer = empty.check(plan_from_words({"scheme": scheme, "reagents": "NaN3", "solvents": "dichloromethane"}))
    assert answer.estimate.fates == ()
    assert answer.precedents == ()
    assert answer.advice == ()
    assert any(f.kind is FindingKind.CAUTION for f in answer.findings)
    assert any(f.rule_id == "data:not-read" for f in answer.findings)


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Book]:
    """Return two runs that contradict each other; water stands in one and was not written down in the other."""
    with open_book(tmp_path_factory.mktemp("two") / "book.sidepath", create=True) as new:
        for share, solvents in ((0.15, ["DMF", "water"]), (0.70, ["DMF"])):
            seen = (
                ProductSeen(fate=Fate.ELIMINATION, share=share),
                ProductSeen(fate=Fate.SUBSTITUTION, share=1 - share),
            )
            new.add(
                Run(
                    scheme="CCC(C)OS(C)(=O)=O>>CCC(C)C#N",
                    conditions=conditions_from_words({"reagents": "KCN", "solvents": solvents, "temperature": "60 °C"}),
                    outcome=Outcome(products=seen, isolated_yield_pct=60),
                ),
                "T",
            )
        yield new


def test_a_contradiction_is_wide_named_and_explained(book: Book) -> None:
    words = {"scheme": "CCC(C)OS(C)(=O)=O>>CCC(C)C#N", "reagents": "KCN", "solvents": "DMF", "temperature": "60 °C"}
    answer = book.check(plan_from_words(words))
    main = answer.estimate.fates[0][1]
    assert main.high - main.low > 0.4
    assert "R-0001" in answer.estimate.note
    assert "R-0002" in answer.estimate.note
    assert "water content not recorded in R-0002" in answer.estimate.note
    assert {p.run for p in answer.precedents} == {"R-0001", "R-0002"}


def test_the_same_plan_gets_the_same_answer(book: Book) -> None:
    plan = plan_from_words({"scheme": "CCC(C)OS(C)(=O)=O", "reagents": "KCN", "solvents": "DMF"})
    assert book.check(plan).as_dict() == book.check(plan).as_dict()


def test_a_check_does_not_change_the_book(book: Book) -> None:
    before = book.store.data_version()
    book.check(plan_from_words({"scheme": "CCC(C)Br", **SN2}))
    assert book.store.data_version() == before


def test_only_the_runs_of_the_view_speak(book: Book) -> None:
    view = book.view()
    nobody = view.only(view.table.yield_pct > 1000)
    plan = plan_from_words({"scheme": "CCC(C)OS(C)(=O)=O", "reagents": "KCN", "solvents": "DMF"})
    assert assess(plan, nobody).precedents == ()
    assert assess(plan, view).precedents


def test_a_house_rule_is_heard(book: Book, tmp_path: Path) -> None:
    from kb.store.values import HouseRule

    rule = HouseRule(
        title="No cyanide on Fridays",
        motif="",
        when="reagent == cyanide",
        severity=Severity.CAUTION,
        why="Nobody is here to help.",
        author="T",
    )
    plan = plan_from_words({"scheme": "CCC(C)Br", "reagents": "KCN", "solvents": "DMF"})
    titles = [f.title for f in assess(plan, book.view(), (rule,)).findings]
    assert "No cyanide on Fridays" in titles


def test_every_figure_of_an_estimate_can_be_traced(book: Book) -> None:
    words = {"scheme": "CCC(C)OS(C)(=O)=O>>CCC(C)C#N", "reagents": "KCN", "solvents": "DMF", "temperature": "60 °C"}
    estimate = book.check(plan_from_words(words)).estimate
    assert {run for run, _ in estimate.runs} == {"R-0001", "R-0002"}
    assert all(0 < weight <= 1 for _, weight in estimate.runs)
    assert set(estimate.yield_runs) == {"R-0001", "R-0002"}
    assert any(sentence.startswith("Sources:") for sentence in estimate.published)


def test_verbose_text_names_what_each_figure_rests_on(book: Book) -> None:
    from kb.cli.render_assessment import render_assessment

    words = {"scheme": "CCC(C)OS(C)(=O)=O>>CCC(C)C#N", "reagents": "KCN", "solvents": "DMF", "temperature": "60 °C"}
    answer = book.check(plan_from_words(words))
    short, long = render_assessment(answer), render_assessment(answer, verbose=True)
    assert "Shares rest on R-000" in long
    assert "Yield rests on" in long
    assert "Sources:" in long
    assert "Shares rest on" not in short

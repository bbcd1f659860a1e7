"""A book that speaks for and against a liability: severities follow what its own runs say near the plan's conditions.

The runs are invented for this test: an ether beside a carbamate that is taken off with hydrogen chloride. Below a
temperature the ether survived eight times and was lost once; above it the reverse.
"""

from __future__ import annotations

from collections.abc import Iterator

import pytest

from kb.book import Book, open_book
from kb.book.plan_words import conditions_from_words, plan_from_words
from kb.record.finding import Finding
from kb.record.outcome import Failure, Outcome, ProductSeen
from kb.record.run import Run
from kb.vocabulary import Fate, Severity, Verdict

COLD, HOT = (-5, -2, 0, 0, 1, 2, 3, 4, 5), (45, 46, 48, 50, 50, 52, 54, 55, 58)
ETHER = "tert-butyl-ether-strong-acid"


def substrate(chain: int) -> tuple[str, str, str]:
    """Return (both groups, the ether alone, neither) on a chain."""
    middle = "C" * chain
    return f"CC(C)(C)O{middle}NC(=O)OC(C)(C)C", f"CC(C)(C)O{middle}N", f"O{middle}N"


def run_at(temperature: int, chain: int, is_lost: bool) -> Run:
    both, ether, neither = substrate(chain)
    found = ((neither, 0.9), (ether, 0.05)) if is_lost else ((ether, 0.95), (neither, 0.02))
    return Run(
        scheme=f"{both}>>{ether}",
        conditions=conditions_from_words(
            {"acids": "HCl=10", "solvents": "1,4-dioxane", "temperature": f"{temperature} °C"}
        ),
        outcome=Outcome(products=tuple(ProductSeen(fate=Fate.GROUP_LOSS, smiles=s, share=x) for s, x in found)),
        verdict=Verdict.FAILED if is_lost else Verdict.WORKED,
        reference=f"{temperature}/{chain}/{'lost' if is_lost else 'kept'}",
    )


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Book]:
    with open_book(tmp_path_factory.mktemp("evidence") / "book.sidepath", create=True) as new:
        for place in range(9):
            new.add(run_at(COLD[place], place + 2, is_lost=place == 4), "T")
            new.add(run_at(HOT[place], place + 2, is_lost=place != 4), "T")
        yield new


def ether_finding(book: Book, temperature: int) -> Finding:
    both, ether, _ = substrate(14)
    words = {"scheme": f"{both}>>{ether}", "acids": "HCl=10", "solvents": "1,4-dioxane"}
    findings = book.check(plan_from_words(words | {"temperature": f"{temperature} °C"})).findings
    return next(f for f in findings if f.rule_id == ETHER)


def test_severity_follows_the_runs_near_the_plan(book: Book) -> None:
    assert ether_finding(book, 0).severity is Severity.CAUTION  # serious by rule, lowered by eight survivors
    assert ether_finding(book, 50).severity is Severity.SERIOUS


def test_the_chance_follows_too_and_moves_over_between(book: Book) -> None:
    means = [ether_finding(book, t).evidence.chance.mean for t in (0, 25, 50)]  # type: ignore[union-attr]
    assert means[0] < 0.25
    assert means[0] < means[1] < means[2]
    assert means[2] > 0.75


def test_every_run_is_named_lost_ones_first(book: Book) -> None:
    evidence = ether_finding(book, 50).evidence
    assert evidence is not None
    assert (evidence.lost, evidence.survived) == (9, 9)
    references = [book.get(code).reference or "" for code in evidence.runs]
    assert all(r.endswith("lost") for r in references[:9])
    assert all(r.endswith("kept") for r in references[9:])


def test_it_is_said_that_far_runs_count_in_part(book: Book) -> None:
    evidence = ether_finding(book, 0).evidence
    assert evidence is not None
    assert "8 runs count in part" in evidence.note


def test_without_a_temperature_every_run_counts_and_nothing_is_lowered(book: Book) -> None:
    both, ether, _ = substrate(14)
    plan = plan_from_words({"scheme": f"{both}>>{ether}", "acids": "HCl=10", "solvents": "1,4-dioxane"})
    finding = next(f for f in book.check(plan).findings if f.rule_id == ETHER)
    assert finding.severity is Severity.SERIOUS
    assert finding.evidence is not None
    assert finding.evidence.chance is not None
    assert finding.evidence.chance.mean == pytest.approx(0.5, abs=0.02)


def test_a_withdrawn_run_no_longer_bears_witness(tmp_path_factory: pytest.TempPathFactory) -> None:
    with open_book(tmp_path_factory.mktemp("withdrawn") / "book.sidepath", create=True) as own:
        kept = [own.add(run_at(50, chain, is_lost=True), "T") for chain in (3, 4)]
        assert ether_finding(own, 50).evidence.lost == 2  # type: ignore[union-attr]
        own.withdraw(str(kept[0].code), who="T", why="wrong vial")
        assert ether_finding(own, 50).evidence.runs == (kept[1].code,)  # type: ignore[union-attr]


def elimination(tmp_path_factory: pytest.TempPathFactory, shares: tuple[float, ...]) -> Finding:
    """Return the finding on a secondary bromide with cyanide, in a book of runs with these shares of alkene."""
    with open_book(tmp_path_factory.mktemp("centre") / "book.sidepath", create=True) as own:
        for place, share in enumerate(shares):
            chain = "C" * (place + 1)
            seen = (
                ProductSeen(fate=Fate.ELIMINATION, share=share),
                ProductSeen(fate=Fate.SUBSTITUTION, share=1 - share),
            )
            own.add(
                Run(
                    scheme=f"CC(Br)C{chain}>>CC(C#N)C{chain}",
                    conditions=conditions_from_words({"reagents": "KCN", "solvents": "DMSO", "temperature": "70 °C"}),
                    outcome=Outcome(products=seen),
                ),
                "T",
            )
        words = {"scheme": "CC(Br)CC(C)C>>CC(C#N)CC(C)C", "reagents": "KCN", "solvents": "DMSO", "temperature": "70 °C"}
        findings = own.check(plan_from_words(words)).findings
    return next(f for f in findings if f.rule_id == "secondary-lg-moderate-base-heat")


def test_a_liability_at_the_centre_hears_the_splits_of_like_runs(tmp_path_factory: pytest.TempPathFactory) -> None:
    bad = elimination(tmp_path_factory, (0.6, 0.7, 0.55, 0.8, 0.65, 0.7))
    good = elimination(tmp_path_factory, (0.05, 0.1, 0.08, 0.02, 0.06, 0.04, 0.05, 0.03))
    assert bad.evidence is not None
    assert good.evidence is not None
    assert (bad.evidence.lost, bad.evidence.survived) == (6, 0)
    assert (good.evidence.lost, good.evidence.survived) == (0, 8)
    assert (bad.severity, good.severity) == (Severity.SERIOUS, Severity.NOTE)  # a caution by rule


@pytest.fixture(scope="module")
def other_book(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Book]:
    """Yield a book of invented runs whose liabilities lie anywhere in the molecule, or on the nucleophile."""
    with open_book(tmp_path_factory.mktemp("anywhere") / "book.sidepath", create=True) as new:
        for chain in range(1, 6):
            tail = "C" * chain
            lost = (ProductSeen(fate=Fate.ELIMINATION, share=0.9), ProductSeen(fate=Fate.SUBSTITUTION, share=0.1))
            new.add(
                Run(
                    scheme=f"BrC(C)CC(=O)O{tail}.[N-]=[N+]=[N-]>>[N-]=[N+]=NC(C)CC(=O)O{tail}",
                    conditions=conditions_from_words(
                        {"reagents": "NaN3", "bases": "K2CO3", "solvents": "DMF", "temperature": "60 °C"}
                    ),
                    outcome=Outcome(products=lost),
                    verdict=Verdict.FAILED,
                ),
                "T",
            )
            twice = (ProductSeen(fate=Fate.SUBSTITUTION, share=0.4), ProductSeen(fate=Fate.OTHER, share=0.6))
            new.add(
                Run(
                    scheme=f"{tail}CBr.NCc1ccccc1>>{tail}CNCc1ccccc1",
                    conditions=conditions_from_words(
                        {"reagents": "benzylamine", "bases": "K2CO3", "solvents": "MeCN", "temperature": "60 °C"}
                    ),
                    outcome=Outcome(products=twice, failures=(Failure(mode="over-reaction"),)),
                    verdict=Verdict.FAILED,
                ),
                "T",
            )
        yield new


@pytest.mark.parametrize(
    ("rule_id", "words"),
    [
        (
            "beta-lg-acceptor-e1cb",
            {"scheme": "BrC(CC)CC(=O)OCC.[N-]=[N+]=[N-]>>[N-]=[N+]=NC(CC)CC(=O)OCC", "reagents": "NaN3",
             "bases": "K2CO3", "solvents": "DMF", "temperature": "60 °C"},
        ),
        (
            "primary-amine-overalkylation",
            {"scheme": "CCCCCCCCBr.NCc1ccccc1>>CCCCCCCCNCc1ccccc1", "reagents": "benzylamine", "bases": "K2CO3",
             "solvents": "MeCN", "temperature": "60 °C"},
        ),
    ],
)  # fmt: skip
def test_a_liability_that_may_lie_anywhere_hears_the_runs_too(
    other_book: Book, rule_id: str, words: dict[str, str]
) -> None:
    finding = next(f for f in other_book.check(plan_from_words(words)).findings if f.rule_id == rule_id)
    assert finding.evidence is not None
    assert (finding.evidence.lost, finding.evidence.survived) == (5, 0)
    assert finding.evidence.chance is not None and finding.evidence.chance.mean > 0.8
    assert finding.severity is Severity.SERIOUS

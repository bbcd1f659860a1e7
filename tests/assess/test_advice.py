"""Advice through a real book: pairs before trends, only what the group has used, never into a serious finding.

The runs are invented; which way a change goes is common practice.
"""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest

from kb.assess.advice import _is_worth_trying
from kb.book import Book, open_book
from kb.book.plan_words import conditions_from_words, plan_from_words
from kb.physorg.competition import Share
from kb.physorg.what_if import Contrast
from kb.record.assessment import Advice, Assessment
from kb.record.outcome import Outcome, ProductSeen
from kb.record.run import Run
from kb.vocabulary import Basis, Fate, Severity


def run(chain: int, substitution: float, **words: object) -> Run:
    """Return the displacement of a secondary mesylate by azide, with a share of substitution."""
    tail = "C" * chain
    conditions = {"reagents": "NaN3", "solvents": "DMF", "temperature": "80 °C"} | words
    seen = (
        ProductSeen(fate=Fate.SUBSTITUTION, share=substitution),
        ProductSeen(fate=Fate.ELIMINATION, share=1 - substitution),
    )
    return Run(
        scheme=f"CC(OS(C)(=O)=O)C{tail}>>CC(N=[N+]=[N-])C{tail}",
        conditions=conditions_from_words(conditions),
        outcome=Outcome(products=seen),
    )


def check(book: Book, **words: object) -> Assessment:
    plan = {"scheme": "CC(OS(C)(=O)=O)CC(C)C>>CC(N=[N+]=[N-])CC(C)C", "reagents": "NaN3", "solvents": "DMF"}
    return book.check(plan_from_words(plan | {"temperature": "80 °C"} | words))


def find(advice: tuple[Advice, ...], word: str) -> Advice:
    return next(a for a in advice if a.change.startswith(word))


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Book]:
    with open_book(tmp_path_factory.mktemp("advice") / "book.sidepath", create=True) as new:
        for chain in range(1, 6):
            new.add(run(chain, 0.80, temperature="80 °C"), "T")
            new.add(run(chain, 0.92, temperature="60 °C"), "T")
            new.add(run(chain, 0.70, temperature="100 °C"), "T")
            new.add(run(chain, 0.88, temperature="80 °C", solvents="DMSO"), "T")
        yield new


def test_pairs_of_the_record_are_counted_named_and_labelled(book: Book) -> None:
    advice = find(check(book).advice, "about 60 °C")
    assert advice.change == "about 60 °C instead of about 80 °C"
    assert advice.basis is Basis.RECORD
    assert advice.pairs == 5
    assert 0 < advice.effect.low < advice.effect.mean < 0.12
    assert "in 5 of them both of one substrate" in advice.why
    assert "R-0001" in advice.why or "R-0005" in advice.why


def test_a_solvent_is_called_by_its_name(book: Book) -> None:
    assert find(check(book).advice, "dimethyl sulfoxide").pairs == 5


def test_what_made_it_worse_is_not_advised(book: Book) -> None:
    assert not any(a.change.startswith("about 100 °C") for a in check(book).advice)


def test_only_what_the_group_has_used_is_offered(book: Book) -> None:
    words = " ".join(a.change for a in check(book).advice)
    assert "acetonitrile" not in words
    assert "0 °C instead" not in words.replace("60 °C", "").replace("40 °C", "")


def test_best_first_and_each_a_single_change(book: Book) -> None:
    advice = check(book).advice
    ranks = [a.effect.low + 0.25 * a.effect.mean + (0.05 if a.basis is Basis.RECORD else 0) for a in advice]
    assert ranks == sorted(ranks, reverse=True)
    assert len({a.change for a in advice}) == len(advice)


def test_an_empty_book_gives_no_advice(tmp_path: Path) -> None:
    with open_book(tmp_path / "empty.sidepath", create=True) as empty:
        assert check(empty).advice == ()


def test_a_plan_that_says_nothing_of_the_condition_gets_no_advice_on_it(book: Book) -> None:
    advice = check(book, temperature=None).advice
    assert not any("°C" in a.change for a in advice)


def test_a_published_trend_is_labelled_with_its_source(tmp_path: Path) -> None:
    # Octadecyl bromide with KOtBu gives mostly alkene, its tosylate mostly ether: P. Veeravagu, R. T. Arnold,
    # E. W. Eigenmann, J. Am. Chem. Soc. 1964, 86, 3072 (check rows SE28, SE29, memory). No mesylate is in the book.
    words = {"bases": "KOtBu", "solvents": "tBuOH", "temperature": "40 °C"}
    with open_book(tmp_path / "book.sidepath", create=True) as book:
        for group in ("Br", "OS(=O)(=O)c1ccc(C)cc1"):
            scheme = f"CCCCC{group}>>CCCCCOC(C)(C)C"
            book.add(Run(scheme=scheme, conditions=conditions_from_words(words)), "T")
        plan = {"scheme": f"{'C' * 18}Br>>{'C' * 18}OC(C)(C)C"} | words
        advice = book.check(plan_from_words(plan)).advice
    tosylate = find(advice, "tosylate")
    assert tosylate.change == "tosylate instead of bromide"
    assert tosylate.basis is Basis.PUBLISHED
    assert tosylate.pairs == 0
    assert tosylate.effect.mean > 0.3
    assert "Veeravagu" in tosylate.why
    assert not any(a.change.startswith("mesylate") for a in advice)


def test_a_published_gain_that_would_stall_the_step_is_not_advised(tmp_path: Path) -> None:
    # Far colder favours substitution a little and stops the reaction (common practice).
    words = {"reagents": "KCN", "solvents": "DMSO"}
    with open_book(tmp_path / "book.sidepath", create=True) as book:
        for temperature in ("60 °C", "0 °C"):
            scheme = "CC(Cl)CCC>>CC(C#N)CCC"
            book.add(Run(scheme=scheme, conditions=conditions_from_words(words | {"temperature": temperature})), "T")
        plan = {"scheme": "CC(Cl)CCCC>>CC(C#N)CCCC", "temperature": "60 °C"} | words
        assert book.check(plan_from_words(plan)).advice == ()


@pytest.fixture(scope="module")
def hydride_book(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Book]:
    """Return runs in which sodium hydride in DMF did best: a serious hazard, however good the split."""
    with open_book(tmp_path_factory.mktemp("hydride") / "book.sidepath", create=True) as new:
        for chain in range(2, 7):
            tail = "C" * chain
            for base, share in (("K2CO3", 0.6), ("NaH", 0.95), ("Cs2CO3", 0.8)):
                words = {"bases": base, "solvents": "DMF", "temperature": "60 °C"}
                seen = (
                    ProductSeen(fate=Fate.SUBSTITUTION, share=share),
                    ProductSeen(fate=Fate.ELIMINATION, share=1 - share),
                )
                new.add(
                    Run(
                        scheme=f"{tail}Br.Oc1ccccc1>>{tail}Oc1ccccc1",
                        conditions=conditions_from_words(words),
                        outcome=Outcome(products=seen),
                    ),
                    "T",
                )
        yield new


def test_a_change_into_a_serious_finding_is_never_advised(hydride_book: Book) -> None:
    words = {"scheme": "CC(C)CCCBr.Oc1ccccc1>>CC(C)CCCOc1ccccc1", "solvents": "DMF", "temperature": "60 °C"}
    answer = hydride_book.check(plan_from_words(words | {"bases": "K2CO3"}))
    changes = " ".join(a.change for a in answer.advice)
    assert "cesium carbonate" in changes or "caesium carbonate" in changes
    assert "hydride" not in changes
    with_hydride = hydride_book.check(plan_from_words(words | {"bases": "NaH"}))
    assert any(f.severity is Severity.SERIOUS for f in with_hydride.findings)  # which is why


def test_another_base_is_asked_whether_it_still_makes_the_nucleophile(tmp_path: Path) -> None:
    # Carbonate leaves an alcohol an alcohol (pKa 16 against 10.3, common practice): it is no way to an alkyl ether.
    with open_book(tmp_path / "book.sidepath", create=True) as book:
        for chain in range(2, 6):
            tail = "C" * chain
            for base in ("NaH", "K2CO3"):
                words = {"bases": base, "solvents": "THF", "temperature": "40 °C"}
                book.add(
                    Run(scheme=f"{tail}Br.CCO>>{tail}OCC", conditions=conditions_from_words(words), outcome=Outcome()),
                    "T",
                )
        words = {"scheme": "BrCCc1ccccc1.CCO>>CCOCCc1ccccc1", "bases": "KOtBu", "solvents": "THF"}
        advice = book.check(plan_from_words(words | {"temperature": "40 °C"})).advice
    assert not any("carbonate" in a.change for a in advice)


@pytest.mark.parametrize(
    ("gain", "low", "pace", "half_life_h", "is_worth", "why"),
    [
        (0.10, 0.02, 1.0, 1.0, True, "a gain at the same pace"),
        (0.01, 0.00, 1.0, 1.0, False, "too small a gain"),
        (0.10, -0.30, 1.0, 1.0, False, "as likely to do harm"),
        (0.05, 0.02, 0.05, 1.0, False, "twenty times slower for five points"),
        (0.30, 0.10, 0.05, 1.0, True, "twenty times slower, but still over in an hour or so, for thirty points"),
        (0.30, 0.10, 0.05, 400.0, False, "it would stall"),
    ],
)
def test_what_a_trend_must_offer(
    gain: float, low: float, pace: float, half_life_h: float, is_worth: bool, why: str
) -> None:
    found = Contrast(effect=Share(mean=gain, low=low, high=gain + 0.1), pace=pace, half_life_h=half_life_h)
    assert _is_worth_trying(found, plan_from_words({"scheme": "CCCBr"})) is is_worth, why


def test_where_a_group_is_to_be_lost_the_yield_is_what_counts(tmp_path: Path) -> None:
    # The carbamate goes either way, and hot acid takes the ether too: both are "loss of a group" in the split.
    with open_book(tmp_path / "book.sidepath", create=True) as book:
        for chain in range(2, 7):
            tail = "C" * chain
            for temperature, found in (("0 °C", 85.0), ("50 °C", 10.0)):
                words = {"acids": "HCl=10", "solvents": "1,4-dioxane", "temperature": temperature}
                run = Run(
                    scheme=f"CC(C)(C)O{tail}NC(=O)OC(C)(C)C>>CC(C)(C)O{tail}N",
                    conditions=conditions_from_words(words),
                    outcome=Outcome(
                        products=(ProductSeen(fate=Fate.GROUP_LOSS, share=0.97),), isolated_yield_pct=found
                    ),
                )
                book.add(run, "T")
        plan = {"scheme": f"CC(C)(C)O{'C' * 8}NC(=O)OC(C)(C)C>>CC(C)(C)O{'C' * 8}N", "temperature": "50 °C"}
        advice = book.check(plan_from_words(plan | {"acids": "HCl=10", "solvents": "1,4-dioxane"})).advice
    cold = find(advice, "about 0 °C")
    assert cold.pairs == 5
    assert cold.effect.mean > 0.5
    assert "in yield" in cold.why


def test_no_protic_solvent_is_offered_to_a_reagent_that_it_destroys(tmp_path: Path) -> None:
    # Water on thionyl chloride: common practice. The record holds chlorides made in water with hydrogen chloride.
    words = {"acids": "HCl", "solvents": "water", "temperature": "0 °C"}
    seen = (ProductSeen(fate=Fate.SUBSTITUTION, share=0.95), ProductSeen(fate=Fate.ELIMINATION, share=0.05))
    with open_book(tmp_path / "book.sidepath", create=True) as new:
        for tail in ("C", "CC", "CCC"):
            scheme = f"CC(C)(O)C{tail}>>CC(C)(Cl)C{tail}"
            outcome = Outcome(products=seen)
            new.add(Run(scheme=scheme, conditions=conditions_from_words(words), outcome=outcome), "T")
        plan = {"scheme": "CC(C)(O)CC>>CC(C)(Cl)CC", "reagents": "SOCl2", "bases": "pyridine"}
        found = new.check(plan_from_words(plan | {"solvents": "DCM", "temperature": "0 °C"}))
    assert not any(a.change.startswith("water") for a in found.advice)


def test_no_solvent_is_offered_that_boils_below_the_bath(tmp_path: Path) -> None:
    with open_book(tmp_path / "book.sidepath", create=True) as new:
        for chain in range(1, 5):
            new.add(run(chain, 0.60, temperature="110 °C"), "T")
            new.add(run(chain, 0.95, temperature="110 °C", solvents="acetone", vessel="sealed tube"), "T")
            new.add(run(chain, 0.90, temperature="110 °C", solvents="DMSO"), "T")
        advice = check(new, temperature="110 °C").advice
    assert any(a.change.startswith("dimethyl sulfoxide") for a in advice)
    assert not any(a.change.startswith("acetone") for a in advice)

"""Haloalkanes in water with half of the compounds on record: which way the other half goes, and in what order.

Source: tests/data/hydrolysis_haloalkanes.csv (US EPA, C. Stevens et al., Environ. Sci. Technol. 2017, 51, 5008), the
rows in neutral water. Every second compound is recorded at the temperatures measured and the others are checked at 25
°C; then the other way round, so that each compound is asked once. Compounds that set a constant of the published
model are on record but not counted.

The collection files 1,3-dibromopropane under elimination; the paper it cites (T. M. Vogel & M. Reinhard, Environ.
Sci. Technol. 1986, 20, 992, abstract) says that it hydrolysed to alcohols with no elimination products detected. It
is taken as the paper has it; a test below says what the collection's own label would make of the count.
"""

from __future__ import annotations

import csv
import math
from pathlib import Path

import pytest
from scipy.stats import spearmanr

from kb.book import open_book
from kb.book.plan_words import conditions_from_words
from kb.physorg.constants import rows_set_from
from kb.record.assessment import Estimate
from kb.record.outcome import Outcome, ProductSeen
from kb.record.plan import Plan
from kb.record.run import Run
from kb.vocabulary import Fate

DATA = Path(__file__).resolve().parent.parent / "data" / "hydrolysis_haloalkanes.csv"
PER_H = {"sec^-1": 3600.0, "hour^-1": 1.0, "min^-1": 60.0, "months^-1": 1 / 730.5}
MISFILED = "1,3-dibromopropane"
LONGEST_H = 1000.0


def read_rows() -> list[dict[str, str]]:
    with DATA.open(encoding="utf-8", newline="") as handle:
        rows = list(csv.DictReader(handle))
    return [r for r in rows if r["regime"] == "neutral" and r["pH"] in ("7", "") and r["k_units"] in PER_H]


def fate_of(row: dict[str, str]) -> Fate:
    is_elimination = row["sheet"].startswith("2_") and row["name"] != MISFILED
    return Fate.ELIMINATION if is_elimination else Fate.SUBSTITUTION


def run_of(row: dict[str, str]) -> Run:
    """Return a measurement as a run stopped at its half-life, or after LONGEST_H with what was left by then."""
    half_life_h = math.log(2) / (float(row["k_reported"]) * PER_H[row["k_units"]])
    hours = min(half_life_h, LONGEST_H)
    left = 0.5 ** (hours / half_life_h)
    words = {"solvents": "water", "temperature": f"{row['T_C']} °C", "time": f"{hours:.6g} h"}
    seen = (ProductSeen(fate=fate_of(row), share=1 - left), ProductSeen(fate=Fate.UNREACTED, share=left))
    return Run(scheme=row["smiles"], conditions=conditions_from_words(words), outcome=Outcome(products=seen))


@pytest.fixture(scope="module")
def answers(tmp_path_factory: pytest.TempPathFactory) -> list[tuple[dict[str, str], Estimate]]:
    """Return (a row of the compound, estimate at 25 °C) of each compound that counts."""
    rows = read_rows()
    compounds = list(dict.fromkeys(r["smiles"] for r in rows))
    set_from = {name.removeprefix("hydrolysis:") for name in rows_set_from()}
    found = []
    for half in (0, 1):
        asked = compounds[half::2]
        with open_book(tmp_path_factory.mktemp("hydrolysis") / f"{half}.sidepath", create=True) as book:
            book.store.add_many([run_of(r) for r in rows if r["smiles"] not in asked], who="T")
            for smiles in asked:
                conditions = conditions_from_words({"solvents": "water", "temperature": "25 °C"})
                estimate = book.check(Plan(scheme=smiles, conditions=conditions), top=0).estimate
                if smiles not in set_from and estimate.fates:
                    found.append((next(r for r in rows if r["smiles"] == smiles), estimate))
    return found


def goes_by_substitution(estimate: Estimate) -> bool:
    shares = {fate: interval.mean for fate, interval in estimate.fates}
    return shares.get(Fate.SUBSTITUTION, 0.0) > shares.get(Fate.ELIMINATION, 0.0)


def test_enough_compounds_count(answers: list[tuple[dict[str, str], Estimate]]) -> None:
    assert len(answers) >= 11


def test_direction_is_right_for_nine_in_ten(answers: list[tuple[dict[str, str], Estimate]]) -> None:
    right = [goes_by_substitution(e) == (fate_of(r) is Fate.SUBSTITUTION) for r, e in answers]
    assert sum(right) / len(right) >= 0.9
    as_filed = [goes_by_substitution(e) == r["sheet"].startswith("1_") for r, e in answers]
    assert sum(as_filed) == sum(right) - 1  # the misfiled compound, and nothing else


def test_order_of_half_lives_is_that_measured(answers: list[tuple[dict[str, str], Estimate]]) -> None:
    pairs = [
        (math.log10(e.half_life_h.mean), math.log10(float(r["half_life_days_25C"]) * 24))
        for r, e in answers
        if e.half_life_h is not None and r["half_life_days_25C"]
    ]
    ours, measured = zip(*pairs, strict=True)
    assert len(pairs) >= 11
    assert spearmanr(ours, measured)[0] >= 0.8


def test_a_hydrogen_of_one_carbon_goes_with_the_chlorine_of_the_other(
    answers: list[tuple[dict[str, str], Estimate]],
) -> None:
    by_name = {r["name"]: e for r, e in answers}
    assert not goes_by_substitution(by_name["Pentachloroethane"])

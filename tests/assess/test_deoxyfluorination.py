"""Yields of alcohols that the book has never seen, on measured deoxyfluorinations.

Source: M. K. Nielsen, D. T. Ahneman, O. Riera, A. G. Doyle, J. Am. Chem. Soc. 2018, 140, 5004 (CC BY 4.0), see
tests/data/deoxyfluorination.README.md. One alcohol at a time is left out; the runs of the other eighteen are the
record, read from a book on disk, and each left-out run is checked as a plan. Constants of `kb/assess/yields.py` and
`low_yield.py` were chosen on the same data by the same leaving-out, so this shows what the method reaches, not what a
new data set would give. How much of it the choice of constants is worth is asked too: constants chosen on one half of
the alcohols are tried on the other half, and no constant matters much.
"""

from __future__ import annotations

import csv
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pytest
from numpy.typing import NDArray

from kb.assess import assessment, yields
from kb.assess.assessment import assess
from kb.book import open_book
from kb.book.facade import Book
from kb.book.plan_words import conditions_from_words
from kb.record.assessment import Assessment
from kb.record.outcome import Outcome
from kb.record.run import Run
from kb.vocabulary import FindingKind, Severity

DATA = Path(__file__).resolve().parent.parent / "data" / "deoxyfluorination.csv"
NOTHING_PCT = 5.0


@dataclass(frozen=True)
class LeftOut:
    """Every run, checked without the runs of its alcohol."""

    rows: list[dict[str, str]]
    measured: NDArray[np.float64]
    assessments: list[Assessment]
    fits: list[tuple[object, ...]]
    """What the fit of each yield was given, in the order of `rows`."""

    @property
    def expected(self) -> NDArray[np.float64]:
        return np.array([a.estimate.yield_pct.mean for a in self.assessments if a.estimate.yield_pct is not None])

    def column(self, name: str) -> NDArray[np.str_]:
        return np.array([row[name] for row in self.rows])


def read_rows() -> list[dict[str, str]]:
    with DATA.open(encoding="utf-8", newline="") as handle:
        return list(csv.DictReader(handle))


def run_of(row: dict[str, str]) -> Run:
    return Run(
        scheme=row["rxn_smiles_unmapped"],
        conditions=conditions_from_words({"solvents": "THF", "temperature": "25 °C"}),
        outcome=Outcome(assay_yield_pct=float(row["yield_pct"])),
        reference=row["id"],
    )


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> Book:
    place = tmp_path_factory.mktemp("deoxyfluorination") / "book.sidepath"
    with open_book(place, create=True) as new:
        new.store.add_many([run_of(row) for row in read_rows()], who="T")
    return open_book(place, read_only=True)


@pytest.fixture(scope="module")
def left_out(book: Book) -> LeftOut:
    rows, view = read_rows(), book.view()
    alcohol = np.array([row["substrate"] for row in rows])
    assessments: list[Assessment] = []
    fits: list[tuple[object, ...]] = []

    def remembering(*given: object) -> yields.YieldFit | None:
        fits.append(given)
        return yields.fit_yield(*given)  # type: ignore[arg-type]

    monkeypatch = pytest.MonkeyPatch()
    monkeypatch.setattr(assessment, "fit_yield", remembering)
    for one in dict.fromkeys(alcohol):
        others = view.only(alcohol != one)
        rest = book.finder().tanimoto_of_runs(view.table.substrate[int(np.argmax(alcohol == one))], others.table.codes)
        assessments += [assess(run_of(rows[i]).plan, others, (), rest, 0) for i in np.flatnonzero(alcohol == one)]
    monkeypatch.undo()
    order = np.argsort(np.concatenate([np.flatnonzero(alcohol == one) for one in dict.fromkeys(alcohol)]))
    return LeftOut(
        rows=rows,
        measured=np.clip(np.array([float(row["yield_pct"]) for row in rows]), 0, 100),
        assessments=[assessments[i] for i in order],
        fits=[fits[i] for i in order],
    )


def mean_of_others(data: LeftOut, *columns: str) -> NDArray[np.float64]:
    """Return the mean yield of the runs of other alcohols that agree in some columns."""
    alcohol = data.column("substrate")
    same = np.ones((len(data.rows), len(data.rows)), dtype=bool)
    for name in columns:
        values = data.column(name)
        same &= values[:, None] == values
    same &= alcohol[:, None] != alcohol
    return np.asarray(same @ data.measured / same.sum(axis=1))


def error(expected: NDArray[np.float64], data: LeftOut) -> float:
    return float(np.abs(expected - data.measured).mean())


def test_every_run_gets_a_yield(left_out: LeftOut) -> None:
    assert len(left_out.expected) == len(left_out.rows) == 380


def test_yields_are_at_least_22_percent_nearer_than_either_mean(left_out: LeftOut) -> None:
    same_flask = error(mean_of_others(left_out, "base", "sulfonyl_fluoride"), left_out)
    same_class = error(mean_of_others(left_out, "centre_degree"), left_out)
    ours = error(left_out.expected, left_out)
    assert ours <= 0.78 * min(same_flask, same_class)
    # On the whole published set the two means miss by 23.8 and 23.2 points (the target that this project was given).
    assert ours <= 0.78 * 23.2


def test_eighty_percent_intervals_hold_eighty_percent(left_out: LeftOut) -> None:
    intervals = [a.estimate.yield_pct for a in left_out.assessments if a.estimate.yield_pct is not None]
    held = [i.low <= y <= i.high for i, y in zip(intervals, left_out.measured, strict=True)]
    assert 0.74 <= np.mean(held) <= 0.86


def test_failures_are_warned_of_better_than_by_carbon_class(left_out: LeftOut) -> None:
    failed = np.array([float(row["yield_pct"]) for row in left_out.rows]) < NOTHING_PCT
    warned = np.array(
        [
            any(f.kind is FindingKind.RESEMBLANCE and f.severity is not Severity.NOTE for f in a.findings)
            for a in left_out.assessments
        ]
    )
    tertiary = left_out.column("centre_degree") == "tertiary"  # the one class that mostly fails
    assert failed[warned].mean() > failed[tertiary].mean()
    assert warned[failed].mean() > tertiary[failed].mean()


CHOICES: tuple[dict[str, float], ...] = (
    {"CENTRE": 600.0},
    {"CONDITIONS": 600.0},
    {"UNWILLING": 100.0},
    {"NOISE": 1000.0},
    {"RECOVERY_PCT": 55.0},
)
"""Constants of the fit, each a few times smaller or larger than as shipped, one at a time."""
EVERY = 5


def missed_with(left_out: LeftOut, **constants: float) -> NDArray[np.float64]:
    """Return by how much every fifth yield is missed [points], without its alcohol, with some constants changed."""
    missed = np.full(len(left_out.rows), np.nan)
    with pytest.MonkeyPatch.context() as patch:
        for name, value in constants.items():
            patch.setattr(yields, name, value)
        for place in range(0, len(left_out.rows), EVERY):
            fit = yields.fit_yield(*left_out.fits[place])  # type: ignore[arg-type]
            assert fit is not None
            missed[place] = abs(fit.yield_pct.mean - left_out.measured[place])
    return missed


def test_constants_chosen_on_other_alcohols_serve_as_well(left_out: LeftOut) -> None:
    missed = np.array([missed_with(left_out, **choice) for choice in ({}, *CHOICES)])
    asked = ~np.isnan(missed[0])
    alcohols = list(dict.fromkeys(left_out.column("substrate")))
    is_even = np.isin(left_out.column("substrate"), alcohols[::2])
    nested = np.full(len(left_out.rows), np.nan)
    for half in (is_even, ~is_even):
        best = int(np.argmin(missed[:, asked & ~half].mean(axis=1)))
        nested[half] = missed[best][half]
    same_class = error(mean_of_others(left_out, "centre_degree"), left_out)
    assert nested[asked].mean() <= 0.78 * same_class
    assert missed[:, asked].mean(axis=1).max() <= 0.85 * same_class  # nor does any one of them matter much


def test_a_warning_names_runs_that_gave_next_to_nothing(left_out: LeftOut, book: Book) -> None:
    found = [f for a in left_out.assessments for f in a.findings if f.rule_id.startswith("resemblance:next-to-nothing")]
    assert found
    for finding in found[::10]:
        assert finding.evidence is not None
        yields = [book.get(code).outcome.yield_pct for code in finding.evidence.runs[: finding.evidence.lost]]
        assert yields
        assert all(y is not None and y < NOTHING_PCT for y in yields)


def test_a_book_without_the_alcohol_says_the_same(left_out: LeftOut, tmp_path: Path) -> None:
    alcohol = "O=C1OCCC1O"
    with open_book(tmp_path / "others.sidepath", create=True) as other:
        other.store.add_many([run_of(r) for r in left_out.rows if r["substrate"] != alcohol], who="T")
        place = next(i for i, r in enumerate(left_out.rows) if r["substrate"] == alcohol)
        answer = other.check(run_of(left_out.rows[place]).plan, top=0)
    assert answer.estimate == left_out.assessments[place].estimate

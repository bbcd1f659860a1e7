"""The entry form as text: integrals become a split, bad fields are named, nothing measured is not zero."""

from __future__ import annotations

import pytest

from kb.vocabulary import Fate, Method, Verdict
from tests.tui.fake_book import AZIDE_SCHEME, MESYLATE, FakeBook, a_run
from tui.condition_text import ConditionTexts, read_conditions, write_conditions
from tui.entry_state import (
    INTEGRALS,
    SHARES,
    changes_between,
    possible_rows,
    read_entry,
    read_split,
    rows_in,
    state_of_outcome,
    with_rows,
)
from tui.plan_state import read_plan, state_of_run, what_if_temperatures


def a_state(**changes: str) -> dict[str, str]:
    rows = possible_rows(FakeBook().read_scheme(MESYLATE))
    state = {"scheme": MESYLATE, "how": INTEGRALS, "method": "nmr", "reagent": "NaN3=1.5", "solvent": "DMF"}
    return {**with_rows(state, rows), **changes}


def test_the_products_that_could_form_are_proposed_and_the_substrate_with_them() -> None:
    fates = [row.fate for row in rows_in(a_state())]
    assert fates == [Fate.SUBSTITUTION, Fate.ELIMINATION, Fate.ELIMINATION, Fate.UNREACTED]


def test_integrals_over_protons_become_shares() -> None:
    """2.00 for two protons, 0.50 for one and 0.50 for one: 2/3... of 2 moles in all, by hand 50, 25, 25 %."""
    state = a_state(**{"p0.value": "2.00", "p0.protons": "2", "p1.value": "0.50", "p2.value": "0.5"})
    shares = [row.share.mean if row.share else None for row in read_split(state).rows]
    assert shares[:3] == pytest.approx([0.5, 0.25, 0.25], abs=1e-3)
    assert shares[3] is None


def test_empty_is_not_looked_for_zero_is_measured_and_seen_is_not_measured() -> None:
    state = a_state(**{"p0.value": "1", "p1.value": "0", "p2.value": "trace"})
    run = read_entry(state, FakeBook(), "JM").run
    assert run is not None
    found = [(p.fate, p.share) for p in run.outcome.products]
    assert found == [(Fate.SUBSTITUTION, 1.0), (Fate.ELIMINATION, 0.0), (Fate.ELIMINATION, None)]


def test_shares_in_percent_keep_their_sum() -> None:
    state = a_state(**{"how": SHARES, "p0.value": "88", "p1.value": "10,5"})
    read = read_split(state)
    assert read.total == pytest.approx(0.985)
    run = read_entry(state, FakeBook(), "JM").run
    assert run is not None
    assert run.outcome.products[0].share_low is None


def test_the_run_holds_what_the_form_holds() -> None:
    state = a_state(
        **{
            "p0.value": "1.8",
            "p0.protons": "2",
            "p1.value": "0.1",
            "isolated": "71",
            "verdict": "partly",
            "failures": "elimination",
            "motif": "[CH]",
            "cause": "suspected",
            "note": "smelled of alkene",
            "reference": "JM-12",
            "date": "2026-03-01",
            "temperature": "80 C",
        }
    )
    run = read_entry(state, FakeBook(), "JM").run
    assert run is not None
    assert run.verdict is Verdict.PARTLY
    assert run.outcome.isolated_yield_pct == 71
    assert run.outcome.products[0].method is Method.NMR
    assert run.outcome.products[0].protons == 2
    assert (run.outcome.failures[0].mode, run.outcome.failures[0].motif) == ("elimination", "[CH]")
    assert str(run.date) == "2026-03-01"
    assert run.by == "JM"
    assert run.note == "smelled of alkene"


@pytest.mark.parametrize(
    ("changes", "field"),
    [
        ({"scheme": " "}, "scheme"),
        ({"temperature": "warm"}, "temperature"),
        ({"solvent": "quicksilver"}, "solvent"),
        ({"isolated": "250"}, "isolated"),
        ({"ee": "x"}, "ee"),
        ({"date": "yesterday"}, "date"),
        ({"p0.value": "much"}, "p0.value"),
        ({"p0.value": "-1"}, "p0.value"),
        ({"p0.value": "1", "p0.protons": "none"}, "p0.value"),
        ({"p0.value": "1", "p0.protons": "0"}, "p0.value"),
        ({"p0.value": "0", "p1.value": "0"}, "p.total"),
    ],
)
def test_each_bad_field_is_named_and_no_run_is_made(changes: dict[str, str], field: str) -> None:
    read = read_entry(a_state(**changes), FakeBook(), "JM")
    assert read.run is None
    assert set(read.errors) == {field}
    assert str(read.errors[field])


def test_figures_stay_with_their_product_when_the_scheme_is_read_again() -> None:
    state = a_state(**{"p1.value": "0.4"})
    rows = rows_in(state)
    turned = with_rows(state, tuple(reversed(rows)))
    kept = [turned[f"p{n}.value"] for n, row in enumerate(rows_in(turned)) if row == rows[1]]
    assert kept == ["0.4"]
    fewer = with_rows(state, rows[:1])
    assert [row.smiles for row in rows_in(fewer)] == [rows[0].smiles, rows[1].smiles]


def test_a_run_written_into_the_form_and_read_again_is_the_same_run() -> None:
    book, run = FakeBook(), a_run(note="as it was")
    state = {**state_of_outcome(run), **state_of_run(run)}
    again = read_entry(state, book, "XX").run
    assert again is not None
    changes = changes_between(run, again)
    assert set(changes) <= {"conditions"}  # only the catalogue's SMILES were added to the names
    assert [c.name for c in again.conditions.components] == ["NaN3"]


def test_conditions_survive_being_written_and_read() -> None:
    texts = ConditionTexts(
        reagent="NaN3=1.5; NaI=0.1", solvent="THF:4; water:1", temperature="0C to rt", time="overnight", scale="5 mmol"
    )
    conditions, errors = read_conditions(texts, FakeBook())
    assert not errors
    assert write_conditions(conditions) == texts


def test_every_bad_condition_is_reported_at_once() -> None:
    texts = ConditionTexts(reagent="XX; YY", solvent="ZZ", temperature="warm", time="long", concentration="2")
    conditions, errors = read_conditions(texts, FakeBook())
    assert set(errors) == {"reagent", "solvent", "temperature", "time", "concentration"}
    assert conditions.components == ()


def test_a_plan_without_a_numbered_temperature_has_no_plot() -> None:
    read = read_plan({"scheme": "CCBr", "temperature": "reflux"}, FakeBook())
    assert what_if_temperatures(read.plan) == ()
    warm = read_plan({"scheme": "CCBr", "temperature": "60 C"}, FakeBook())
    assert 60.0 in what_if_temperatures(warm.plan)
    cold = read_plan({"scheme": AZIDE_SCHEME, "temperature": "-78 C"}, FakeBook())
    assert min(what_if_temperatures(cold.plan)) >= -78

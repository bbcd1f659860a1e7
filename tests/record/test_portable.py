"""The portable form of a run is lossless, readable, and refuses what it does not know."""

from __future__ import annotations

import json

import pytest
from hypothesis import given
from hypothesis import settings as hypothesis_settings

from kb.errors import InvalidRecord
from kb.record.portable import run_from_dict, run_to_dict
from kb.record.run import Run
from tests.factories import a_run, runs


@given(runs())
def test_any_run_comes_back_equal_through_json_text(run: Run) -> None:
    text = json.dumps(run_to_dict(run), ensure_ascii=False, allow_nan=False)
    assert run_from_dict(json.loads(text)) == run


@pytest.mark.soak
@given(runs())
@hypothesis_settings(max_examples=5000)
def test_five_thousand_runs_come_back_equal_through_json_text(run: Run) -> None:
    text = json.dumps(run_to_dict(run), ensure_ascii=False, allow_nan=False)
    assert run_from_dict(json.loads(text)) == run


def test_the_form_is_readable() -> None:
    form = run_to_dict(a_run())
    assert form["sidepath_run"] == 1
    assert form["verdict"] == "worked"
    assert form["date"] == "2024-05-16"
    assert form["conditions"]["components"][0] == {
        "role": "reagent",
        "name": "NaN3",
        "smiles": "[N-]=[N+]=[N-].[Na+]",
        "equiv": 1.5,
    }
    assert form["outcome"]["products"][1]["share"] == 0.07


def test_zero_is_measured_and_missing_is_not_recorded() -> None:
    run = run_from_dict({"scheme": "CBr>>CO", "outcome": {"ee_pct": 0, "products": [{"fate": "other", "share": 0}]}})
    assert run.outcome.ee_pct == 0
    assert run.outcome.products[0].share == 0
    assert run.outcome.conversion_pct is None
    assert run_to_dict(run)["outcome"]["products"] == [{"fate": "other", "share": 0.0}]


def test_only_the_scheme_must_be_there() -> None:
    run = run_from_dict({"scheme": "CBr>>CO"})
    assert run == Run(scheme="CBr>>CO", run_id=run.run_id)


def test_whole_numbers_and_decimals_are_the_same_amount() -> None:
    run = run_from_dict({"scheme": "CBr", "conditions": {"scale_mmol": 5}})
    assert isinstance(run.conditions.scale_mmol, float)


@pytest.mark.parametrize(
    ("data", "place"),
    [
        ([], "run is"),
        ({}, "no scheme"),
        ({"scheme": 7}, "run.scheme is 7"),
        ({"scheme": "C", "colour": "red"}, "'colour'"),
        ({"scheme": "C", "conditions": []}, "run.conditions is"),
        ({"scheme": "C", "conditions": {"scale": 1}}, "run.conditions has a key 'scale'"),
        ({"scheme": "C", "conditions": {"scale_mmol": "5 mmol"}}, "run.conditions.scale_mmol"),
        ({"scheme": "C", "conditions": {"scale_mmol": True}}, "run.conditions.scale_mmol"),
        ({"scheme": "C", "conditions": {"scale_mmol": float("nan")}}, "run.conditions.scale_mmol"),
        ({"scheme": "C", "conditions": {"scale_mmol": float("inf")}}, "run.conditions.scale_mmol"),
        ({"scheme": "C", "conditions": {"scale_mmol": 10**400}}, "run.conditions.scale_mmol"),
        ({"scheme": "C", "conditions": {"scale_mmol": -1}}, "scale_mmol is -1"),
        ({"scheme": "C", "conditions": {"components": {}}}, "run.conditions.components"),
        ({"scheme": "C", "conditions": {"components": [{"role": "base"}]}}, "components[0].name"),
        ({"scheme": "C", "conditions": {"components": [{"role": "b", "name": "x"}]}}, "components[0].role"),
        ({"scheme": "C", "conditions": {"temperature": "60 C"}}, "run.conditions.temperature"),
        ({"scheme": "C", "outcome": {"products": [{"fate": "vanished"}]}}, "products[0].fate"),
        ({"scheme": "C", "outcome": {"products": [{"fate": "other", "share": 1.5}]}}, "share of other is 1.5"),
        ({"scheme": "C", "outcome": {"products": [{"fate": "other", "protons": 2.5}]}}, "protons"),
        ({"scheme": "C", "outcome": {"products": [{"fate": "other", "protons": 2**70}]}}, "protons"),
        ({"scheme": "C", "date": "17.5.2024"}, "run.date"),
        ({"scheme": "C", "recorded_at": "2024-05-17T09:30:00"}, "run.recorded_at"),
        ({"scheme": "C", "run_id": "42"}, "run.run_id"),
        ({"scheme": "C", "revision": -1}, "run.revision"),
        ({"scheme": "C", "note": "a\x00b"}, "run.note"),
        ({"scheme": "C", "note": "a\ud800b"}, "run.note"),
        ({"scheme": "C", "sidepath_run": 2}, "form 2"),
        ({"scheme": "C", "attachments": [{"name": "a", "sha256": "0"}]}, "attachments[0].size_bytes"),
    ],
)
def test_what_it_cannot_take_is_refused_with_the_place(data: object, place: str) -> None:
    with pytest.raises(InvalidRecord) as caught:
        run_from_dict(data)  # type: ignore[arg-type]
    assert place in caught.value.message
    assert caught.value.hint


def test_a_hostile_key_is_shown_escaped() -> None:
    with pytest.raises(InvalidRecord) as caught:
        run_from_dict({"scheme": "C", "\x1b[2J": 1})
    assert "\x1b" not in str(caught.value)

"""Whether one set of conditions is at least as forcing as another; common practice throughout."""

from __future__ import annotations

import numpy as np
import pytest
from tables_by_hand import facts, table_of

from kb.assess.forcing import HALVING_K, harsher_by_k, is_at_least_as_forcing, is_no_more_forcing, say_of
from kb.assess.table import one_row
from kb.materials.profile import ConditionProfile

KNOWN = {"has_unknown_reagent": False, "has_unknown_solvent": False, "lewis_acid": "none"}
HOT_ACID = ConditionProfile(acidity="strong", temperature_c=50.0, **KNOWN)  # type: ignore[arg-type]
STRONG_BASE = ConditionProfile(acidity="none", base_pkah=17.0, temperature_c=60.0, **KNOWN)  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("changes", "failed", "expected", "why"),
    [
        ({"acidity": "strong", "temperature_c": 60.0}, HOT_ACID, True, "hotter in the same acid"),
        ({"acidity": "strong", "temperature_c": 0.0}, HOT_ACID, False, "fifty kelvin colder"),
        ({"acidity": "weak", "temperature_c": 60.0}, HOT_ACID, False, "a weaker acid"),
        ({"acidity": "strong", "temperature_c": None}, HOT_ACID, None, "temperature not recorded"),
        ({"acidity": "none", "base_pkah": 19.0, "temperature_c": 60.0}, STRONG_BASE, True, "a stronger base"),
        (
            {"acidity": "none", "base_pkah": 10.3, "temperature_c": 90.0},
            STRONG_BASE,
            False,
            "carbonate is weaker",
        ),
        ({"acidity": "none", "temperature_c": 90.0}, STRONG_BASE, False, "no base, and all is known"),
    ],
)
def test_forcing(changes: dict, failed: ConditionProfile, expected: bool | None, why: str) -> None:
    assert is_at_least_as_forcing(ConditionProfile(**(KNOWN | changes)), failed) is expected, why


def test_an_unknown_reagent_leaves_the_question_open() -> None:
    plan = ConditionProfile(has_unknown_reagent=True, temperature_c=60.0)
    assert is_at_least_as_forcing(plan, STRONG_BASE) is None


def test_for_runs_in_which_nothing_happened_the_comparison_turns_round() -> None:
    cooler = ConditionProfile(acidity="none", base_pkah=17.0, temperature_c=20.0, **KNOWN)  # type: ignore[arg-type]
    assert is_no_more_forcing(cooler, STRONG_BASE) is True
    assert is_at_least_as_forcing(cooler, STRONG_BASE) is False


def harsher(plan: dict, run: dict) -> float:
    table = table_of((facts(**run), {}, None, None))
    return float(harsher_by_k(one_row(facts(**plan)), table, np.array([0]))[0])


@pytest.mark.parametrize(
    ("plan", "run", "sign", "why"),
    [
        ({"temperature_c": 20.0}, {"temperature_c": 50.0}, 1, "thirty kelvin hotter"),
        ({"temperature_c": 50.0}, {"temperature_c": 20.0}, -1, "thirty kelvin colder"),
        ({"acidity": "weak"}, {"acidity": "strong"}, 1, "a stronger acid at the same temperature"),
        ({"acidity": "strong"}, {"acidity": "none"}, -1, "no acid"),
        ({"base_pkah": 10.0}, {"base_pkah": 19.0}, 1, "a much stronger base"),
        ({"base_pkah": 1.0}, {"base_pkah": 4.7}, 0, "neither is a base that forces anything"),
        ({"temperature_c": None}, {"temperature_c": 90.0}, 0, "not recorded adds nothing"),
        (
            {"acidity": "strong", "base_pkah": 19.0},
            {"acidity": "strong", "base_pkah": 4.7},
            0,
            "acid decides where there is acid",
        ),
    ],
)
def test_how_much_harsher_a_run_was(plan: dict, run: dict, sign: int, why: str) -> None:
    assert np.sign(harsher(plan, run)) == sign, why


def test_a_level_of_acid_outweighs_some_kelvin() -> None:
    cold_strong = {"acidity": "strong", "temperature_c": 55.0}
    assert harsher({"acidity": "weak", "temperature_c": 60.0}, cold_strong) > 0


def test_witnesses_who_hold_for_the_plan_all_the_more_count_in_full() -> None:
    harsher_k = np.array([-40.0, 40.0, 0.0])
    assert say_of(harsher_k, np.array([True, True, True])).tolist()[::2] == [1.0, 1.0]
    assert say_of(harsher_k, np.array([False, False, False])).tolist()[1:] == [1.0, 1.0]


def test_others_count_half_for_each_step() -> None:
    say = say_of(np.array([5.0, 5.0 + HALVING_K, 5.0 + 2 * HALVING_K]), np.array([True, True, True]))
    assert say.tolist() == [1.0, 0.5, 0.25]
    assert say_of(np.array([-25.0]), np.array([False]))[0] == 0.25

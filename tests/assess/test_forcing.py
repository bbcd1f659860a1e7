"""Whether one set of conditions is at least as forcing as another; common practice throughout."""

from __future__ import annotations

import pytest

from kb.assess.forcing import is_at_least_as_forcing, is_no_more_forcing
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

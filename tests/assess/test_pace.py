"""Half-lives: published figures moved by what like runs took. First-order arithmetic is checked by hand."""

from __future__ import annotations

import math

import numpy as np
import pytest
from tables_by_hand import facts, table_of, view_of

from kb.assess.pace import expect_half_life, half_life_of
from kb.assess.published_runs import published_run
from kb.assess.record_view import RecordView
from kb.materials.profile import ConditionProfile
from kb.record.finding import Interval
from kb.record.run import Run

MEDIUM = ConditionProfile(
    solvent_classes=frozenset({"amide", "polar-aprotic"}),
    has_unknown_solvent=False,
    reagent_classes=frozenset({"azide"}),
    nucleophile_class="azide",
    temperature_c=25.0,
    acidity="none",
)
PUBLISHED = Interval(mean=2.0, low=0.3, high=14.0)


def view(*runs: tuple[float | None, float | None]) -> RecordView:
    """Return runs of n-butyl bromide with (time [h], share left)."""
    rows = [
        (
            facts(carbon_class="primary", substrate="CCCCBr", centre_atom=3, time_h=hours),
            {} if left is None else {"unreacted": left, "substitution": 1 - left},
            None,
            None,
        )
        for hours, left in runs
    ]
    return view_of(table_of(*rows), [MEDIUM] * len(rows), [()] * len(rows), [Run(scheme="CBr")] * len(rows))


@pytest.mark.parametrize(
    ("hours", "left", "half_life"),
    [(4.0, 0.5, 4.0), (4.0, 0.25, 2.0), (10.0, 0.9, 10 * math.log(2) / -math.log(0.9))],
)
def test_a_run_shows_its_half_life_by_first_order(hours: float, left: float, half_life: float) -> None:
    assert half_life_of(view((hours, left)), 0) == pytest.approx(half_life)


@pytest.mark.parametrize("run", [(None, 0.5), (4.0, None), (4.0, 0.0), (16.0, 0.04), (4.0, 1.0), (0.0, 0.5)])
def test_a_run_that_cannot_tell_shows_none(run: tuple[float | None, float | None]) -> None:
    assert half_life_of(view(run), 0) is None


def test_without_a_published_figure_there_is_none() -> None:
    assert expect_half_life(None, view((4.0, 0.5)), np.ones(1)) is None


def test_without_like_runs_it_is_the_published_one() -> None:
    found = expect_half_life(PUBLISHED, view((4.0, 0.5)), np.zeros(1))
    assert found is not None
    assert found.mean == pytest.approx(PUBLISHED.mean)


def test_slow_runs_move_it_their_way_and_narrow_it() -> None:
    slow = view(*[(2000.0, 0.5)] * 6)
    published = published_run(slow, 0)
    assert published is not None
    assert published.half_life_h is not None
    assert published.half_life_h < 200
    moved = expect_half_life(PUBLISHED, slow, np.ones(6))
    assert moved is not None
    assert moved.mean > 3 * PUBLISHED.mean
    assert moved.high / moved.low < PUBLISHED.high / PUBLISHED.low


def test_unlike_runs_move_it_less() -> None:
    slow = view(*[(2000.0, 0.5)] * 3)
    near, far = (expect_half_life(PUBLISHED, slow, np.full(3, s)) for s in (1.0, 0.55))
    assert near is not None
    assert far is not None
    assert near.mean > far.mean > PUBLISHED.mean

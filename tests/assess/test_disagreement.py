"""Contradictions: which two runs, and what is known to differ or was left unwritten. Runs are invented."""

from __future__ import annotations

import numpy as np
from tables_by_hand import facts, table_of, view_of

from kb.assess.disagreement import word_disagreement
from kb.assess.record_view import RecordView
from kb.book.plan_words import conditions_from_words
from kb.materials.profile import ConditionProfile
from kb.record.run import Run
from kb.vocabulary import Fate

DRY = ConditionProfile(water=False)


def view(*runs: tuple[float, dict, ConditionProfile, dict]) -> RecordView:
    """Return runs of (share of elimination, facts, profile, words of the conditions)."""
    rows = [(facts(**own), {"elimination": e, "substitution": 1 - e}, None, None) for e, own, _, _ in runs]
    stored = [
        Run(scheme="CCC(C)Br", conditions=conditions_from_words(w), code=f"R-{i + 1}") for i, (*_, w) in enumerate(runs)
    ]
    return view_of(table_of(*rows), [p for _, _, p, _ in runs], [()] * len(runs), stored)


def test_runs_that_agree_are_no_contradiction() -> None:
    agreeing = view((0.15, {}, DRY, {}), (0.2, {}, DRY, {}), (0.25, {}, DRY, {}))
    assert word_disagreement(agreeing, np.ones(3), Fate.ELIMINATION) == ""


def test_the_two_that_disagree_most_are_named_with_their_shares() -> None:
    three = view((0.15, {}, DRY, {}), (0.5, {}, DRY, {}), (0.7, {}, DRY, {}))
    said = word_disagreement(three, np.ones(3), Fate.ELIMINATION)
    assert "R-1 gave 15 % elimination, R-3 gave 70 % elimination" in said


def test_water_in_one_and_not_written_down_in_the_other_is_said_first() -> None:
    wet = view(
        (0.15, {}, ConditionProfile(water=True), {"solvents": ["DMF", "water"]}),
        (0.7, {"temperature_c": 80.0}, ConditionProfile(water=None), {"solvents": "DMF"}),
    )
    said = word_disagreement(wet, np.ones(2), Fate.ELIMINATION)
    assert "what differs: water in R-1, water content not recorded in R-2" in said
    assert "R-2: 80 °C" in said


def test_what_one_of_them_left_out_is_said() -> None:
    silent = view((0.1, {}, DRY, {"time": "4 h"}), (0.9, {}, DRY, {}))
    assert "time not recorded in R-2" in word_disagreement(silent, np.ones(2), Fate.ELIMINATION)


def test_where_nothing_differs_that_is_said_too() -> None:
    twins = view((0.1, {}, DRY, {}), (0.9, {}, DRY, {}))
    assert "nothing that was recorded differs" in word_disagreement(twins, np.ones(2), Fate.ELIMINATION)


def test_far_runs_contradict_nobody() -> None:
    far = view((0.1, {}, DRY, {}), (0.9, {}, DRY, {}))
    assert word_disagreement(far, np.array([1.0, 0.3]), Fate.ELIMINATION) == ""


def test_a_close_pair_is_named_before_a_wider_gap_far_away() -> None:
    runs = view((0.1, {}, DRY, {}), (0.7, {}, DRY, {}), (0.9, {}, DRY, {}))
    said = word_disagreement(runs, np.array([1.0, 1.0, 0.5]), Fate.ELIMINATION)
    assert "R-1" in said
    assert "R-2" in said


def test_one_outlier_among_many_that_agree_is_no_contradiction() -> None:
    runs = view(*[(0.2, {}, DRY, {})] * 11, (0.55, {}, DRY, {}))
    assert word_disagreement(runs, np.ones(12), Fate.ELIMINATION) == ""

"""The best rows, checked against sorting everything."""

from __future__ import annotations

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from kb.assess.ranking import best_rows

SCORES = st.lists(st.sampled_from([0.0, 0.1, 0.5, 0.5001, 0.9, 1.0]), max_size=40)


@given(SCORES, st.integers(-1, 45))
def test_the_answer_is_that_of_a_stable_sort(scores: list[float], count: int) -> None:
    score = np.array(scores)
    expected = np.argsort(-score, kind="stable")[: max(count, 0)]
    assert best_rows(score, count).tolist() == expected.tolist()


@given(SCORES, st.integers(0, 45), st.data())
def test_only_the_rows_asked_about_are_ranked(scores: list[float], count: int, data: st.DataObject) -> None:
    score = np.array(scores)
    among = np.array(
        sorted(data.draw(st.sets(st.integers(0, len(scores) - 1)) if scores else st.just(set()))), dtype=int
    )
    found = best_rows(score, count, among)
    expected = sorted(among.tolist(), key=lambda row: (-score[row], row))[:count]
    assert found.tolist() == expected

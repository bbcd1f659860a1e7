"""Matched pairs: who is paired with whom, and what the mean of their differences may claim."""

from __future__ import annotations

import numpy as np
import pytest
from tables_by_hand import facts, table_of

from kb.assess.advice_pairs import PRIOR_SD, mean_effect, pair_runs
from kb.assess.table import FATES, FactTable
from kb.vocabulary import Fate

OTHER = bytes([170] * 32)
COLUMN = FATES.index(Fate.SUBSTITUTION)


def table(*rows: tuple[str, float]) -> FactTable:
    """Return runs of (substrate, share of substitution)."""
    return table_of(*((facts(substrate=s), {"substitution": x, "elimination": 1 - x}, None, None) for s, x in rows))


def paired(runs: FactTable, here: list[int], there: list[int]):  # type: ignore[no-untyped-def]
    return pair_runs(runs, here, there, runs.shares[:, COLUMN])


def test_runs_of_one_substrate_are_paired_before_others() -> None:
    runs = table(("CCBr", 0.5), ("CCCBr", 0.6), ("CCCBr", 0.8), ("CCBr", 0.7))
    found = paired(runs, [0, 1], [2, 3])
    assert set(found.pairs) == {(0, 3), (1, 2)}
    assert found.same_substrate == 2
    assert found.effect.mean == pytest.approx(0.2 * 2 / 3, abs=1e-3)


def test_without_a_common_substrate_like_centres_are_paired() -> None:
    runs = table_of(
        (facts(substrate="CBr"), {"substitution": 0.5}, None, None),
        (facts(substrate="CCBr", centre_bits=OTHER), {"substitution": 0.5}, None, None),
        (facts(substrate="CCCBr", centre_bits=OTHER), {"substitution": 0.5}, None, None),
    )
    assert pair_runs(runs, [0, 1], [2], runs.shares[:, COLUMN]).pairs == ((1, 2),)  # type: ignore[union-attr]


def test_no_run_is_used_twice() -> None:
    runs = table(*[("CCBr", 0.5)] * 3, *[("CCBr", 0.9)] * 5)
    found = paired(runs, [0, 1, 2], [3, 4, 5, 6, 7])
    assert len(found.pairs) == 3
    assert len({b for _, b in found.pairs}) == 3


def test_a_side_without_runs_gives_no_pair() -> None:
    assert paired(table(("CCBr", 0.5)), [0], []) is None
    assert paired(table(("CCBr", 0.5)), [], [0]) is None


def test_one_lucky_pair_is_no_law() -> None:
    lucky, many = mean_effect(np.array([0.3])), mean_effect(np.full(12, 0.3))
    assert lucky.mean < many.mean
    assert lucky.high - lucky.low > many.high - many.low > 0


def test_a_lone_pair_is_as_unsure_as_a_single_difference() -> None:
    effect = mean_effect(np.array([0.3]))
    assert effect.high - effect.mean == pytest.approx(1.2816 * PRIOR_SD, abs=0.002)


def test_the_interval_holds_the_mean_and_stays_between_minus_and_plus_one() -> None:
    for differences in ([1.0, 1.0], [-1.0], [0.5, -0.5], [0.0]):
        effect = mean_effect(np.array(differences))
        assert -1 <= effect.low <= effect.mean <= effect.high <= 1


def test_with_many_pairs_the_interval_is_that_of_the_mean() -> None:
    # 80 % interval of a mean of n differences: 1.2816 standard errors (normal quantile, scipy.stats.norm.ppf(0.9)).
    differences = np.random.default_rng(1).normal(0.1, 0.2, 400)
    effect = mean_effect(differences)
    assert effect.high - effect.mean == pytest.approx(1.2816 * differences.std() / 20, rel=0.05)

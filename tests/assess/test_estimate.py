"""The arithmetic of evidence, checked against scipy's distributions and against what honesty demands."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats
from tables_by_hand import facts, table_of

from kb.assess.estimate import beta_interval, estimate, loss_chance
from kb.record.finding import Interval
from kb.vocabulary import Basis, Fate


def prior(substitution: float) -> dict[Fate, Interval]:
    return {
        Fate.SUBSTITUTION: Interval(
            mean=substitution, low=max(substitution - 0.15, 0), high=min(substitution + 0.15, 1)
        ),
        Fate.ELIMINATION: Interval(mean=1 - substitution, low=0, high=1),
    }


def runs(*shares: float, yield_pct: float | None = None):  # type: ignore[no-untyped-def]
    return table_of(*((facts(), {"substitution": s, "elimination": 1 - s}, yield_pct, "worked") for s in shares))


def main(result) -> tuple[float, float, float]:  # type: ignore[no-untyped-def]
    interval = dict(result.fates)[Fate.SUBSTITUTION]
    return interval.mean, interval.low, interval.high


@pytest.mark.parametrize(("mean", "concentration"), [(0.5, 2.0), (0.9, 10.0), (0.2, 40.0), (0.03, 5.0)])
def test_intervals_agree_with_the_beta_quantiles_of_scipy(mean: float, concentration: float) -> None:
    # reference: scipy.stats.beta.ppf; samples are good to about one point
    got = beta_interval(mean, concentration)
    low, high = stats.beta.ppf([0.1, 0.9], mean * concentration, (1 - mean) * concentration)
    assert got.low == pytest.approx(low, abs=0.02)
    assert got.high == pytest.approx(high, abs=0.02)


def test_chance_of_loss_is_the_jeffreys_mean() -> None:
    # Beta(lost + 1/2, survived + 1/2): Brown, Cai, DasGupta, Statistical Science 2001, 16, 101 (memory)
    assert loss_chance(5, 2).mean == pytest.approx(5.5 / 8, abs=1e-4)


def test_agreeing_runs_narrow_the_interval_and_disagreeing_ones_widen_it() -> None:
    one = runs(0.8)
    agreeing = runs(0.8, 0.82, 0.79, 0.81)
    fighting = runs(0.85, 0.3, 0.85, 0.3)
    width = [m[2] - m[1] for m in (main(estimate(np.ones(len(t)), t)) for t in (agreeing, one, fighting))]
    assert width[0] < width[1] < width[2]


def test_a_disagreement_is_said_in_words() -> None:
    table = runs(0.85, 0.3)
    assert "disagree" in estimate(np.ones(2), table).note


def test_shares_sum_to_one() -> None:
    table = runs(0.7, 0.9)
    result = estimate(np.ones(2), table, prior(0.5))
    assert sum(i.mean for _, i in result.fates) == pytest.approx(1, abs=1e-3)


def test_far_runs_have_no_say_and_nothing_is_invented() -> None:
    result = estimate(np.full(3, 0.2), runs(0.7, 0.9, 0.8), None, "Bridgehead: neither way is open.")
    assert result.fates == ()
    assert result.basis is Basis.NONE
    assert result.note == "Bridgehead: neither way is open."


def test_near_runs_outweigh_the_prior_and_far_ones_do_not() -> None:
    near = main(estimate(np.ones(4), runs(0.9, 0.9, 0.9, 0.9), prior(0.1)))[0]
    far = main(estimate(np.full(4, 0.45), runs(0.9, 0.9, 0.9, 0.9), prior(0.1)))[0]
    assert near > 0.75 > far


def test_a_split_that_does_not_add_up_is_scaled() -> None:
    table = table_of((facts(), {"substitution": 0.6, "elimination": 0.3}, None, "worked"))
    assert main(estimate(np.ones(1), table))[0] == pytest.approx(2 / 3, abs=1e-3)


def test_what_is_left_and_how_the_rest_divides_are_two_questions() -> None:
    # A run that hardly went says what is left over, and little of the way; the prior is sure of the way.
    table = table_of((facts(), {"unreacted": 0.9, "substitution": 0.1}, None, None))
    sure = {
        Fate.ELIMINATION: Interval(mean=0.95, low=0.9, high=1.0),
        Fate.SUBSTITUTION: Interval(mean=0.05, low=0, high=0.1),
    }
    shares = {fate: interval.mean for fate, interval in estimate(np.ones(1), table, sure, "", sure).fates}
    assert sum(shares.values()) == pytest.approx(1, abs=1e-3)
    assert shares[Fate.UNREACTED] > 0.75
    assert shares[Fate.ELIMINATION] > shares[Fate.SUBSTITUTION]


def test_a_run_that_went_says_which_way() -> None:
    table = table_of((facts(), {"unreacted": 0.1, "substitution": 0.9}, None, None))
    unsure = {
        Fate.ELIMINATION: Interval(mean=0.6, low=0.1, high=1.0),
        Fate.SUBSTITUTION: Interval(mean=0.4, low=0, high=0.9),
    }
    shares = {fate: interval.mean for fate, interval in estimate(np.ones(1), table, unsure, "", unsure).fates}
    assert shares[Fate.SUBSTITUTION] > 0.6


def test_published_rates_alone_leave_room_for_what_they_do_not_know() -> None:
    certain = {Fate.SUBSTITUTION: Interval(mean=1.0, low=1.0, high=1.0)}
    result = estimate(np.zeros(0), table_of(), certain)
    mean, low, high = main(result)
    assert (mean, high) == (1.0, 1.0)
    assert 0.8 < low < 0.95
    assert "what reacts" in result.note

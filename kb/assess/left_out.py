"""What the book would have expected of one of its own runs, had that run (or its whole substrate) not been in it.

It owns the leaving-out, by giving left-out rows no likeness; estimate and fit are those of a check. The run is taken
from its stored facts, so nothing is read again: the difference to a fresh check is that the base has no structure for
its bulk.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from kb.assess.endangered import endangered_in_run
from kb.assess.estimate import estimate
from kb.assess.precedent import compare
from kb.assess.published_runs import step_of_run
from kb.assess.record_view import RecordView
from kb.assess.yields import YieldFit, fit_yield
from kb.physorg.competition import Share, compete
from kb.physorg.conversion import DEFAULT_TIME_H
from kb.record.assessment import Estimate
from kb.record.finding import Interval
from kb.vocabulary import Fate


@dataclass(frozen=True, slots=True, kw_only=True)
class LeftOut:
    """A run and what was expected of it.

    Attributes:
        row: of the run.
        expected: shares, without a yield.
        fit: of the yield; None = no other run close enough.
    """

    row: int
    expected: Estimate
    fit: YieldFit | None


def expect_left_out(
    view: RecordView, row: int, rest: NDArray[np.float64] | None = None, with_substrate: bool = False
) -> LeftOut:
    """Return what the other runs and published rates expect of a run.

    Args:
        view: the runs (n).
        row: of the run that is left out.
        rest: whole-molecule Tanimoto of each run's substrate to this one's (n); None = not computed.
        with_substrate: leave out every run of its substrate.
    """
    table = view.table
    one = table.rows(np.array([row]))
    endangered = endangered_in_run(view, row)
    _, similarity = compare(one, table, rest, endangered.differences())
    if table.word("carbon_class", row) is None:
        similarity = np.zeros(len(table))
    similarity[row] = 0.0
    if with_substrate:
        same = view.known.setdefault("substrates", np.array(table.substrate, dtype=object))
        similarity[same == table.substrate[row]] = 0.0
    expected = estimate(similarity, table, *_prior(view, row))
    word = table.word("fate", row)
    share = next((i.mean for f, i in expected.fates if word is not None and f is Fate(word)), None)
    if share is None and expected.fates and word is not None:
        share = 0.0
    fit = fit_yield(one, view, similarity, share, (endangered.mine, endangered.runs))
    return LeftOut(row=row, expected=expected, fit=fit)


def _prior(view: RecordView, row: int) -> tuple[dict[Fate, Interval], str, dict[Fate, Interval]]:
    """Return published shares of everything, nothing to say, and published shares of what reacts."""
    step = step_of_run(view, row)
    if step is None:
        return {}, "", {}
    result = compete(step, view.table.number("time_h", row) or DEFAULT_TIME_H)
    return _intervals(result.fates_after or result.fates), "", _intervals(result.fates)


def _intervals(shares: tuple[tuple[Fate, Share], ...]) -> dict[Fate, Interval]:
    return {fate: Interval(mean=s.mean, low=s.low, high=s.high) for fate, s in shares}

"""How long a step takes to half: published rates, corrected by how long like runs took.

It owns that correction. A run with a recorded time and some starting material left gives a half-life of its own, by
first order; how far like runs were off the published figure moves the plan's, in log10, as far as their weight allows
against one run's worth of no correction. The result is good to about a factor of ten at best and says so by its
interval.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from kb.assess.estimate import weights_of
from kb.assess.published_runs import published_run
from kb.assess.ranking import best_rows
from kb.assess.record_view import RecordView
from kb.assess.table import FATES
from kb.record.finding import Interval
from kb.vocabulary import Fate

LEFT_FROM, LEFT_TO = 0.2, 0.98
"""Share of starting material between which a half-life can be read from a run. What little is left of a run that went
was left by something else: it stood overnight, and would have stood the same had it been over in an hour."""
NEAREST = 32
"""Runs that are asked, the most similar ones."""
PRIOR_RUNS = 1.0
"""Weight of no correction, in whole runs; judgement."""
RESIDUAL_SD = 0.3
"""Scatter of log10 half-lives between repeats; judgement."""
_Z80 = 1.2816


def expect_half_life(published: Interval | None, view: RecordView, similarity: NDArray[np.float64]) -> Interval | None:
    """Return the half-life to expect [h], None where published rates give none.

    Args:
        published: with 80 % interval [h].
        view: the runs (n).
        similarity: of each run to the plan (n).
    """
    if published is None or published.mean <= 0:
        return None
    centre = math.log10(published.mean)
    spread = max((math.log10(published.high) - math.log10(max(published.low, 1e-30))) / (2 * _Z80), RESIDUAL_SD)
    rows = best_rows(similarity, NEAREST)
    weight = weights_of(similarity[rows])
    off: list[float] = []
    heard: list[float] = []
    for row, say in zip(rows.tolist(), weight.tolist(), strict=True):
        measured = half_life_of(view, row) if say > 0 else None
        expected = published_run(view, row) if measured is not None else None
        if measured is not None and expected is not None and expected.half_life_h:
            off.append(math.log10(measured) - math.log10(expected.half_life_h))
            heard.append(say)
    total = sum(heard)
    centre += sum(w * d for w, d in zip(heard, off, strict=True)) / (total + PRIOR_RUNS)
    sd = math.hypot(spread / math.sqrt(1 + total / PRIOR_RUNS), RESIDUAL_SD)
    mean, low, high = (10.0 ** min(max(x, -30.0), 100.0) for x in (centre, centre - _Z80 * sd, centre + _Z80 * sd))
    return Interval(mean=mean, low=low, high=high)


def half_life_of(view: RecordView, row: int) -> float | None:
    """Return the half-life that a run shows [h], None where its time or what was left says too little."""
    hours = view.table.number("time_h", row)
    shares = view.table.shares[row]
    if not hours or np.isnan(shares).all():
        return None
    total = float(np.nansum(shares))
    left = float(np.nan_to_num(shares[FATES.index(Fate.UNREACTED)])) / total if total > 0 else 0.0
    return hours * math.log(2) / -math.log(left) if LEFT_FROM <= left <= LEFT_TO else None

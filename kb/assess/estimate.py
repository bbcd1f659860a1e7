"""What to expect: shares per fate with 80 % intervals, from weighted runs and a published prior.

It owns the arithmetic of evidence; it knows no chemistry, and yields are `yields.py`. Each run close to the plan
speaks with a weight that falls with dissimilarity. The mean is the Dirichlet mean of prior pseudo-counts and weighted
shares; the interval is the spread to expect of the *next run*, a Beta whose concentration follows from how far the
weighted runs scatter, shrunk towards a prior scatter: two precedents that disagree give a wide interval, not a
confident middle.

SHARPNESS, LEAST_SIMILARITY and PRIOR_RUNS were chosen on the demo book, leaving one run out at a time, from a coarse
grid around which the mean error is flat to a third of a point; `audit calibration` repeats the measurement on any
book. Other constants are judgements. Intervals are taken from fixed-seed samples (deterministic to about one percentage
point) rather than from an inverse incomplete beta function of our own.
"""

from __future__ import annotations

from collections.abc import Mapping
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from kb.assess.ranking import best_rows
from kb.assess.table import FATES, FactTable
from kb.record.assessment import Estimate
from kb.record.finding import Interval
from kb.vocabulary import Basis, Fate

LEVEL = 0.8
SHARPNESS = 3.0
"""Power of the similarity above the floor that becomes a weight."""
LEAST_SIMILARITY = 0.45
"""Runs below it have no say."""
PRIOR_RUNS = 0.5
"""Weight of the published prior, in whole runs, where its main share is uncertain by USUAL_SPREAD."""
USUAL_SPREAD = 0.15
LEAST_PRIOR, MOST_PRIOR = 0.25, 1.0
PRIOR_SCATTER = 0.12
"""Standard deviation of a share between like runs, before any have been seen (0..1)."""
SCATTER_RUNS = 1.0
"""How many runs that prior scatter is worth."""
WEIGHT_THAT_COUNTS = 0.25
"""Effective precedents below which the record alone gives no number."""
MOST_RUNS = 500
"""Runs that are asked at most, the most similar ones."""
NAMED = 60
"""Runs named as carrying a figure, the heaviest ones."""
DISAGREE_FROM = 0.18
"""Scatter of the main share between like runs from which it is said (0..1); judgement."""
NOT_MODELLED = 0.12
"""Share by which an interval of published rates alone is widened towards the middle: starting material left, other
reactions, decomposition, none of which they know. It holds the runs of the demo book that worked."""
PRIOR_LEFT = 0.05
"""What published half-lives are worth for what is left over, in whole runs: they are good to a factor of ten, and
whoever set the recorded runs up chose conditions under which they go."""
LEFT = FATES.index(Fate.UNREACTED)
_SAMPLES = 4000


def weights_of(similarity: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return evidence weights (n), 0..1: similarity above the floor, raised to SHARPNESS."""
    scaled = np.clip((similarity - LEAST_SIMILARITY) / (1 - LEAST_SIMILARITY), 0, 1)
    return np.asarray(scaled**SHARPNESS)


def estimate(
    similarity: NDArray[np.float64],
    table: FactTable,
    prior: Mapping[Fate, Interval] | None = None,
    no_number: str = "",
    of_what_reacts: Mapping[Fate, Interval] | None = None,
) -> Estimate:
    """Estimate the shares of a plan; `yield_pct` is left to `yields.fit_yield`.

    Args:
        similarity: of each run to the plan (n), 0..1.
        table: the runs (n).
        prior: published shares per fate with 80 % intervals, means summing to 1; None = none. Where no run is close
            enough they are the answer as they stand.
        of_what_reacts: published shares with the unreacted left out, likewise; None = `prior` is that already.
        no_number: why published chemistry forbids a number ("" = it does not); a record may still speak.

    Returns:
        An Estimate; `fates` is empty where neither record nor prior says anything, and `note` says why.
    """
    rows = best_rows(similarity, MOST_RUNS, np.flatnonzero(similarity > LEAST_SIMILARITY))
    shares = table.shares[rows]
    w = weights_of(similarity[rows]) * ~np.isnan(shares).all(axis=1)
    effective = float(w.sum())
    from_record = effective >= WEIGHT_THAT_COUNTS
    note = no_number or "No run close enough and no published model for this centre: no number is honest here."
    fates: tuple[tuple[Fate, Interval], ...] = ()
    if from_record:
        fates, scatter = _shares(w, shares, prior or {}, of_what_reacts or prior or {})
        note = _note(effective, scatter, no_number)
    elif prior:
        fates = tuple(sorted(((f, _with_room(i)) for f, i in prior.items()), key=lambda pair: -pair[1].mean))
        note = no_number or (
            "No run close enough in this book; published relative rates alone. They speak of what reacts: the "
            "intervals leave room for what does not."
        )
    basis = {
        (True, True): Basis.BOTH,
        (True, False): Basis.RECORD,
        (False, True): Basis.PUBLISHED,
        (False, False): Basis.NONE,
    }[(from_record, bool(prior))]
    return Estimate(
        fates=fates,
        level=LEVEL,
        effective_precedents=round(effective, 2),
        basis=basis,
        note=note,
        runs=_named(table, rows, w) if from_record else (),
    )


def _named(table: FactTable, rows: NDArray[np.intp], w: NDArray[np.float64]) -> tuple[tuple[str, float], ...]:
    """Return the codes and weights of the heaviest runs; `rows` come most similar first."""
    pairs = zip(rows.tolist(), w.tolist(), strict=True)
    return tuple((table.codes[row], round(say, 3)) for row, say in pairs if say > 0)[:NAMED]


@lru_cache(maxsize=4096)
def beta_interval(mean: float, concentration: float) -> Interval:
    """Return mean and 80 % bounds of a Beta distribution.

    Args:
        mean: 0..1, kept off the ends by 0.002.
        concentration: a + b of the Beta, > 0.
    """
    inside = min(max(mean, 0.002), 0.998)
    draws = np.random.default_rng(20).beta(inside * concentration, (1 - inside) * concentration, _SAMPLES)
    low, high = np.quantile(draws, [(1 - LEVEL) / 2, (1 + LEVEL) / 2])
    return Interval(mean=round(mean, 4), low=round(min(float(low), mean), 4), high=round(max(float(high), mean), 4))


def loss_chance(lost: float, survived: float) -> Interval:
    """Return the chance of loss from counts, Jeffreys prior (Beta(1/2, 1/2)), with 80 % interval."""
    total = lost + survived + 1.0
    return beta_interval((lost + 0.5) / total, total)


def _with_room(interval: Interval) -> Interval:
    """Return a published interval widened by what published rates leave out; the mean stays theirs."""
    low = max(interval.low - NOT_MODELLED * interval.mean, 0.0)
    high = min(interval.high + NOT_MODELLED * (1.0 - interval.mean), 1.0)
    return Interval(mean=interval.mean, low=round(low, 4), high=round(high, 4))


def _weight_of_prior(surest: Interval | None) -> float:
    """Return how many runs the prior is worth: PRIOR_RUNS at its usual spread, more where it is sure, within limits."""
    if surest is None:
        return 0.0
    spread = max((surest.high - surest.low) / 2.56, 0.02)
    return min(max(PRIOR_RUNS * USUAL_SPREAD / spread, LEAST_PRIOR), MOST_PRIOR)


def _shares(
    w: NDArray[np.float64],
    shares: NDArray[np.float64],
    prior: Mapping[Fate, Interval],
    of_what_reacts: Mapping[Fate, Interval],
) -> tuple[tuple[tuple[Fate, Interval], ...], float]:
    """Return intervals per fate, largest first, and the scatter of the largest (0..1).

    What is left over and how the rest divides are two questions. A run speaks of the second as far as it reacted, and
    the prior as sure as it is of that: a prior that expects little to react may still be certain of the way.
    """
    x = np.nan_to_num(shares[w > 0])
    totals = x.sum(axis=1, keepdims=True)
    x = np.divide(x, totals, out=x, where=totals > 0)
    wx = w[w > 0]
    prior_mean = np.array([prior[f].mean if f in prior else 0.0 for f in FATES])
    surest = max(prior.values(), key=lambda interval: interval.mean, default=None)
    prior_weight = _weight_of_prior(surest)
    total = float(w.sum()) + prior_weight
    mean = (wx @ x + prior_weight * prior_mean) / total
    left = float((wx @ x[:, LEFT] + PRIOR_LEFT * prior_mean[LEFT]) / (float(w.sum()) + PRIOR_LEFT * bool(prior)))
    divided = np.array([of_what_reacts[f].mean if f in of_what_reacts else 0.0 for f in FATES])
    if divided.sum() > 0:
        weight = _weight_of_prior(max(of_what_reacts.values(), key=lambda interval: interval.mean))
        way = wx @ x + weight * divided
        way[LEFT] = 0.0
        mean = (1.0 - left) * way / way.sum()
        mean[LEFT] = left
    # The 80 % interval of a normal distribution is 2.56 standard deviations wide.
    prior_scatter = PRIOR_SCATTER if surest is None else max((surest.high - surest.low) / 2.56, 0.02)
    rows: list[tuple[Fate, Interval]] = []
    main_scatter = 0.0
    for place in np.argsort(-mean, kind="stable"):
        m = float(mean[place])
        if m < 0.005:
            continue
        squares = float(wx @ (x[:, place] - m) ** 2) + prior_weight * (float(prior_mean[place]) - m) ** 2
        variance = (squares + SCATTER_RUNS * prior_scatter**2 * 4 * m * (1 - m)) / (total + SCATTER_RUNS)
        variance *= 1 + 1 / (total + 1)
        variance = min(max(variance, 1e-5), 0.95 * m * (1 - m) + 1e-6)
        rows.append((FATES[place], beta_interval(m, max(m * (1 - m) / variance - 1, 0.05))))
        if not main_scatter:
            main_scatter = float(np.sqrt(squares / total))
    return tuple(rows), main_scatter


def _note(effective: float, scatter: float, no_number: str) -> str:
    said = f"Rests on {effective:.1f} effective runs of this book."
    if scatter > DISAGREE_FROM:
        said += f" They disagree by some {100 * scatter:.0f} points, so the interval is wide."
    return f"{said} {no_number}".strip()

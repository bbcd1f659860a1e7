"""The yield to expect, and the chance of next to nothing: runs close to the plan, corrected for what differs.

It owns the arithmetic of a local fit. What published rates (or the run's own measured split) give as the share of the
wanted fate, times RECOVERY_PCT, is the starting figure for the plan and for each run. How far runs came out above or
below theirs is then carried over to the plan by a Gaussian process with a sum of likenesses:

- alike centres deviate alike (rooted environment, leaving group, endangered groups);
- alike conditions deviate alike, whatever the substrate (base, reagents, solvent, temperature, promoter);
- alike centres under alike conditions, most of all;
- alike conditions deviate alike the more, the less the wanted fate is expected: conditions matter most where the
  substrate is unwilling.

Twenty runs of one substrate so count as one substrate under twenty conditions, not as twenty opinions. The same fit, on
the fact that a run gave less than NOTHING_PCT, gives the chance of that.

Source of the method: C. E. Rasmussen & C. K. I. Williams, Gaussian Processes for Machine Learning, MIT Press 2006,
chapter 2. Weights and RECOVERY_PCT were chosen by leaving out one alcohol at a time of the deoxyfluorinations of
Nielsen et al. (J. Am. Chem. Soc. 2018, 140, 5004) and one run at a time of the demo book, from a coarse grid; neither
moves by more than half a point when any of them is halved or doubled. `tests/assess/test_deoxyfluorination.py` and
`audit calibration` measure the result.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from kb.assess.estimate import WEIGHT_THAT_COUNTS, beta_interval, weights_of
from kb.assess.kernel import centre_likeness, pairwise_part
from kb.assess.published_runs import published_share
from kb.assess.ranking import best_rows
from kb.assess.record_view import RecordView
from kb.assess.table import FATES, FactTable, stack
from kb.record.finding import Interval
from kb.vocabulary import Fate

RECOVERY_PCT = 70.0
"""Yield of a run in which all goes the wanted way; what is lost is conversion and isolation."""
UNKNOWN_PCT = 50.0
"""Starting figure where nothing says which way the run goes."""
CENTRE, CONDITIONS, BOTH, UNWILLING, LEVEL = 150.0, 150.0, 200.0, 400.0, 25.0
"""Variances of the five kinds of deviation [points squared]."""
NOISE = 250.0
"""Variance between repeats, hand and flask included [points squared]."""
NOTHING_PCT = 5.0
"""Below this a run gave next to nothing."""
NOTHING_AT_WORST, NOTHING_UNKNOWN = 0.4, 0.15
"""Chance of next to nothing before any run is seen: where the wanted fate is expected not at all; where unknown."""
NEAREST = 64
"""Runs that enter the fit."""
CONDITION_PARTS = ("nucleophile", "base", "solvent", "temperature", "promoter", "reagents")
CONDITION_POWER = 0.5


@dataclass(frozen=True, slots=True, kw_only=True)
class YieldFit:
    """What the runs close to a plan say of its yield.

    Attributes:
        yield_pct: percent, with the 80 % interval of the next run.
        nothing: chance 0..1 of less than NOTHING_PCT, with 80 % interval.
        rows: the runs that weigh most, heaviest first.
        starting_pct: the figure before any run was seen.
    """

    yield_pct: Interval
    nothing: Interval
    rows: tuple[int, ...]
    starting_pct: float


def fit_yield(
    plan: FactTable,
    view: RecordView,
    similarity: NDArray[np.float64],
    expected_share: float | None,
    holds: tuple[NDArray[np.bool_], NDArray[np.bool_]] | None = None,
) -> YieldFit | None:
    """Fit the yield of a plan.

    Args:
        plan: a table of one row.
        view: the runs (n).
        similarity: of each run to the plan (n), 0..1; the nearest NEAREST with a yield are used.
        expected_share: of the wanted fate in the plan, 0..1; None = not known.
        holds: which endangered groups the plan (k) and each run (k, n) hold; None = not looked for.

    Returns:
        The fit, or None where no run with a yield is close enough.
    """
    table = view.table
    rows = best_rows(similarity, NEAREST, np.flatnonzero(~np.isnan(table.yield_pct)))
    rows = rows[similarity[rows] > 0]
    if weights_of(similarity[rows]).sum() < WEIGHT_THAT_COUNTS:
        return None
    near = table.rows(rows)
    share = np.array([expected_share_of(view, int(row)) for row in rows])
    mine = np.nan if expected_share is None else expected_share
    alike, medium = likenesses(plan, near)
    if holds is not None and len(holds[0]):
        held = np.column_stack([holds[0], holds[1][:, rows]])
        alike = alike * 0.1 ** (held[:, :, None] != held[:, None, :]).sum(axis=0)
    weights, variance = _weights(alike, medium, np.concatenate([[mine], share]))
    y = np.clip(near.yield_pct, 0, 100)
    starting = float(_starting_pct(np.array([mine]))[0])
    mean = float(np.clip(starting + weights @ (y - _starting_pct(share)), 0, 100))
    nothing = float(
        np.clip(
            _starting_chance(np.array([mine]))[0] + weights @ ((y < NOTHING_PCT) - _starting_chance(share)), 0.01, 0.99
        )
    )
    heaviest = np.argsort(-np.abs(weights), kind="stable")
    heard = float(weights_of(similarity[rows]).sum())
    return YieldFit(
        yield_pct=_percent(mean, variance),
        nothing=beta_interval(nothing, 2.0 + min(heard, 10.0)),
        rows=tuple(int(rows[i]) for i in heaviest if abs(weights[i]) > 0.01),
        starting_pct=round(starting, 1),
    )


def expected_share_of(view: RecordView, row: int) -> float:
    """Return the share of the fate wanted in a run: as measured, else as published; NaN where neither says."""
    word = view.table.word("fate", row)
    if word is None:
        return float("nan")
    measured = view.table.shares[row]
    if not np.isnan(measured).all():
        total = float(np.nansum(measured))
        return float(np.nan_to_num(measured[FATES.index(Fate(word))]) / total) if total > 0 else float("nan")
    return published_share(view, row, Fate(word))


def likenesses(plan: FactTable, near: FactTable) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return the likeness of centres and of conditions between the plan (place 0) and m runs, each (m + 1, m + 1)."""
    both = stack(plan, near)
    alike = centre_likeness(both.centre_bits, both.centre_bits)
    np.fill_diagonal(alike, 1.0)
    alike *= pairwise_part("leaving group", both)
    medium = np.prod([pairwise_part(name, both) for name in CONDITION_PARTS], axis=0) ** CONDITION_POWER
    return alike, (medium + medium.T) / 2


def _weights(
    alike: NDArray[np.float64], medium: NDArray[np.float64], share: NDArray[np.float64]
) -> tuple[NDArray[np.float64], float]:
    """Return the weight of each run's deviation (m) and the variance of the next run [points squared].

    A product of likenesses that are no proper kernels may have small negative eigenvalues; they are made up for by
    noise.
    """
    unwilling = 1.0 - np.nan_to_num(share, nan=0.5)
    kernel = CENTRE * alike + CONDITIONS * medium + BOTH * alike * medium + LEVEL
    kernel += UNWILLING * medium * unwilling[:, None] * unwilling
    among, across = kernel[1:, 1:], kernel[0, 1:]
    lowest = float(np.linalg.eigvalsh(among)[0])
    among = among + (NOISE + max(0.0, -lowest)) * np.eye(len(among))
    weights: NDArray[np.float64] = np.linalg.solve(among, across).astype(np.float64)
    explained = float(weights @ across)
    return weights, max(float(kernel[0, 0]) - explained, 0.0) + NOISE


def _starting_pct(share: NDArray[np.float64]) -> NDArray[np.float64]:
    return np.where(np.isnan(share), UNKNOWN_PCT, RECOVERY_PCT * np.nan_to_num(share))


def _starting_chance(share: NDArray[np.float64]) -> NDArray[np.float64]:
    return np.where(np.isnan(share), NOTHING_UNKNOWN, NOTHING_AT_WORST * (1.0 - np.nan_to_num(share)))


def _percent(mean_pct: float, variance: float) -> Interval:
    """Return a Beta interval in percent with the mean and variance given, the variance cut to what 0..100 allows."""
    m = min(max(mean_pct / 100, 0.01), 0.99)
    v = min(max(variance / 1e4, 1e-4), 0.9 * m * (1 - m))
    interval = beta_interval(m, m * (1 - m) / v - 1)
    low, high = 100 * min(interval.low, mean_pct / 100), 100 * max(interval.high, mean_pct / 100)
    return Interval(mean=round(mean_pct, 1), low=round(low, 1), high=round(high, 1))

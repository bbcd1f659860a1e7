"""How far the estimates of a book can be trusted: each run expected from the others, beside what came out.

It owns the measuring: errors, coverage of the 80 % intervals, their width, plain baselines to beat, and rows for a
plot of expected against measured. It judges no run and tunes nothing. Large books are measured on a sample with a
fixed seed, so that the same book gives the same figures. A book that repeats itself flatters an estimate;
`with_substrate` leaves out every run of the substrate and shows what to expect of a molecule that nobody here has
run.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import asdict, dataclass, replace
from itertools import pairwise
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kb.assess.left_out import LeftOut, expect_left_out
from kb.assess.record_view import RecordView
from kb.assess.table import FATES
from kb.progress import Progress, Silent
from kb.showing import ShowsItself

MOST_RUNS = 1200
"""Runs that are measured at most."""
WORTH_COUNTING = 0.02
"""Share, expected or measured, from which a fate counts in the error."""
BINS = 5
_SEED = 20

Rest = Callable[[str | None, Sequence[str]], "NDArray[np.float64] | None"]
"""From a substrate and the codes of n runs to whole-molecule similarities (n), or None."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Measure:
    """One kind of figure, measured.

    Attributes:
        runs: how many runs count.
        error: mean absolute error [points of 100]; None = no run counts, here and below.
        same_class_error: of the mean over other runs of the carbon class, on the same runs [points].
        all_runs_error: of the mean over all other runs [points].
        coverage: share of runs inside their 80 % interval, 0..1.
        width: mean width of these intervals [points].
    """

    runs: int
    error: float | None
    same_class_error: float | None
    all_runs_error: float | None
    coverage: float | None
    width: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class ReliabilityRow:
    """Runs whose main share was expected within some bounds.

    Attributes:
        low, high: the bounds, 0..1.
        runs: how many.
        expected, measured: means, 0..1.
        coverage: share of them inside their 80 % interval, 0..1.
    """

    low: float
    high: float
    runs: int
    expected: float
    measured: float
    coverage: float


@dataclass(frozen=True, slots=True, kw_only=True)
class MainShare:
    """One run that was left out: the fate expected most, beside what was found.

    Attributes:
        run: its code.
        expected, low, high: share of that fate with its interval, 0..1. found: measured, 0..1.
        precedents: effective ones.
    """

    run: str
    expected: float
    low: float
    high: float
    found: float
    precedents: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Calibration(ShowsItself):
    """How well a book expects itself.

    Attributes:
        runs: standing runs.
        asked: how many were left out, one at a time.
        with_substrate: every run of the substrate was left out with it.
        level: what the intervals mean to hold.
        main_share: of the fate expected most.
        all_shares_error: mean over all fates that count [points].
        main_fate_right: how often the fate expected most was the one found most, 0..1.
        yields: of the isolated or assay yield.
        reliability: rows for a plot, by expected main share.
        by_support: error of the main share by effective precedents: (from, to, runs, error in points).
        stopped: the user ended it early; figures are of what was done.
        main_shares: the runs behind `main_share`, `reliability` and `by_support`; not part of the JSON.
    """

    runs: int
    asked: int
    with_substrate: bool
    level: float
    main_share: Measure
    all_shares_error: float | None
    main_fate_right: float | None
    yields: Measure
    reliability: tuple[ReliabilityRow, ...]
    by_support: tuple[tuple[float, float, int, float], ...]
    stopped: bool = False
    main_shares: tuple[MainShare, ...] = ()

    def as_dict(self) -> dict[str, Any]:
        """Return plain JSON values."""
        values = asdict(replace(self, main_shares=()))
        del values["main_shares"]
        return values | {
            "reliability": [asdict(row) for row in self.reliability],
            "by_support": [  # JSON knows no infinity: an open end is null
                [low, high if math.isfinite(high) else None, runs, error] for low, high, runs, error in self.by_support
            ],
        }

    @property
    def words(self) -> tuple[str, ...]:
        """Return the result in plain sentences."""
        left = "its substrate" if self.with_substrate else "it"
        lines = [f"{self.asked} of {self.runs} runs were each expected from the book without {left}."]
        if self.asked < 2:
            return (*lines, "That is too few to say anything.")
        lines += _sentences("The main share", self.main_share, self.level)
        if self.main_fate_right is not None:
            lines.append(f"The fate expected most was the one found most in {100 * self.main_fate_right:.0f} %.")
        lines += _sentences("The yield", self.yields, self.level)
        if self.stopped:
            lines.append("Stopped early; the figures are of what was done.")
        return tuple(lines)


def calibrate(
    view: RecordView,
    rest: Rest | None = None,
    progress: Progress | None = None,
    most: int = MOST_RUNS,
    with_substrate: bool = False,
) -> Calibration:
    """Measure a book against itself.

    Args:
        view: the runs.
        rest: whole-molecule similarity (`Finder.tanimoto_of_runs`); None = left out, counted as not recorded.
        progress: told while it works; cancelled = figures of what was done.
        most: runs asked at most, drawn with a fixed seed.
        with_substrate: leave out every run of the substrate, not the one run.
    """
    progress = progress or Silent()
    rows = _sample(view, most)
    done: list[LeftOut] = []
    for row in rows:
        if progress.cancelled():
            break
        likeness = rest(view.table.substrate[row] or None, view.table.codes) if rest is not None else None
        done.append(expect_left_out(view, row, likeness, with_substrate))
        progress.advance(len(done), len(rows), "runs left out and expected")
    return _gather(view, done, with_substrate, stopped=len(done) < len(rows))


def _sample(view: RecordView, most: int) -> list[int]:
    """Return the rows that say how they went and whose centre was read, or a sample of them, ascending."""
    table = view.table
    told = ~np.isnan(table.shares).all(axis=1) | ~np.isnan(table.yield_pct)
    rows = np.flatnonzero(told & (table.words["carbon_class"] >= 0))
    if len(rows) > most:
        rows = np.sort(np.random.default_rng(_SEED).choice(rows, size=most, replace=False))
    return [int(row) for row in rows]


def _gather(view: RecordView, done: Sequence[LeftOut], with_substrate: bool, stopped: bool) -> Calibration:
    shares = _normalised(view.table.shares)
    level = done[0].expected.level if done else 0.8
    mains: list[tuple[int, int, float, float, float]] = []  # row, fate, expected, low, high
    errors: list[float] = []
    right: list[bool] = []
    support: list[float] = []
    for one in done:
        measured = shares[one.row]
        if np.isnan(measured).any() or not one.expected.fates:
            continue
        fate, interval = one.expected.fates[0]
        mains.append((one.row, FATES.index(fate), interval.mean, interval.low, interval.high))
        expected = np.zeros(len(FATES))
        for f, i in one.expected.fates:
            expected[FATES.index(f)] = i.mean
        counts = (expected > WORTH_COUNTING) | (measured > WORTH_COUNTING)
        errors.append(float(np.abs(expected - measured)[counts].mean()))
        right.append(int(np.argmax(measured)) == FATES.index(fate))
        support.append(one.expected.effective_precedents)
    fits = [(one.row, one.fit) for one in done if one.fit is not None and not np.isnan(view.table.yield_pct[one.row])]
    yields = np.clip(view.table.yield_pct, 0, 100) / 100
    main_rows = np.array([m[0] for m in mains], dtype=np.intp)
    main_fates = np.array([m[1] for m in mains], dtype=np.intp)
    found = shares[main_rows, main_fates]
    bounds = np.array([m[2:] for m in mains]).reshape(-1, 3)
    yield_rows = np.array([row for row, _ in fits], dtype=np.intp)
    yield_bounds = (
        np.array([(f.yield_pct.mean, f.yield_pct.low, f.yield_pct.high) for _, f in fits]).reshape(-1, 3) / 100
    )
    everything = np.column_stack([shares, yields])
    return Calibration(
        runs=len(view.table),
        asked=len(done),
        with_substrate=with_substrate,
        level=level,
        main_share=_measure(view, everything, main_rows, main_fates, bounds),
        all_shares_error=_points(errors),
        main_fate_right=float(np.mean(right)) if right else None,
        yields=_measure(view, everything, yield_rows, np.full(len(fits), len(FATES), dtype=np.intp), yield_bounds),
        reliability=_reliability(bounds, found),
        by_support=_by_support(np.array(support), np.abs(bounds[:, 0] - found)),
        stopped=stopped,
        main_shares=tuple(
            MainShare(
                run=view.table.codes[row],
                expected=round(mean, 4),
                low=round(low, 4),
                high=round(high, 4),
                found=round(float(share), 4),
                precedents=round(precedents, 2),
            )
            for (row, _, mean, low, high), share, precedents in zip(mains, found.tolist(), support, strict=True)
        ),
    )


def _normalised(shares: NDArray[np.float64]) -> NDArray[np.float64]:
    totals = np.nansum(shares, axis=1, keepdims=True)
    return np.asarray(np.divide(shares, totals, out=np.full_like(shares, np.nan), where=totals > 0))


def _measure(
    view: RecordView,
    values: NDArray[np.float64],
    rows: NDArray[np.intp],
    columns: NDArray[np.intp],
    bounds: NDArray[np.float64],
) -> Measure:
    """Measure expectations (m, 3: mean, low, high) of some values (n, k) at (rows, columns)."""
    if not len(rows):
        return Measure(runs=0, error=None, same_class_error=None, all_runs_error=None, coverage=None, width=None)
    found = values[rows, columns]
    classes = view.table.words["carbon_class"]
    same, every = np.zeros(len(rows)), np.zeros(len(rows))
    for column in np.unique(columns):
        here = columns == column
        known = ~np.isnan(values[:, column])
        x = np.where(known, values[:, column], 0.0)
        every[here] = _mean_without(x.sum(), known.sum(), found[here])
        for code in np.unique(classes[rows[here]]):
            alike = known & (classes == code)
            mine = here & (classes[rows] == code)
            same[mine] = _mean_without(x[alike].sum(), alike.sum(), found[mine])
    return Measure(
        runs=len(rows),
        error=_points(np.abs(bounds[:, 0] - found)),
        same_class_error=_points(np.abs(same - found)),
        all_runs_error=_points(np.abs(every - found)),
        coverage=round(float(((bounds[:, 1] <= found) & (found <= bounds[:, 2])).mean()), 4),
        width=_points(bounds[:, 2] - bounds[:, 1]),
    )


def _mean_without(total: float, count: int, own: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return the mean of all others for each value; one half where there is no other."""
    return np.asarray((total - own) / (count - 1)) if count > 1 else np.full(len(own), 0.5)


def _points(values: Sequence[float] | NDArray[np.float64]) -> float | None:
    return round(100 * float(np.mean(values)), 2) if len(values) else None


def _reliability(bounds: NDArray[np.float64], found: NDArray[np.float64]) -> tuple[ReliabilityRow, ...]:
    rows = []
    for place in range(BINS):
        low, high = place / BINS, (place + 1) / BINS
        inside = (bounds[:, 0] >= low) & ((bounds[:, 0] < high) | (place == BINS - 1))
        if inside.any():
            held = (bounds[inside, 1] <= found[inside]) & (found[inside] <= bounds[inside, 2])
            rows.append(
                ReliabilityRow(
                    low=low,
                    high=high,
                    runs=int(inside.sum()),
                    expected=round(float(bounds[inside, 0].mean()), 4),
                    measured=round(float(found[inside].mean()), 4),
                    coverage=round(float(held.mean()), 4),
                )
            )
    return tuple(rows)


def _by_support(
    support: NDArray[np.float64], error: NDArray[np.float64]
) -> tuple[tuple[float, float, int, float], ...]:
    edges = (0.0, 0.25, 1.0, 3.0, 10.0, float("inf"))
    rows = []
    for low, high in pairwise(edges):
        inside = (support >= low) & (support < high)
        if inside.any():
            rows.append((low, high, int(inside.sum()), round(100 * float(error[inside].mean()), 2)))
    return tuple(rows)


def _sentences(what: str, measure: Measure, level: float) -> list[str]:
    if measure.error is None or measure.coverage is None:
        return [f"{what} could not be measured: no run close enough has one."]
    held = f"Its {100 * level:.0f} % intervals held {100 * measure.coverage:.0f} %"
    return [
        f"{what} missed by {measure.error:.1f} points on {measure.runs} runs; the mean of the same carbon class "
        f"would have missed by {measure.same_class_error:.1f}, the mean of all runs by {measure.all_runs_error:.1f}.",
        f"{held}; they are {measure.width:.0f} points wide.",
    ]

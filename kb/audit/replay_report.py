"""What a replay came to: failures warned of and missed, false alarms, by mode, over time, and at every threshold.

It owns the counting and its intervals (Wilson, 80 %); it checks nothing. Runs that do not say whether they failed are
counted apart and speak nowhere. Failures of the hand, the bottle or the funnel (`failing.NOT_CHEMISTRY`) are counted
like the rest, since nobody knows beforehand which a failure will be; `by_mode` shows them.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from kb.audit.replay import Hindsight
from kb.audit.wilson import counted_share
from kb.record.finding import Interval
from kb.showing import ShowsItself

CURVE_POINTS = 50
"""Most thresholds that the curve lists."""


@dataclass(frozen=True, slots=True, kw_only=True)
class ModeCount:
    """One failure mode: how many failures, how many of them warned of, and that share with its 80 % interval."""

    mode: str
    failures: int
    warned: int
    share: Interval | None

    def as_dict(self) -> dict[str, Any]:
        """Return plain JSON values."""
        return {"failures": self.failures, "warned": self.warned, "share": _interval(self.share)}


@dataclass(frozen=True, slots=True, kw_only=True)
class Period:
    """One quarter of a year ("2025-Q2")."""

    name: str
    failures: int
    warned: int
    successes: int
    false_alarms: int

    def as_dict(self) -> dict[str, Any]:
        """Return plain JSON values."""
        return {
            "period": self.name,
            "failures": self.failures,
            "warned": self.warned,
            "successes": self.successes,
            "false_alarms": self.false_alarms,
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class CurvePoint:
    """What a threshold on the worry would have done.

    Attributes:
        threshold: warn from this worry on (0..1).
        warned: failures warned of. false_alarms: successes warned of.
        recall: share of failures warned of (0..1).
        precision: share of warnings that were right (0..1); None = no warning.
        false_alarm_share: share of successes warned of (0..1).
    """

    threshold: float
    warned: int
    false_alarms: int
    recall: float
    precision: float | None
    false_alarm_share: float

    def as_dict(self) -> dict[str, Any]:
        """Return plain JSON values."""
        return {name: getattr(self, name) for name in self.__slots__}


@dataclass(frozen=True, slots=True, kw_only=True)
class ReplayReport(ShowsItself):
    """A replay, counted.

    Attributes:
        failures, successes: runs that say how they went.
        warned, missed: failures; they add up to `failures`.
        warned_by_record: failures whose warning rested on recorded losses or a house rule.
        false_alarms: successes warned of.
        recall, precision, false_alarm_share: 0..1 with 80 % intervals; None = nothing to count.
        by_mode: most frequent first; a run with two modes counts in both.
        periods: in order of time.
        curve: thresholds ascending.
        runs: every run, in date order.
        unjudged: runs that do not say. undated: runs without a date, left out.
        stopped: the walk did not finish.
    """

    failures: int
    warned: int
    missed: int
    warned_by_record: int
    successes: int
    false_alarms: int
    recall: Interval | None
    precision: Interval | None
    false_alarm_share: Interval | None
    by_mode: tuple[ModeCount, ...]
    periods: tuple[Period, ...]
    curve: tuple[CurvePoint, ...]
    runs: tuple[Hindsight, ...]
    unjudged: int
    undated: int
    stopped: bool = False

    def as_dict(self) -> dict[str, Any]:
        """Return the contract's JSON object."""
        return {
            "failures": self.failures,
            "warned": self.warned,
            "missed": self.missed,
            "warned_by_record": self.warned_by_record,
            "successes": self.successes,
            "false_alarms": self.false_alarms,
            "by_mode": {m.mode: m.as_dict() for m in self.by_mode},
            "recall": _interval(self.recall),
            "precision": _interval(self.precision),
            "false_alarm_share": _interval(self.false_alarm_share),
            "level": 0.8,
            "over_time": [p.as_dict() for p in self.periods],
            "curve": [p.as_dict() for p in self.curve],
            "runs": [r.as_dict() for r in self.runs],
            "unjudged": self.unjudged,
            "undated": self.undated,
            "stopped": self.stopped,
        }


def report_replay(runs: Sequence[Hindsight], undated: int = 0, stopped: bool = False) -> ReplayReport:
    """Count a replay; the order of `runs` does not matter."""
    ordered = sorted(runs, key=lambda r: (r.date, r.run))
    failed = [r for r in ordered if r.failed]
    fine = [r for r in ordered if r.failed is False]
    warned = sum(r.warned for r in failed)
    alarms = sum(r.warned for r in fine)
    return ReplayReport(
        failures=len(failed),
        warned=warned,
        missed=len(failed) - warned,
        warned_by_record=sum(r.by_record for r in failed),
        successes=len(fine),
        false_alarms=alarms,
        recall=counted_share(warned, len(failed)),
        precision=counted_share(warned, warned + alarms),
        false_alarm_share=counted_share(alarms, len(fine)),
        by_mode=_by_mode(failed),
        periods=_periods(ordered),
        curve=threshold_curve(ordered),
        runs=tuple(ordered),
        unjudged=len(ordered) - len(failed) - len(fine),
        undated=undated,
        stopped=stopped,
    )


def threshold_curve(runs: Sequence[Hindsight], points: int = CURVE_POINTS) -> tuple[CurvePoint, ...]:
    """Return what each threshold on the worry would have done, thresholds ascending.

    Args:
        runs: replayed; those that do not say whether they failed are left out.
        points: most points; thresholds are quantiles of the worries met.
    """
    judged = [r for r in runs if r.failed is not None]
    if not judged:
        return ()
    worry = np.array([r.worry for r in judged])
    failed = np.array([r.failed for r in judged], dtype=bool)
    thresholds = np.unique(np.quantile(worry, np.linspace(0, 1, points), method="nearest"))
    found = []
    for threshold in thresholds:
        warn = worry >= threshold
        warned, alarms = int((warn & failed).sum()), int((warn & ~failed).sum())
        found.append(
            CurvePoint(
                threshold=round(float(threshold), 4),
                warned=warned,
                false_alarms=alarms,
                recall=round(warned / max(int(failed.sum()), 1), 4),
                precision=round(warned / (warned + alarms), 4) if warned + alarms else None,
                false_alarm_share=round(alarms / max(int((~failed).sum()), 1), 4),
            )
        )
    return tuple(found)


def _by_mode(failed: Sequence[Hindsight]) -> tuple[ModeCount, ...]:
    met = Counter(mode for r in failed for mode in r.modes or ("not named",))
    hits = Counter(mode for r in failed if r.warned for mode in r.modes or ("not named",))
    return tuple(
        ModeCount(mode=mode, failures=n, warned=hits[mode], share=counted_share(hits[mode], n))
        for mode, n in sorted(met.items(), key=lambda pair: (-pair[1], pair[0]))
    )


def _periods(runs: Sequence[Hindsight]) -> tuple[Period, ...]:
    names = list(dict.fromkeys(_quarter(r) for r in runs))
    found = []
    for name in names:
        of = [r for r in runs if _quarter(r) == name]
        failed, fine = [r for r in of if r.failed], [r for r in of if r.failed is False]
        found.append(
            Period(
                name=name,
                failures=len(failed),
                warned=sum(r.warned for r in failed),
                successes=len(fine),
                false_alarms=sum(r.warned for r in fine),
            )
        )
    return tuple(found)


def _quarter(run: Hindsight) -> str:
    return f"{run.date.year}-Q{(run.date.month + 2) // 3}"


def _interval(interval: Interval | None) -> dict[str, float] | None:
    return interval.as_dict() if interval else None

"""Hindsight replay: each run checked against what stood in the book that morning; would a warning have come?

It owns the walk and what is kept of each check; judging is `kb.assess`, counting is `replay_report`. A run is *warned
of* when its check reports a liability, a resemblance or a house rule of severity caution or more; hazards of the
mixture and gaps in the data are other matters. Beside that yes or no each check gives a *worry*, 0..1: how likely the
check makes a failure, so that a group may choose its own threshold (`worry_of`).

The answer for a run depends on that run and on earlier days only, so it is the same however the walk is cut into
parts, stopped and taken up again, or spread over processes (tested).
"""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping, Sequence
from dataclasses import asdict, dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kb.assess.assessment import Comparison, compare_with_record, estimate_plan, find_findings
from kb.assess.estimate import weights_of
from kb.assess.published import published_estimate
from kb.assess.record_view import RecordView
from kb.audit.failing import failed_rows, judged_rows
from kb.audit.hindsight import DatedRecord
from kb.errors import InvalidRecord
from kb.progress import Progress, Silent
from kb.record.finding import Finding
from kb.record.plan import Plan
from kb.store.derivation import Account, account_of_plan
from kb.store.values import HouseRule
from kb.vocabulary import FindingKind, Role, Severity

WARNS = frozenset({FindingKind.LIABILITY, FindingKind.RESEMBLANCE, FindingKind.HOUSE_RULE})
_WORRY = {Severity.SERIOUS: 0.6, Severity.CAUTION: 0.4, Severity.NOTE: 0.15}
"""Worry that a finding without counted runs gives; judgement."""
_READ_AHEAD = 500
_BASE_RUNS = 2.0
"""How many whole runs the book's own rate of failure is worth beside like runs; judgement."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Hindsight:
    """One run in the replay.

    Attributes:
        run: its code.
        date: day it was run.
        failed: whether it failed; None = the record does not say.
        modes: its failure modes.
        warned: a finding of caution or more would have been shown.
        by_record: the warning rested on recorded losses, or was a resemblance or house rule; not on general knowledge
            alone.
        worry: 0..1, to be ranked.
        findings: (rule id, severity) of what would have been shown, most severe first.
        precedents: runs of the record behind the warning, losses first.
    """

    run: str
    date: dt.date
    failed: bool | None
    modes: tuple[str, ...]
    warned: bool
    by_record: bool
    worry: float
    findings: tuple[tuple[str, str], ...] = ()
    precedents: tuple[str, ...] = ()

    def as_dict(self) -> dict[str, Any]:
        """Return plain JSON values; `hindsight_from_dict` reads them back."""
        return asdict(self) | {
            "date": self.date.isoformat(),
            "modes": list(self.modes),
            "findings": [list(pair) for pair in self.findings],
            "precedents": list(self.precedents),
        }


def hindsight_from_dict(values: Mapping[str, Any]) -> Hindsight:
    """Read back what `Hindsight.as_dict` gave.

    Raises:
        InvalidRecord: something else.
    """
    try:
        return Hindsight(
            run=str(values["run"]),
            date=dt.date.fromisoformat(values["date"]),
            failed=values["failed"],
            modes=tuple(values["modes"]),
            warned=bool(values["warned"]),
            by_record=bool(values["by_record"]),
            worry=float(values["worry"]),
            findings=tuple((str(rule), str(severity)) for rule, severity in values["findings"]),
            precedents=tuple(values["precedents"]),
        )
    except (KeyError, TypeError, ValueError):
        raise InvalidRecord("A kept line of a replay cannot be read.", "Replay anew into another file.") from None


class Replayer:
    """Checks the runs of a dated record, each against earlier days."""

    def __init__(self, dated: DatedRecord) -> None:
        self.dated = dated
        self._failed = failed_rows(dated.view)[dated.rows]
        self._judged = judged_rows(dated.view)[dated.rows]

    def walk(
        self, places: Sequence[int], total: int | None = None, progress: Progress | None = None
    ) -> list[Hindsight]:
        """Check the runs at some places, in the order given; stopped early where progress says so."""
        progress = progress or Silent()
        seen: list[Hindsight] = []
        for number, place in enumerate(places):
            if progress.cancelled():
                break
            if number % _READ_AHEAD == 0:
                self.read_ahead(places[number : number + _READ_AHEAD])
            seen.append(self.check(place))
            progress.advance(len(seen), total, "runs checked")
        return seen

    def read_ahead(self, places: Sequence[int]) -> None:
        """Read the whole runs at some places in one go, which is ten times as fast as one by one."""
        self.dated.view.fetch(int(self.dated.rows[place]) for place in places)

    def check(self, place: int) -> Hindsight:
        """Check the run at a place against what stood in the book that morning."""
        run, view = self.dated.run(place), self.dated.before(place)
        account = account_of_plan(run.plan)
        compared = compare_with_record(account, view, self.dated.rest(account.facts.substrate, len(view.table)))
        findings = _findings(run.plan, account, view, compared, self.dated.rules_on(place))
        warnings = [f for f in findings if f.kind in WARNS and f.severity is not Severity.NOTE]
        own = [f for f in warnings if _rests_on_the_record(f)]
        chance = self._chance_by_likeness(compared.similarity, len(view.table))
        return Hindsight(
            run=self.dated.table.codes[place],
            date=dt.date.fromordinal(int(self.dated.dates[place])),
            failed=bool(self._failed[place]) if self._judged[place] else None,
            modes=tuple(dict.fromkeys(mode for mode, _ in self.dated.failures[place])),
            warned=bool(warnings),
            by_record=bool(own),
            worry=worry_of(findings, chance),
            findings=tuple((f.rule_id, str(f.severity)) for f in warnings),
            precedents=tuple(
                dict.fromkeys(code for f in own if f.evidence for code in f.evidence.runs[: f.evidence.lost])
            ),
        )

    def _chance_by_likeness(self, similarity: NDArray[np.float64], count: int) -> float:
        """Return the share of failures among like earlier runs, the book's own rate beside it as _BASE_RUNS runs."""
        judged, failed = self._judged[:count], self._failed[:count]
        known = float(judged.sum())
        base = (float(failed[judged].sum()) + 1) / (known + 3)
        weight = weights_of(similarity) * judged
        return float((weight[failed].sum() + _BASE_RUNS * base) / (weight.sum() + _BASE_RUNS))


def worry_of(findings: Sequence[Finding], chance_by_likeness: float) -> float:
    """Return how likely a check makes a failure (0..1): by its worst finding and by its like runs.

    A finding counts with the chance of loss that it states, else by its severity. The two are joined as independent
    reasons, 1 - (1 - a)(1 - b); the figure ranks plans, it is no calibrated chance.
    """
    worst = max((_chance(f) for f in findings if f.kind in WARNS), default=0.0)
    return round(1 - (1 - worst) * (1 - chance_by_likeness), 4)


def _findings(
    plan: Plan, account: Account, view: RecordView, compared: Comparison, rules: Sequence[HouseRule]
) -> tuple[Finding, ...]:
    """Return the findings of a check without its precedents and advice, which warn of nothing."""
    base = next((c.smiles for c in plan.conditions.components if c.role is Role.BASE and c.smiles), None)
    published = published_estimate(account.reading, account.facts.substrate or "", account.profile, base)
    _, fit = estimate_plan(account, view, compared, published)
    return find_findings(plan, account, view, compared, rules, published, fit)


def places_left(dated: DatedRecord, kept: Sequence[Hindsight]) -> list[int]:
    """Return the places that are not among results kept from an earlier walk."""
    done = {one.run for one in kept}
    return [place for place, code in enumerate(dated.table.codes) if code not in done]


def _rests_on_the_record(finding: Finding) -> bool:
    if finding.kind in (FindingKind.RESEMBLANCE, FindingKind.HOUSE_RULE):
        return True
    return finding.evidence is not None and finding.evidence.lost > 0


def _chance(finding: Finding) -> float:
    by_severity = _WORRY[finding.severity]
    if finding.evidence is None or finding.evidence.chance is None:
        return by_severity
    counted = finding.evidence.lost + finding.evidence.survived
    share = counted / (counted + 2)  # a few runs do not yet outvote general knowledge
    return share * finding.evidence.chance.mean + (1 - share) * by_severity

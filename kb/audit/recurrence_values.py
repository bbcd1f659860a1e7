"""What a recurring failure is, as values: the cluster, its cost, its proposed house rule; found by `recurrence.py`.

It owns what they say and how they read as JSON. Initials stand nowhere in them.
"""

from __future__ import annotations

import datetime as dt
from dataclasses import dataclass
from typing import Any

from kb.assess.house_rules import RuleTrial
from kb.showing import ShowsItself
from kb.store.values import HouseRule


@dataclass(frozen=True, slots=True, kw_only=True)
class Circumstance:
    """What a run's cost is reckoned from; None = not recorded."""

    project: str | None = None
    scale_mmol: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Proposal:
    """A house rule that would have warned, and what it does on the whole book."""

    rule: HouseRule
    trial: RuleTrial

    def as_dict(self) -> dict[str, Any]:
        """Return plain JSON values."""
        return {
            "title": self.rule.title,
            "motif": self.rule.motif,
            "when": self.rule.when,
            "severity": str(self.rule.severity),
            "why": self.rule.why,
            "hits": list(self.trial.hits),
            "false_alarms": list(self.trial.false_alarms),
            "undecided": len(self.trial.undecided),
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class Cluster:
    """One recurring failure.

    Attributes:
        name: stable within a book ("group-loss/tertiary-alkyl-ether/acid").
        mode, meaning: word of the list, and what it means.
        place: words. smarts: of what the members share in the substrate; "" = nothing in the substrate.
        conditions: plain words for what the members share in the flask.
        runs: codes in date order, undated last.
        first, last: days; None = none is dated.
        quarters: ("2025-Q2", count), in order.
        projects: (word, count), most first; runs without a project are left out.
        lost_mmol: substrate that did not become what was wanted [mmol], over the runs that record a scale.
        lost_mmol_runs: how many those are.
        days: reaction time spent [d], over `days_runs` runs that record it.
        repeats: (run, earlier run) where an earlier member stood in the book under conditions no harsher.
        came_through: codes of runs at the same place that worked, whatever their conditions.
        covered_by: (house rule in force, members it warns of), best first.
        proposal: None where no line of conditions tells the failures apart, or a house rule covers them all.
        example: (substrate SMILES, atoms of the shared place in it), for drawing; of the latest member.
        foreseeable: False for losses by hand, bottle and funnel.
    """

    name: str
    mode: str
    meaning: str
    place: str
    smarts: str
    conditions: str
    runs: tuple[str, ...]
    first: dt.date | None
    last: dt.date | None
    quarters: tuple[tuple[str, int], ...]
    projects: tuple[tuple[str, int], ...]
    lost_mmol: float
    lost_mmol_runs: int
    days: float
    days_runs: int
    repeats: tuple[tuple[str, str], ...]
    came_through: tuple[str, ...]
    covered_by: tuple[tuple[str, int], ...]
    proposal: Proposal | None
    example: tuple[str, tuple[int, ...]]
    foreseeable: bool

    @property
    def title(self) -> str:
        """Return the cluster in one line."""
        return f"{self.mode.replace('-', ' ').capitalize()}: {self.place}" + (
            f", {self.conditions}" if self.conditions else ""
        )

    def as_dict(self) -> dict[str, Any]:
        """Return plain JSON values."""
        return {
            "name": self.name,
            "title": self.title,
            "mode": self.mode,
            "meaning": self.meaning,
            "place": self.place,
            "smarts": self.smarts,
            "conditions": self.conditions,
            "count": len(self.runs),
            "runs": list(self.runs),
            "first": self.first.isoformat() if self.first else None,
            "last": self.last.isoformat() if self.last else None,
            "quarters": [list(pair) for pair in self.quarters],
            "projects": [list(pair) for pair in self.projects],
            "lost_mmol": self.lost_mmol,
            "lost_mmol_runs": self.lost_mmol_runs,
            "days": self.days,
            "days_runs": self.days_runs,
            "repeats": [{"run": run, "earlier": earlier} for run, earlier in self.repeats],
            "came_through": len(self.came_through),
            "covered_by": [{"rule": rule, "runs": n} for rule, n in self.covered_by],
            "proposal": self.proposal.as_dict() if self.proposal else None,
            "example": {"smiles": self.example[0], "atoms": list(self.example[1])},
            "foreseeable": self.foreseeable,
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class Recurrence(ShowsItself):
    """All recurring failures of a book, costliest first.

    Attributes:
        clusters: see `Cluster`.
        runs, failures: in the book, and since the date asked for.
        in_clusters: failures (since the date) that stand in a cluster.
        unplaced: failures whose place the record does not show.
        since: only failures from this day were counted; None = all.
    """

    clusters: tuple[Cluster, ...]
    runs: int
    failures: int
    in_clusters: int
    unplaced: int
    since: dt.date | None = None

    def as_dict(self) -> dict[str, Any]:
        """Return the JSON object of `audit recurring`."""
        return {
            "runs": self.runs,
            "failures": self.failures,
            "in_clusters": self.in_clusters,
            "unplaced": self.unplaced,
            "since": self.since.isoformat() if self.since else None,
            "clusters": [c.as_dict() for c in self.clusters],
        }

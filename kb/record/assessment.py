"""The assessment of one plan: reading, findings, estimate, precedents, advice, as one value.

Only values live here; they are made by `kb.assess` and shown by the front ends.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from kb.chem.facts import Reading
from kb.record.finding import Finding, Interval
from kb.record.plan import Plan
from kb.record.portable import run_to_dict
from kb.record.run import Run
from kb.showing import ShowsItself
from kb.vocabulary import Basis, Fate, Verdict


def plan_as_dict(plan: Plan) -> dict[str, Any]:
    """Return a plan in the portable form of a run, the outcome left out."""
    form = run_to_dict(Run(scheme=plan.scheme, conditions=plan.conditions, project=plan.project))
    return {key: form[key] for key in ("scheme", "project", "conditions")}


WORTH_DIVIDING = 0.05
"""Share of elimination from which the alkenes are told apart in words."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Estimate:
    """What to expect.

    Attributes:
        fates: share per fate, 0..1, with 80 % intervals; empty = no honest number.
        yield_pct: percent, or None.
        level: coverage of the intervals.
        effective_precedents: sum of kernel weights, in runs.
        basis: what the figure rests on.
        note: plain words: why it is wide, why there is none.
        half_life_h: of the substrate at 1 M of reagent [h], to about a factor of ten; None = no honest number.
        runs: codes of the runs that carry the shares, with their weights 0..1, heaviest first.
        yield_runs: codes of the runs that carry the yield, heaviest first.
        published: what published rates expect, in plain sentences with their sources; empty = nothing.
        alkenes: SMILES of each alkene that published rates expect, and its share of the alkenes, largest first.
    """

    fates: tuple[tuple[Fate, Interval], ...] = ()
    yield_pct: Interval | None = None
    level: float = 0.8
    effective_precedents: float = 0.0
    basis: Basis = Basis.NONE
    note: str = ""
    half_life_h: Interval | None = None
    runs: tuple[tuple[str, float], ...] = ()
    yield_runs: tuple[str, ...] = ()
    published: tuple[str, ...] = ()
    alkenes: tuple[tuple[str, Interval], ...] = ()

    def alkenes_in_words(self, most: int = 4) -> str:
        """Return which alkenes to expect in one sentence; empty where hardly any or only one forms."""
        formed = next((share.mean for fate, share in self.fates if fate is Fate.ELIMINATION), 0.0)
        if formed < WORTH_DIVIDING or len(self.alkenes) < 2:
            return ""
        told = (f"{name} {100 * i.mean:.0f} % ({100 * i.low:.0f} to {100 * i.high:.0f})" for name, i in self.alkenes)
        return f"Of the alkenes, by published rates: {', '.join([*told][:most])}."

    def as_dict(self) -> dict[str, Any]:
        """Return the contract's JSON object."""
        return {
            "fates": {str(f): i.as_dict() for f, i in self.fates},
            "yield_pct": self.yield_pct.as_dict() if self.yield_pct else None,
            "level": self.level,
            "effective_precedents": self.effective_precedents,
            "basis": str(self.basis),
            "note": self.note,
            "half_life_h": self.half_life_h.as_dict() if self.half_life_h else None,
            "runs": [list(pair) for pair in self.runs],
            "yield_runs": list(self.yield_runs),
            "published": list(self.published),
            "alkenes": {name: share.as_dict() for name, share in self.alkenes},
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class Precedent:
    """A recorded run close to the plan.

    Attributes:
        run: its code.
        similarity: 0..1.
        parts: similarity per named part, 0..1.
        differs: words for what differs ("bromide, not mesylate"), most telling first.
        split: shares per fate.
        yield_pct: percent; None = not recorded.
        verdict: the chemist's word.
    """

    run: str
    similarity: float
    parts: tuple[tuple[str, float], ...] = ()
    differs: tuple[str, ...] = ()
    split: tuple[tuple[Fate, float], ...] = ()
    yield_pct: float | None = None
    verdict: Verdict | None = None

    def as_dict(self) -> dict[str, Any]:
        """Return the contract's JSON object."""
        return {
            "run": self.run,
            "similarity": self.similarity,
            "parts": dict(self.parts),
            "differs": list(self.differs),
            "split": {str(f): s for f, s in self.split},
            "yield_pct": self.yield_pct,
            "verdict": str(self.verdict) if self.verdict else None,
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class Advice:
    """One change and what it is likely to do.

    Attributes:
        change: plain words ("60 °C instead of 80 °C").
        effect: on the share wanted, in points 0..1, with 80 % interval.
        pairs: matched pairs behind it; 0 for a published trend.
        basis: record or published.
        why: plain words, with the source of a published trend.
        runs: codes of every pair, (where the plan stands, after the change), best matched first; empty for a trend.
    """

    change: str
    effect: Interval
    pairs: int
    basis: Basis
    why: str
    runs: tuple[tuple[str, str], ...] = ()

    def as_dict(self) -> dict[str, Any]:
        """Return the contract's JSON object."""
        return {
            "change": self.change,
            "effect": self.effect.as_dict(),
            "pairs": self.pairs,
            "basis": str(self.basis),
            "why": self.why,
            "runs": [list(pair) for pair in self.runs],
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class Assessment(ShowsItself):
    """All of a check for one plan."""

    plan: Plan
    reading: Reading
    findings: tuple[Finding, ...] = ()
    estimate: Estimate
    precedents: tuple[Precedent, ...] = ()
    advice: tuple[Advice, ...] = ()

    def as_dict(self) -> dict[str, Any]:
        """Return the contract's JSON object."""
        return {
            "plan": plan_as_dict(self.plan),
            "reading": self.reading.as_dict(),
            "findings": [f.as_dict() for f in self.findings],
            "estimate": self.estimate.as_dict(),
            "precedents": [p.as_dict() for p in self.precedents],
            "advice": [a.as_dict() for a in self.advice],
        }

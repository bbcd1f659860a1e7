"""A finding: one thing that a check reports, with its evidence and its source.

Findings are values; who makes them is `kb.assess`. Sorted most severe first.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from kb.vocabulary import FindingKind, Severity


@dataclass(frozen=True, slots=True, kw_only=True)
class Interval:
    """A mean with the bounds of its 80 % interval, in the unit of the field that holds it."""

    mean: float
    low: float
    high: float

    def as_dict(self) -> dict[str, float]:
        """Return the contract's JSON object."""
        return {"mean": self.mean, "low": self.low, "high": self.high}


@dataclass(frozen=True, slots=True, kw_only=True)
class Evidence:
    """What the book knows of the same motif under the same conditions.

    Attributes:
        lost, survived: counts of runs.
        runs: their codes, lost ones first.
        chance: of loss, 0..1 with 80 % interval; None = no runs.
        note: plain words where the runs differ from the plan ("both survivors below 10 °C").
    """

    lost: int
    survived: int
    runs: tuple[str, ...] = ()
    chance: Interval | None = None
    note: str = ""

    def as_dict(self) -> dict[str, Any]:
        """Return the contract's JSON object."""
        return {
            "lost": self.lost,
            "survived": self.survived,
            "runs": list(self.runs),
            "chance": self.chance.as_dict() if self.chance else None,
            "note": self.note,
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class Finding:
    """One thing to worry about.

    Attributes:
        rule_id: stable id ("n-boc-strong-acid", "resemblance:R-0042").
        kind, severity: controlled words.
        title: one line.
        why: plain words, mechanism first.
        component: left-side fragment that carries the motif; None = the mixture itself.
        atoms: motif atoms in that fragment, for drawing.
        evidence: from the book; None = rule keeps none.
        side_product: canonical SMILES of what would form; None = not one structure.
        do_instead: what others do, most useful first.
        source: where the rule comes from, with "(memory)" where it is.
        is_uncertain: the conditions left the rule open ("cannot tell: temperature not given").
        side_products: every structure that could form, `side_product` first; no ranking is meant beyond that.
        also: ids of other rules that fired on the same place and are told in this finding.
        acknowledged: who saw it for this very plan and went on, when and why; said in `why` too.
    """

    rule_id: str
    kind: FindingKind
    severity: Severity
    title: str
    why: str
    component: int | None = None
    atoms: tuple[int, ...] = ()
    evidence: Evidence | None = None
    side_product: str | None = None
    do_instead: tuple[str, ...] = ()
    source: str = ""
    is_uncertain: bool = False
    side_products: tuple[str, ...] = ()
    also: tuple[str, ...] = ()
    acknowledged: tuple[str, ...] = ()

    def as_dict(self) -> dict[str, Any]:
        """Return the contract's JSON object."""
        return {
            "id": self.rule_id,
            "kind": str(self.kind),
            "severity": str(self.severity),
            "title": self.title,
            "why": self.why,
            "component": self.component,
            "atoms": list(self.atoms),
            "evidence": self.evidence.as_dict() if self.evidence else None,
            "side_product": self.side_product,
            "do_instead": list(self.do_instead),
            "source": self.source,
            "is_uncertain": self.is_uncertain,
            "side_products": list(self.side_products),
            "also": list(self.also),
            "acknowledged": list(self.acknowledged),
        }

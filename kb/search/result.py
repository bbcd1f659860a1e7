"""What a search answers: one page of runs, where each matched, and whether the answer is whole.

Frozen values only; nothing here knows how they were found.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any


@dataclass(frozen=True, slots=True, kw_only=True)
class MatchedAt:
    """Where a structure query sits in a run.

    Attributes:
        component: position among the fragments of its side of the scheme (left side, or products).
        role: what that component is ("substrate", "reagent", "product").
        smiles: the component; its atoms are counted in this SMILES.
        atoms: matched atoms, in query order; empty for a similarity.
    """

    component: int
    role: str
    smiles: str
    atoms: tuple[int, ...] = ()

    def as_dict(self) -> dict[str, Any]:
        """Return the contract's JSON object."""
        return {
            "component": self.component,
            "atoms": list(self.atoms),
            "role": self.role,
            "smiles": self.smiles,
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class FindItem:
    """One run that fits.

    Attributes:
        run: its code.
        score: Tanimoto similarity 0..1, where one was asked for; None otherwise.
        matched: where the structure query sits; None where no structure was asked for.
    """

    run: str
    score: float | None = None
    matched: MatchedAt | None = None

    def as_dict(self) -> dict[str, Any]:
        """Return the contract's JSON object."""
        matched = self.matched.as_dict() if self.matched else None
        return {"run": self.run, "score": self.score, "matched": matched}


@dataclass(frozen=True, slots=True, kw_only=True)
class FindResult:
    """One page of an answer.

    Attributes:
        total: runs that fit, on all pages; a lower bound where `complete` is False.
        page: number of this page, from 1.
        items: the runs of this page, in order.
        elapsed_ms: from question to answer [ms].
        complete: False = stopped by the deadline or the user; what is listed fits, others may too.
        notes: what the user should know, one sentence each (a misspelt word that was bent, a name that no run has).
    """

    total: int
    page: int
    items: tuple[FindItem, ...]
    elapsed_ms: float
    complete: bool = True
    notes: tuple[str, ...] = ()

    def as_dict(self) -> dict[str, Any]:
        """Return the contract's JSON object."""
        return {
            "total": self.total,
            "page": self.page,
            "items": [item.as_dict() for item in self.items],
            "elapsed_ms": round(self.elapsed_ms, 3),
            "complete": self.complete,
            "notes": list(self.notes),
        }

"""A plan: a step not yet run."""

from __future__ import annotations

from dataclasses import dataclass, field

from kb.record.conditions import Conditions


@dataclass(frozen=True, slots=True, kw_only=True)
class Plan:
    """A scheme and the conditions it is meant to meet.

    Attributes:
        scheme: reaction SMILES, a substrate SMILES alone, or a name; as entered.
        conditions: empty where nothing is decided.
        project: the project's word; None = none given.
    """

    scheme: str
    conditions: Conditions = field(default_factory=Conditions)
    project: str | None = None

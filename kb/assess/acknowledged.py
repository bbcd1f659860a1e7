"""Findings that somebody saw and went on in spite of, with a name and a reason.

It owns the words and the key of a plan. Nothing is left out or lowered for it: an acknowledged caution is told as
before, with who took it on and why behind it. An acknowledgement is of one plan as it stands; another scale,
temperature or reagent is another plan and has to be looked at anew.
"""

from __future__ import annotations

import dataclasses
import datetime as dt
import json
from collections.abc import Iterable
from typing import Protocol

from kb.plain import plain
from kb.record.assessment import Assessment, plan_as_dict
from kb.record.finding import Finding
from kb.record.plan import Plan


class Acknowledged(Protocol):
    """Somebody's word on a finding (`kb.store.values.Acknowledgement`)."""

    @property
    def finding_id(self) -> str:
        """Return the finding's rule id."""

    @property
    def who(self) -> str:
        """Return initials."""

    @property
    def why(self) -> str:
        """Return the reason."""

    @property
    def at(self) -> dt.datetime:
        """Return when."""


def plan_key(plan: Plan) -> str:
    """Return the text by which a plan is kept: scheme and conditions, whatever their order of writing."""
    return json.dumps(plan_as_dict(plan), sort_keys=True, ensure_ascii=False)


def note_acknowledged(assessment: Assessment, words: Iterable[Acknowledged]) -> Assessment:
    """Return an assessment whose findings say who acknowledged them; none is left out, none lowered."""
    by_id: dict[str, list[str]] = {}
    for word in words:
        said = f"{plain(word.who)}, {word.at.date().isoformat()}: {plain(word.why)}"
        by_id.setdefault(word.finding_id, []).append(said)
    if not by_id:
        return assessment
    findings = tuple(_noted(f, by_id.get(f.rule_id, [])) for f in assessment.findings)
    return dataclasses.replace(assessment, findings=findings)


def _noted(finding: Finding, said: list[str]) -> Finding:
    if not said:
        return finding
    words = f"Acknowledged by {'; '.join(said)}. It holds all the same."
    return dataclasses.replace(finding, why=f"{finding.why} {words}", acknowledged=tuple(said))

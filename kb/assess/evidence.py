"""What the book knows of a liability under its conditions: it struck in these runs, not in those.

It owns the choice of witnesses, how much each counts, and what that does to a severity. Witnesses are runs with the
rule's motif in the rule's place under conditions that fulfil its condition line; a loss under no harsher and a survival
under no milder conditions than the plan's count in full, others in part (`forcing.say_of`). An intended loss (a
deprotection that worked) is a loss: it shows that the conditions do it. At most MOST_WITNESSES are asked, those whose
conditions are nearest to the plan's.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Iterable, Sequence

import numpy as np
from numpy.typing import NDArray

from kb.assess.distinct import distinct
from kb.assess.estimate import loss_chance
from kb.assess.evidence_motif import FindMotif, motif_came_through
from kb.assess.forcing import harsher_by_k, say_of
from kb.assess.liability import get_rule
from kb.assess.liability_rule import Rule
from kb.assess.ranking import best_rows
from kb.assess.record_view import RecordView
from kb.assess.table import FATES, FactTable
from kb.record.finding import Evidence, Finding, Interval
from kb.vocabulary import Fate, Severity

FEARED_SHARE = 0.3
"""Share of the feared fate from which a run at the centre counts as struck; judgement."""
MOST_WITNESSES = 48
MOST_LOOKED_AT = 600
"""Runs whose centre is compared with the rule's, those nearest in conditions."""

_MODES_OF_FATE: dict[Fate, frozenset[str]] = {
    Fate.ELIMINATION: frozenset({"elimination"}),
    Fate.REARRANGED: frozenset({"rearrangement"}),
    Fate.TRANSPOSED: frozenset({"transposition"}),
    Fate.UNREACTED: frozenset({"no-reaction", "stalled"}),
}
_MODES_OF_GROUP: dict[str, frozenset[str]] = {
    "stereo": frozenset({"racemisation"}),
    "solvolysis": frozenset({"solvolysis"}),
    "exchange": frozenset({"exchange"}),
    "participation": frozenset({"neighbour-attack"}),
    "ring-closure": frozenset({"neighbour-attack"}),
    "regiochemistry": frozenset({"wrong-regioisomer"}),
    "epoxide": frozenset({"wrong-regioisomer"}),
}
"""Failure modes that say that a rule without a fate of its own has struck."""
_MODES_WHEREVER: dict[str, frozenset[str]] = {
    "epimerisation": frozenset({"epimerisation", "racemisation"}),
    "amine-alkylation": frozenset({"over-reaction"}),
}
"""Likewise for rules whose motif may lie anywhere, or on the nucleophile, and stays in the product."""
_NEEDS_MEASURE = frozenset({"epimerisation"})
"""Groups in which a run that worked shows nothing unless ee or dr was measured."""


def with_evidence(finding: Finding, plan: FactTable, view: RecordView) -> Finding:
    """Put the book's evidence beside a liability, and let it speak for the severity.

    Args:
        finding: of a shipped rule.
        plan: facts of the plan, a table of one row.
        view: the runs.
    """
    rule = get_rule(finding.rule_id)
    way = _way_of(rule, plan, view) if len(view.table) else ""
    if not way:
        return finding
    rows = _nearest(rule, plan, view, at_centre=way == "centre")
    if way == "bystander":
        struck, spared = count_evidence(view, rows, rule.find_motif)
    else:
        struck, spared = _count_by_fate(rule, view, rows)
    evidence = word_evidence(view, struck, spared, plan)
    severity = finding.severity if finding.is_uncertain else weighed_severity(finding.severity, evidence)
    return dataclasses.replace(finding, evidence=evidence, severity=severity)


def _way_of(rule: Rule, plan: FactTable, view: RecordView) -> str:
    """Return how runs bear witness: by the motif ("bystander"), the fate ("centre") or a failure ("modes"); "" = not.

    A rule whose motif may lie anywhere is asked where it lies in the plan.
    """
    if rule.side == "bystander":
        return "bystander"
    if rule.group in _MODES_WHEREVER:
        return "modes"
    if rule.side not in ("centre", "anywhere"):
        return ""
    if rule.side == "anywhere" and not _lies_at_centre(rule, plan, 0, view):
        return "bystander"
    return "centre" if rule.gives is not None or rule.group in _MODES_OF_GROUP else ""


def count_evidence(view: RecordView, rows: Iterable[int], find: FindMotif) -> tuple[list[int], list[int]]:
    """Split rows by whether a motif was lost or survived; rows that say neither are left out."""
    asked = [int(row) for row in rows]
    view.fetch(asked)
    lost: list[int] = []
    survived: list[int] = []
    for row in asked:
        outcome = motif_came_through(view.run(row), find, view.mol)
        if outcome is False:
            lost.append(row)
        elif outcome is True:
            survived.append(row)
    return lost, survived


def word_evidence(view: RecordView, lost: list[int], survived: list[int], plan: FactTable) -> Evidence:
    """Turn counted rows into evidence: runs named, chance of loss weighed, and what divides them in words."""
    codes = view.table.codes
    rows = np.array([*lost, *survived], dtype=np.intp)
    is_lost = np.arange(len(rows)) < len(lost)
    say = say_of(harsher_by_k(plan, view.table, rows), is_lost)
    in_part = int((say < 0.75).sum())
    notes = [_temperature_note(view, lost, survived, plan.number("temperature_c", 0))]
    if in_part:
        runs = "run counts" if in_part == 1 else "runs count"
        notes.append(f"{in_part} {runs} in part: lost under harsher or spared under milder conditions than this plan's")
    return Evidence(
        lost=len(lost),
        survived=len(survived),
        runs=tuple(codes[r] for r in [*lost, *survived]),
        chance=_chance(float(say[is_lost].sum()), float(say[~is_lost].sum())) if len(rows) else None,
        note="; ".join(note for note in notes if note),
    )


def weighed_severity(severity: Severity, evidence: Evidence) -> Severity:
    """Let the book speak: raise or lower a rule's severity by one step where its evidence is clear.

    Raised where even the low end of the chance is above one half; lowered where the high end is below one third, which
    takes four survivors without a loss. Limits are judgements.
    """
    if evidence.chance is None:
        return severity
    order = list(Severity)
    if evidence.chance.low > 0.5:
        return order[min(severity.rank + 1, 2)]
    if evidence.chance.high < 1 / 3:
        return order[max(severity.rank - 1, 0)]
    return severity


def _chance(lost: float, survived: float) -> Interval:
    return loss_chance(lost, survived)


def _nearest(rule: Rule, plan: FactTable, view: RecordView, *, at_centre: bool) -> list[int]:
    """Return the runs that can bear witness, those nearest in conditions first, at most MOST_WITNESSES."""
    holding = distinct(np.concatenate([view.rows_with_motif(smarts) for smarts in rule.motifs])).astype(np.intp)
    rows = holding[view.told(("rule", rule.rule_id), rule.applies, holding) == 1]
    nearness = -np.abs(harsher_by_k(plan, view.table, rows))
    if not at_centre:
        return [int(row) for row in rows[best_rows(nearness, MOST_WITNESSES)]]
    rows = rows[best_rows(nearness, MOST_LOOKED_AT)]
    found: list[int] = []
    for row in rows:
        if _lies_at_centre(rule, view.table, int(row), view):
            found.append(int(row))
            if len(found) >= MOST_WITNESSES:
                break
    return found


def _lies_at_centre(rule: Rule, table: FactTable, row: int, view: RecordView) -> bool:
    """Return True where the rule's motif sits on the centre that was read in a run, or in the plan."""
    atom = table.number("centre_atom", row)
    if atom is None:
        return False
    substrate = table.substrate[row]
    key = ("at centre", rule.rule_id, substrate, atom)
    if key not in view.known:
        mol = view.mol(substrate)
        matches = rule.matches(mol) if mol is not None else ()
        view.known[key] = any(way.get(m) == int(atom) for match in matches for way in match.ways for m in rule.at)
    return bool(view.known[key])


def _count_by_fate(rule: Rule, view: RecordView, rows: Sequence[int]) -> tuple[list[int], list[int]]:
    """Split rows by whether the feared fate took FEARED_SHARE or a failure names it; silent rows are left out."""
    modes = _MODES_OF_GROUP.get(rule.group, frozenset()) | _MODES_WHEREVER.get(rule.group, frozenset())
    if rule.gives is not None:
        modes = modes | _MODES_OF_FATE.get(rule.gives, frozenset())
    if rule.group in _NEEDS_MEASURE:
        view.fetch(rows)
    struck: list[int] = []
    spared: list[int] = []
    for row in rows:
        shares = view.table.shares[row]
        is_measured = not np.isnan(shares).all()
        share = _share(shares, rule.gives) if is_measured else 0.0
        if share >= FEARED_SHARE or any(mode in modes for mode, _ in view.failures[row]):
            struck.append(row)
        elif rule.group in _NEEDS_MEASURE:
            outcome = view.run(row).outcome
            if outcome.ee_pct is not None or outcome.dr is not None:
                spared.append(row)
        elif is_measured or view.table.word("verdict", row) == "worked":
            spared.append(row)
    return struck, spared


def _share(shares: NDArray[np.float64], fate: Fate | None) -> float:
    if fate is None:
        return 0.0
    total = float(np.nansum(shares))
    return float(np.nan_to_num(shares[FATES.index(fate)])) / total if total > 0 else 0.0


def _temperature_note(view: RecordView, lost: list[int], survived: list[int], plan_c: float | None) -> str:
    hot = [t for r in lost if (t := view.table.number("temperature_c", r)) is not None]
    cold = [t for r in survived if (t := view.table.number("temperature_c", r)) is not None]
    if hot and cold and max(cold) < min(hot):
        where = ""
        if plan_c is not None:
            where = "; this plan is with the losses" if plan_c >= min(hot) else "; this plan lies below the losses"
        return f"survived at {max(cold):.0f} °C and below, lost at {min(hot):.0f} °C and above{where}"
    return ""

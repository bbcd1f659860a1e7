"""Resemblance: where a plan looks like a recorded failure, and how often that kind of run failed.

It owns two likenesses. Failures *at the centre* (an alkene instead of the ether, a shift, nothing at all) resemble a
plan with the same aim and the same kind of centre, leaving group and nucleophile. Failures *elsewhere* (a group lost
or attacked) resemble a plan that holds the failure's motif (`resemblance_motifs.py`). Both only under conditions at
least as forcing, or, for runs in which nothing happened, no more forcing. Failures of one kind are told once, with
the runs that came through beside them. A run whose chemist said that it failed but named no mode counts as a mode of
its own.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np
from numpy.typing import NDArray

from kb.assess.estimate import loss_chance
from kb.assess.evidence_motif import finder_of, motif_came_through
from kb.assess.forcing import Force, force_of, forces_as_much, forces_no_more, harsher_by_k
from kb.assess.ranking import best_rows
from kb.assess.record_view import RecordView
from kb.assess.resemblance_motifs import gather_motifs
from kb.assess.table import FactTable
from kb.materials.profile import ConditionProfile
from kb.record.failure_modes import failure_modes, modes_that_lose_a_group
from kb.record.finding import Evidence, Finding
from kb.vocabulary import FindingKind, Severity

LEAST_PARTS = {"centre": 0.45, "leaving group": 0.55, "nucleophile": 0.5}
"""Likeness of each part from which a failure at the centre concerns the plan; judgement."""
LEAST_CHANCE = 0.2
"""Chance of the failure below which a resemblance is not worth a line; judgement."""
MOST_ALIKE = 150
"""Runs of the plan's kind that are counted, the most similar ones."""
MOST_WITNESSES = 48
"""Runs with a failure's motif that are counted, those nearest in conditions."""
_MILDEST = 12
_NOTHING_HAPPENED = frozenset({"no-reaction", "stalled"})
_NOT_CHEMISTRY = frozenset({"emulsion", "isolation-loss", "reagent-quality", "other"})
UNNAMED = "failed, mode not named"

Compare = Callable[[Force, Force], bool | None]


def find_resemblances(
    view: RecordView,
    plan: FactTable,
    parts: dict[str, NDArray[np.float64]],
    similarity: NDArray[np.float64],
    profile: ConditionProfile,
    fragments: Sequence[str],
    centre: tuple[int, int] | None,
    skip_motifs: Sequence[frozenset[int]] = (),
    products: Sequence[str] = (),
) -> tuple[Finding, ...]:
    """Report the recorded failures that the plan resembles, most likely first.

    Args:
        view: the runs.
        plan: its facts, a table of one row.
        parts, similarity: of each run to the plan (`kernel.similarity_parts`, `kernel.combine`).
        profile: the plan's conditions.
        fragments: SMILES of its left-side fragments as entered.
        centre: (component, atom) of its centre; None = not read.
        skip_motifs: atom sets already reported by a liability with evidence, in the substrate; not said twice.
        products: SMILES of what is wanted; a motif that they lack is meant to be lost.

    Returns:
        Findings, sorted by severity and chance; empty where the record holds nothing alike.
    """
    if not len(view.table):
        return ()
    found = _at_the_centre(view, plan, parts, similarity, profile, centre)
    found += _elsewhere(view, plan, similarity, profile, fragments, skip_motifs, products)
    return tuple(sorted(found, key=lambda f: (-f.severity.rank, -_mean(f))))


def _mean(finding: Finding) -> float:
    return finding.evidence.chance.mean if finding.evidence and finding.evidence.chance else 0.0


def _severity(chance: float, lost: int) -> Severity:
    if chance >= 0.55 and lost >= 2:
        return Severity.SERIOUS
    return Severity.CAUTION if chance >= 0.3 else Severity.NOTE


def _at_the_centre(
    view: RecordView,
    plan: FactTable,
    parts: dict[str, NDArray[np.float64]],
    similarity: NDArray[np.float64],
    profile: ConditionProfile,
    centre: tuple[int, int] | None,
) -> list[Finding]:
    if centre is None:
        return []
    is_alike = _wanted_the_same(view.table, plan)
    for name, least in LEAST_PARTS.items():
        is_alike &= parts[name] >= least
    alike = best_rows(similarity, MOST_ALIKE, np.flatnonzero(is_alike))
    findings = []
    mine = force_of(profile)
    for mode, failed in _kinds_of_failure(view, alike).items():
        compare = forces_no_more if mode in _NOTHING_HAPPENED else forces_as_much
        answers = _compared(view, failed, lambda other, c=compare: c(mine, other))  # type: ignore[misc]
        lost = [r for r, answer in answers.items() if answer is not False]
        if not lost:
            continue
        decided = [r for r in lost if answers[r]] or lost
        others = [int(r) for r in alike if int(r) not in answers and _spoke(view, int(r))]
        survived = _through_as_much(view, others, decided, compare)
        is_uncertain = all(answers[r] is None for r in lost)
        finding = _finding(view, mode, lost, survived, centre[0], (centre[1],), is_uncertain)
        if finding is not None:
            findings.append(finding)
    return findings


def _wanted_the_same(table: FactTable, plan: FactTable) -> NDArray[np.bool_]:
    """Return a mask of the runs that were after what the plan is after; what is not read counts as the same.

    An alkene is the failure of an ether synthesis and the aim of an elimination: runs with another aim neither warn
    of this one nor speak for it.
    """
    wanted = int(plan.words["fate"][0])
    fate = table.words["fate"]
    return np.ones(len(table), dtype=bool) if wanted < 0 else (fate == wanted) | (fate < 0)


def _kinds_of_failure(view: RecordView, alike: NDArray[np.intp]) -> dict[str, list[int]]:
    """Return the rows that failed at the centre, by mode; those without a named mode under UNNAMED."""
    kinds: dict[str, list[int]] = {}
    for row in map(int, alike):
        modes = {mode for mode, _ in view.failures[row]}
        if not modes and view.table.word("verdict", row) == "failed":
            kinds.setdefault(UNNAMED, []).append(row)
        for mode in modes - modes_that_lose_a_group() - _NOT_CHEMISTRY:
            kinds.setdefault(mode, []).append(row)
    return dict(sorted(kinds.items()))


def _compared(view: RecordView, rows: Sequence[int], compare: Callable[[Force], bool | None]) -> dict[int, bool | None]:
    """Return what a comparison says of each row's conditions, asked once per distinct profile."""
    codes = {int(view.table.profile[row]) for row in rows}
    told = {code: compare(_force(view, code)) for code in codes}
    return {row: told[int(view.table.profile[row])] for row in rows}


def _through_as_much(view: RecordView, others: Sequence[int], failed: Sequence[int], compare: Compare) -> list[int]:
    """Return the rows under conditions at least as forcing (or, by `compare`, no more so) as some failed run's."""
    forces = [_force(view, code) for code in {int(view.table.profile[r]) for r in failed}]
    forces.sort(key=lambda force: force.temperature_c or 0.0, reverse=compare is forces_no_more)
    mildest = forces[:_MILDEST]
    answers = _compared(view, others, lambda other: any(compare(other, one) for one in mildest))
    return [row for row in others if answers[row]]


def _force(view: RecordView, code: int) -> Force:
    """Return the force of a condition profile by its code, kept."""
    key = ("force", view.table.profiles[code])
    if key not in view.known:
        view.known[key] = force_of(view.profile_of_code(code))
    force: Force = view.known[key]
    return force


def _spoke(view: RecordView, row: int) -> bool:
    """Return True when a run says how it went at all."""
    return view.table.word("verdict", row) is not None or bool(view.table.split(row))


def _elsewhere(
    view: RecordView,
    plan: FactTable,
    similarity: NDArray[np.float64],
    profile: ConditionProfile,
    fragments: Sequence[str],
    skip: Sequence[frozenset[int]],
    products: Sequence[str],
) -> list[Finding]:
    failed = np.zeros(len(view.table), dtype=bool)
    for mode in modes_that_lose_a_group() & set(view.modes):
        failed |= view.failed_in(mode)
    mine = force_of(profile)
    answers = _compared(view, np.flatnonzero(failed).tolist(), lambda other: forces_as_much(mine, other))
    concerns = np.zeros(len(view.table), dtype=bool)
    concerns[[row for row, answer in answers.items() if answer is not False]] = True
    wanted = [m for p in products if (m := view.mol(p)) is not None]
    findings: list[Finding] = []
    seen: set[tuple[str, frozenset[int]]] = set()
    for (mode, smarts), rows in gather_motifs(view, concerns, similarity, fragments).items():
        find = finder_of(smarts)
        for component, smiles in enumerate(fragments):
            mol = view.mol(smiles)
            matches = find(mol) if mol is not None else ()
            match = next(iter(matches), ())
            if not match or (mode, frozenset(match)) in seen:
                continue
            if wanted and sum(len(find(m)) for m in wanted) < len(matches):
                continue
            if any(len(frozenset(match) & s) * 2 >= len(match) for s in skip):
                continue
            survived = _motif_survived(view, plan, smarts, rows)
            unsure = all(answers[r] is None for r in rows)
            finding = _finding(view, mode, rows, survived, component, tuple(match), unsure)
            if finding is not None:
                seen.add((mode, frozenset(match)))
                findings.append(finding)
    return findings


def _motif_survived(view: RecordView, plan: FactTable, smarts: str, failed: Sequence[int]) -> list[int]:
    """Return the rows in which a motif came through conditions at least as forcing as some failed run's."""
    holding = np.setdiff1d(view.rows_with_motif(smarts), np.array(failed, dtype=np.intp))
    nearness = -np.abs(harsher_by_k(plan, view.table, holding))
    nearest = holding[best_rows(nearness, MOST_WITNESSES)].tolist()
    through = _through_as_much(view, nearest, failed, forces_as_much)
    view.fetch(through)
    find = finder_of(smarts)
    return [row for row in through if motif_came_through(view.run(row), find, view.mol)]


def _finding(
    view: RecordView,
    mode: str,
    lost: list[int],
    survived: list[int],
    component: int,
    atoms: tuple[int, ...],
    is_uncertain: bool,
) -> Finding | None:
    chance = loss_chance(len(lost), len(survived))
    if chance.mean < LEAST_CHANCE:
        return None
    meaning = {m.word: m.meaning for m in failure_modes()}.get(mode, mode)
    severity = _severity(chance.mean, len(lost))
    if is_uncertain:
        severity = Severity(min(severity, Severity.CAUTION, key=lambda s: s.rank))
    first = view.table.codes[lost[0]]
    runs = "run" if len(lost) == 1 else "runs"
    why = f"In {len(lost)} {runs} of this book: {meaning}. {len(survived)} like it came through."
    view.fetch(lost[:3])
    notes = [run.note.strip() for run in (view.run(r) for r in lost[:3]) if run.note.strip()]
    if notes:
        why += f" Noted then: “{notes[0]}”"
    if is_uncertain:
        why += " Cannot tell whether this plan is as forcing: temperature or components not given."
    return Finding(
        rule_id=f"resemblance:{mode.replace(', ', '-').replace(' ', '-')}:{first}",
        kind=FindingKind.RESEMBLANCE,
        severity=severity,
        title=f"Like {len(lost)} recorded {'failure' if len(lost) == 1 else 'failures'}: {mode.replace('-', ' ')}",
        why=why,
        component=component,
        atoms=atoms,
        evidence=Evidence(
            lost=len(lost),
            survived=len(survived),
            runs=tuple(view.table.codes[r] for r in [*lost, *survived]),
            chance=chance,
        ),
        source="this book",
        is_uncertain=is_uncertain,
    )

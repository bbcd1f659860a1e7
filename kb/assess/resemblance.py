"""Resemblance: where a plan looks like a recorded failure, and how often that kind of run failed.

It owns two likenesses. Failures *at the centre* (an alkene instead of the ether, a shift, nothing at all) resemble a
plan with the same kind of centre, leaving group and nucleophile. Failures *elsewhere* (a group lost or attacked)
resemble a plan that holds the failure's motif. Both only under conditions at least as forcing, or, for runs in which
nothing happened, no more forcing. Failures of one kind are told once, with the runs that came through beside them.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kb.assess.estimate import loss_chance
from kb.assess.evidence import finder_of, motif_came_through
from kb.assess.forcing import is_at_least_as_forcing, is_no_more_forcing
from kb.assess.motif import generalise, lost_atoms
from kb.assess.record_view import RecordView
from kb.materials.profile import ConditionProfile
from kb.record.failure_modes import failure_modes, modes_that_lose_a_group
from kb.record.finding import Evidence, Finding
from kb.vocabulary import Fate, FindingKind, Severity

LEAST_PARTS = {"centre": 0.45, "leaving group": 0.55, "nucleophile": 0.5}
"""Likeness of each part from which a failure at the centre concerns the plan; judgement."""
LEAST_CHANCE = 0.2
"""Chance of the failure below which a resemblance is not worth a line; judgement."""
_NOTHING_HAPPENED = frozenset({"no-reaction", "stalled"})
_NOT_CHEMISTRY = frozenset({"emulsion", "isolation-loss", "reagent-quality", "other"})


def find_resemblances(
    view: RecordView,
    parts: dict[str, NDArray[np.float64]],
    profile: ConditionProfile,
    fragments: Sequence[str],
    centre: tuple[int, int] | None,
    skip_motifs: Sequence[frozenset[int]] = (),
    products: Sequence[str] = (),
) -> tuple[Finding, ...]:
    """Report the recorded failures that the plan resembles, most likely first.

    Args:
        view: the runs.
        parts: of the similarity of each run to the plan (`kernel.similarity_parts`).
        profile: the plan's conditions.
        fragments: SMILES of its left-side fragments as entered.
        centre: (component, atom) of its centre; None = not read.
        skip_motifs: atom sets already reported by a liability with evidence, in the substrate; not said twice.
        products: SMILES of what is wanted; a motif that they lack is meant to be lost.

    Returns:
        Findings, sorted by severity and chance; empty where the record holds nothing alike.
    """
    found = _at_the_centre(view, parts, profile, centre)
    found += _elsewhere(view, profile, fragments, skip_motifs, products)
    return tuple(sorted(found, key=lambda f: (-f.severity.rank, -_mean(f))))


def _mean(finding: Finding) -> float:
    return finding.evidence.chance.mean if finding.evidence and finding.evidence.chance else 0.0


def _severity(chance: float, lost: int) -> Severity:
    if chance >= 0.55 and lost >= 2:
        return Severity.SERIOUS
    return Severity.CAUTION if chance >= 0.3 else Severity.NOTE


def _at_the_centre(
    view: RecordView,
    parts: dict[str, NDArray[np.float64]],
    profile: ConditionProfile,
    centre: tuple[int, int] | None,
) -> list[Finding]:
    if centre is None or not len(view.table):
        return []
    alike = np.ones(len(view.table), dtype=bool)
    for name, least in LEAST_PARTS.items():
        alike &= parts[name] >= least
    findings = []
    for mode in view.modes:
        if mode in modes_that_lose_a_group() or mode in _NOT_CHEMISTRY:
            continue
        failed = view.failed_in(mode) & alike
        if not failed.any():
            continue
        compare = is_no_more_forcing if mode in _NOTHING_HAPPENED else is_at_least_as_forcing
        answers = {int(r): compare(profile, view.profile(int(r))) for r in np.flatnonzero(failed)}
        lost = [r for r, answer in answers.items() if answer is not False]
        if not lost:
            continue
        mildest = [r for r in lost if answers[r]] or lost
        others = [int(r) for r in np.flatnonzero(alike & ~view.failed_in(mode))]
        survived = [
            r for r in others if any(compare(view.profile(r), view.profile(f)) for f in mildest) and _spoke(view, r)
        ]
        finding = _finding(view, mode, lost, survived, centre[0], (centre[1],), all(answers[r] is None for r in lost))
        if finding is not None:
            findings.append(finding)
    return findings


def _spoke(view: RecordView, row: int) -> bool:
    """Return True when a run says how it went at all."""
    return view.table.word("verdict", row) is not None or bool(view.table.split(row))


def _elsewhere(
    view: RecordView,
    profile: ConditionProfile,
    fragments: Sequence[str],
    skip: Sequence[frozenset[int]],
    products: Sequence[str],
) -> list[Finding]:
    findings: list[Finding] = []
    seen: set[tuple[str, frozenset[int]]] = set()
    for (mode, smarts), rows in _motifs(view).items():
        find = finder_of(smarts)
        for component, smiles in enumerate(fragments):
            mol = view.mol(smiles)
            matches = find(mol) if mol is not None else ()
            match = next(iter(matches), ())
            wanted = [m for p in products if (m := view.mol(p)) is not None]
            if wanted and sum(len(find(m)) for m in wanted) < len(matches):
                continue
            if not match or (mode, frozenset(match)) in seen:
                continue
            if any(len(frozenset(match) & s) * 2 >= len(match) for s in skip):
                continue
            answers = {r: is_at_least_as_forcing(profile, view.profile(r)) for r in rows}
            lost = [r for r, answer in answers.items() if answer is not False]
            if not lost:
                continue
            survived = [
                int(r)
                for r in view.rows_with_motif(smarts)
                if int(r) not in rows
                and any(is_at_least_as_forcing(view.profile(int(r)), view.profile(f)) for f in lost)
                and motif_came_through(view.run(int(r)), find, view.mol)
            ]
            unsure = all(answers[r] is None for r in lost)
            finding = _finding(view, mode, lost, survived, component, tuple(match), unsure)
            if finding is not None:
                seen.add((mode, frozenset(match)))
                findings.append(finding)
    return findings


def _motifs(view: RecordView) -> dict[tuple[str, str], list[int]]:
    """Gather the motifs of recorded losses, stated or generalised, and the rows that failed by them; kept in the view."""
    key = "resemblance motifs"
    if key not in view.memory:
        gathered: dict[tuple[str, str], list[int]] = {}
        for row, pairs in enumerate(view.failures):
            for mode, stated in pairs:
                if mode not in modes_that_lose_a_group():
                    continue
                smarts = stated or _generalised(view, row)
                if smarts:
                    gathered.setdefault((mode, smarts), []).append(row)
        view.memory[key] = gathered
    motifs: dict[tuple[str, str], list[int]] = view.memory[key]
    return motifs


def _generalised(view: RecordView, row: int) -> str | None:
    """Work out the motif of a loss from what was found; None where the record does not show it."""
    run = view.run(row)
    substrate = view.mol(view.table.substrate[row])
    found = [p.smiles for p in run.outcome.products if p.fate is Fate.GROUP_LOSS and p.smiles]
    if substrate is None or not found or (product := view.mol(found[0])) is None:
        return None
    lost = lost_atoms(substrate, product)
    survivors = _survivors(view, row)
    motif = generalise(substrate, lost, survivors)
    return motif.smarts if motif else None


def _survivors(view: RecordView, row: int, limit: int = 200) -> list[Any]:
    """Return substrates that came through conditions at least as forcing as those of a failed row."""
    failed = view.profile(row)
    mols = []
    for other in range(len(view.table)):
        if view.failures[other] or view.table.word("verdict", other) != "worked":
            continue
        if view.table.word("fate", other) == "group-loss":
            continue
        if is_at_least_as_forcing(view.profile(other), failed) and (mol := view.mol(view.table.substrate[other])):
            mols.append(mol)
            if len(mols) >= limit:
                break
    return mols


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
    notes = [run.note.strip() for run in (view.run(r) for r in lost[:3]) if run.note.strip()]
    if notes:
        why += f" Noted then: “{notes[0]}”"
    if is_uncertain:
        why += " Cannot tell whether this plan is as forcing: temperature or components not given."
    return Finding(
        rule_id=f"resemblance:{mode}:{first}",
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

"""What the book knows of a motif under a rule's conditions: lost in these runs, survived in those.

It owns the question "did the motif come through this run?" and the counting. A motif counts as lost when a failure of
the run names it, or when products that lack it make up `LOST_SHARE` or more; as survived when the main product still
holds it. Runs that say neither are not counted. An intended loss (a deprotection that worked) is a loss: it shows
that the conditions do it.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from typing import Any

from kb.assess.estimate import loss_chance
from kb.assess.record_view import RecordView
from kb.record.failure_modes import modes_that_lose_a_group
from kb.record.finding import Evidence
from kb.record.run import Run
from kb.vocabulary import Fate, Severity, Verdict

LOST_SHARE = 0.10
"""Share of products without the motif from which it counts as lost; judgement."""


FindMotif = Callable[[Any], Sequence[tuple[int, ...]]]
"""From an RDKit molecule to the atom numbers of each instance of the motif."""


def motif_came_through(run: Run, find: FindMotif, mols: Callable[[str], Any]) -> bool | None:
    """Say whether a motif survived a run.

    Args:
        run: as recorded.
        find: finds the motif in a molecule.
        mols: from SMILES to RDKit molecule or None.

    Returns:
        True = survived, False = lost, None = the record does not say.
    """
    left = [m for s in _left(run) if (m := mols(s)) is not None]
    before = sum(len(find(m)) for m in left)
    if not before:
        return None
    for failure in run.outcome.failures:
        if failure.mode in modes_that_lose_a_group() and failure.motif and _overlaps(failure.motif, find, left):
            return False
    lacking, holding = 0.0, 0.0
    for smiles, share in _products(run):
        mol = mols(smiles)
        if mol is None:
            continue
        if len(find(mol)) < before:
            lacking += share
        else:
            holding += share
    unseen_loss = sum(p.share or 0.0 for p in run.outcome.products if p.fate is Fate.GROUP_LOSS and p.smiles is None)
    if lacking >= LOST_SHARE:
        return False
    if holding > 0 and unseen_loss < LOST_SHARE and holding >= lacking:
        return True
    return None


def count_evidence(view: RecordView, rows: Iterable[int], find: FindMotif) -> tuple[list[int], list[int]]:
    """Split rows into (lost, survived) row numbers, in record order."""
    lost: list[int] = []
    survived: list[int] = []
    for row in rows:
        outcome = motif_came_through(view.run(row), find, view.mol)
        if outcome is False:
            lost.append(row)
        elif outcome is True:
            survived.append(row)
    return lost, survived


def word_evidence(view: RecordView, lost: list[int], survived: list[int], temperature_c: float | None) -> Evidence:
    """Turn counted rows into evidence with the chance of loss and a note on temperature where it divides them."""
    codes = view.table.codes
    return Evidence(
        lost=len(lost),
        survived=len(survived),
        runs=tuple(codes[r] for r in [*lost, *survived]),
        chance=loss_chance(len(lost), len(survived)) if lost or survived else None,
        note=_temperature_note(view, lost, survived, temperature_c),
    )


def weighed_severity(severity: Severity, evidence: Evidence) -> Severity:
    """Let the book speak: raise or lower a rule's severity by one step where its evidence is clear.

    Raised where even the low end of the chance is above one half; lowered where the high end is below one quarter
    (a lone survivor never lowers anything). Both limits are judgements.
    """
    if evidence.chance is None:
        return severity
    order = list(Severity)
    if evidence.chance.low > 0.5:
        return order[min(severity.rank + 1, 2)]
    if evidence.chance.high < 0.25:
        return order[max(severity.rank - 1, 0)]
    return severity


def _left(run: Run) -> list[str]:
    side = run.scheme.split(">")
    return [s for part in side[:2] for s in part.split(".") if s] if len(side) == 3 else run.scheme.split(".")


def _products(run: Run) -> list[tuple[str, float]]:
    """Return products with structure and a share: measured, else told by the verdict."""
    measured = [(p.smiles, p.share) for p in run.outcome.products if p.smiles and p.share]
    if measured:
        return [(s, float(share)) for s, share in measured if s and share]
    side = run.scheme.split(">")
    stated = [s for s in side[2].split(".") if s] if len(side) == 3 else []
    share = {Verdict.WORKED: 1.0, Verdict.PARTLY: 0.5}.get(run.verdict, 0.0) if run.verdict else 0.0
    yield_pct = run.outcome.yield_pct
    if yield_pct is not None:
        share = max(share, min(yield_pct / 100, 1.0))
    return [(s, share) for s in stated] if share else []


def finder_of(smarts: str) -> FindMotif:
    """Return a finder for one SMARTS; a SMARTS that cannot be read is found nowhere."""
    from rdkit import Chem

    query = Chem.MolFromSmarts(smarts)

    def find(mol: Any) -> Sequence[tuple[int, ...]]:
        return () if query is None else mol.GetSubstructMatches(query, uniquify=True, maxMatches=64)

    return find


def _overlaps(smarts: str, find: FindMotif, mols: list[Any]) -> bool:
    """Return True when a failure's motif and the rule's share an atom somewhere."""
    named = finder_of(smarts)
    for mol in mols:
        hit = {a for match in named(mol) for a in match}
        if any(hit & set(match) for match in find(mol)):
            return True
    return False


def _temperature_note(view: RecordView, lost: list[int], survived: list[int], plan_c: float | None) -> str:
    hot = [t for r in lost if (t := view.table.number("temperature_c", r)) is not None]
    cold = [t for r in survived if (t := view.table.number("temperature_c", r)) is not None]
    if hot and cold and max(cold) < min(hot):
        where = ""
        if plan_c is not None:
            where = "; this plan is with the losses" if plan_c >= min(hot) else "; this plan lies below the losses"
        return f"survived at {max(cold):.0f} °C and below, lost at {min(hot):.0f} °C and above{where}"
    return ""

"""Cautions: hazards of a planned mixture, each with its consequence, its source and who decides.

It owns the walk over the hazard table and the worked-out checks, the findings that come of them, and which
liabilities need not be told beside them. A caution is never suppressed, by no evidence and no setting. It
repeats what the usual safety literature says; it is never permission, and every finding defers to local rules
and qualified people.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from kb.assess.caution_checks import Worked, work_out
from kb.assess.caution_mixture import Ingredient, Mixture, build_mixture
from kb.assess.caution_table import CautionRule, load_cautions
from kb.assess.predicate_words import NO_SOLVENT
from kb.assess.rulefile import load_rules
from kb.chem.facts import Reading
from kb.materials.profile import ConditionProfile
from kb.record.conditions import Conditions
from kb.record.finding import Finding
from kb.vocabulary import FindingKind, Severity


def find_cautions(
    *,
    reading: Reading,
    fragments: Sequence[str],
    profile: ConditionProfile,
    conditions: Conditions,
    products: Sequence[str] = (),
) -> tuple[Finding, ...]:
    """Return the hazards of a mixture, most severe first.

    Args:
        reading: its fate says whether groups are meant to be lost (gas).
        fragments: SMILES of the left-side fragments as entered, in component order.
        profile: what the conditions are.
        conditions: vessel, scale, work-up, and components with a known structure.
        products: SMILES of what should form.

    Returns:
        Findings of kind caution; one per group of the table, the most severe.
    """
    table = load_cautions()
    mixture = build_mixture(fragments, products, conditions, profile)
    best: dict[str, Finding] = {}
    for rule in table.rules:
        finding = _from_rule(rule, mixture, table.defer)
        if finding is not None:
            held = best.get(rule.group)
            if held is None or _weight(finding) > _weight(held):
                best[rule.group] = finding
    worked = [_from_worked(w, table.defer) for w in work_out(mixture, reading, table)]
    return tuple(sorted([*best.values(), *worked], key=lambda f: (-f.severity.rank, f.is_uncertain)))


def drop_told(liabilities: Sequence[Finding], cautions: Sequence[Finding]) -> tuple[Finding, ...]:
    """Return the liabilities that no caution tells already.

    A liability yields to a caution that its rule names (`also_caution`), where that caution is at least as severe and
    as certain. It stays where the book holds losses: those stand in no caution. A caution never yields.
    """
    told = {c.rule_id: c for c in cautions}
    return tuple(f for f in liabilities if not _is_told(f, told))


def _is_told(finding: Finding, told: Mapping[str, Finding]) -> bool:
    if finding.kind is not FindingKind.LIABILITY or (finding.evidence is not None and finding.evidence.lost):
        return False
    names = next((r.also_caution for r in load_rules() if r.rule_id == finding.rule_id), ())
    found = [told[name] for name in names if name in told]
    return any(c.severity.rank >= finding.severity.rank and c.is_uncertain <= finding.is_uncertain for c in found)


def _weight(finding: Finding) -> tuple[int, int]:
    return finding.severity.rank, int(not finding.is_uncertain)


def _from_rule(rule: CautionRule, mixture: Mixture, defer: str) -> Finding | None:
    """Return the finding of one row, None where it does not hold."""
    if rule.needs_closed_vessel and mixture.is_closed is not True:
        return None
    if rule.min_scale_mmol is not None and (mixture.scale_mmol or 0.0) < rule.min_scale_mmol:
        return None
    said, gaps = _conditions_hold(rule, mixture)
    if said is None:
        return None
    places = [mixture.first_with(smarts) for smarts in rule.motifs]
    if any(place is None for place in places):
        return None
    first = next((p for p in places if p is not None), None)
    lines = [rule.consequence]
    if gaps:
        lines.append(f"Cannot tell whether it applies: {'; '.join(gaps)}.")
    elif said:
        lines.append(f"Here: {said}.")
    lines.append(defer)
    severity = min(rule.severity, Severity.CAUTION, key=lambda s: s.rank) if gaps else rule.severity
    return Finding(
        rule_id=rule.rule_id,
        kind=FindingKind.CAUTION,
        severity=severity,
        title=rule.title,
        why=" ".join(lines),
        component=first[0].component if first else None,
        atoms=first[1] if first and first[0].component is not None else (),
        do_instead=rule.do,
        source=rule.source,
        is_uncertain=bool(gaps),
    )


def _conditions_hold(rule: CautionRule, mixture: Mixture) -> tuple[str | None, tuple[str, ...]]:
    """Return why the conditions hold (None = they do not) and what is missing where that cannot be told."""
    profile = mixture.profile
    gaps: tuple[str, ...] = ()
    if rule.when is None and not rule.workup:
        return "", ()
    if rule.when is not None:
        truth = rule.when.evaluate(profile)
        if truth:
            return "; ".join(rule.when.reasons(profile)), ()
        gaps = rule.when.deciding_gaps(profile) if truth is None else ()
        gaps = tuple(gap for gap in gaps if gap != NO_SOLVENT)
    acid = mixture.first_acid() if rule.any_acid and rule.workup_when and rule.workup_when.evaluate(profile) else None
    if acid:
        return f"the flask holds {acid}", ()
    words = (mixture.conditions.workup or "").lower()
    in_workup = next((w for w in rule.workup if w in words), None)
    if in_workup and (rule.workup_when is None or rule.workup_when.evaluate(profile)):
        return f"the work-up names {in_workup}", ()
    return ("", gaps) if gaps else (None, ())


def _from_worked(worked: Worked, defer: str) -> Finding:
    place: Ingredient | None = worked.ingredient
    component = place.component if place else None
    return Finding(
        rule_id=worked.rule_id,
        kind=FindingKind.CAUTION,
        severity=worked.severity,
        title=worked.title,
        why=f"{worked.why} {defer}",
        component=component,
        atoms=worked.atoms if component is not None else (),
        do_instead=worked.do,
        source=worked.source,
    )

"""Liabilities of a planned step: which motifs of its molecules the conditions are known to damage.

It owns the search of all rules over the fragments of a scheme and the findings that come of it. It keeps
no rules (`rulefile`), reads no scheme (`kb.chem`) and weighs no evidence from the book. Rules whose
condition line is False are never searched for, so a check compiles and matches only what could matter.

What is meant to happen is not a worry: a group that the stated product no longer has, or a fate that is
the intended one, gives no finding. Where the conditions leave a rule open, the finding is uncertain, says
what is missing, and is at most a caution. Several rules of one group on one place are one finding, the
most severe first.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from kb.assess.liability_rule import Rule
from kb.assess.predicate_words import NO_SOLVENT
from kb.assess.rulefile import load_rules
from kb.chem.facts import Reading
from kb.errors import RecordNotFound
from kb.materials.profile import ConditionProfile
from kb.record.finding import Finding
from kb.vocabulary import Confidence, Fate, FindingKind, Severity

if TYPE_CHECKING:
    from rdkit import Chem

    from kb.assess.liability_fragments import Fragment
    from kb.assess.liability_intent import Place

MAX_PRODUCTS = 4
"""Most regioisomers named in one finding."""


@dataclass(frozen=True, slots=True, kw_only=True)
class _Hit:
    """A rule that fires on places of one fragment (no place: on the mixture)."""

    rule: Rule
    places: tuple[Place, ...]
    gaps: tuple[str, ...]
    severity: Severity

    @property
    def component(self) -> int | None:
        return self.places[0].component if self.places else None

    @property
    def atoms(self) -> frozenset[int]:
        return frozenset(a for p in self.places for a in p.match.core)


def all_rules() -> tuple[Rule, ...]:
    """Return every shipped rule, in table order."""
    return load_rules()


def get_rule(rule_id: str) -> Rule:
    """Return the rule of that id.

    Raises:
        RecordNotFound: where no shipped rule has it.
    """
    for rule in load_rules():
        if rule.rule_id == rule_id:
            return rule
    raise RecordNotFound(f"No liability rule is called {rule_id}.", "See DEVELOPERS.md for the list.", rule_id)


def find_liabilities(
    *,
    reading: Reading,
    fragments: Sequence[str],
    profile: ConditionProfile,
    product: str | None = None,
    others: Sequence[str] = (),
    ignore_intention: bool = False,
    rules: Iterable[Rule] | None = None,
    kind: FindingKind = FindingKind.LIABILITY,
) -> tuple[Finding, ...]:
    """Search every rule and return what fires, most severe first.

    Args:
        reading: its centres, nucleophile and fate say what is meant to happen.
        fragments: SMILES of the left-side fragments as entered, in component order; one that cannot be
            read is passed over.
        profile: what the conditions are.
        product: SMILES of the intended product; None = take it from the reading.
        others: SMILES of recorded reagents and solvents that are not drawn; possible second reactants.
        ignore_intention: report also what is meant to be lost.
        rules: which rules; None = the shipped ones.
        kind: kind of the findings made (house rules are searched by this same function).

    Returns:
        Findings; atom indices refer to the fragment as entered.
    """
    open_rules = [
        (rule, gaps)
        for rule in (load_rules() if rules is None else rules)
        if (gaps := _gaps(rule, profile)) is not None
    ]
    if not open_rules:
        return ()
    from kb.assess.liability_fragments import read_fragments, read_named
    from kb.assess.liability_intent import read_product, stated_product
    from kb.assess.liability_outrun import is_outrun

    flask = read_fragments(fragments, reading)
    if reading.nucleophile is None:
        flask = (*flask, *read_named(profile, flask))
    target = None if ignore_intention else read_product(product or stated_product(reading))
    intended = reading.fate if not ignore_intention else None
    hits: list[_Hit] = []
    for rule, gaps in open_rules:
        if rule.gives is not None and rule.gives is intended and rule.side in ("centre", "nucleophile"):
            continue
        severity = min(rule.severity, Severity.CAUTION, key=lambda s: s.rank) if gaps else rule.severity
        if rule.side == "mixture":
            hits.append(_Hit(rule=rule, places=(), gaps=gaps, severity=severity))
            continue
        places = _places(rule, flask, reading, profile)
        if rule.yields_to and not ignore_intention and is_outrun(rule, reading, profile, target, flask):
            places = tuple(p for p in places if not _holds_centre(p, reading))
        if rule.side in ("bystander", "anywhere") and not ignore_intention:
            places = _not_meant(rule, places, target, reading)
        elif rule.side in ("centre", "nucleophile") and reading.confidence is Confidence.UNRESOLVED:
            severity = min(severity, Severity.CAUTION, key=lambda s: s.rank)
        for component in dict.fromkeys(p.component for p in places):
            here = tuple(p for p in places if p.component == component)
            hits.append(_Hit(rule=rule, places=here, gaps=gaps, severity=severity))
    made = []
    for group in _grouped(hits):
        finding = _finding(group, flask, others, profile, target, kind)
        if finding is not None:
            made.append(finding)
    return tuple(sorted(made, key=lambda f: (-f.severity.rank, f.is_uncertain, f.component or 0)))


def _gaps(rule: Rule, profile: ConditionProfile) -> tuple[str, ...] | None:
    """Return what single missing thing would decide a rule, () where it applies, None where it does not matter.

    A solvent that is not given makes no rule about a mixture matter: there would be one for every solvent.
    """
    truth = rule.applies(profile)
    if truth is not None:
        return () if truth else None
    gaps = rule.when.deciding_gaps(profile)
    if rule.side == "mixture":
        gaps = tuple(gap for gap in gaps if gap != NO_SOLVENT)
    return gaps or None


def _places(rule: Rule, flask: Sequence[Fragment], reading: Reading, profile: ConditionProfile) -> tuple[Place, ...]:
    """Return the instances of a rule's motif that lie where the rule says."""
    from kb.assess.liability_intent import Place

    places = [
        Place(component=fragment.component, mol=fragment.mol, match=match)
        for fragment in flask
        if (fragment.may_attack if rule.side == "nucleophile" else fragment.is_reactant)
        for match in rule.matches(fragment.mol, profile)
    ]
    if rule.side == "centre" and reading.centres:
        at = {(c.component, c.atom) for c in reading.centres}
    elif rule.side == "nucleophile" and reading.nucleophile is not None:
        at = {(reading.nucleophile.component, reading.nucleophile.atom)}
    else:
        return tuple(places)
    return tuple(
        p for p in places if any((p.component, way[m]) in at for way in p.match.ways for m in rule.at if m in way)
    )


def _not_meant(rule: Rule, places: tuple[Place, ...], target: Chem.Mol | None, reading: Reading) -> tuple[Place, ...]:
    """Return the places to worry about: what should survive, and the centre where a rule speaks of it too.

    A bystander is never the reacting centre itself. A rule for any place keeps the centre, unless what the
    rule predicts is what is intended there. Loss of a group without a stated product is not known to be meant.
    """
    from kb.assess.liability_intent import surviving

    is_wanted = rule.gives is not None and rule.gives is reading.fate
    at_centre = [p for p in places if _holds_centre(p, reading)]
    elsewhere = [p for p in places if p not in at_centre]
    if rule.side == "bystander" and reading.fate is Fate.GROUP_LOSS:
        elsewhere, at_centre = list(places), []
    kept = surviving(rule, elsewhere, target, reading) if elsewhere else ()
    return kept if rule.side == "bystander" or is_wanted else (*at_centre, *kept)


def _holds_centre(place: Place, reading: Reading) -> bool:
    """Return True where an instance holds a reacting centre and the atom that leaves it."""
    atoms = place.match.atoms
    return any(c.component == place.component and c.atom in atoms and c.leaving_atom in atoms for c in reading.centres)


def _grouped(hits: Sequence[_Hit]) -> list[list[_Hit]]:
    """Return hits told together: same group, same fragment, overlapping core atoms; most severe first."""
    groups: list[list[_Hit]] = []
    for hit in sorted(hits, key=lambda h: (-h.severity.rank, bool(h.gaps), -h.rule.severity.rank)):
        for group in groups:
            head = group[0]
            same = bool(hit.rule.group) and head.rule.group == hit.rule.group
            if same and head.component == hit.component and (not head.places or head.atoms & hit.atoms):
                group.append(hit)
                break
        else:
            groups.append([hit])
    return groups


def _finding(
    group: Sequence[_Hit],
    flask: Sequence[Fragment],
    others: Sequence[str],
    profile: ConditionProfile,
    target: Chem.Mol | None,
    kind: FindingKind,
) -> Finding | None:
    from kb.assess.liability_fragments import as_entered, find_partners
    from kb.assess.liability_intent import same_structure
    from kb.assess.liability_product import RACEMISED_PRODUCT, racemised_product, side_products

    head, rule = group[0], group[0].rule
    formed: list[str] = []
    blurred: list[str | None] = []
    for hit in group:
        candidates = find_partners(hit.rule, hit.component, flask, others, profile)
        if hit.rule.partner is not None and hit.rule.partner_from == "scheme" and not candidates:
            if hit is head:
                return _finding(group[1:], flask, others, profile, target, kind) if group[1:] else None
            continue
        if hit.places:
            first = hit.places[0]
            formed += side_products(hit.rule, first.match, first.mol, candidates)
            if hit.rule.product_of(first.match) == RACEMISED_PRODUCT:
                blurred.append(racemised_product(first.match, first.mol, target))
    formed = list(dict.fromkeys(formed))
    if rule.side != "bystander" and formed and all(same_structure(s, target) for s in formed):
        return None
    formed = list(dict.fromkeys([*(s for s in blurred if s), *formed]))
    atoms = sorted({a for hit in group for p in hit.places for a in p.match.atoms})
    component = head.component
    return Finding(
        rule_id=rule.rule_id,
        kind=kind,
        severity=head.severity,
        title=rule.title if len(head.places) < 2 else f"{rule.title} ({len(head.places)} places)",
        why=_why(group, formed, profile),
        component=component,
        atoms=as_entered(flask, component, atoms),
        side_product=formed[0] if formed else None,
        side_products=tuple(formed[:MAX_PRODUCTS]),
        do_instead=tuple(dict.fromkeys(d for hit in group for d in hit.rule.do_instead)),
        source="; ".join(dict.fromkeys(c for hit in group if (c := hit.rule.cited()))),
        is_uncertain=bool(head.gaps),
        also=tuple(hit.rule.rule_id for hit in group[1:]),
    )


def _why(group: Sequence[_Hit], formed: Sequence[str], profile: ConditionProfile) -> str:
    head = group[0]
    lines = [head.rule.mechanism]
    if head.gaps:
        lines.append(f"Cannot tell whether it applies: {'; '.join(head.gaps)}.")
    elif reasons := head.rule.when.reasons(profile):
        lines.append(f"Here: {'; '.join(reasons)}.")
    lines += [f"Also: {hit.rule.title}." for hit in group[1:]]
    if len(formed) > 1:
        more = " and others" if len(formed) > MAX_PRODUCTS else ""
        lines.append(f"Could give {', '.join(formed[:MAX_PRODUCTS])}{more}.")
    return " ".join(lines)

"""What becomes of a drawn stereocentre at the reacting carbon, as a finding.

It owns the words and severities; the outcome itself is `kb.physorg.stereo`, and how the product was drawn is read in
`kb.chem`. Inversion is what a chemist expects of a displacement and is a note; a centre that is likely to lose its
configuration through a cation or an ion pair is a caution. Where a liability rule has already said that the centre
racemises, only a note is added. A product that is drawn as no displacement gives it is serious, unless a neighbouring
group that takes part, or a chlorosulfite, could give retention.
"""

from __future__ import annotations

from collections.abc import Collection

from kb.assess.published import PublishedEstimate
from kb.record.finding import Finding
from kb.store.derivation import Account
from kb.vocabulary import Fate, FindingKind, Severity

LEAST_SUBSTITUTION = 0.05
"""Share of substitution below which its stereochemistry is not worth a line; judgement."""
KEPT_FROM = 0.5
"""Low end of the net inversion from which the configuration is taken to be carried over; judgement."""
_SAID_BY_RULE = frozenset({"ion-pair-racemisation", "thionyl-chloride-stereochemistry"})
_TITLES = {
    "inversion": "The drawn centre inverts",
    "mostly inversion": "The drawn centre mostly inverts",
    "racemisation with some inversion": "The drawn centre loses most of its configuration",
    "racemisation": "The drawn centre racemises",
    "unsettled": "Configuration at the drawn centre cannot be told",
}
_KEPT = frozenset({"inversion", "mostly inversion"})
_DRAWN = {
    "retention": (
        "The product is drawn with retention",
        "A displacement comes from the back and turns the centre over: the product as drawn is not what it gives.",
    ),
    "impossible": (
        "As drawn, the two groups cannot meet",
        "The attacking atom and the leaving group stand on one face of the ring, so that nothing can come from behind.",
    ),
}


def find_stereo_findings(
    account: Account, published: PublishedEstimate, rules_fired: Collection[str]
) -> tuple[Finding, ...]:
    """Return what to expect of the configuration at a drawn centre; nothing where none is drawn or none substitutes.

    Args:
        account: the plan, read.
        published: what published chemistry expects of it.
        rules_fired: ids of the liabilities that fired.
    """
    return (*_as_drawn(account, published, rules_fired), *_as_expected(account, published, rules_fired))


def _as_drawn(account: Account, published: PublishedEstimate, rules_fired: Collection[str]) -> tuple[Finding, ...]:
    """Return what is wrong with the configuration of the product as it was drawn."""
    word, centre = account.reading.stereo, account.reading.centre
    if word not in ("retention", "impossible") or centre is None:
        return ()
    has_other_way = any(i.startswith("ngp-") or i == "thionyl-chloride-stereochemistry" for i in rules_fired)
    if word == "impossible":
        severity = Severity.SERIOUS
    elif has_other_way:
        severity = Severity.NOTE
    else:
        inverts = published.stereo is not None and published.stereo.word in _KEPT
        severity = Severity.SERIOUS if inverts else Severity.CAUTION
    title, why = _DRAWN[word]
    return (
        Finding(
            rule_id=f"stereo:drawn-{word}",
            kind=FindingKind.LIABILITY,
            severity=severity,
            title=title,
            why=why + (" Here a neighbouring group or the reagent may turn it twice." if has_other_way else ""),
            component=centre.component,
            atoms=(centre.atom,),
            do_instead=(
                "look at the drawing: the product of one displacement is the other isomer",
                "for retention invert twice, for instance by way of another halide or a Mitsunobu reaction",
            )
            if word == "retention"
            else ("start from the trans isomer, or invert one of the two centres first",),
            source="inversion in displacement: E. D. Hughes, C. K. Ingold and co-workers (common practice)",
        ),
    )


def _title(word: str, account: Account) -> str:
    """Return the title; where other centres are drawn, epimers form and nothing racemises."""
    centre = account.reading.centre
    has_others = centre is not None and account.fragments[centre.component].replace("@@", "@").count("@") > 1
    return "The drawn centre gives both epimers" if word == "racemisation" and has_others else _TITLES[word]


def _as_expected(account: Account, published: PublishedEstimate, rules_fired: Collection[str]) -> tuple[Finding, ...]:
    """Return what published chemistry expects of the configuration."""
    stereo, centre = published.stereo, account.reading.centre
    if stereo is None or centre is None or account.reading.fate not in (None, Fate.SUBSTITUTION):
        return ()
    if any(i.startswith("ngp-") for i in rules_fired):
        return ()  # a neighbouring group that takes part decides the face, and its own finding says so
    substituted = dict(published.fates).get(Fate.SUBSTITUTION)
    if substituted is None or substituted.mean < LEAST_SUBSTITUTION:
        return ()
    is_told = bool(_SAID_BY_RULE & set(rules_fired))
    net = stereo.net_inversion
    is_kept = stereo.word in _KEPT and net.low >= KEPT_FROM
    return (
        Finding(
            rule_id=f"stereo:{stereo.word.replace(' ', '-')}",
            kind=FindingKind.LIABILITY,
            severity=Severity.NOTE if is_kept or is_told else Severity.CAUTION,
            title=_title(stereo.word, account),
            why=(
                f"{stereo.why} Net inversion of the substituted product, from 1 (all inverted) over 0 (racemic) to -1 "
                f"(all retained): {net.mean:.2f} ({net.low:.2f} to {net.high:.2f})."
            ),
            component=centre.component,
            atoms=(centre.atom,),
            do_instead=()
            if is_kept
            else (
                "a better nucleophile in a dipolar aprotic solvent",
                "a less ionising solvent and no acid, Lewis acid or silver",
                "carry the configuration in later, or check ee before going on",
            ),
            source="; ".join(stereo.sources),
        ),
    )

"""The channels open to a step, each with the terms of its rate.

It owns the list: SN2 by the reagent, from within the substrate (a ring closes) and at the far end of an allyl system,
displacement by the solvent, E2 and its relatives towards each carbon, ionisation and each way out of the cation. It
adds to each the spread that an additive model leaves out. Rates become shares in `competition`.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from kb.physorg.cation import Branch, is_downhill
from kb.physorg.closure import closure_terms
from kb.physorg.constants import REFERENCE_C, get_constant
from kb.physorg.elimination import SiteRate, e2_sites, geometry_extra, soft_sites, split_geometry
from kb.physorg.rates import ionisation_terms, solvent_substitution_terms, substitution_terms
from kb.physorg.step import Centre, StepFacts
from kb.physorg.terms import Term, term
from kb.vocabulary import CarbonClass, Fate, LeavingGroup


@dataclass(frozen=True, slots=True, kw_only=True)
class Draft:
    """A channel before it has a share.

    Attributes:
        name, kind, fate, terms, alkenes, is_capture: see `kb.physorg.competition.Channel`.
        branch: which way out of the cation it is; None = no cation.
    """

    name: str
    kind: str
    fate: Fate
    terms: tuple[Term, ...]
    alkenes: tuple[tuple[str, str, float], ...] = ()
    is_capture: bool = False
    branch: int | None = None


def list_channels(step: StepFacts, ways: Sequence[Branch]) -> list[Draft]:
    """Return every channel open to a step; `ways` are those out of its cation."""
    centre, medium = step.centre, step.medium
    drafts: list[Draft] = []
    extra = (term("model", "activated in situ", "activated in the flask"),) if medium.activates_hydroxyl else ()
    by_reagent = substitution_terms(step)
    if by_reagent:
        terms = (*by_reagent, *extra, term("model", "sn2", "spread of the model for SN2"))
        drafts.append(Draft(name=f"SN2 by {medium.nucleophile}", kind="sn2", fate=Fate.SUBSTITUTION, terms=terms))
        if centre.far_end_alkyl is not None and not centre.is_symmetric_allyl:
            far = (*_far_end(step, terms),)
            drafts.append(Draft(name="SN2' at the far end", kind="sn2'", fate=Fate.TRANSPOSED, terms=far))
    from_within = closure_terms(step)
    if from_within and step.closure:
        drafts.append(
            Draft(
                name=f"ring closure by {step.closure.nucleophile} ({step.closure.ring_size} members)",
                kind="closure",
                fate=Fate.OTHER if step.closure.is_aside else Fate.SUBSTITUTION,
                terms=(*from_within, *extra, term("model", "sn2", "spread of the model for SN2")),
            )
        )
    by_solvent = solvent_substitution_terms(step)
    if by_solvent:
        terms = (*by_solvent, term("model", "solvolysis", "spread of the model for solvolysis"))
        drafts.append(Draft(name="displacement by the solvent", kind="solvent", fate=Fate.SUBSTITUTION, terms=terms))
    at = REFERENCE_C if medium.temperature_c is None else medium.temperature_c
    for site in e2_sites(step):
        kind = "e1cb" if site.is_carbanionic else "e2"
        drafts.append(_site_draft(site, kind, "e2", at, geometry_extra(step), _conflict(centre)))
    drafts += [_site_draft(site, "soft e2", "soft", at, 0.0, ()) for site in soft_sites(step)]
    ionisation = ionisation_terms(step) if _can_ionise(step) else None
    if ionisation and ways:
        base = (
            *_assisted(step, ionisation),
            term("model", "ionisation", "spread of the model for ionisation"),
        )
        only_shifted = centre.carbon_class is CarbonClass.PRIMARY and not centre.is_stabilised
        for position, way in enumerate(ways):
            if only_shifted and _is_neopentyl(centre) and way.fate is not Fate.REARRANGED:
                continue
            drafts.append(
                Draft(
                    name=f"ionisation, then {way.name}",
                    kind="ionisation",
                    fate=way.fate,
                    terms=base,
                    alkenes=way.alkenes,
                    is_capture=way.is_capture,
                    branch=position,
                )
            )
    return drafts


def _site_draft(
    site: SiteRate, kind: str, model: str, temperature_c: float, extra: float, conflict: tuple[Term, ...]
) -> Draft:
    fractions = split_geometry(site.neighbour, "e2 alkoxide", temperature_c, extra)
    word = {"e1cb": "E1cB-like elimination", "e2": "E2", "soft e2": "elimination by a soft or weak base"}[kind]
    own = Term(
        because=f"one alkene against another: {site.neighbour.label}",
        log10=0.0,
        sigma=get_constant("model", "site").sigma,
    )
    return Draft(
        name=f"{word} towards {site.neighbour.label}",
        kind=kind,
        fate=Fate.ELIMINATION,
        terms=(
            *site.common,
            *site.own,
            own,
            *conflict,
            term("model", model, "spread of the model for elimination"),
        ),
        alkenes=tuple((a.label, a.geometry, f) for a, f in zip(site.neighbour.alkenes, fractions, strict=True)),
    )


def _can_ionise(step: StepFacts) -> bool:
    """Return whether a cation, free or with something moving, is worth a channel."""
    centre = step.centre
    if centre.carbon_class in (CarbonClass.SECONDARY, CarbonClass.TERTIARY) or centre.is_stabilised:
        return True
    if "cyclopropyl" in centre.activations:
        return True
    return centre.carbon_class is CarbonClass.PRIMARY and (
        _is_neopentyl(centre) or (step.medium.lewis_acid == "strong" and bool(centre.shifts))
    )


def _is_neopentyl(centre: Centre) -> bool:
    return any(n.carbons >= 3 for n in centre.neighbours)


def _assisted(step: StepFacts, terms: Sequence[Term]) -> list[Term]:
    """Return ionisation with the help of a group that moves as the leaving group goes, where one can."""
    centre = step.centre
    if centre.is_stabilised:
        return list(terms)
    if centre.carbon_class is CarbonClass.PRIMARY:
        assisted = term("ionisation_neopentyl", "assisted", "the neighbouring group moves as the leaving group goes")
        extra = []
        if any(s.migrant == "aryl" for s in centre.shifts):
            extra.append(term("ionisation_neopentyl", "aryl", "an aryl group moves more readily than an alkyl"))
        if step.leaving_group is LeavingGroup.HYDROXYL and step.medium.acid == "strong":
            extra.append(term("ionisation_neopentyl", "protonated alcohol", "water leaves a protonated alcohol"))
        return [*(assisted if t.because == "primary cation" else t for t in terms), *extra]
    if centre.carbon_class is CarbonClass.SECONDARY and any(is_downhill(centre, s.cation) for s in centre.shifts):
        return [
            *terms,
            term("ionisation_participation", "secondary", "a neighbour moves as the leaving group goes"),
        ]
    return list(terms)


def _far_end(step: StepFacts, terms: Iterable[Term]) -> list[Term]:
    """Return SN2' from SN2: near branching does not count, its rarity and the far end's alkyls do."""
    kept = [t for t in terms if not t.because.endswith((" centre", "on the next carbon"))]
    kept.append(term("transposition", "sn2prime", "attack at the far end is rarer than at the centre"))
    if step.centre.far_end_alkyl:
        kept.append(term("sn2_class", "secondary", "far end is substituted", min(step.centre.far_end_alkyl, 2)))
    return kept


def _conflict(centre: Centre) -> tuple[Term, ...]:
    if centre.carbon_class is CarbonClass.PRIMARY and not any(n.substituents for n in centre.neighbours):
        return (term("conflict", "ethyl e2", "published figures for ethyl disagree (0.9 and 10 %)"),)
    return ()

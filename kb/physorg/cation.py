"""What becomes of a cation: capture (here or at the far end of an allyl), loss of a proton, a 1,2-shift.

It owns the partition, as log10 relative to capture by the solvent (or by the nucleophile where the solvent
does not attack), not how fast the cation forms (`rates`). One shift is followed, not two. The products of a
shift are called rearranged whether captured or not, but for alkenes that loss without a shift gives as well: one
product has one fate.
"""

from __future__ import annotations

import math
from collections.abc import Set
from dataclasses import dataclass

from kb.physorg.constants import R_J_MOL_K, REFERENCE_C, find_constant, get_constant
from kb.physorg.elimination import split_geometry
from kb.physorg.energetics import kelvin
from kb.physorg.medium import nucleophile_n, solvent_word
from kb.physorg.rates import HALIDES, cation_terms, is_dehydrating, solvent_captures
from kb.physorg.step import Centre, Medium, Neighbour, StepFacts
from kb.physorg.terms import Term, find_term, term, total
from kb.vocabulary import CarbonClass, Fate, LeavingGroup

_DOWNHILL = 2.0
"""Gain in log10 of ionisation from which a shift is downhill; judged."""
_LIKE = 0.6
"""Loss in log10 of ionisation up to which a cation is about as good; judged."""
_ALKYL = ("methyl", "n-alkyl", "sec-alkyl", "tert-alkyl")


@dataclass(frozen=True, slots=True, kw_only=True)
class Branch:
    """One way out of a cation.

    Attributes:
        name: words for a person.
        fate: where it counts.
        terms: log10 relative to capture.
        alkenes: (label, geometry, fraction of this branch); empty for captures.
        is_capture: a bond to a nucleophile forms (its configuration is then open).
    """

    name: str
    fate: Fate
    terms: tuple[Term, ...]
    alkenes: tuple[tuple[str, str, float], ...] = ()
    is_capture: bool = False


def partition(step: StepFacts) -> list[Branch]:
    """Return the ways out of the cation that the step's centre would give."""
    ways = _ways_out(step.centre, step, Fate.SUBSTITUTION, Fate.ELIMINATION)
    direct = {a.label for n in step.centre.neighbours for a in n.alkenes}
    for shift in step.centre.shifts:
        if not shift_is_worth_it(step.centre, shift.cation):
            continue
        move = _shift_term(step, shift.migrant, shift.cation)
        inner = _ways_out(shift.cation, step, Fate.REARRANGED, Fate.REARRANGED)
        log_whole = math.log10(sum(10 ** total(b.terms) for b in inner)) if inner else 0.0
        for branch in inner:
            note = f"{_MIGRANTS[shift.migrant]} shift to {_describe(shift.cation)}, then {branch.name}"
            share = Term(because=f"share of the shifted cation: {branch.name}", log10=total(branch.terms) - log_whole)
            ways.append(
                Branch(
                    name=note,
                    fate=Fate.ELIMINATION if _is_direct(branch, direct) else Fate.REARRANGED,
                    terms=(move, share),
                    alkenes=branch.alkenes,
                    is_capture=branch.is_capture,
                )
            )
    return ways


def _is_direct(branch: Branch, direct: Set[str]) -> bool:
    """Return whether a branch gives only alkenes that form without a shift as well."""
    return bool(branch.alkenes) and all(label in direct for label, _, _ in branch.alkenes)


def is_downhill(before: Centre, after: Centre) -> bool:
    """Return whether a shift leads to a much better cation."""
    return total(cation_terms(after)) > total(cation_terms(before)) + _DOWNHILL


def shift_is_worth_it(before: Centre, after: Centre) -> bool:
    """Return whether a shift leads to a better cation or, from a secondary one, to one about as good."""
    gain = total(cation_terms(after)) - total(cation_terms(before))
    if before.carbon_class is CarbonClass.TERTIARY or before.is_stabilised:
        return gain > _DOWNHILL
    return gain > -_LIKE


def _ways_out(centre: Centre, step: StepFacts, captured: Fate, lost: Fate) -> list[Branch]:
    medium = step.medium
    ways = []
    attacks = solvent_captures(step)
    if attacks:
        ways.append(
            Branch(
                name=f"capture by the solvent ({attacks.replace('_', ' ')})",
                fate=captured,
                terms=(Term(because="capture by the solvent", log10=0.0, sigma=0.1),),
                is_capture=True,
            )
        )
    external = _external_capture(centre, medium, attacks is not None)
    if external:
        ways.append(external if captured is Fate.SUBSTITUTION else _renamed(external, captured))
    if centre.far_end_alkyl is not None and not centre.is_symmetric_allyl and captured is Fate.SUBSTITUTION and ways:
        ways.append(_transposed(centre))
    if "cyclopropyl" in centre.activations and captured is Fate.SUBSTITUTION and ways:
        ways.append(
            Branch(
                name="the cyclopropane opens or grows, then capture",
                fate=Fate.REARRANGED,
                terms=(term("shift", "cyclopropylmethyl", "cyclopropylmethyl, cyclobutyl and allylcarbinyl mix"),),
                is_capture=True,
            )
        )
    ways += [_loss(centre, n, step, lost) for n in centre.neighbours if n.hydrogens and n.can_be_alkene]
    return ways


def _external_capture(centre: Centre, medium: Medium, solvent_attacks: bool) -> Branch | None:
    n = nucleophile_n(medium)
    if medium.nucleophile is None or n is None:
        return None
    if not solvent_attacks:
        words = f"capture by {medium.nucleophile}"
        terms: tuple[Term, ...] = (Term(because=words, log10=0.0, sigma=0.3),)
    else:
        stabilised = "stabilised" if centre.is_stabilised else str(centre.carbon_class)
        slope = find_constant("capture_selectivity", stabilised) or get_constant("capture_selectivity", "secondary")
        terms = (
            term("capture", "constant", f"{medium.nucleophile} at 1 M against the solvent"),
            Term(
                because="the cation's lifetime lets it choose",
                log10=slope.value * n[0],
                sigma=slope.sigma * abs(n[0]),
                source=slope.source,
            ),
        )
    return Branch(name=f"capture by {medium.nucleophile}", fate=Fate.SUBSTITUTION, terms=terms, is_capture=True)


def _transposed(centre: Centre) -> Branch:
    here = max(len(centre.neighbours) + centre.aryl_count, 0)
    gap = (centre.far_end_alkyl or 0) - here
    return Branch(
        name="capture at the far end of the allyl cation",
        fate=Fate.TRANSPOSED,
        terms=(
            term(
                "transposition",
                "per far alkyl",
                f"alkyl groups: {centre.far_end_alkyl} there, {here} here",
                gap,
            ),
        ),
        is_capture=True,
    )


def _loss(centre: Centre, neighbour: Neighbour, step: StepFacts, fate: Fate) -> Branch:
    medium = step.medium
    at = REFERENCE_C if medium.temperature_c is None else medium.temperature_c
    enthalpy = get_constant("loss_enthalpy", "loss over capture")
    per_kj = 1000 / (R_J_MOL_K * math.log(10)) * (1 / kelvin(REFERENCE_C) - 1 / kelvin(at))
    terms = [
        term("loss", "per hydrogen of tert-butyl", "loss of a proton from the tert-butyl cation, per hydrogen"),
        Term(
            because=f"{neighbour.hydrogens} hydrogen(s) on {neighbour.label}",
            log10=math.log10(neighbour.hydrogens),
            sigma=0.1,
        ),
        Term(
            because=f"{at:g} °C: heat favours loss over capture",
            log10=enthalpy.value * per_kj,
            sigma=enthalpy.sigma * abs(per_kj),
            source=enthalpy.source,
        ),
    ]
    leaving = find_term("loss_leaving", step.leaving_group, f"{step.leaving_group} nearby")
    if leaving:
        terms.append(leaving)
    terms += _loss_medium(step)
    if centre.oxocarbenium:
        terms.append(term("loss_class", "oxocarbenium", "a donor-stabilised cation is captured"))
    elif "benzylic" in centre.activations and centre.carbon_class is CarbonClass.SECONDARY:
        terms.append(term("loss_class", "secondary benzylic", "a secondary benzylic cation is captured"))
    factor = get_constant("loss_beta_second", "factor").value
    alkyls = sorted((s for s in neighbour.substituents if s in _ALKYL), key=_ALKYL.index)
    terms += [
        term("loss_beta", size, f"{size} on {neighbour.label} stabilises the alkene", 1.0 if i == 0 else factor)
        for i, size in enumerate(alkyls)
    ]
    others = [find_term("loss_beta", s, f"{s} on {neighbour.label}") for s in neighbour.substituents if s not in _ALKYL]
    terms += [t for t in others if t]
    fractions = split_geometry(neighbour, "loss", at, 0.0)
    return Branch(
        name=f"loss of a proton from {neighbour.label}",
        fate=fate,
        terms=tuple(terms),
        alkenes=tuple((a.label, a.geometry, f) for a, f in zip(neighbour.alkenes, fractions, strict=True)),
    )


def _loss_medium(step: StepFacts) -> list[Term]:
    medium = step.medium
    word = solvent_word(medium)
    terms = []
    found = find_term("loss_solvent", word, f"in {word}") if word else None
    if found and not ("water" in medium.solvent_kinds and len(medium.solvent_kinds & {"alcohol", "polar-aprotic"})):
        terms.append(found)  # aqueous alcohols are the reference itself
    if is_dehydrating(medium):
        terms.append(term("loss_base", "activated alcohol with an amine", "the amine in the flask takes the proton"))
    if _has_halide(medium) and medium.acid == "strong":
        terms.append(term("loss_acid_heat", "halide", "the alkene adds the hydrogen halide again"))
    return terms


def _has_halide(medium: Medium) -> bool:
    return medium.nucleophile in {str(h) for h in HALIDES} | {
        "hydrogen_halide", "hydrogen_bromide", "hydrogen_chloride", "hydrogen_iodide", "hydrogen_fluoride"
    }  # fmt: skip


def _shift_term(step: StepFacts, migrant: str, after: Centre) -> Term:
    before = step.centre
    words = f"1,2-shift ({_MIGRANTS[migrant]}) to {_describe(after)}"
    if step.leaving_group is LeavingGroup.EPOXIDE and after.oxocarbenium and solvent_captures(step):
        return term("shift", "epoxide to carbonyl", words)
    if migrant == "ring":
        return term("shift", "ring expansion", words)
    if before.carbon_class is CarbonClass.PRIMARY and not before.is_stabilised and migrant == "hydride":
        return term("shift", "hydride primary by strong Lewis acid", words)
    if before.carbon_class is CarbonClass.PRIMARY and not before.is_stabilised:
        return term("shift", "alkyl secondary to tertiary", words)
    if is_downhill(before, after):
        if after.is_stabilised and not before.is_stabilised:
            return term("shift", "to a stabilised cation", words)
        if migrant != "hydride":
            return term("shift", "alkyl secondary to tertiary", words)
        if _has_halide(step.medium) and not step.medium.is_protic:
            return term("shift", "hydride secondary to tertiary by halide", words)
        return term("shift", "hydride secondary to tertiary", words)
    key = "hydride to a like cation" if migrant == "hydride" else "alkyl to a like cation"
    return term("shift", key, words)


def _renamed(branch: Branch, fate: Fate) -> Branch:
    return Branch(name=branch.name, fate=fate, terms=branch.terms, alkenes=branch.alkenes, is_capture=branch.is_capture)


def _describe(centre: Centre) -> str:
    kind = str(centre.carbon_class)
    extra = next((a for a in ("benzylic", "allylic", "alpha-oxygen", "alpha-nitrogen") if a in centre.activations), "")
    return f"a {kind}{' ' + extra if extra else ''} cation"


_MIGRANTS = {"hydride": "hydride", "alkyl": "alkyl", "aryl": "aryl", "ring": "ring"}

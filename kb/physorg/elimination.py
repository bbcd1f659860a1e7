"""E2 per beta carbon and per alkene: how fast, towards which side, E or Z.

It owns the regiochemistry of concerted elimination (Saytzeff against Hofmann with base bulk and leaving
group, anti-periplanar demand, acidified hydrogens) and the E/Z preference that `cation` shares. Rates are
sums of terms on the scale of `rates` (log10 of k in 1/s at 1 M). A site without a hydrogen that can stand
anti gives nothing.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from kb.physorg.constants import R_J_MOL_K, find_constant, get_constant
from kb.physorg.energetics import kelvin
from kb.physorg.medium import aprotic_gain, base_terms, bulk_of, concentration_term, heat, nucleophile_n, y_of
from kb.physorg.rates import SULFONATES
from kb.physorg.step import Alkene, Centre, Neighbour, StepFacts
from kb.physorg.terms import Term, find_term, term
from kb.vocabulary import CarbonClass, LeavingGroup

_ALKYL = ("methyl", "n-alkyl", "sec-alkyl", "tert-alkyl")
_ACIDIFYING = frozenset({"aryl", "poor aryl", "carbonyl", "vinyl", "alkynyl"})


@dataclass(frozen=True, slots=True, kw_only=True)
class SiteRate:
    """Elimination towards one carbon.

    Attributes:
        neighbour: that carbon.
        common: terms shared by all sites (base, leaving group, alpha substituents, heat).
        own: terms of this site.
        is_carbanionic: its hydrogen is acid enough for E1cB to be the better word.
    """

    neighbour: Neighbour
    common: tuple[Term, ...]
    own: tuple[Term, ...]
    is_carbanionic: bool


def e2_sites(step: StepFacts) -> list[SiteRate]:
    """Return E2 by the base, one entry per carbon that can give an alkene; empty without a base."""
    base = base_terms(step.medium)
    if base is None:
        return []
    _, strength = base
    common = [
        term("sn2_reference", "ethyl bromide + ethoxide", "scale of ethyl bromide with ethoxide in ethanol"),
        term("e2_reference", "per hydrogen of ethyl bromide", "E2 of ethyl bromide, per hydrogen"),
        term("e2", step.leaving_group, f"{step.leaving_group} against bromide"),
        *strength,
        *_alpha_terms(step.centre),
        *_branch_terms(step.centre),
    ]
    bulk, bulk_sigma = bulk_of(step.medium)
    y = y_of(step.medium)
    if y is not None and step.medium.is_protic:
        slope = get_constant("solvent_e2", "per Y")
        gap = y[0] - get_constant("y", "ethanol").value
        if gap > 0:
            common.append(
                Term(
                    because="more aqueous medium holds the base back",
                    log10=slope.value * gap,
                    sigma=math.hypot(slope.sigma * gap, slope.value * y[1]),
                    source=slope.source,
                )
            )
    if step.medium.is_protic is None:
        common.append(Term(because="solvent not known", log10=0.0, sigma=0.4))
    common.append(heat("e2", step.medium))
    sites = []
    for neighbour in step.centre.neighbours:
        if _hydrogens(neighbour) <= 0:
            continue
        own = [
            _statistics(neighbour),
            *_beta_terms(step, neighbour, bulk, bulk_sigma),
            *_ring_terms(step.centre),
            *_merging_terms(step, neighbour, bulk),
        ]
        sites.append(
            SiteRate(
                neighbour=neighbour,
                common=tuple(common),
                own=tuple(own),
                is_carbanionic="carbonyl" in neighbour.substituents,
            )
        )
    return sites


def _merging_terms(step: StepFacts, neighbour: Neighbour, bulk: float) -> tuple[Term, ...]:
    """Return what sets sulfonates of plain alkyl apart from those with an acid proton, on which rates were measured."""
    if step.leaving_group not in SULFONATES or _ACIDIFYING & set(neighbour.substituents):
        return ()
    plain = term("merging", "plain sulfonate", "no charge builds up on carbon, so a sulfonate lags less")
    if not bulk or step.centre.carbon_class is not CarbonClass.PRIMARY:
        return (plain,)
    return (plain, term("merging", "sulfonate with bulky base", "a sulfonate with a bulky base prefers SN2", bulk))


def soft_sites(step: StepFacts) -> list[SiteRate]:
    """Return elimination by a soft or weakly basic anion (follows n, not pKaH), one entry per carbon."""
    word, n = step.medium.nucleophile, nucleophile_n(step.medium)
    if word is None or n is None or step.medium.is_protic is None or _is_strong_base(word):
        return []
    if step.leaving_group is LeavingGroup.EPOXIDE:
        return []  # epoxides open; bases alone make allylic alcohols of them
    reference = get_constant("n", "alkoxide").value
    common = [
        term("sn2_reference", "ethyl bromide + ethoxide", "scale of ethyl bromide with ethoxide in ethanol"),
        term("e2_soft", "per hydrogen of ethyl", "elimination that follows nucleophilicity, per hydrogen"),
        term("sn2", step.leaving_group, f"{step.leaving_group} against bromide"),
        Term(because=f"nucleophile {word}, n {n[0]:.3g}", log10=n[0] - reference, sigma=n[1], source=n[2]),
        *_alpha_terms(step.centre),
        heat("e2", step.medium),
    ]
    gain = aprotic_gain(word, False, step.medium)
    common.append(gain if gain else term("e2_soft", "protic", "protic solvent"))
    amount = concentration_term(step.medium.nucleophile_molar)
    if amount:
        common.append(amount)
    return [
        SiteRate(
            neighbour=neighbour,
            common=tuple(common),
            own=(_statistics(neighbour), *_beta_terms(step, neighbour, 0.0, 0.0), *_ring_terms(step.centre)),
            is_carbanionic=False,
        )
        for neighbour in step.centre.neighbours
        if _hydrogens(neighbour) > 0
    ]


def split_geometry(neighbour: Neighbour, development: str, temperature_c: float, extra_log10: float) -> list[float]:
    """Return the fraction of each alkene of a site (same order), summing to 1.

    Args:
        neighbour: the site.
        development: row of the table that says how much of the strain is felt.
        temperature_c: [degC].
        extra_log10: further preference for E over Z, log10.
    """
    felt = get_constant("development", development).value
    per_kj = 1000 / (R_J_MOL_K * kelvin(temperature_c) * math.log(10))
    weights = []
    for alkene in neighbour.alkenes:
        log10 = -felt * per_kj * sum(clash_kj_mol(pair) for pair in alkene.cis_pairs)
        weights.append(10 ** (log10 + (extra_log10 / 2 if _is_opposed(alkene, neighbour) else -extra_log10 / 2)))
    whole = sum(weights)
    return [w / whole for w in weights]


def geometry_extra(step: StepFacts) -> float:
    """Return how base and leaving group move E over Z in E2, log10."""
    bulk, _ = bulk_of(step.medium)
    extra = bulk * get_constant("geometry", "per bulk").value
    if step.leaving_group in SULFONATES:
        extra += bulk * get_constant("geometry", "sulfonate with bulky base").value
    return extra


def clash_kj_mol(pair: tuple[str, str]) -> float:
    """Return the strain of two groups cis to each other [kJ/mol]; 0 for hydrogen, halogen and heteroatoms."""
    order = {"methyl": 0, "n-alkyl": 1, "sec-alkyl": 2, "tert-alkyl": 3, "aryl": 4}
    flat = {"vinyl": "n-alkyl", "alkynyl": "methyl", "carbonyl": "sec-alkyl", "poor aryl": "aryl"}
    names = [flat.get(p, p) for p in pair]
    if any(p not in order for p in names):
        return 0.0
    first, second = sorted(names, key=order.__getitem__)
    return get_constant("clash", f"{first} {second}").value


def _is_strong_base(word: str) -> bool:
    """Return whether an E2 by proton affinity is the whole story (alkoxides, hydroxide, amides)."""
    row = find_constant("pkah", word)
    return row is not None and row.value >= get_constant("pkah", "hydroxide").value


def _is_opposed(alkene: Alkene, neighbour: Neighbour) -> bool:
    strain = [sum(clash_kj_mol(p) for p in a.cis_pairs) for a in neighbour.alkenes]
    mine = sum(clash_kj_mol(p) for p in alkene.cis_pairs)
    return mine <= min(strain)


def _hydrogens(neighbour: Neighbour) -> float:
    return min(neighbour.anti_hydrogens, neighbour.hydrogens) if neighbour.can_be_alkene else 0.0


def _statistics(neighbour: Neighbour) -> Term:
    count = _hydrogens(neighbour)
    return Term(
        because=f"{count:g} hydrogen(s) on {neighbour.label} that can stand anti",
        log10=math.log10(count),
        sigma=0.3 if count != round(count) else 0.1,
    )


def _alpha_terms(centre: Centre) -> list[Term]:
    terms = []
    if len(centre.neighbours) > 1:
        others = len(centre.neighbours) - 1
        terms.append(term("e2_alpha", "alkyl", f"{others} further alkyl on the centre", others))
    for word, key in (("benzylic", "aryl"), ("allylic", "vinyl")):
        if word in centre.activations:
            terms.append(term("e2_alpha", key, f"the alkene is conjugated with {key} on the centre"))
    if centre.oxocarbenium:
        terms.append(term("e2_alpha", "hetero", "heteroatom on the centre"))
    halogens = centre.activations.count("alpha-halogen")
    if halogens:
        terms.append(term("e2_alpha", "halogen", f"{halogens} further halogen(s) on the centre", halogens))
    return terms


def _beta_terms(step: StepFacts, neighbour: Neighbour, bulk: float, bulk_sigma: float) -> list[Term]:
    terms: list[Term] = []
    factor = get_constant("e2_beta_second", "factor").value
    alkyls = sorted((s for s in neighbour.substituents if s in _ALKYL), key=_ALKYL.index)
    for position, size in enumerate(alkyls):
        scale = 1.0 if position == 0 else factor
        terms.append(term("e2_beta", size, f"{size} on {neighbour.label} stabilises the alkene", scale))
        if bulk:
            cost = get_constant("e2_bulk", size)
            terms.append(
                Term(
                    because=f"bulky base meets {size} on {neighbour.label}",
                    log10=scale * bulk * cost.value,
                    sigma=scale * math.hypot(bulk * cost.sigma, bulk_sigma * cost.value),
                    source=cost.source,
                )
            )
        hofmann = find_term("hofmann", step.leaving_group, f"{step.leaving_group} leans to the acid hydrogen", scale)
        if hofmann:
            terms.append(hofmann)
    for word in neighbour.substituents:
        if word not in _ALKYL:
            found = find_term("e2_beta", word, f"{word} on {neighbour.label}")
            if found:
                terms.append(found)
            cost_term = find_term("e2_bulk", word, f"bulky base meets {word}", bulk) if bulk else None
            if cost_term:
                terms.append(cost_term)
    return terms


def _branch_terms(centre: Centre) -> list[Term]:
    """Return how branching beside a secondary or tertiary centre crowds the base, all sites alike."""
    branches = sum(n.carbons > 0 for n in centre.neighbours) if len(centre.neighbours) > 1 else 0
    if not branches:
        return []
    return [term("e2_crowding", "alkyl", f"{branches} branched neighbour(s) crowd the base", branches)]


def _ring_terms(centre: Centre) -> list[Term]:
    if centre.ring_size != 6:
        return []
    return [term("e2_ring6", "trans-diaxial", "six-membered ring: leaving group and hydrogen must both be axial")]

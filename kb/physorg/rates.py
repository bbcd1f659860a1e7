"""Rates of the ways in which a centre loses its leaving group to substitution or to a cation.

It owns SN2 (by reagent and by solvent), ionisation, and what closes them (bridgehead, vinyl, aryl, a group
that does not leave). E2 is in `elimination`, the fate of the cation in `cation`. Every rate is a sum of
terms: log10 of a constant in 1/s at 1 M, 25 degC unless the heat term says otherwise. Refuses to give a
rate where published chemistry has none: None, with the reason in `closed_because`.
"""

from __future__ import annotations

from kb.physorg.constants import find_constant, get_constant
from kb.physorg.medium import (
    aprotic_gain,
    bulk_of,
    concentration_term,
    heat,
    n_t_of,
    nucleophile_n,
    solvent_word,
    y_of,
)
from kb.physorg.step import Centre, Medium, StepFacts
from kb.physorg.terms import Term, find_term, term
from kb.vocabulary import CarbonClass, LeavingGroup

NEEDS_ACTIVATION = frozenset({LeavingGroup.HYDROXYL, LeavingGroup.ALKOXIDE})
SULFONATES = frozenset(
    {
        LeavingGroup.MESYLATE,
        LeavingGroup.TOSYLATE,
        LeavingGroup.TRIFLATE,
        LeavingGroup.SULFONATE,
        LeavingGroup.SULFATE,
    }
)
HALIDES = frozenset({LeavingGroup.FLUORIDE, LeavingGroup.CHLORIDE, LeavingGroup.BROMIDE, LeavingGroup.IODIDE})

_BRIDGEHEAD = (
    "A bridgehead: the back is closed to SN2, a double bond there would break Bredt's rule, and the cation "
    "cannot flatten (P. D. Bartlett & L. H. Knox, J. Am. Chem. Soc. 1939, 61, 3184; R. C. Bingham & P. v. R. "
    "Schleyer, ibid. 1971, 93, 3189: rates from 10^-3 for 1-adamantyl to 10^-13 for 1-norbornyl of tert-butyl). "
    "No honest number."
)
_VINYL = (
    "A vinyl carbon: neither SN2 from the back nor ionisation is open under ordinary conditions "
    "(common practice; addition or metal catalysis is another reaction). No honest number."
)
_ARYL = (
    "An aryl carbon: SN2 and SN1 are closed; addition-elimination and metal catalysis are other reactions, "
    "which these tables do not hold (common practice). No honest number."
)


def closed_because(step: StepFacts) -> str:
    """Return why no number can be given for a step, "" where one can."""
    centre, group, medium = step.centre, step.leaving_group, step.medium
    by_class = {CarbonClass.BRIDGEHEAD: _BRIDGEHEAD, CarbonClass.VINYL: _VINYL, CarbonClass.ARYL: _ARYL}
    if centre.carbon_class in by_class:
        return by_class[centre.carbon_class]
    if find_constant("sn2", group) is None:
        return f"The tables hold no rates for {group} as leaving group. No honest number."
    if group in NEEDS_ACTIVATION and not is_acidic(medium) and not medium.activates_hydroxyl:
        what = "A hydroxyl" if group is LeavingGroup.HYDROXYL else "An alkoxide"
        if medium.acid is None and not medium.is_complete:
            return (
                f"{what} leaves only once activated, and it cannot be told whether anything here does. "
                "No honest number."
            )
        return (
            f"{what} does not leave without acid, a Lewis acid or an activating reagent (common practice): "
            "nothing that these tables hold should happen. No honest number."
        )
    return ""


def is_acidic(medium: Medium) -> bool:
    """Return True where an oxygen would be protonated or complexed well enough to leave."""
    return medium.acid == "strong" or medium.lewis_acid == "strong"


def is_dehydrating(medium: Medium) -> bool:
    """Return whether an alcohol is activated with a chloride to follow and an amine beside it (SOCl2 or POCl3)."""
    return medium.activates_hydroxyl and medium.nucleophile == "chloride" and medium.base is not None


def substitution_terms(step: StepFacts) -> list[Term] | None:
    """Return the terms of SN2 by the reagent, or None without a nucleophile of known n."""
    medium, centre = step.medium, step.centre
    word, n = medium.nucleophile, nucleophile_n(medium)
    if word is None or n is None or centre.carbon_class not in _OPEN:
        return None
    reference = get_constant("n", "alkoxide").value
    slope = get_constant("s", "primary" if centre.carbon_class in _UNHINDERED else "secondary")
    gap = n[0] - reference
    terms = [
        term("sn2_reference", "ethyl bromide + ethoxide", "ethyl bromide with ethoxide in ethanol"),
        *centre_terms(centre, step.leaving_group),
        *_protonation_terms(step),
        term("sn2", step.leaving_group, f"{step.leaving_group} against bromide"),
        Term(
            because=f"nucleophile {word}, n {n[0]:.3g} against ethoxide {reference:.3g}",
            log10=slope.value * gap,
            sigma=((slope.sigma * gap) ** 2 + n[1] ** 2) ** 0.5,
            source=n[2],
        ),
    ]
    bulk, bulk_sigma = bulk_of(medium) if medium.base in (None, word) else (0.0, 0.0)
    if bulk:
        terms.append(_bulk_term(centre, bulk, bulk_sigma))
    if is_dehydrating(medium) and centre.carbon_class is CarbonClass.TERTIARY:
        terms.append(term("sn2_class", "tertiary activated", "an activated tertiary alcohol with an amine dehydrates"))
    if word == "tertiary_amine" and centre.carbon_class is CarbonClass.SECONDARY:
        terms.append(term("sn2_bulk", "secondary", "a tertiary amine cannot reach a secondary centre well"))
    terms += [t for t in (aprotic_gain(word, False, medium), concentration_term(medium.nucleophile_molar)) if t]
    terms.append(heat("sn2", medium))
    return terms


def solvent_substitution_terms(step: StepFacts) -> list[Term] | None:
    """Return the terms of displacement by the solvent (k_s), or None where it does not attack."""
    medium, centre = step.medium, step.centre
    y, n_t = y_of(medium), n_t_of(medium)
    key = str(centre.carbon_class)
    base = find_term("solvolysis", key, f"{key} bromide in water") if y and n_t else None
    if y is None or n_t is None or base is None or gives_start_back(step):
        return None
    m, slope_l = get_constant("solvolysis_m", key), get_constant("solvolysis_l", key)
    water_y, water_n = get_constant("y", "water").value, get_constant("nt", "water").value
    group = step.leaving_group
    leaving = find_term("solvolysis", group, f"{group} against bromide") or term(
        "sn2", group, f"{group} against bromide"
    )
    return [
        base,
        *(t for t in centre_terms(centre, group) if not t.because.startswith(("secondary", "methyl", "primary"))),
        *_protonation_terms(step),
        leaving,
        Term(
            because=f"ionising power Y {y[0]:.3g} against water {water_y:.3g}",
            log10=m.value * (y[0] - water_y),
            sigma=m.value * y[1],
            source=y[2],
        ),
        Term(
            because=f"solvent nucleophilicity N_T {n_t[0]:.3g} against water {water_n:.3g}",
            log10=slope_l.value * (n_t[0] - water_n),
            sigma=slope_l.value * n_t[1],
            source=n_t[2],
        ),
        heat("solvolysis", medium),
    ]


def ionisation_terms(step: StepFacts) -> list[Term] | None:
    """Return the terms of ionisation (k_c), or None where the solvent is not known or no cation forms."""
    medium, centre, group = step.medium, step.centre, step.leaving_group
    y = y_of(medium)
    if y is None or centre.carbon_class not in _OPEN:
        return None
    terms = [
        term("ionisation_reference", "tert-butyl chloride", "tert-butyl chloride in 80 % ethanol"),
        *cation_terms(centre),
        term("ionisation", group, f"{group} against chloride"),
        Term(because=f"ionising power Y {y[0]:.3g}", log10=y[0], sigma=y[1], source=y[2]),
    ]
    if medium.halophile in ("silver", "mercury") and group in HALIDES:
        terms.append(term("ionisation_promoter", medium.halophile, f"{medium.halophile} draws the halide out"))
    if medium.lewis_acid in ("strong", "mild"):
        key = f"lewis {medium.lewis_acid}"
        terms.append(term("ionisation_promoter", key, f"{medium.lewis_acid} Lewis acid"))
    if group is LeavingGroup.EPOXIDE and medium.acid == "strong" and medium.lewis_acid not in ("strong", "mild"):
        terms.append(term("ionisation_promoter", "protonated epoxide", "the epoxide is protonated"))
    terms.append(heat("ionisation", medium))
    return terms


def _protonation_terms(step: StepFacts) -> list[Term]:
    """Return what acid does to an epoxide that opens from the back; other groups have rows of their own."""
    medium = step.medium
    if step.leaving_group is not LeavingGroup.EPOXIDE:
        return []
    if is_acidic(medium):
        return [term("epoxide_acid", "strong", "the epoxide is protonated or complexed")]
    if medium.lewis_acid == "mild" or medium.acid == "weak":
        return [term("epoxide_acid", "mild", "a mild acid helps the epoxide open")]
    return []


def centre_terms(centre: Centre, leaving_group: LeavingGroup | None = None) -> list[Term]:
    """Return what class, branching, activation and ring do to SN2, ethyl = 0."""
    key = str(centre.carbon_class)
    terms = [term("sn2_class", key, f"{key} centre")]
    # Halogens and heteroatoms hinder an attack from the back as carbons do.
    groups = {n.label: min(len(n.substituents), 3) for n in centre.neighbours}
    if centre.carbon_class is CarbonClass.PRIMARY:
        most = max(groups.values(), default=0)
        if most:
            terms.append(term("sn2_branch", f"primary {most}", f"{most} group(s) on the next carbon"))
    elif centre.carbon_class is CarbonClass.SECONDARY:
        least = 1 if centre.ring_size is None else 2  # a ring counts its own bonds in its own row
        for label, count in groups.items():
            if count >= least:
                terms.append(term("sn2_branch", f"secondary {count}", f"{count} group(s) on {label}"))
    if centre.ring_size is not None and centre.carbon_class is CarbonClass.SECONDARY:
        key = "epoxide" if leaving_group is LeavingGroup.EPOXIDE else str(min(max(centre.ring_size, 3), 8))
        terms.append(term("sn2_ring", key, f"in a {centre.ring_size}-membered ring"))
    for word in dict.fromkeys(centre.activations):
        count = centre.activations.count(word)
        each = count if word in ("alpha-halogen", "beta-heteroatom", "beta-halogen") else 1
        found = find_term("sn2_activation", "beta-heteroatom" if word == "beta-halogen" else word, word, each)
        if found:
            terms.append(found)
    return terms


def cation_terms(centre: Centre) -> list[Term]:
    """Return how easily the centre becomes a cation, tert-butyl = 0."""
    donor = centre.oxocarbenium
    if donor:
        terms = [term("ionisation_oxocarbenium", donor, f"{donor} carries the charge")]
    else:
        key = str(centre.carbon_class)
        terms = [term("ionisation_class", key, f"{key} cation")]
        for word in ("benzylic", "allylic", "cyclopropyl"):
            if word in centre.activations:
                terms.append(term("ionisation_activation", f"{_three(centre)} {word}", f"{word} cation"))
        if centre.aryl_count > 1:
            terms.append(term("ionisation_activation", "second aryl", "more aryl groups", centre.aryl_count - 1))
        if centre.far_end_alkyl:
            terms.append(
                term("ionisation_activation", "allylic far alkyl", "alkyl at the far end", centre.far_end_alkyl)
            )
    for word in dict.fromkeys(centre.activations):
        if word in (
            "propargylic",
            "alpha-carbonyl",
            "alpha-nitrile",
            "alpha-halogen",
            "beta-heteroatom",
            "beta-halogen",
        ):
            terms.append(term("ionisation_activation", word, word, centre.activations.count(word)))
    if centre.ring_size is not None:
        found = find_term("ionisation_ring", str(centre.ring_size), f"{centre.ring_size}-membered ring")
        if found:
            terms.append(found)
    return terms


def solvent_captures(step: StepFacts) -> str | None:
    """Return the solvent class that ends up on a cation, None where none does.

    Water on the cation of an alcohol only gives the alcohol back, so that it is no way out.
    """
    medium = step.medium
    word = solvent_word(medium)
    if gives_start_back(step):
        return None
    if word in ("water", "alcohol", "carboxylic_acid", "fluorinated_alcohol", "strong_acid"):
        return word
    return "aromatic" if medium.lewis_acid == "strong" and "aromatic" in medium.solvent_kinds else None


def gives_start_back(step: StepFacts) -> bool:
    """Return whether attack by the solvent would only remake the substrate (water on an alcohol)."""
    return step.leaving_group is LeavingGroup.HYDROXYL and solvent_word(step.medium) in (
        "water",
        "strong_acid",
    )


def _three(centre: Centre) -> str:
    return str(centre.carbon_class) if centre.carbon_class is not CarbonClass.METHYL else "primary"


def _bulk_term(centre: Centre, bulk: float, sigma: float) -> Term:
    constant, per_alkyl = get_constant("sn2_bulk", "constant"), get_constant("sn2_bulk", "per beta alkyl")
    value = constant.value
    if centre.carbon_class is CarbonClass.SECONDARY:
        value += get_constant("sn2_bulk", "secondary").value
    if any(n.carbons for n in centre.neighbours):
        value += per_alkyl.value
    return Term(
        because="bulky nucleophile",
        log10=bulk * value,
        sigma=((bulk * constant.sigma) ** 2 + (sigma * value) ** 2) ** 0.5,
        source=constant.source,
    )


_OPEN = frozenset({CarbonClass.METHYL, CarbonClass.PRIMARY, CarbonClass.SECONDARY, CarbonClass.TERTIARY})
_UNHINDERED = frozenset({CarbonClass.METHYL, CarbonClass.PRIMARY})

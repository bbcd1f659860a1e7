"""What the medium does to each kind of step: ionising power, nucleophilicity, base strength and bulk, heat.

It owns the reading of `Medium` against the tables; it knows nothing of the substrate but its class. Where a
value is not given it takes the mean of the solvent or reagent class, with that class's spread, and says so.
Units: Y and N_T on their scales (80 % ethanol = 0), n after Swain and Scott (water = 0), pKaH in water,
rates as log10.
"""

from __future__ import annotations

from kb.physorg.constants import REFERENCE_C, find_constant, get_constant
from kb.physorg.energetics import shift_log10_rate
from kb.physorg.step import Medium
from kb.physorg.terms import Term, from_constant, term

SOFT = frozenset(
    {
        "thiolate",
        "iodide",
        "thiocyanate",
        "hydrosulfide",
        "thiosulfate",
        "xanthate",
        "thiocarboxylate",
        "selenide",
    }
)
NEUTRAL = frozenset(
    {
        "water", "alcohol", "carboxylic_acid", "ammonia", "primary_amine", "secondary_amine",
        "tertiary_amine", "aromatic_amine", "aromatic_amine_base", "amidine_base", "guanidine_base",
        "phosphazene_base", "thioether", "phosphine", "thiourea", "hydroxylamine", "azole",
    }
)  # fmt: skip
WEAK_ANIONS = frozenset({"chloride", "bromide", "iodide", "thiocyanate", "nitrate", "thiosulfate"})
"""Anions that never act as E2 bases through proton affinity; they may still eliminate by the soft path."""

_Y_BY_CLASS = (
    "strong_acid", "fluorinated_alcohol", "water", "carboxylic_acid", "alcohol", "polar-aprotic",
    "weakly-polar", "nonpolar",
)  # fmt: skip


def solvent_word(medium: Medium) -> str | None:
    """Return the class that stands for the solvent, the most protic one first; None = not known."""
    return next((k for k in _Y_BY_CLASS if k in medium.solvent_kinds), None)


def y_of(medium: Medium) -> tuple[float, float, str] | None:
    """Return (Y, sigma, source), or None where the solvent is not known."""
    if medium.solvent_y is not None:
        return medium.solvent_y, 0.2, "Y of the solvent (Grunwald & Winstein 1948; Fainberg & Winstein 1956)"
    kinds = medium.solvent_kinds
    if {"water", "alcohol"} <= kinds or ({"water"} <= kinds and "polar-aprotic" in kinds):
        return 0.3, 1.0, "aqueous mixture of unknown composition, taken near 80 % ethanol"
    word = solvent_word(medium)
    if word is None:
        return None
    row = get_constant("y", word)
    return row.value, row.sigma, row.source


def n_t_of(medium: Medium) -> tuple[float, float, str] | None:
    """Return (N_T, sigma, source), or None for a solvent that does not attack."""
    kinds = medium.solvent_kinds
    if medium.solvent_n_t is not None:
        return medium.solvent_n_t, 0.2, "N_T of the solvent (Kevill and co-workers)"
    if "water" in kinds and len(kinds & {"alcohol", "polar-aprotic", "weakly-polar"}):
        key = "aqueous alcohol"
    else:
        key = next(
            (k for k in ("strong_acid", "fluorinated_alcohol", "water", "carboxylic_acid", "alcohol") if k in kinds),
            "",
        )
    row = find_constant("nt", key)
    return None if row is None else (row.value, row.sigma, row.source)


def heat(kind: str, medium: Medium) -> Term:
    """Return what the temperature does to a kind of step ("sn2", "e2", "ionisation", "solvolysis")."""
    row = get_constant("energy", kind)
    at = REFERENCE_C if medium.temperature_c is None else medium.temperature_c
    value = shift_log10_rate(row.value, REFERENCE_C, at)
    words = (
        f"{at:g} °C instead of 25 °C" if medium.temperature_c is not None else "temperature not recorded: 25 °C taken"
    )
    # Most of the spread is common to all barriers and moves rates, not splits: three tenths of it are kept (judged).
    return Term(because=words, log10=value, sigma=abs(value) * row.sigma / row.value * 0.3, source=row.source)


def nucleophile_n(medium: Medium) -> tuple[float, float, str] | None:
    """Return (n, sigma, source) of the nucleophile, or None where no value is known."""
    word = medium.nucleophile
    if word is None:
        return None
    row = find_constant("n", word) or (find_constant("n", "alkoxide") if word == "tertiary_alkoxide" else None)
    if medium.nucleophile_n is not None:
        return medium.nucleophile_n, 0.25, "n of that nucleophile (Swain & Scott 1953)"
    return None if row is None else (row.value, row.sigma, row.source)


def bulk_of(medium: Medium) -> tuple[float, float]:
    """Return (bulk, sigma) of the base: 0 unhindered, 1 tert-butoxide in tert-butyl alcohol."""
    bulk, sigma = medium.base_bulk, 0.15
    if bulk is None:
        hindered = {"tertiary_alkoxide", "amidine_base", "guanidine_base", "phosphazene_base", "metal_amide"}
        bulk = 1.0 if (medium.base or medium.nucleophile) in hindered else 0.0
        sigma = 0.3 if bulk else 0.05
    if bulk <= 0:
        return 0.0, 0.05
    factor = get_constant("bulk", "dissociated")
    if not medium.solvent_kinds:
        # Alcohol or dipolar aprotic: published terminal alkene runs from 21 to 78 % (check rows ZH17, ZH02).
        return bulk * (1 + factor.value) / 2, 0.45
    if medium.solvent_kinds & {"sulfoxide", "amide", "urea", "phosphoramide"} and not medium.is_protic:
        return bulk * factor.value, factor.sigma
    return bulk, sigma


def aprotic_gain(word: str, as_base: bool, medium: Medium) -> Term | None:
    """Return what an anion gains without hydrogen bonds; None in protic solvents and for neutrals."""
    if medium.is_protic is not False or word in NEUTRAL:
        return None
    if word == "fluoride" and as_base:
        return None  # its strength without hydrogen bonds is a row of its own
    if word == "fluoride" and not medium.activates_hydroxyl:
        # How bare it is counts more than the polarity of the solvent; beside an activated alcohol it is held by acid.
        return from_constant(get_constant("aprotic", "fluoride sn2"), "fluoride without hydrogen bonds")
    if word in SOFT:
        row = get_constant("aprotic", "soft anion sn2")
    else:
        row = get_constant("aprotic", "small anion e2" if as_base else "small anion sn2")
    if "polar-aprotic" in medium.solvent_kinds:
        return from_constant(row, "dipolar aprotic solvent sets the anion free")
    if as_base and word == "tertiary_alkoxide":
        share = get_constant("aprotic", "tertiary alkoxide in ether")
        return from_constant(row, "a tertiary alkoxide stays soluble and strong in ethers", share.value)
    share = get_constant("aprotic", "weakly polar")
    return from_constant(row, "aprotic solvent of low polarity: ion pairs, half set free", share.value)


def base_terms(medium: Medium) -> tuple[str, list[Term]] | None:
    """Return the base's word and what its strength and bulk do to an E2 at an unhindered hydrogen.

    The nucleophile acts where no base was added. None = nothing basic is there.
    """
    word = medium.base or medium.nucleophile
    if word is None or word in WEAK_ANIONS:
        return None
    row = find_constant("pkah", word)
    pkah = medium.base_pkah if medium.base is not None and medium.base_pkah is not None else None
    if pkah is None:
        if row is None:
            return None
        pkah = row.value
    sigma_pkah = 0.3 if row is None or medium.base_pkah is not None else row.sigma
    slope = get_constant("e2_base", "beta")
    ceiling = get_constant("e2_base", "ceiling").value
    reference = get_constant("pkah", "alkoxide").value
    gap = min(pkah, ceiling) - reference
    terms = [
        Term(
            because=f"base {word}, pKaH {pkah:.3g} against ethoxide {reference:.3g}",
            log10=slope.value * gap,
            sigma=((slope.sigma * gap) ** 2 + (slope.value * sigma_pkah) ** 2) ** 0.5,
            source=slope.source,
        )
    ]
    bulk, _ = bulk_of(medium)
    if bulk:
        terms.append(term("e2_base", "bulky", "bulky base takes the proton rather than the carbon", bulk))
    if word in NEUTRAL:
        terms.append(term("e2_base", "neutral amine", "neutral base"))
    if word == "fluoride" and medium.is_protic is not True and not medium.activates_hydroxyl:
        terms.append(term("e2_base", "fluoride aprotic", "fluoride without hydrogen bonds is a strong base"))
    gain = aprotic_gain(word, True, medium)
    if gain:
        terms.append(gain)
    if medium.base_molar is not None and medium.base_molar > 0:
        terms.append(_concentration(medium.base_molar))
    return word, terms


def concentration_term(molar: float | None) -> Term | None:
    """Return what a concentration [mol/L] other than 1 M does; None = not known, so 1 M."""
    return _concentration(molar) if molar is not None and molar > 0 else None


def _concentration(molar: float) -> Term:
    import math

    return Term(because=f"{molar:g} M", log10=math.log10(molar))

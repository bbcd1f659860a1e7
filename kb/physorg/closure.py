"""Rings that close when the attacking atom sits in the substrate: SN2 from within.

It owns the rate of that channel: SN2 between separate molecules at 1 M, times the effective molarity of the ring that
forms (`closures.csv`: three, five and six members close fast, four and seven slowly). Larger rings and bridges are
not in the table: no number, with the reason. Crowding from outside (a ring's own hindrance, branching towards the
attacking atom) is left out, since the attack does not come from outside.
"""

from __future__ import annotations

from kb.physorg.constants import find_constant, get_constant
from kb.physorg.medium import aprotic_gain, heat
from kb.physorg.rates import centre_terms
from kb.physorg.step import Closure, StepFacts
from kb.physorg.terms import Term, term
from kb.vocabulary import CarbonClass

_OPEN = frozenset({CarbonClass.METHYL, CarbonClass.PRIMARY, CarbonClass.SECONDARY, CarbonClass.TERTIARY})
_OUTSIDE = "membered ring"
_FAMILIES = {
    **dict.fromkeys(("alkoxide", "phenoxide", "alcohol", "phenol"), "oxygen"),
    **dict.fromkeys(("primary_amine", "secondary_amine", "tertiary_amine", "aromatic_amine"), "nitrogen"),
    **dict.fromkeys(("thiolate", "thiol"), "sulfur"),
    **dict.fromkeys(("carboxylate", "carboxylic_acid"), "carboxylate"),
}


def closure_refused(closure: Closure) -> str:
    """Return why nothing can be said of a ring closure that the scheme asks for, "" where something can."""
    if _row_of(closure) is not None and not closure.is_bridging and find_constant("n", closure.nucleophile):
        return ""
    if closure.is_bridging:
        what = "The attacking atom would close a bridge across a ring"
    else:
        what = f"The attacking atom sits in the substrate and would close a {closure.ring_size}-membered ring"
    return f"{what}; the tables of effective molarities do not hold that. No honest number."


def closure_terms(step: StepFacts) -> list[Term] | None:
    """Return the terms of closing the ring, None where the substrate does not attack itself."""
    closure, centre = step.closure, step.centre
    if closure is None or closure_refused(closure) or closure.is_aligned is False:
        return None
    if centre.carbon_class not in _OPEN:
        return None
    n, reference = get_constant("n", closure.nucleophile), get_constant("n", "alkoxide")
    slope = get_constant("s", "secondary" if centre.carbon_class is CarbonClass.SECONDARY else "primary")
    gap = n.value - reference.value
    terms = [
        term("sn2_reference", "ethyl bromide + ethoxide", "ethyl bromide with ethoxide in ethanol"),
        *(t for t in centre_terms(centre) if not t.because.endswith(_OUTSIDE) and "group(s) on" not in t.because),
        term("sn2", step.leaving_group, f"{step.leaving_group} against bromide"),
        Term(
            because=f"{closure.nucleophile} of the substrate, n {n.value:.3g} against ethoxide {reference.value:.3g}",
            log10=slope.value * gap,
            sigma=((slope.sigma * gap) ** 2 + n.sigma**2) ** 0.5,
            source=n.source,
        ),
        term("closure", f"{_FAMILIES[closure.nucleophile]} {closure.ring_size}", f"{closure.ring_size}-membered ring"),
    ]
    if closure.is_aligned is None:
        terms.append(term("closure", "not drawn", "configuration not drawn: half of it can close"))
    if closure.ionised_log10 < 0:
        terms.append(
            Term(
                because="only part of the attacking group has lost its proton",
                log10=closure.ionised_log10,
                sigma=0.5,
                source="difference of pKa between the group and the base (judged)",
            )
        )
    gain = aprotic_gain(closure.nucleophile, False, step.medium)
    if gain:
        terms.append(gain)
    terms.append(heat("sn2", step.medium))
    return terms


def _row_of(closure: Closure) -> str | None:
    family = _FAMILIES.get(closure.nucleophile)
    key = f"{family} {closure.ring_size}"
    return key if family and find_constant("closure", key) else None

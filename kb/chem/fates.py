"""Everything that could form from a substrate with what is in the flask: distinct products, a note each.

It gathers what the `fates_*` files draw, for the principal centre and the sensitive places around it, and
keeps the list short enough to pick from: at most `MOST` entries, none for molecules past `LARGEST` heavy
atoms. The order is by kind, not by likelihood. Likelihood is for `kb.physorg` and `kb.assess`.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import replace
from itertools import chain, islice

from kb.chem.centre import LeavingSite, find_leaving_sites
from kb.chem.facts import PossibleFate
from kb.chem.fates_addition import iter_additions, iter_halogenations, multiple_bonds
from kb.chem.fates_displacement import (
    Attacker,
    iter_displacements,
    iter_double_displacements,
    iter_sulfonylations,
)
from kb.chem.fates_elimination import can_eliminate, iter_eliminations
from kb.chem.fates_loss import iter_losses
from kb.chem.fates_shifts import iter_ring_openings, iter_shifted, iter_transposed
from kb.chem.molgraph import Molgraph
from kb.chem.nucleophile import NucleophileSite, find_nucleophile_sites, settle_word
from kb.chem.promoters import Promoters

MOST = 24
"""Most products listed for one scheme."""

LARGEST = 160
"""Heavy atoms of the largest substrate for which products are drawn."""

_LEAST_RANK = 20
_MOST_ATTACKERS = 4
_SOLVENT_WORDS = ("water", "alcohol", "amide", "sulfonate", "nitrile", "carboxylate", "chloride", "bromide", "iodide",
                  "fluoride", "tertiary_amine", "carbonate_base")  # fmt: skip


def choose_attackers(
    graphs: Sequence[Molgraph],
    reactants: int,
    substrate: int,
    leading: tuple[int, int] | None = None,
    promoters: Promoters | None = None,
) -> list[Attacker]:
    """Return the nucleophilic atoms worth drawing, the leading one first.

    Both ends of an ambident partner are taken; solvents, bases and counter-ions only when nothing better is there.

    Args:
        graphs: left-side fragments.
        reactants: how many of them are reactants; the rest are agents.
        substrate: part number of the substrate, which is no attacker here.
        leading: (part, atom) of the nucleophile that was matched; None = not known.
        promoters: what tells an acid from its anion; None = the words of the anions.
    """
    ranked: list[tuple[int, int, int, NucleophileSite]] = []
    for part, graph in enumerate(graphs):
        if part == substrate or len(graph) > LARGEST:
            continue
        for site in find_nucleophile_sites(graph):
            if site.rank < _LEAST_RANK or (site.word == "azide" and site.gone is not None and site.rank < 60):
                continue
            lead = leading == (part, site.atom)
            standing = 400 * lead + site.rank - (60 if part >= reactants else 0)
            standing += 200 if leading is not None and leading[0] == part else 0
            standing -= 100 if site.word in _SOLVENT_WORDS else 0
            ranked.append((standing, -part, -site.atom, site))
    ranked.sort(key=lambda r: (-r[0], -r[1], -r[2]))
    chosen: list[Attacker] = []
    for standing, part, _, site in ranked:
        if len(chosen) == _MOST_ATTACKERS:
            break
        plain = standing < -20
        if plain and len(chosen) >= 2:
            break
        if promoters is not None:
            site = replace(site, word=settle_word(graphs[-part], site.atom, site.word, promoters))
        chosen.append(Attacker(graphs[-part], site))
    return chosen


def list_fates(
    graph: Molgraph,
    site: LeavingSite | None,
    attackers: Sequence[Attacker],
    promoters: Promoters,
    others: Sequence[Molgraph] = (),
) -> tuple[PossibleFate, ...]:
    """Return the distinct products that could form.

    Args:
        graph: the substrate.
        site: the leaving group at its principal centre; None = none (an alkene, a labile group).
        attackers: nucleophiles present.
        promoters: what else the flask does.
        others: every other fragment, for halogens.

    Returns:
        At most `MOST`, grouped by kind; empty for molecules past `LARGEST` heavy atoms.
    """
    if len(graph) > LARGEST:
        return ()
    sources: list[Iterator[PossibleFate]] = []
    if site is not None:
        sites = [site, *_other_ends(graph, site)]
        for end in sites:
            sources.append(islice(iter_displacements(graph, end, attackers), 6))
        for attacker in attackers[:1] if site.departs else ():
            sources.append(islice(iter_double_displacements(graph, site, attacker), 2))
        if promoters.sulfonylating:
            sources.append(islice(iter_sulfonylations(graph, site, others), 2))
        for end in sites:
            if can_eliminate(end):
                sources.append(islice(iter_eliminations(graph, end), 8))
        sources.append(islice(iter_transposed(graph, site, attackers[:2]), 4))
        if not promoters.strong_base:
            sources.append(islice(iter_shifted(graph, site, attackers[:1]), 6))
            sources.append(islice(iter_ring_openings(graph, site, attackers[:1]), 4))
    elif multiple_bonds(graph):
        halogens = [o for o in others if len(o) == 2 and set(o.elements) <= {17, 35, 53}]
        sources.append(islice(iter_additions(graph, attackers[:2], with_proton=promoters.is_acidic), 12))
        if halogens:
            has_water = any(o.smiles == "O" for o in others)
            sources.append(islice(iter_halogenations(graph, halogens, with_water=has_water), 4))
    sources.append(islice(iter_losses(graph, promoters, site), 4))
    return _distinct(chain.from_iterable(sources), graph.smiles)


def _other_ends(graph: Molgraph, site: LeavingSite) -> list[LeavingSite]:
    """Return the other carbon of a ring leaving group: an epoxide opens at both ends."""
    if site.departs is not None:
        return []
    return [s for s in find_leaving_sites(graph) if s.leaving == site.leaving and s.centre != site.centre]


def _distinct(fates: Iterable[PossibleFate], substrate: str) -> tuple[PossibleFate, ...]:
    """Return the first entry for each product, without the substrate itself."""
    seen = {substrate}
    kept = []
    for fate in fates:
        if fate.product not in seen:
            seen.add(fate.product)
            kept.append(fate)
            if len(kept) == MOST:
                break
    return tuple(kept)

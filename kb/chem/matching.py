"""Which of the things that could form is the stated product?

It balances atoms (`balance`, `skeleton`) for every combination of an opening, a nucleophile and what may come
off besides, simplest first, and stops at the first level that gives the product plainly. It draws no
structures. Conditions decide only where two readings balance equally well (an ester from an acid and an
alcohol).

Levels: one change; one change after a shift or transposition; two changes (ring closures, two equivalents, a
second step in the same flask); oxidation states. Within all that balance the least cost wins, then the rank.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import replace

from kb.chem.assumptions import landing_cost
from kb.chem.balance import Losses, Workbench
from kb.chem.centre import name_group
from kb.chem.labile import comes_off
from kb.chem.match import Match
from kb.chem.matching_halogen import find_halogenations
from kb.chem.matching_twofold import find_double, find_pairs_lost
from kb.chem.molgraph import Molgraph
from kb.chem.nucleophile import HALIDES, NucleophileSite
from kb.chem.openings import (
    Opening,
    fills,
    find_addition_shifts,
    find_additions,
    find_displacements,
    find_ring_openings,
    find_shifts,
    find_transfers,
    find_transpositions,
)
from kb.chem.skeleton import Edit, Target, target_of
from kb.vocabulary import Fate

PLAIN_COST = 2
"""A reading up to this cost ends the search; a dearer one is kept only if no later level does better."""

def find_matches(bench: Workbench, product: Molgraph) -> list[Match]:
    """Return the readings that give a product, plainest first; empty when none does.

    Args:
        bench: the left side.
        product: one stated product.
    """
    target = target_of(product)
    displacements = find_displacements(bench)
    additions, transfers = find_additions(bench), find_transfers(bench)
    openings = displacements + additions + transfers
    found = list(find_losses(bench, target))
    found += _single(bench, target, openings)
    if not _is_settled(found):
        moved = find_transpositions(bench, displacements) + find_shifts(bench, displacements)
        moved += find_ring_openings(bench, displacements)
        found += _single(bench, target, moved + find_addition_shifts(bench))
    if not _is_settled(found):
        found += find_double(bench, target, openings)
        found += find_pairs_lost(bench, target, displacements)
        found += find_halogenations(bench, target)
    found = [_weighed(bench, product, match) for match in found]
    return sorted(found, key=lambda m: (m.cost, -m.rank))


def _is_settled(found: Sequence[Match]) -> bool:
    return any(match.cost <= PLAIN_COST for match in found)


def _weighed(bench: Workbench, product: Molgraph, match: Match) -> Match:
    """Return the match, made dearer when the product's bond orders speak against it."""
    if match.edit is None:
        return match
    if match.fate is Fate.ELIMINATION:
        part, atom, _ = match.centres[0]
        (where,) = bench.pool.places(match.edit, product, [bench.atom(part, atom)])
        holds = any(product.aromatic[p] or _unsaturation(product, p) > 1 for p in where)
    elif match.landing and (match.fate is Fate.ADDITION or "addition to" in match.note):
        part, atom = match.landing
        graph = bench.graphs[part]
        ends = [atom, *(n for n, code in graph.neighbours[atom].items() if code in (2, 3))][:2]
        places = bench.pool.places(match.edit, product, [bench.atom(part, a) for a in ends])
        holds = all(
            any(_unsaturation(product, p) < _unsaturation(graph, a) for p in where)
            for a, where in zip(ends, places, strict=True)
        )
    else:
        return match
    return match if holds else replace(match, cost=match.cost + 2)


def _unsaturation(graph: Molgraph, atom: int) -> int:
    """Return the highest bond order of an atom; aromatic counts as 2."""
    return max((2 if code == 4 else code for code in graph.neighbours[atom].values()), default=1)


def find_losses(bench: Workbench, target: Target) -> Iterator[Match]:
    """Yield losses of one to three labile groups from one fragment."""
    for part in range(bench.count):
        for losses in bench.losses_for((part,), bench.excess((part,), target)):
            edit = bench.edit((part,), (), (), losses) if losses else None
            if edit is None or not bench.gives(edit, target):
                continue
            lost = [g for _, g in losses if comes_off(g, bench.promoters)]
            groups = (*lost, *(g for _, g in losses if g not in lost))
            yield Match(
                fate=Fate.GROUP_LOSS if lost else Fate.OTHER,
                edit=edit,
                centres=tuple((part, g.carbon, g.leaving) for g in lost if g.carbon is not None),
                note=("loss of " if lost else "cleavage of ") + " and ".join(g.name for g in groups),
                rank=100,
                cost=len(groups) - 1,
                lost=groups,
            )


def _single(bench: Workbench, target: Target, openings: Sequence[Opening]) -> list[Match]:
    """Return matches of one opening, filled or left empty."""
    found: list[Match] = []
    for opening in openings:
        if opening.site is not None and opening.fate is not Fate.TRANSPOSED:
            found.extend(_emptied(bench, target, opening))
        if opening.fate is Fate.OTHER and opening.site is not None:
            continue
        for other in bench.attackers_within(opening.part, target, opening.removals, opening.gain):
            found.extend(_filled(bench, target, opening, other))
    return found


def _emptied(bench: Workbench, target: Target, opening: Opening) -> Iterator[Match]:
    """Yield what comes of no nucleophile: a proton lost (elimination) or a hydride taken up (reduction)."""
    parts, site = (opening.part,), opening.site
    elements, protons = bench.excess(parts, target, *opening.removals)
    if site is None:
        return
    graph = bench.graphs[opening.part]
    group = name_group(graph, site)
    is_carbene = all(n == site.leaving or graph.elements[n] in HALIDES for n in graph.neighbours[site.centre])
    if (elements, protons) == (0, -2) and opening.fate is not Fate.REARRANGED:
        edit = bench.edit(parts, opening.removals, opening.joins)
        if edit and bench.gives(edit, target):
            note = f"replacement of {group} by hydrogen"
            yield Match(fate=Fate.OTHER, edit=edit, note=note, rank=opening.rank, cost=2)
    for losses in bench.losses_for(parts, (elements, protons)):
        edit = bench.edit(parts, opening.removals, opening.joins, losses)
        if edit and bench.gives(edit, target) and opening.centre is not None:
            if is_carbene:
                note = f"loss of {group} and a proton from one carbon, a carbene"
                yield Match(fate=Fate.OTHER, edit=edit, note=note, rank=opening.rank, cost=opening.cost)
                continue
            rearranged = opening.fate is Fate.REARRANGED
            yield Match(
                fate=Fate.REARRANGED if rearranged else Fate.ELIMINATION,
                edit=edit,
                centres=((opening.part, *opening.centre),),
                note=f"{opening.note.removesuffix(', capture')}, then of a proton"
                if rearranged
                else f"loss of {group} to an alkene",
                rank=opening.rank,
                cost=opening.cost + len(losses),
                lost=tuple(g for _, g in losses),
            )


def _filled(bench: Workbench, target: Target, opening: Opening, other: int) -> Iterator[Match]:
    """Yield the opening filled by each nucleophilic atom of one part."""
    within = other == opening.part
    parts = (opening.part,) if within else (opening.part, other)
    elements, protons = bench.excess(parts, target, *opening.removals)
    protons += opening.gain
    fitting = bench.loss_table(parts).get
    graph = bench.graphs[opening.part]
    for nucleophile, dropped in bench.drops(other):
        sets = fitting((elements - dropped.elements, protons - dropped.protons))
        if sets is None or (within and not fills(nucleophile, opening, graph)):
            continue
        if opening.gain and bench.graphs[other].elements[nucleophile.atom] != 7:
            continue
        for losses in sets:
            joins = (*opening.joins, (bench.atom(opening.part, opening.atom), bench.atom(other, nucleophile.atom)))
            edit = bench.edit(parts, (*opening.removals, dropped), joins, losses)
            if edit and bench.gives(edit, target):
                yield _match(bench, opening, other, nucleophile, edit, losses, within=within)


def _match(
    bench: Workbench,
    opening: Opening,
    other: int,
    nucleophile: NucleophileSite,
    edit: Edit,
    losses: Losses,
    *,
    within: bool,
) -> Match:
    """Return the match of one filled opening."""
    word = nucleophile.word.replace("_", " ")
    note = opening.note if opening.fate is Fate.OTHER else f"{opening.note} by {word}"
    note = note.replace("addition to a multiple bond, capture by", "addition to a multiple bond of")
    unstated = 1 if not bench.is_stated(other) else 0
    if losses:
        note += ", besides loss of " + " and ".join(g.name for _, g in losses)
    return Match(
        fate=opening.fate,
        edit=edit,
        centres=((opening.part, *opening.centre),) if opening.centre else (),
        nucleophile=(other, nucleophile.atom, nucleophile.word),
        note=note + (" within the molecule" if within and opening.fate is not Fate.OTHER else ""),
        rank=opening.rank + nucleophile.rank,
        cost=opening.cost
        + len(losses)
        + unstated
        + landing_cost(opening.fate, opening.group, nucleophile.word, bench.promoters),
        lost=tuple(g for _, g in losses),
        landing=(opening.part, opening.atom),
    )

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
from dataclasses import dataclass, replace

from kb.chem.balance import Losses, Removal, Workbench
from kb.chem.labile import LabileGroup, comes_off
from kb.chem.molgraph import Molgraph
from kb.chem.nucleophile import NucleophileSite
from kb.chem.openings import (
    Opening,
    fills,
    find_additions,
    find_displacements,
    find_shifts,
    find_transfers,
    find_transpositions,
    landing_cost,
)
from kb.chem.skeleton import Edit, Target, skeleton_summary
from kb.vocabulary import Fate

PLAIN_COST = 2
"""A reading up to this cost ends the search; a dearer one is kept only if no later level does better."""

Place = tuple[int, int, int | None]
"""(part, atom, leaving atom or None), numbers within the part."""


@dataclass(frozen=True, slots=True)
class Match:
    """A reading that balances.

    Attributes:
        fate: its word.
        edit: the bond changes; None when the reading did not come from a balance.
        centres: principal centre first; empty for `other`.
        nucleophile: (part, atom in part, class word), or None.
        note: plain words for how.
        rank: to choose among equally plain ones, higher first.
        cost: assumptions needed.
        lost: groups that came off besides.
        landing: (part, atom) where the nucleophile of the leading step lands; None for losses and eliminations.
    """

    fate: Fate
    edit: Edit | None
    centres: tuple[Place, ...] = ()
    nucleophile: tuple[int, int, str] | None = None
    note: str = ""
    rank: int = 0
    cost: int = 0
    lost: tuple[LabileGroup, ...] = ()
    landing: tuple[int, int] | None = None


def find_matches(bench: Workbench, product: Molgraph) -> list[Match]:
    """Return the readings that give a product, plainest first; empty when none does.

    Args:
        bench: the left side.
        product: one stated product.
    """
    target = skeleton_summary(product).target
    displacements = find_displacements(bench)
    additions, transfers = find_additions(bench), find_transfers(bench)
    openings = displacements + additions + transfers
    found = list(find_losses(bench, target))
    found += _single(bench, target, openings)
    if not _is_settled(found):
        moved = find_transpositions(bench, displacements) + find_shifts(bench, displacements)
        found += _single(bench, target, moved)
    if not _is_settled(found):
        found += _double(bench, target, openings)
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
                centres=tuple((part, g.carbon, g.leaving) for g in lost),
                note=("loss of " if lost else "hydrolysis or cleavage of ") + " and ".join(g.name for g in groups),
                rank=100,
                cost=len(groups) - 1,
                lost=groups,
            )


def _single(bench: Workbench, target: Target, openings: Sequence[Opening]) -> list[Match]:
    """Return matches of one opening, filled or left empty."""
    found: list[Match] = []
    for opening in openings:
        if opening.site is not None and opening.fate is not Fate.TRANSPOSED and not opening.gain:
            found.extend(_emptied(bench, target, opening))
        if opening.fate is Fate.OTHER and opening.site is not None:
            continue
        for other in bench.attackers:
            found.extend(_filled(bench, target, opening, other))
    return found


def _emptied(bench: Workbench, target: Target, opening: Opening) -> Iterator[Match]:
    """Yield eliminations: the opening left empty, a proton lost beside it."""
    parts = (opening.part,)
    for losses in bench.losses_for(parts, bench.excess(parts, target, *opening.removals)):
        edit = bench.edit(parts, opening.removals, opening.joins, losses)
        if edit and bench.gives(edit, target) and opening.centre is not None:
            rearranged = opening.fate is Fate.REARRANGED
            yield Match(
                fate=Fate.REARRANGED if rearranged else Fate.ELIMINATION,
                edit=edit,
                centres=((opening.part, *opening.centre),),
                note=f"{opening.note}, then of a proton" if rearranged else f"loss of {opening.group} to an alkene",
                rank=opening.rank,
                cost=opening.cost + len(losses),
                lost=tuple(g for _, g in losses),
            )


def _filled(bench: Workbench, target: Target, opening: Opening, other: int) -> Iterator[Match]:
    """Yield the opening filled by each nucleophilic atom of one part."""
    within = other == opening.part
    parts = (opening.part,) if within else (opening.part, other)
    here = bench.excess(parts, target, *opening.removals)
    graph = bench.graphs[opening.part]
    for nucleophile in bench.nucleophiles(other):
        if within and not fills(nucleophile, opening, graph):
            continue
        dropped = bench.of_nucleophile(other, nucleophile)
        excess = (here[0] - dropped.elements, here[1] - dropped.protons + opening.gain)
        for losses in bench.losses_for(parts, excess):
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
        + landing_cost(bench.graphs[opening.part], opening, nucleophile.word, bench.promoters),
        lost=tuple(g for _, g in losses),
        landing=(opening.part, opening.atom),
    )


def _double(bench: Workbench, target: Target, openings: Sequence[Opening]) -> list[Match]:
    """Return matches of two openings filled: by one partner or two, in one molecule or in two portions of it."""
    found: list[Match] = []
    firsts = [o for o in openings if o.cost <= 1 and o.fate is not Fate.OTHER]
    seconds = [o for o in openings if o.cost <= 1 and not (o.fate is Fate.OTHER and o.site is not None)]
    for index, first in enumerate(firsts):
        found.extend(_twice(bench, target, first))
        for second in seconds:
            if second in firsts[: index + 1] or second.gain:
                continue
            if first.part == second.part and first.centre == second.centre:
                continue
            found.extend(_pair(bench, target, first, second))
        if bench.gave_up:
            break
    return found


def _twice(bench: Workbench, target: Target, opening: Opening) -> Iterator[Match]:
    """Yield two portions of the electrophile on one partner."""
    if opening.site is None:
        return
    again = bench.pool.second_portion(opening.part)
    removals = (opening.removals[0], bench.of_site(again, opening.site))
    for other in range(bench.count):
        if other == opening.part:
            continue
        parts = (opening.part, again, other)
        excess = bench.excess(parts, target, *removals)
        yield from _pairs_of_atoms(bench, target, opening, opening, parts, (other, other), removals, excess, again)


def _pair(bench: Workbench, target: Target, first: Opening, second: Opening) -> Iterator[Match]:
    """Yield two openings filled from within, by a shared partner, by two portions of it, or one each."""
    removals = (*first.removals, *second.removals)
    own = (first.part,) if first.part == second.part else (first.part, second.part)
    base = bench.excess(own, target, *removals)
    for other in bench.attackers:
        parts = own if other in own else (*own, other)
        excess = base if other in own else bench.excess(parts, target, *removals)
        fillers = {(other, other)}
        for inner in own:
            fillers |= {(other, inner), (inner, other)}
        for pair in sorted(fillers):
            yield from _pairs_of_atoms(bench, target, first, second, parts, pair, removals, excess, None)
        if other not in own and bench.is_stated(other) and len(own) == 1:
            copy = bench.pool.second_portion(other)
            both = (*parts, copy)
            excess = bench.excess(both, target, *removals)
            yield from _pairs_of_atoms(bench, target, first, second, both, (other, copy), removals, excess, None)


def _pairs_of_atoms(
    bench: Workbench,
    target: Target,
    first: Opening,
    second: Opening,
    parts: tuple[int, ...],
    fillers: tuple[int, int],
    removals: tuple[Removal, ...],
    excess: tuple[int, int],
    again: int | None,
) -> Iterator[Match]:
    """Yield every choice of the two attacking atoms, once the balance allows any."""
    options = list(bench.losses_for(parts, excess, most=1))
    if not options:
        return
    second_part = second.part if again is None else again
    one = [n for n in bench.nucleophiles(fillers[0]) if n.gone is None and n.rank >= 6]
    two = [n for n in bench.nucleophiles(fillers[1]) if n.gone is None and n.rank >= 6]
    for losses in options:
        for a in one:
            if fillers[0] == first.part and not fills(a, first, bench.graphs[first.part]):
                continue
            for b in two:
                if fillers[1] == second_part and not fills(b, second, bench.graphs[second_part]):
                    continue
                joins = (
                    (bench.atom(first.part, first.atom), bench.atom(fillers[0], a.atom)),
                    (bench.atom(second_part, second.atom), bench.atom(fillers[1], b.atom)),
                )
                edit = bench.edit(parts, removals, joins, losses)
                if edit and bench.gives(edit, target):
                    yield _double_match(bench, first, second, fillers, (a, b), edit, losses, second_part)


def _double_match(
    bench: Workbench,
    first: Opening,
    second: Opening,
    fillers: tuple[int, int],
    pair: tuple[NucleophileSite, NucleophileSite],
    edit: Edit,
    losses: Losses,
    second_part: int,
) -> Match:
    """Return the match of two filled openings; the displacement names it, whichever came first."""
    steps = [(first, first.part, fillers[0], pair[0]), (second, second_part, fillers[1], pair[1])]
    order = (Fate.SUBSTITUTION, Fate.ADDITION, Fate.OTHER)
    steps.sort(key=lambda s: (order.index(s[0].fate), s[0].cost, -s[0].rank))
    lead, lead_part, other, nucleophile = steps[0]
    graph = bench.graphs
    by_ylide = any(
        o.fate is Fate.OTHER and (f, n.atom) == (lead_part, lead.atom) for o, _, f, n in steps if lead.site is not None
    )
    return Match(
        fate=Fate.OTHER if by_ylide else lead.fate,
        edit=edit,
        centres=() if by_ylide else tuple((o.part, *o.centre) for o, _, _, _ in steps if o.centre is not None),
        nucleophile=(other, nucleophile.atom, nucleophile.word),
        note=f"{lead.note} by {nucleophile.word.replace('_', ' ')}, and {steps[1][0].note}",
        rank=lead.rank + nucleophile.rank,
        cost=1
        + len(losses)
        + sum(
            o.cost + landing_cost(graph[o.part], o, n.word, bench.promoters) + (not bench.is_stated(f))
            for o, _, f, n in steps
        ),
        lost=tuple(g for _, g in losses),
    )


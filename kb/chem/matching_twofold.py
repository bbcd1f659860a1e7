"""Products of two changes: ring closures, two equivalents, a second step in the flask, two groups lost to a pi bond.

It is asked only when one change does not give the stated product. Every choice of two openings is weighed against
elements and P before any skeleton is looked at, so that most cost two integer comparisons.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from kb.chem.assumptions import landing_cost
from kb.chem.balance import Losses, Removal, Workbench
from kb.chem.centre import name_group
from kb.chem.match import Match
from kb.chem.nucleophile import NucleophileSite
from kb.chem.openings import Opening, fills
from kb.chem.skeleton import Edit, Target
from kb.vocabulary import Fate

_WILLING = 6
"""Least rank of a nucleophilic atom that is tried in a twofold change."""


def find_double(bench: Workbench, target: Target, openings: Sequence[Opening]) -> list[Match]:
    """Return matches of two openings filled: by one partner or two, in one molecule or in two portions of it."""
    found: list[Match] = []
    firsts = [o for o in openings if o.cost <= 1 and o.fate is not Fate.OTHER]
    seconds = [o for o in openings if o.cost <= 1 and not (o.fate is Fate.OTHER and o.site is not None)]
    done: set[int] = set()
    for first in firsts:
        found.extend(_twice(bench, target, first))
        done.add(id(first))
        for second in seconds:
            if id(second) in done or second.gain:
                continue
            if first.part == second.part and first.centre == second.centre:
                continue
            found.extend(_paired(bench, target, first, second))
            if bench.gave_up:
                return found
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


def _paired(bench: Workbench, target: Target, first: Opening, second: Opening) -> Iterator[Match]:
    """Yield two openings filled from within, by a shared partner, by two portions of it, or one each."""
    removals = (*first.removals, *second.removals)
    own = (first.part,) if first.part == second.part else (first.part, second.part)
    base = bench.excess(own, target, *removals)
    for other in bench.attackers:
        bench.pairs += 1
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
    one = [n for n in bench.nucleophiles(fillers[0]) if n.gone is None and n.rank >= _WILLING]
    two = [n for n in bench.nucleophiles(fillers[1]) if n.gone is None and n.rank >= _WILLING]
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
            o.cost + landing_cost(o.fate, o.group, n.word, bench.promoters) + (not bench.is_stated(f))
            for o, _, f, n in steps
        ),
        lost=tuple(g for _, g in losses),
    )


def find_pairs_lost(bench: Workbench, target: Target, displacements: Sequence[Opening]) -> list[Match]:
    """Return eliminations of two leaving groups: to an alkyne or diene, or by a metal from neighbouring carbons.

    Args:
        bench: the left side.
        target: the product.
        displacements: openings at leaving groups.
    """
    found = []
    sites = [o for o in displacements if o.site is not None and o.site.departs and o.cost == 0]
    for index, first in enumerate(sites):
        for second in sites[index + 1 :]:
            if first.part != second.part or first.site is None or second.site is None:
                continue
            parts, removals = (first.part,), (*first.removals, *second.removals)
            elements, protons = bench.excess(parts, target, *removals)
            if elements or protons not in (0, -2):
                continue
            graph = bench.graphs[first.part]
            by_metal = protons == -2
            if by_metal and second.site.centre not in graph.neighbours[first.site.centre]:
                continue
            edit = bench.edit(parts, removals, ())
            if edit and bench.gives(edit, target):
                names = f"{name_group(graph, first.site)} and {name_group(graph, second.site)}"
                found.append(
                    Match(
                        fate=Fate.ELIMINATION,
                        edit=edit,
                        centres=((first.part, *_named(first)), (second.part, *_named(second))),
                        note=f"loss of both {names}" + (", by a metal" if by_metal else ""),
                        rank=first.rank,
                        cost=1,
                    )
                )
    return found


def _named(opening: Opening) -> tuple[int, int | None]:
    """Return (centre, leaving atom) of an opening at a leaving group."""
    return opening.centre or (opening.atom, None)

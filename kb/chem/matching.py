"""Which of the things that could form is the stated product?

It balances atoms (`skeleton`) for every combination of a leaving group, a nucleophile and what may follow in the same
flask, simplest first, and stops at the first level of complexity that gives the product. It draws no
structures and applies no conditions except where two readings balance equally well (an ester from acid and alcohol).
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property
from itertools import combinations

from kb.chem.centre import LeavingSite, find_leaving_sites
from kb.chem.labile import LabileGroup, find_labile_groups
from kb.chem.molgraph import Molgraph
from kb.chem.nucleophile import NucleophileSite, find_nucleophile_sites
from kb.chem.skeleton import Cut, Edit, Pool, Tally, Target, skeleton_summary
from kb.chem.transfer import TransferSite, find_transfer_sites
from kb.vocabulary import Fate

MAX_TRIES = 4000
"""Most candidate edits whose skeleton is looked at for one product."""


@dataclass(frozen=True, slots=True)
class Removal:
    """What a step takes from the balance: cuts, and the elements and P that go."""

    cuts: tuple[Cut, ...]
    elements: int
    protons: int


@dataclass(frozen=True, slots=True)
class Match:
    """A reading that balances.

    Attributes:
        fate: its word.
        edit: the bond changes.
        centre: (part, atom in part, leaving atom in part or None) of the principal centre; None for `other`.
        further: more centres, likewise.
        nucleophile: (part, atom in part, class word), or None.
        note: plain words for how.
        rank: to choose among equally simple ones, higher first.
        followed_by: names of groups lost besides.
    """

    fate: Fate
    edit: Edit
    centre: tuple[int, int, int | None] | None
    further: tuple[tuple[int, int, int | None], ...] = ()
    nucleophile: tuple[int, int, str] | None = None
    note: str = ""
    rank: int = 0
    followed_by: tuple[str, ...] = ()


class Workbench:
    """The left side of a scheme, taken apart: what can leave, attack, come off, in pool numbering."""

    def __init__(self, graphs: Sequence[Molgraph]) -> None:
        self.pool = Pool(graphs)
        self.count = len(graphs)
        self.tries = 0
        self._removals: dict[object, Removal] = {}

    @property
    def graphs(self) -> list[Molgraph]:
        """Return the fragments, second portions included."""
        return self.pool.graphs

    def second(self, part: int) -> int:
        """Return the part number of a second portion of a fragment."""
        return self.pool.second_portion(part)

    def atom(self, part: int, atom: int) -> int:
        """Return the pool number of an atom of a part."""
        return self.pool.starts[part] + atom

    def removal(self, part: int, kept: int, gone: int, departs: frozenset[int] | None, gain: int) -> Removal:
        """Return the balance of one broken bond; a bond held by a ring costs nothing."""
        key = (part, kept, gone, gain)
        known = self._removals.get(key)
        if known is None:
            start = self.pool.starts[part]
            moved = frozenset(a + start for a in departs or ())
            tally = self.pool.tally_of(moved)
            worth = gain if departs else 0
            if departs is None and gain == -2:
                worth = -2
            known = Removal(
                (Cut(kept + start, gone + start, moved, worth),), tally.elements, tally.protons - worth
            )
            self._removals[key] = known
        return known

    def of_site(self, part: int, site: LeavingSite) -> Removal:
        """Return the balance of a leaving group's departure."""
        return self.removal(part, site.centre, site.leaving, site.departs, -1)

    def of_nucleophile(self, part: int, site: NucleophileSite) -> Removal:
        """Return the balance of what a nucleophile drops first."""
        if site.gone is None:
            return _NOTHING
        return self.removal(part, site.atom if site.holder is None else site.holder, site.gone, site.departs, 1)

    def of_group(self, part: int, group: LabileGroup) -> Removal:
        """Return the balance of a labile group's loss."""
        key = (part, group)
        known = self._removals.get(key)
        if known is None:
            start = self.pool.starts[part]
            cuts, gone = [], frozenset[int]()
            for loss in group.losses:
                moved = frozenset(a + start for a in loss.departs)
                cuts.append(Cut(loss.kept + start, loss.gone + start, moved, loss.gain))
                gone |= moved
            tally = self.pool.tally_of(gone)
            known = Removal(tuple(cuts), tally.elements, tally.protons - sum(c.gain for c in cuts))
            self._removals[key] = known
        return known

    @cached_property
    def sites(self) -> list[tuple[int, LeavingSite]]:
        """Return every leaving group at sp3 carbon with its part."""
        return [(p, s) for p in range(self.count) for s in find_leaving_sites(self.graphs[p]) if s.is_sp3]

    @cached_property
    def transfers(self) -> list[tuple[int, TransferSite]]:
        """Return every electrophilic atom that is no sp3 carbon, with its part."""
        return [(p, s) for p in range(self.count) for s in find_transfer_sites(self.graphs[p])]

    def losses(self, part: int) -> dict[tuple[int, int], list[tuple[LabileGroup, ...]]]:
        """Return combinations of up to three labile groups of a part, keyed by what they take from the balance."""
        graph = self.graphs[part]
        known = graph.memo.get("loss table")
        if known is None:
            table: dict[tuple[int, int], list[tuple[LabileGroup, ...]]] = {(0, 0): [()]}
            groups = find_labile_groups(graph)[:24]
            for size in (1, 2, 3):
                if size == 3 and len(groups) > 8:
                    break
                for chosen in combinations(groups, size):
                    gone: set[int] = set()
                    clash = False
                    for group in chosen:
                        mine = {a for loss in group.losses for a in loss.departs}
                        if gone & mine or any(loss.kept in gone for loss in group.losses):
                            clash = True
                            break
                        gone |= mine
                    if clash or any(loss.kept in gone for g in chosen for loss in g.losses):
                        continue
                    removals = [self.of_group(part, g) for g in chosen]
                    key = (sum(r.elements for r in removals), sum(r.protons for r in removals))
                    table.setdefault(key, []).append(chosen)
            graph.memo["loss table"] = table
            known = table
        return known  # type: ignore[return-value]


_NOTHING = Removal((), 0, 0)


def find_matches(bench: Workbench, product: Molgraph) -> list[Match]:
    """Return the readings that give a product, of the simplest kind that gives any; best first, empty when none does."""
    target = skeleton_summary(product).target
    for level in (_single_steps, _double_steps):
        found = list(level(bench, target))
        if found:
            return sorted(found, key=lambda m: (len(m.followed_by), -m.rank))
    return []


def _fits(bench: Workbench, target: Target, edit: Edit) -> bool:
    bench.tries += 1
    return bench.tries <= MAX_TRIES and bench.pool.makes(edit, target)


def _sum(*removals: Removal) -> tuple[int, int]:
    return sum(r.elements for r in removals), sum(r.protons for r in removals)


def _excess(bench: Workbench, parts: Sequence[int], target: Target, *removals: Removal) -> tuple[int, int]:
    """Return the elements and P that still must go for the parts to give the target."""
    elements = sum(bench.pool.tallies[p].elements for p in parts) - target.tally.elements
    protons = sum(bench.pool.tallies[p].protons for p in parts) - target.tally.protons
    gone = _sum(*removals)
    return elements - gone[0], protons - gone[1]


def _loss_options(
    bench: Workbench, parts: Sequence[int], excess: tuple[int, int]
) -> Iterator[tuple[tuple[int, LabileGroup], ...]]:
    """Yield sets of labile groups over the parts whose loss removes the excess exactly; first the empty set."""
    if len(parts) == 1:
        for chosen in bench.losses(parts[0]).get(excess, ()):
            yield tuple((parts[0], g) for g in chosen)
        return
    if excess == (0, 0):
        yield ()
        return
    first, rest = parts[0], parts[1:]
    for key, options in bench.losses(first).items():
        remaining = (excess[0] - key[0], excess[1] - key[1])
        for tail in _loss_options(bench, rest, remaining):
            for chosen in options:
                yield tuple((first, g) for g in chosen) + tail


def _edit(
    bench: Workbench,
    parts: Sequence[int],
    removals: Sequence[Removal],
    joins: Sequence[tuple[int, int]],
    losses: Sequence[tuple[int, LabileGroup]],
) -> Edit | None:
    """Return the edit, or None when one step removes an atom that another needs."""
    cuts = [c for r in removals for c in r.cuts]
    for part, group in losses:
        cuts.extend(bench.of_group(part, group).cuts)
    gone: set[int] = set()
    for cut in cuts:
        gone |= cut.departs
    if any(c.kept in gone for c in cuts) or any(a in gone or b in gone for a, b in joins):
        return None
    return Edit(tuple(parts), tuple(cuts), tuple(joins))


def _single_steps(bench: Workbench, target: Target) -> Iterator[Match]:
    yield from _losses(bench, target)
    yield from _eliminations(bench, target)
    yield from _displacements(bench, target)
    yield from _additions(bench, target)
    yield from _transfers(bench, target)


def _losses(bench: Workbench, target: Target) -> Iterator[Match]:
    """Yield losses of one to three labile groups from one fragment."""
    for part in range(bench.count):
        for losses in _loss_options(bench, (part,), _excess(bench, (part,), target)):
            if not losses:
                continue
            edit = _edit(bench, (part,), (), (), losses)
            if edit and _fits(bench, target, edit):
                groups = [g for _, g in losses]
                principal = next((g for g in groups if g.fate is Fate.GROUP_LOSS), groups[0])
                yield Match(
                    fate=principal.fate,
                    edit=edit,
                    centre=(part, principal.carbon, principal.leaving) if principal.fate is Fate.GROUP_LOSS else None,
                    further=tuple(
                        (part, g.carbon, g.leaving) for g in groups if g is not principal and g.fate is Fate.GROUP_LOSS
                    ),
                    note="loss of " + " and ".join(g.name for g in groups)
                    if principal.fate is Fate.GROUP_LOSS
                    else "hydrolysis of " + " and ".join(g.name for g in groups),
                    rank=10,
                    followed_by=tuple(g.name for g in groups[1:]),
                )


def _eliminations(bench: Workbench, target: Target) -> Iterator[Match]:
    for part, site in bench.sites:
        removal = bench.of_site(part, site)
        for losses in _loss_options(bench, (part,), _excess(bench, (part,), target, removal)):
            edit = _edit(bench, (part,), (removal,), (), losses)
            if edit and _fits(bench, target, edit):
                yield Match(
                    fate=Fate.ELIMINATION,
                    edit=edit,
                    centre=(part, site.centre, site.leaving),
                    note=f"loss of {site.group}",
                    rank=site.rank,
                    followed_by=tuple(g.name for _, g in losses),
                )


def _displacements(bench: Workbench, target: Target) -> Iterator[Match]:
    """Yield displacement of one leaving group by one nucleophile, between molecules or within one."""
    for part, site in bench.sites:
        removal = bench.of_site(part, site)
        partners = list(range(bench.count))
        for other in partners:
            within = other == part
            parts = (part,) if within else (part, other)
            excess_here = _excess(bench, parts, target, removal)
            for nucleophile in find_nucleophile_sites(bench.graphs[other]):
                dropped = bench.of_nucleophile(other, nucleophile)
                excess = (excess_here[0] - dropped.elements, excess_here[1] - dropped.protons)
                if within and _is_idle(site, nucleophile, bench.graphs[part]):
                    continue
                for losses in _loss_options(bench, parts, excess):
                    join = (bench.atom(part, site.centre), bench.atom(other, nucleophile.atom))
                    edit = _edit(bench, parts, (removal, dropped), (join,), losses)
                    if edit and _fits(bench, target, edit):
                        yield Match(
                            fate=Fate.SUBSTITUTION,
                            edit=edit,
                            centre=(part, site.centre, site.leaving),
                            nucleophile=(other, nucleophile.atom, nucleophile.word),
                            note=f"displacement of {site.group} by {nucleophile.word.replace('_', ' ')}"
                            + (" within the molecule" if within else ""),
                            rank=site.rank + nucleophile.rank,
                            followed_by=tuple(g.name for _, g in losses),
                        )


def _is_idle(site: LeavingSite, nucleophile: NucleophileSite, graph: Molgraph) -> bool:
    """Return whether an internal attack is no reaction: by the leaving group, or on an atom already bonded."""
    atom = nucleophile.atom
    return (
        atom in (site.centre, site.leaving)
        or atom in graph.neighbours[site.centre]
        or (site.departs is not None and atom in site.departs)
    )


def _additions(bench: Workbench, target: Target) -> Iterator[Match]:
    """Yield additions of one nucleophile (and a proton) to a carbon-carbon multiple bond."""
    for part in range(bench.count):
        graph = bench.graphs[part]
        carbons = alkene_carbons(graph)
        if not carbons:
            continue
        for other in range(bench.count):
            within = other == part
            parts = (part,) if within else (part, other)
            for nucleophile in find_nucleophile_sites(bench.graphs[other]):
                dropped = bench.of_nucleophile(other, nucleophile)
                for losses in _loss_options(bench, parts, _excess(bench, parts, target, dropped)):
                    for carbon in carbons:
                        if within and (nucleophile.atom == carbon or nucleophile.atom in graph.neighbours[carbon]):
                            continue
                        join = (bench.atom(part, carbon), bench.atom(other, nucleophile.atom))
                        edit = _edit(bench, parts, (dropped,), (join,), losses)
                        if edit and _fits(bench, target, edit):
                            yield Match(
                                fate=Fate.ADDITION,
                                edit=edit,
                                centre=(part, carbon, None),
                                nucleophile=(other, nucleophile.atom, nucleophile.word),
                                note=f"addition of {nucleophile.word.replace('_', ' ')}",
                                rank=nucleophile.rank,
                                followed_by=tuple(g.name for _, g in losses),
                            )


def alkene_carbons(graph: Molgraph) -> list[int]:
    """Return the carbons of non-aromatic carbon-carbon double and triple bonds."""
    return [
        a
        for a, z in enumerate(graph.elements)
        if z == 6 and not graph.aromatic[a] and graph.has_multiple_bond(a, 6)
    ]


def _transfers(bench: Workbench, target: Target) -> Iterator[Match]:
    """Yield acyl, sulfonyl, silyl and aryl transfers and carbonyl additions: fate `other`."""
    for part, site in bench.transfers:
        removal = (
            _NOTHING if site.gone is None else bench.removal(part, site.atom, site.gone, site.departs, site.gain)
        )
        for other in range(bench.count):
            within = other == part
            parts = (part,) if within else (part, other)
            for gain in (0, 2) if "carbonyl" in site.name else (0,):
                here = _excess(bench, parts, target, removal)
                for nucleophile in find_nucleophile_sites(bench.graphs[other]):
                    dropped = bench.of_nucleophile(other, nucleophile)
                    excess = (here[0] - dropped.elements, here[1] - dropped.protons + gain)
                    if within and (
                        nucleophile.atom == site.atom or nucleophile.atom in bench.graphs[part].neighbours[site.atom]
                    ):
                        continue
                    for losses in _loss_options(bench, parts, excess):
                        join = (bench.atom(part, site.atom), bench.atom(other, nucleophile.atom))
                        edit = _edit(bench, parts, (removal, dropped), (join,), losses)
                        if edit and _fits(bench, target, edit):
                            yield Match(
                                fate=Fate.OTHER,
                                edit=edit,
                                centre=None,
                                nucleophile=(other, nucleophile.atom, nucleophile.word),
                                note=site.name,
                                rank=20 + nucleophile.rank,
                                followed_by=tuple(g.name for _, g in losses),
                            )


def _double_steps(bench: Workbench, target: Target) -> Iterator[Match]:
    """Yield two displacements: ring closure by two leaving groups, two equivalents of one partner, or one after another."""
    good = [(p, s) for p, s in bench.sites if s.leaves_unaided or s.rank > 0]
    for index, (part, site) in enumerate(good):
        removal = bench.of_site(part, site)
        for other in range(bench.count):
            if other == part:
                continue
            nucleophiles = [n for n in find_nucleophile_sites(bench.graphs[other]) if n.rank >= 10 and n.gone is None]
            if not nucleophiles:
                continue
            yield from _two_sites_one_partner(bench, target, good[index + 1 :], part, site, other, nucleophiles)
            yield from _two_portions(bench, target, part, site, removal, other, nucleophiles)


def _two_sites_one_partner(
    bench: Workbench,
    target: Target,
    later: list[tuple[int, LeavingSite]],
    part: int,
    site: LeavingSite,
    other: int,
    nucleophiles: list[NucleophileSite],
) -> Iterator[Match]:
    removal = bench.of_site(part, site)
    for part2, site2 in later:
        if part2 != part or site2.centre == site.centre:
            continue
        removal2 = bench.of_site(part, site2)
        for parts in ((part, other), (part, other, -1)):
            if parts[-1] == -1:
                parts = (part, other, bench.second(other))
            for losses in _loss_options(bench, parts, _excess(bench, parts, target, removal, removal2)):
                for first in nucleophiles:
                    for second in nucleophiles:
                        joins = (
                            (bench.atom(part, site.centre), bench.atom(parts[1], first.atom)),
                            (bench.atom(part, site2.centre), bench.atom(parts[-1], second.atom)),
                        )
                        edit = _edit(bench, parts, (removal, removal2), joins, losses)
                        if edit and _fits(bench, target, edit):
                            yield Match(
                                fate=Fate.SUBSTITUTION,
                                edit=edit,
                                centre=(part, site.centre, site.leaving),
                                further=((part, site2.centre, site2.leaving),),
                                nucleophile=(other, first.atom, first.word),
                                note=f"double displacement of {site.group} by {first.word.replace('_', ' ')}",
                                rank=site.rank + first.rank,
                                followed_by=tuple(g.name for _, g in losses),
                            )


def _two_portions(
    bench: Workbench,
    target: Target,
    part: int,
    site: LeavingSite,
    removal: Removal,
    other: int,
    nucleophiles: list[NucleophileSite],
) -> Iterator[Match]:
    again = bench.second(part)
    parts = (part, again, other)
    removal2 = bench.removal(again, site.centre, site.leaving, site.departs, -1)
    for losses in _loss_options(bench, parts, _excess(bench, parts, target, removal, removal2)):
        for index, first in enumerate(nucleophiles):
            for second in nucleophiles[index:]:
                joins = (
                    (bench.atom(part, site.centre), bench.atom(other, first.atom)),
                    (bench.atom(again, site.centre), bench.atom(other, second.atom)),
                )
                edit = _edit(bench, parts, (removal, removal2), joins, losses)
                if edit and _fits(bench, target, edit):
                    yield Match(
                        fate=Fate.SUBSTITUTION,
                        edit=edit,
                        centre=(part, site.centre, site.leaving),
                        nucleophile=(other, first.atom, first.word),
                        note=f"two displacements of {site.group} by {first.word.replace('_', ' ')}",
                        rank=site.rank + first.rank,
                        followed_by=tuple(g.name for _, g in losses),
                    )

"""The left side of a scheme laid out for trying: what each piece costs when it leaves, comes off or is let go.

It owns the arithmetic between the chemistry rules (leaving groups, nucleophiles, labile groups) and the
bookkeeping of `skeleton`: every step is a `Removal` of elements and P from the sum of the fragments, so
whether a combination can give a product at all is two integer comparisons, done before any graph is looked
at.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from kb.chem.centre import LeavingSite
from kb.chem.labile import LabileGroup, find_labile_groups
from kb.chem.molgraph import Molgraph, molgraph_of
from kb.chem.nucleophile import NucleophileSite, find_nucleophile_sites
from kb.chem.promoters import Promoters, find_promoters
from kb.chem.skeleton import Cut, Edit, Pool, Target

MAX_TRIES = 6000
"""Most candidate edits that are compared with one product; past it the reading says that it stopped."""

MAX_PAIRS = 20_000
"""Most combinations of two openings and a partner that are weighed for a twofold change."""

MAX_LABILE = 24
"""Most labile groups of one fragment that are combined; a peptide with more is read by its first ones."""


@dataclass(frozen=True, slots=True)
class Removal:
    """What a step takes from the balance: the cuts, and the elements and P that go."""

    cuts: tuple[Cut, ...] = ()
    elements: int = 0
    protons: int = 0


NOTHING = Removal()

Losses = tuple[tuple[int, LabileGroup], ...]
"""Labile groups that come off besides, each with its part."""

LossTable = dict[tuple[int, int], list[Losses]]
"""(elements, P) taken from the balance -> the losses that take just that."""


class Workbench:
    """The fragments of the left side under pool numbering, with a portion of water at hand.

    Water is always there (solvent, work-up, air); its part number is `water`, past the stated fragments, so that no
    fact ever names it as a component.
    """

    def __init__(self, graphs: Sequence[Molgraph]) -> None:
        self.pool = Pool(graphs)
        self.count = len(graphs)
        self.promoters: Promoters = find_promoters(graphs)
        self.water = self.pool.add(molgraph_of("O"))
        self.tries = 0
        self.pairs = 0
        self._removals: dict[object, Removal] = {}
        self._tables_held: dict[tuple[int, ...], LossTable] = {}
        self._sums: dict[tuple[int, int], tuple[tuple[int, int], set[tuple[int, int]], LossTable]] = {}
        self._drops: dict[int, list[tuple[NucleophileSite, Removal]]] = {}

    @property
    def graphs(self) -> list[Molgraph]:
        """Return the fragments, water and second portions included."""
        return self.pool.graphs

    @property
    def attackers(self) -> list[int]:
        """Return the parts that may bring a nucleophile."""
        return [*range(self.count), self.water]

    @property
    def gave_up(self) -> bool:
        """Return whether a limit was reached."""
        return self.tries > MAX_TRIES or self.pairs > MAX_PAIRS

    def is_stated(self, part: int) -> bool:
        """Return whether the part was written in the scheme."""
        return part < self.count

    def atom(self, part: int, atom: int) -> int:
        """Return the pool number of an atom of a part."""
        return self.pool.starts[part] + atom

    def nucleophiles(self, part: int) -> tuple[NucleophileSite, ...]:
        """Return the nucleophilic atoms of a part."""
        return find_nucleophile_sites(self.graphs[part])

    def drops(self, part: int) -> list[tuple[NucleophileSite, Removal]]:
        """Return the nucleophilic atoms of a part, each with the balance of what it drops first."""
        known = self._drops.get(part)
        if known is None:
            known = self._drops[part] = [(n, self.of_nucleophile(part, n)) for n in self.nucleophiles(part)]
        return known

    def attackers_within(
        self, part: int, target: Target, removals: Sequence[Removal], gain: int
    ) -> Iterator[int]:
        """Yield the parts one of whose nucleophilic atoms balances an opening in `part`, elements and P alone asked.

        Most do not, and what an opening takes away is the same for all of them.
        """
        elements, protons = -target.tally.elements, gain - target.tally.protons
        for removal in removals:
            elements -= removal.elements
            protons -= removal.protons
        for other in self.attackers:
            held = self._sums.get((part, other))
            if held is None:
                parts = (part,) if other == part else (part, other)
                tallies = [self.pool.tallies[p] for p in parts]
                dropped = {(d.elements, d.protons) for _, d in self.drops(other)}
                sums = (sum(t.elements for t in tallies), sum(t.protons for t in tallies))
                held = self._sums[part, other] = (sums, dropped, self.loss_table(parts))
            (all_elements, all_protons), dropped, table = held
            e, p = elements + all_elements, protons + all_protons
            for gone_elements, gone_protons in dropped:
                if (e - gone_elements, p - gone_protons) in table:
                    yield other
                    break

    def removal(self, part: int, kept: int, gone: int, departs: frozenset[int] | None, gain: int) -> Removal:
        """Return the balance of one broken bond.

        Args:
            part: the fragment.
            kept: atom that stays [number in the part].
            gone: atom that goes.
            departs: all that goes; None when a ring holds it, so that nothing leaves the molecule.
            gain: what the kept atom's side gains in P when the rest does leave.
        """
        key = (part, kept, gone, gain)
        known = self._removals.get(key)
        if known is None:
            start = self.pool.starts[part]
            moved = frozenset(a + start for a in departs or ())
            tally = self.pool.tally_of(moved)
            worth = gain if departs else 0
            known = Removal(
                (Cut(kept + start, gone + start, moved, worth),), tally.elements, tally.protons - worth
            )
            self._removals[key] = known
        return known

    def of_site(self, part: int, site: LeavingSite) -> Removal:
        """Return the balance of a leaving group's departure."""
        return self.removal(part, site.centre, site.leaving, site.departs, site.gain)

    def of_nucleophile(self, part: int, site: NucleophileSite) -> Removal:
        """Return the balance of what a nucleophile drops first."""
        if site.gone is None:
            return NOTHING
        holder = site.atom if site.holder is None else site.holder
        return self.removal(part, holder, site.gone, site.departs, site.gain)

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

    def excess(self, parts: Sequence[int], target: Target, *removals: Removal) -> tuple[int, int]:
        """Return the elements and P that must still go for the parts, less the removals, to give the target."""
        pool = self.pool
        elements = -target.tally.elements
        protons = -target.tally.protons
        for part in parts:
            elements += pool.tallies[part].elements
            protons += pool.tallies[part].protons
        for removal in removals:
            elements -= removal.elements
            protons -= removal.protons
        return elements, protons

    def losses_for(self, parts: Sequence[int], excess: tuple[int, int], *, most: int = 3) -> Iterator[Losses]:
        """Yield the sets of labile groups over the parts whose loss takes away the excess exactly, smallest first."""
        for losses in self.loss_table(parts).get(excess, ()):
            if len(losses) <= most:
                yield losses

    def loss_table(self, parts: Sequence[int]) -> LossTable:
        """Return the sets of labile groups over the parts, keyed by the elements and P that they take, smallest first.

        Most parts hold no labile group, so most choices of parts share a table.
        """
        held = self._tables_held
        table = held.get(tuple(parts))
        if table is None:
            key = tuple(p for p in sorted(set(parts)) if find_labile_groups(self.graphs[p]))
            table = held.get(key)
            if table is None:
                table = held[key] = self._loss_table(key)
            held[tuple(parts)] = table
        return table

    def _loss_table(self, parts: tuple[int, ...]) -> LossTable:
        """Return combinations of labile groups of the parts, keyed by what they take from the balance."""
        groups = [(p, g) for p in parts for g in find_labile_groups(self.graphs[p])[:MAX_LABILE]]
        removals = [self.of_group(p, g) for p, g in groups]
        table: LossTable = {(0, 0): [()]}
        for group, removal in zip(groups, removals, strict=True):
            table.setdefault((removal.elements, removal.protons), []).append((group,))
        if len(groups) < 2 or len(groups) > 30:
            return table
        count = len(groups)
        apart = _which_stand_apart(removals)
        pairs = [(i, j) for i in range(count) for j in apart[i]]
        for i, j in pairs:
            one, two = removals[i], removals[j]
            key = (one.elements + two.elements, one.protons + two.protons)
            table.setdefault(key, []).append((groups[i], groups[j]))
        if count > 8:
            return table
        for i, j in pairs:
            one, two = removals[i], removals[j]
            for k in apart[j]:
                if k in apart[i]:
                    three = removals[k]
                    key = (one.elements + two.elements + three.elements, one.protons + two.protons + three.protons)
                    table.setdefault(key, []).append((groups[i], groups[j], groups[k]))
        return table

    def edit(
        self,
        parts: Sequence[int],
        removals: Sequence[Removal],
        joins: Sequence[tuple[int, int]],
        losses: Losses = (),
    ) -> Edit | None:
        """Return the edit, or None when one step removes an atom that another one needs."""
        cuts = [c for r in removals for c in r.cuts]
        for part, group in losses:
            cuts.extend(self.of_group(part, group).cuts)
        gone: set[int] = set()
        for cut in cuts:
            gone |= cut.departs
        if any(c.kept in gone for c in cuts) or any(a in gone or b in gone or a == b for a, b in joins):
            return None
        return Edit(tuple(parts), tuple(cuts), tuple(joins))

    def gives(self, edit: Edit | None, target: Target) -> bool:
        """Return whether an edit gives the target; always False once the limit on tries is reached."""
        if edit is None:
            return False
        self.tries += 1
        return self.tries <= MAX_TRIES and self.pool.makes(edit, target)


def _which_stand_apart(removals: Sequence[Removal]) -> list[list[int]]:
    """Return, for each removal, the later ones that it can be carried out with: none takes what the other needs."""
    gone = [frozenset().union(*(c.departs for c in r.cuts)) for r in removals]
    kept = [frozenset(c.kept for c in r.cuts) for r in removals]
    whole = [not (g & k) for g, k in zip(gone, kept, strict=True)]
    return [
        [
            j
            for j in range(i + 1, len(removals))
            if whole[i] and whole[j] and gone[i].isdisjoint(gone[j])
            and kept[i].isdisjoint(gone[j]) and kept[j].isdisjoint(gone[i])
        ]
        for i in range(len(removals))
    ]

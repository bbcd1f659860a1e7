"""What the atom maps of a scheme say: which bond at an sp3 carbon broke, and what came instead.

Maps are taken at their word for the carbons they cover; unmapped atoms are passed over. Nothing is drawn or
balanced here. When the maps show no change at a leaving group, a multiple bond or a labile group, there is no
evidence and the scheme is read as if unmapped.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from kb.chem.cations import alkene_carbons
from kb.chem.centre import LeavingSite, find_leaving_sites
from kb.chem.labile import LabileGroup, comes_off, find_labile_groups
from kb.chem.nucleophile import find_nucleophile_sites
from kb.chem.nucleophile_site import METALS
from kb.chem.promoters import Promoters
from kb.chem.scheme import Fragment, Scheme
from kb.vocabulary import Fate

Spot = tuple[int, int]
"""(fragment number, atom) on one side of a scheme."""


@dataclass(frozen=True, slots=True)
class Evidence:
    """A change that the maps show.

    Attributes:
        fate: its word.
        centres: (part, atom, leaving atom or None), principal first.
        nucleophile: (part, atom, class word); None = none, or not mapped.
        note: plain words.
    """

    fate: Fate
    centres: tuple[tuple[int, int, int | None], ...]
    nucleophile: tuple[int, int, str] | None
    note: str


class _Atlas:
    """Both sides of a scheme tied together by map numbers."""

    def __init__(self, scheme: Scheme) -> None:
        self.left, self.right = scheme.left, scheme.products
        self.on_left = _places(self.left)
        self.on_right = _places(self.right)

    def product_of(self, part: int, atom: int) -> Spot | None:
        """Return where an atom of the left side is in the products; None when it is not mapped or not there."""
        number = self.left[part].maps[atom]
        return self.on_right.get(number) if number else None

    def is_bonded_after(self, part: int, a: int, b: int) -> bool:
        """Return whether two atoms of a fragment are still bonded in the products."""
        first, second = self.product_of(part, a), self.product_of(part, b)
        if first is None or second is None or first[0] != second[0]:
            return False
        return second[1] in self.right[first[0]].graph.neighbours[first[1]]

    def gained(self, part: int, atom: int) -> list[Spot | None]:
        """Return the new neighbours of an atom, as left-side spots; None stands for one that is not mapped."""
        spot = self.product_of(part, atom)
        if spot is None:
            return []
        fragment = self.right[spot[0]]
        found: list[Spot | None] = []
        for n in fragment.graph.neighbours[spot[1]]:
            origin = self.on_left.get(fragment.maps[n]) if fragment.maps[n] else None
            if origin is None:
                found.append(None)
            elif origin[0] != part or origin[1] not in self.left[part].graph.neighbours[atom]:
                found.append(origin)
        return found

    def holds_metal(self, part: int, atom: int) -> bool:
        """Return whether an atom is bonded to a metal in the products."""
        spot = self.product_of(part, atom)
        if spot is None:
            return False
        graph = self.right[spot[0]].graph
        return any(graph.elements[n] in METALS - {5} for n in graph.neighbours[spot[1]])

    def order_after(self, part: int, atom: int) -> int:
        """Return the highest bond order of an atom in the products; aromatic counts as 2, 0 when it is not there."""
        spot = self.product_of(part, atom)
        if spot is None:
            return 0
        return max((2 if c == 4 else c for c in self.right[spot[0]].graph.neighbours[spot[1]].values()), default=1)


def _places(side: Sequence[Fragment]) -> dict[int, Spot]:
    """Return where each map number stands; the first place wins where a number was used twice."""
    found: dict[int, Spot] = {}
    for number, fragment in enumerate(side):
        for atom, mark in enumerate(fragment.maps):
            if mark:
                found.setdefault(mark, (number, atom))
    return found


def read_maps(scheme: Scheme, promoters: Promoters) -> Evidence | None:
    """Return what the maps show, or None when they show nothing that we read."""
    atlas = _Atlas(scheme)
    if not atlas.on_left or not atlas.on_right:
        return None
    return _displacement(atlas) or _loss(atlas, promoters) or _addition(atlas)


def _displacement(atlas: _Atlas) -> Evidence | None:
    """Return the substitutions and eliminations at leaving groups, the readiest first."""
    found: list[tuple[int, Fate, tuple[int, int, int], tuple[int, int, str] | None]] = []
    for part, fragment in enumerate(atlas.left):
        for site in find_leaving_sites(fragment.graph):
            if not site.is_sp3 or atlas.product_of(part, site.centre) is None:
                continue
            if atlas.is_bonded_after(part, site.centre, site.leaving):
                continue
            fate, nucleophile = _outcome(atlas, part, site)
            if fate is not None:
                found.append((site.rank, fate, (part, site.centre, site.leaving), nucleophile))
    if not found:
        return None
    found.sort(key=lambda f: (f[1] is not Fate.SUBSTITUTION, -f[0], f[2]))
    _, fate, centre, nucleophile = found[0]
    return Evidence(fate, (centre, *(c for _, _, c, _ in found[1:])), nucleophile, f"{fate}, from the atom maps")


def _outcome(
    atlas: _Atlas, part: int, site: LeavingSite
) -> tuple[Fate | None, tuple[int, int, str] | None]:
    """Return what took the place of a leaving group; nothing for a metal, which takes no place of a pair."""
    if atlas.holds_metal(part, site.centre):
        return None, None
    for spot in atlas.gained(part, site.centre):
        if spot is None:
            return Fate.SUBSTITUTION, None
        return Fate.SUBSTITUTION, (*spot, _word(atlas, spot))
    if atlas.order_after(part, site.centre) >= 2:
        return Fate.ELIMINATION, None
    return None, None


def _word(atlas: _Atlas, spot: Spot) -> str:
    graph = atlas.left[spot[0]].graph
    return next((s.word for s in find_nucleophile_sites(graph) if s.atom == spot[1]), "nucleophile")


def _loss(atlas: _Atlas, promoters: Promoters) -> Evidence | None:
    """Return the loss of labile groups whose bond is gone while the atom that carried them is kept."""
    lost: list[tuple[int, LabileGroup]] = []
    for part, fragment in enumerate(atlas.left):
        for group in find_labile_groups(fragment.graph):
            first = group.losses[0]
            if atlas.product_of(part, first.kept) is None or not comes_off(group, promoters):
                continue
            if atlas.product_of(part, first.gone) is None and not atlas.gained(part, first.kept):
                lost.append((part, group))
    if not lost:
        return None
    note = "loss of " + " and ".join(g.name for _, g in lost) + ", from the atom maps"
    centres = tuple((p, g.carbon, g.leaving) for p, g in lost if g.carbon is not None)
    return Evidence(Fate.GROUP_LOSS, centres, None, note)


def _addition(atlas: _Atlas) -> Evidence | None:
    """Return the addition of a nucleophile to a multiple bond that lost one order."""
    for part, fragment in enumerate(atlas.left):
        graph = fragment.graph
        for carbon in alkene_carbons(graph):
            before = max(graph.neighbours[carbon].values())
            after = atlas.order_after(part, carbon)
            if not after or after >= before:
                continue
            for spot in atlas.gained(part, carbon):
                nucleophile = None if spot is None else (*spot, _word(atlas, spot))
                return Evidence(Fate.ADDITION, ((part, carbon, None),), nucleophile, "addition, from the atom maps")
    return None

"""What a scheme does: the centre, the leaving group, the nucleophile, the fate, or an honest `unresolved`.

It joins the other files of this room and decides the order in which they are asked: maps where given and
wanted; the balance of atoms (`matching`); oxidation and reduction (`interchange`); substrate and product side
by side (`comparison`). Without a product it infers the centre. It never raises on text it cannot use: the
reading then has `ok=False` and says why. Whatever is picked among equivalent atoms is the one that was
entered first.
"""

from __future__ import annotations

from collections.abc import Sequence

from rdkit import Chem

from kb.chem.balance import Workbench
from kb.chem.centre import describe_centre, find_leaving_sites
from kb.chem.comparison import compare
from kb.chem.facts import Centre, NucleophileFact, PossibleFate, Reading
from kb.chem.fates import LARGEST, choose_attackers, list_fates
from kb.chem.fates_displacement import Attacker, describe_configuration
from kb.chem.inference import guess_centre
from kb.chem.interchange import find_interchange
from kb.chem.mapped import read_maps
from kb.chem.match import Match
from kb.chem.matching import find_matches
from kb.chem.molgraph import Molgraph
from kb.chem.nucleophile import find_nucleophile_sites
from kb.chem.promoters import Promoters
from kb.chem.scheme import Fragment, Scheme, parse_scheme
from kb.chem.structure import make_visible
from kb.errors import StructureError
from kb.vocabulary import Confidence, Fate

LARGEST_SCHEME = 700
"""Heavy atoms on the left side past which products are not matched."""

Place = tuple[int, int, int | None]


def read_scheme(text: str, *, ignore_maps: bool = False) -> Reading:
    """Return what a scheme does.

    Args:
        text: reaction SMILES, or structures alone.
        ignore_maps: read as if no atom were mapped; map numbers are reported all the same.

    Returns:
        The reading. `ok` is False, with the reason, when the text is no usable scheme.

    >>> read_scheme("CCCBr.[N-]=[N+]=[N-]>>CCCN=[N+]=[N-]").fate
    <Fate.SUBSTITUTION: 'substitution'>
    """
    try:
        scheme = parse_scheme(text)
    except StructureError as problem:
        return Reading(
            scheme=make_visible(text, 2000), ok=False, confidence=Confidence.UNRESOLVED, reason=str(problem)
        )
    reader = _Reader(scheme)
    if scheme.products:
        return reader.with_product(ignore_maps=ignore_maps)
    return reader.without_product()


class _Reader:
    """One scheme being read."""

    def __init__(self, scheme: Scheme) -> None:
        self.scheme = scheme
        self.left = scheme.left
        self.graphs = [f.graph for f in self.left]
        self.bench = Workbench(self.graphs)

    @property
    def promoters(self) -> Promoters:
        """Return what is in the flask besides the substrate."""
        return self.bench.promoters

    def with_product(self, *, ignore_maps: bool) -> Reading:
        """Return the reading of a scheme that states a product."""
        products = self._products()
        if not products:
            return self._unchanged()
        if sum(len(g) for g in self.graphs) > LARGEST_SCHEME:
            return self._unresolved(f"The left side has more than {LARGEST_SCHEME} heavy atoms, too many to match.")
        mapped = any(f.is_mapped for f in self.left) and not ignore_maps
        evidence = read_maps(self.scheme, self.promoters) if mapped else None
        for product in products:
            matches = find_matches(self.bench, product.graph)
            if evidence is not None:
                matches = [m for m in matches if m.centres[:1] == evidence.centres[:1] and m.fate is evidence.fate]
            if matches:
                rival = _find_rival(self.graphs, matches)
                if rival and evidence is None:
                    return self._unresolved(rival)
                return self._matched(matches[0], product, by_maps=evidence is not None)
        if evidence is not None:
            match = Match(evidence.fate, None, evidence.centres, evidence.nucleophile, evidence.note)
            return self._matched(match, products[0], by_maps=True)
        return self._compared(products)

    def _products(self) -> list[Fragment]:
        """Return the products that are no starting material, larger first; carbon compounds if there are any."""
        left = {f.smiles for f in self.left}
        new = [f for f in self.scheme.products if f.smiles not in left]
        carbon = [f for f in new if 6 in f.graph.elements]
        return sorted(carbon or new, key=lambda f: (-len(f.graph), f.smiles))

    def _unchanged(self) -> Reading:
        """Return the reading of a scheme whose products all stand on the left too."""
        return Reading(
            scheme=self.scheme.text,
            ok=True,
            confidence=Confidence.MATCHED,
            fate=Fate.UNREACTED,
            possible=(
                PossibleFate(fate=Fate.UNREACTED, product=self.scheme.products[0].smiles, note="starting material"),
            ),
            reason="Every stated product is a starting material.",
        )

    def _compared(self, products: Sequence[Fragment]) -> Reading:
        """Return the reading when no enumerated product is the stated one."""
        for product in products:
            change = find_interchange(self.graphs, product.graph)
            if change is not None:
                return self._matched(Match(Fate.OTHER, None, note=change.note), product)
        comparison = compare(self.graphs, products[0].graph)
        if comparison.part is not None and comparison.site is not None:
            site = comparison.site
            place = (comparison.part, site.centre, site.leaving)
            note = f"displacement of {site.group}: {comparison.reason}"
            return self._matched(Match(Fate.SUBSTITUTION, None, (place,), None, note), products[0])
        reason = comparison.reason
        if self.bench.gave_up:
            reason += " The search was stopped at its limit."
        return self._unresolved(reason)

    def _unresolved(self, reason: str) -> Reading:
        """Return an honest refusal to read, with what could form from the likeliest centre."""
        guess = guess_centre(self.graphs, len(self.scheme.reactants), self.promoters)
        possible: tuple[PossibleFate, ...] = ()
        if guess.part is not None and len(self.graphs) <= 60:
            site = guess.site
            place = None if site is None else (guess.part, site.centre, site.leaving)
            possible = self._fates(guess.part, place, None)
        return Reading(
            scheme=self.scheme.text,
            ok=True,
            confidence=Confidence.UNRESOLVED,
            possible=possible,
            reason=reason,
        )

    def _matched(self, match: Match, product: Fragment, *, by_maps: bool = False) -> Reading:
        """Return the reading of a match, its side products listed after the stated one."""
        places = match.centres if by_maps else self._entered_first(match.centres)
        nucleophile = self._nucleophile(match)
        note = match.note
        configuration = self._configuration(match, product)
        if configuration:
            note += f", {configuration}"
        stated = PossibleFate(fate=match.fate, product=product.smiles, note=note)
        part = places[0][0] if places else self._likely_substrate()
        leading = match.nucleophile[:2] if match.nucleophile and self.bench.is_stated(match.nucleophile[0]) else None
        place = places[0] if places and match.fate is not Fate.GROUP_LOSS else None
        others = self._fates(part, place, leading) if part is not None else ()
        return Reading(
            scheme=self.scheme.text,
            ok=True,
            confidence=Confidence.MATCHED,
            fate=match.fate,
            centres=tuple(self._centre(*place) for place in places),
            nucleophile=nucleophile,
            possible=(stated, *(f for f in others if f.product != product.smiles)),
            reason=f"The stated product is that of {note}." if note else "",
            substrate=self.left[part].smiles if places and part is not None else None,
        )

    def _likely_substrate(self) -> int | None:
        """Return the largest reactant: for readings that name no centre."""
        count = len(self.scheme.reactants)
        return max(range(count), key=lambda p: len(self.graphs[p])) if count else None

    def _configuration(self, match: Match, product: Fragment) -> str:
        """Return how the configuration fared, for a single displacement at a drawn stereocentre."""
        if match.fate is not Fate.SUBSTITUTION or len(match.centres) != 1 or match.nucleophile is None:
            return ""
        part, centre, leaving = match.centres[0]
        other, atom, _ = match.nucleophile
        if other == part or "@" not in self.graphs[part].smiles or "@" not in product.smiles or match.lost:
            return ""
        known = find_leaving_sites(self.graphs[part])
        site = next((s for s in known if (s.centre, s.leaving) == (centre, leaving)), None)
        graph = self.bench.graphs[other]
        attack = next((n for n in find_nucleophile_sites(graph) if n.atom == atom), None)
        if site is None or attack is None or len(product.graph) > LARGEST:
            return ""
        return describe_configuration(self.graphs[part], site, Attacker(graph, attack), product.smiles)

    def _entered_first(self, places: Sequence[Place]) -> tuple[Place, ...]:
        """Return the places, a lone centre moved to its equivalent that was entered first; second portions dropped."""
        stated = [p for p in places if p[0] < len(self.left)]
        if len(stated) != 1:
            return tuple(dict.fromkeys(stated))
        part, centre, leaving = stated[0]
        graph, entered = self.graphs[part], self.left[part].entered
        ranks = symmetry_classes(graph)
        best = (part, centre, leaving)
        for a in range(len(graph)):
            if ranks[a] != ranks[centre] or entered[a] >= entered[best[1]]:
                continue
            if leaving is None:
                best = (part, a, None)
                continue
            twin = next((n for n in graph.neighbours[a] if ranks[n] == ranks[leaving]), None)
            if twin is not None:
                best = (part, a, twin)
        return (best,)

    def _centre(self, part: int, centre: int, leaving: int | None) -> Centre:
        fragment = self.left[part]
        return describe_centre(
            fragment.graph, centre, leaving, component=part, entered=fragment.entered, maps=fragment.maps
        )

    def _nucleophile(self, match: Match) -> NucleophileFact | None:
        """Return the nucleophile of a match in the numbering of the entry; None when it was not stated."""
        if match.nucleophile is None or not match.centres:
            return None
        part, atom, word = match.nucleophile
        if part >= len(self.left):
            return None
        if word == "alcohol" and self.promoters.strong_base:
            word = "alkoxide"
        fragment = self.left[part]
        return NucleophileFact(
            component=part,
            atom=fragment.entered[atom],
            atom_map=fragment.maps[atom] or None,
            nucleophile_class=word,
        )

    def _fates(self, part: int, place: Place | None, leading: tuple[int, int] | None) -> tuple[PossibleFate, ...]:
        """Return what could form from a substrate."""
        graph = self.graphs[part]
        if len(graph) > LARGEST:
            return ()
        site = None
        if place is not None and place[2] is not None:
            site = next((s for s in find_leaving_sites(graph) if (s.centre, s.leaving) == place[1:]), None)
        attackers = choose_attackers(self.graphs, len(self.scheme.reactants), part, leading)
        others = [g for i, g in enumerate(self.graphs) if i != part]
        return list_fates(graph, site, attackers, self.promoters, others)

    def without_product(self) -> Reading:
        """Return the reading of a scheme that states no product."""
        guess = guess_centre(self.graphs, len(self.scheme.reactants), self.promoters)
        if guess.part is None or guess.centre is None:
            return Reading(
                scheme=self.scheme.text, ok=True, confidence=Confidence.UNRESOLVED, reason=guess.reason
            )
        (place,) = self._entered_first([(guess.part, guess.centre, guess.leaving)])
        possible = self._fates(guess.part, place if guess.site else None, None)
        reason = guess.reason
        if len(self.graphs[guess.part]) > LARGEST:
            reason += f" It has more than {LARGEST} heavy atoms, so its products were not drawn."
        fates = {f.fate for f in possible}
        return Reading(
            scheme=self.scheme.text,
            ok=True,
            confidence=Confidence.INFERRED,
            # Beside a lone substrate nobody knows what attacks it, so one kind of product proves nothing.
            fate=next(iter(fates)) if len(fates) == 1 and len(self.graphs) > 1 else None,
            centres=(self._centre(*place),),
            possible=possible,
            reason=reason,
            substrate=self.left[guess.part].smiles,
        )


def symmetry_classes(graph: Molgraph) -> list[int]:
    """Return a number per atom, equal for atoms that the molecule's symmetry exchanges."""
    known = graph.memo.get("symmetry")
    if known is None:
        known = list(Chem.CanonicalRankAtoms(graph.mol, breakTies=False))
        graph.memo["symmetry"] = known
    return known  # type: ignore[return-value]


def _find_rival(graphs: Sequence[Molgraph], matches: Sequence[Match]) -> str:
    """Return why the best match cannot be told from another, or nothing when it stands alone.

    Two readings rival each other when they assume as little and differ in which carbon gave up its leaving group:
    an ether from two alcohols.
    """
    best = matches[0]
    if best.fate is not Fate.SUBSTITUTION or len(best.centres) != 1:
        return ""
    for other in matches[1:]:
        if other.cost != best.cost or other.fate is not Fate.SUBSTITUTION or len(other.centres) != 1:
            continue
        (part, centre, leaving), (part2, centre2, leaving2) = best.centres[0], other.centres[0]
        if part2 >= len(graphs) or part >= len(graphs) or leaving is None or leaving2 is None:
            continue
        if (graphs[part].smiles, symmetry_classes(graphs[part])[centre]) == (
            graphs[part2].smiles,
            symmetry_classes(graphs[part2])[centre2],
        ):
            continue
        if abs(other.rank - best.rank) < 10:
            return (
                "Two carbons could have given up their leaving group for the stated product, and nothing in the scheme "
                "tells which did."
            )
    return ""

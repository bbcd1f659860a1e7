"""What a scheme does: the centre, the leaving group, the nucleophile, the fate, or an honest `unresolved`.

It joins the other files of this room and decides the order in which they are asked: maps where given and
wanted; the balance of atoms (`matching`); oxidation and reduction (`interchange`); substrate and product side
by side (`comparison`). Without a product it infers the centre. It never raises on text it cannot use: the
reading then has `ok=False` and says why. Whatever is picked among equivalent atoms is the one that was
entered first.
"""

from __future__ import annotations

from collections.abc import Sequence

from kb.chem.balance import Workbench
from kb.chem.centre import describe_centre, find_leaving_sites
from kb.chem.comparison import compare, find_metal_insertion
from kb.chem.configuration import STEREO_WORDS, judge_configuration
from kb.chem.facts import Centre, NucleophileFact, PossibleFate, Reading
from kb.chem.fates import LARGEST, choose_attackers, list_fates
from kb.chem.fates_displacement import CLOSED, Attacker
from kb.chem.inference import guess_centre
from kb.chem.interchange import find_interchange
from kb.chem.mapped import read_maps
from kb.chem.match import Match
from kb.chem.matching import find_matches
from kb.chem.nucleophile import find_nucleophile_sites, settle_word
from kb.chem.promoters import Promoters
from kb.chem.rivals import find_rival, symmetry_classes
from kb.chem.scheme import Fragment, Scheme, parse_scheme
from kb.chem.structure import make_visible
from kb.errors import StructureError
from kb.vocabulary import Confidence, Fate

LARGEST_SCHEME = 700
"""Heavy atoms on the left side past which products are not matched."""

Place = tuple[int, int, int | None]


def read_scheme(text: str, *, ignore_maps: bool = False, with_possible: bool = True) -> Reading:
    """Return what a scheme does.

    Args:
        text: reaction SMILES, or structures alone.
        ignore_maps: read as if no atom were mapped; map numbers are reported all the same.
        with_possible: False leaves out, beside a stated product, what else could form: a third of the time, and
            nothing of the centre, the nucleophile or the fate rests on it.

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
    reader = _Reader(scheme, with_possible=with_possible)
    if scheme.products:
        return reader.with_product(ignore_maps=ignore_maps)
    return reader.without_product()


class _Reader:
    """One scheme being read."""

    def __init__(self, scheme: Scheme, *, with_possible: bool = True) -> None:
        self.scheme = scheme
        self.with_possible = with_possible
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
                rival = find_rival(self.graphs, matches)
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
            if find_metal_insertion(self.graphs, product.graph):
                note = "insertion of a metal, which bonds to the carbon"
                return self._matched(Match(Fate.OTHER, None, note=note), product)
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
        if self.with_possible and guess.part is not None and len(self.graphs) <= 60:
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
        places = match.centres if by_maps else self._chosen_places(match, product)
        nucleophile = self._nucleophile(match)
        note = match.note
        if nucleophile is not None and match.nucleophile is not None:
            old, new = (w.replace("_", " ") for w in (match.nucleophile[2], nucleophile.nucleophile_class))
            note = note.replace(f"by {old}", f"by {new}")
        stereo = self._configuration(match, places, product)
        if stereo:
            note += f", {STEREO_WORDS[stereo]}"
        stated = PossibleFate(fate=match.fate, product=product.smiles, note=note)
        part = places[0][0] if places else self._likely_substrate()
        leading = match.nucleophile[:2] if match.nucleophile and self.bench.is_stated(match.nucleophile[0]) else None
        place = places[0] if places and match.fate is not Fate.GROUP_LOSS else None
        others = self._fates(part, place, leading) if self.with_possible and part is not None else ()
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
            stereo=stereo,
        )

    def _likely_substrate(self) -> int | None:
        """Return the largest reactant: for readings that name no centre."""
        count = len(self.scheme.reactants)
        return max(range(count), key=lambda p: len(self.graphs[p])) if count else None

    def _configuration(self, match: Match, places: Sequence[Place], product: Fragment) -> str:
        """Return the word for how the configuration fared, for a single displacement at a drawn stereocentre."""
        if match.fate is not Fate.SUBSTITUTION or len(places) != 1 or match.nucleophile is None or match.lost:
            return ""
        part, centre, leaving = places[0]
        other, atom, _ = match.nucleophile
        if "@" not in self.graphs[part].smiles or "@" not in product.smiles or len(product.graph) > LARGEST:
            return ""
        known = find_leaving_sites(self.graphs[part])
        site = next((s for s in known if (s.centre, s.leaving) == (centre, leaving)), None)
        graph = self.bench.graphs[other]
        attack = next((n for n in find_nucleophile_sites(graph) if n.atom == atom), None)
        if site is None or attack is None:
            return ""
        attacker = attack if other == part else Attacker(graph, attack)
        stated = {f.smiles for f in self.scheme.products}
        return judge_configuration(self.graphs[part], site, attacker, product.smiles, stated)

    def _chosen_places(self, match: Match, product: Fragment) -> tuple[Place, ...]:
        """Return the places of a match; of equivalent ones that which is inverted, else the first entered."""
        twins = self._twins(match.centres)
        if not twins:
            return self._entered_first(match.centres)
        inverted = [p for p in twins if self._configuration(match, (p,), product) == "inversion"]
        return self._entered_first(match.centres) if not inverted else (inverted[0],)

    def _twins(self, places: Sequence[Place]) -> list[Place]:
        """Return a lone centre and all that symmetry makes equal to it, first entered first; none for several."""
        stated = [p for p in places if p[0] < len(self.left)]
        if len(stated) != 1:
            return []
        part, centre, leaving = stated[0]
        graph, entered = self.graphs[part], self.left[part].entered
        ranks = symmetry_classes(graph)
        found: list[Place] = []
        for a in range(len(graph)):
            if ranks[a] != ranks[centre]:
                continue
            if leaving is None:
                found.append((part, a, None))
                continue
            found.extend((part, a, n) for n in graph.neighbours[a] if ranks[n] == ranks[leaving])
        return sorted(found, key=lambda p: entered[p[1]])

    def _entered_first(self, places: Sequence[Place]) -> tuple[Place, ...]:
        """Return the places, a lone centre moved to its equivalent that was entered first; second portions dropped."""
        twins = self._twins(places)
        return (twins[0],) if twins else tuple(dict.fromkeys(p for p in places if p[0] < len(self.left)))

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
        fragment = self.left[part]
        word = settle_word(fragment.graph, atom, word, self.promoters)
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
        attackers = choose_attackers(self.graphs, len(self.scheme.reactants), part, leading, self.promoters)
        others = [g for i, g in enumerate(self.graphs) if i != part]
        return list_fates(graph, site, attackers, self.promoters, others)

    def without_product(self) -> Reading:
        """Return the reading of a scheme that states no product."""
        guess = guess_centre(self.graphs, len(self.scheme.reactants), self.promoters)
        if guess.part is None:
            return Reading(
                scheme=self.scheme.text, ok=True, confidence=Confidence.UNRESOLVED, reason=guess.reason
            )
        if guess.centre is None:
            return Reading(
                scheme=self.scheme.text,
                ok=True,
                confidence=Confidence.INFERRED,
                fate=Fate.OTHER,
                reason=guess.reason,
            )
        (place,) = self._entered_first([(guess.part, guess.centre, guess.leaving)])
        possible = self._fates(guess.part, place if guess.site else None, None)
        reason = guess.reason
        if len(self.graphs[guess.part]) > LARGEST:
            reason += f" It has more than {LARGEST} heavy atoms, so its products were not drawn."
        fates = {f.fate for f in possible}
        # Beside a lone substrate nobody knows what attacks it, so one kind of product proves nothing. Nor does the one
        # product that a closed centre leaves, unless a strong base is there to make it.
        settled = len(fates) == 1 and len(self.graphs) > 1
        if guess.site is not None and guess.site.carbon_class in CLOSED and not self.promoters.strong_base:
            settled = False
        return Reading(
            scheme=self.scheme.text,
            ok=True,
            confidence=Confidence.INFERRED,
            fate=next(iter(fates)) if settled else None,
            centres=(self._centre(*place),),
            possible=possible,
            reason=reason,
            substrate=self.left[guess.part].smiles,
        )

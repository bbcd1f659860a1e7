"""How a drawn configuration fared in a displacement: what the stated product says beside what one attack does.

It compares drawings at one centre and says one word. It does not say why (a second displacement, a neighbouring
group, ionisation), and it stays silent (`""`) where the centre or the product was drawn flat, where a labile group
came off as well, or where the drawing fits neither epimer.

Words: `inversion` and `retention`, as the product of a single attack is drawn; `scrambled`, both epimers are stated;
`impossible`, a three-membered ring that closes on a face its own ring keeps out of reach. Displacement closes an
epoxide, aziridine or thiirane only when the two groups stand anti (common textbook knowledge); groups that are cis on
a ring of at most seven atoms never do.
"""

from __future__ import annotations

from collections.abc import Collection

from kb.chem.carbon import has_drawn_configuration
from kb.chem.centre import LeavingSite
from kb.chem.fates_displacement import CLOSED, Attacker, draw_closure, draw_displacement
from kb.chem.molgraph import Molgraph
from kb.chem.nucleophile import NucleophileSite
from kb.chem.sketch import Configuration

STEREO_WORDS = {
    "": "",
    "inversion": "with inversion",
    "retention": "with retention: no single displacement does that",
    "scrambled": "with both configurations stated",
    "impossible": "although the two groups are cis on the ring, so that no displacement closes it",
}
"""The word of a reading and what a sentence adds for it."""

_LARGEST_RIGID_RING = 7


def judge_configuration(
    graph: Molgraph,
    site: LeavingSite,
    attacker: Attacker | NucleophileSite,
    product: str,
    products: Collection[str] = (),
) -> str:
    """Return the word for what became of the configuration at a centre; empty where nothing can be said.

    Args:
        graph: the substrate.
        site: what left.
        attacker: another molecule's atom, or a site of the substrate itself when a ring closes.
        product: canonical SMILES of the stated product.
        products: every stated product, to see whether both epimers are among them.
    """
    if not has_drawn_configuration(graph, site.centre) or site.carbon_class in CLOSED:
        return ""
    if isinstance(attacker, NucleophileSite) and _is_held_cis(graph, site, attacker.atom):
        return "impossible"
    inverted = _drawn(graph, site, attacker, "inverted")
    retained = _drawn(graph, site, attacker, "retained")
    if inverted == retained or product not in (inverted, retained):
        return ""
    if inverted in products and retained in products:
        return "scrambled"
    return "inversion" if product == inverted else "retention"


def _drawn(
    graph: Molgraph, site: LeavingSite, attacker: Attacker | NucleophileSite, wanted: Configuration
) -> str | None:
    if isinstance(attacker, NucleophileSite):
        return draw_closure(graph, site, attacker, wanted)
    return draw_displacement(graph, site, attacker, wanted)


def _is_held_cis(graph: Molgraph, site: LeavingSite, nucleophile: int) -> bool:
    """Return whether an attack on the neighbouring carbon would have to come from the leaving group's own side."""
    centre = site.centre
    for holder in graph.neighbours[nucleophile]:
        if holder not in graph.neighbours[centre] or not has_drawn_configuration(graph, holder):
            continue
        for ring in graph.mol.GetRingInfo().AtomRings():
            if len(ring) > _LARGEST_RIGID_RING or centre not in ring or holder not in ring:
                continue
            if site.leaving not in ring and nucleophile not in ring:
                return _are_cis(graph, ring, (centre, site.leaving), (holder, nucleophile))
    return False


def _are_cis(graph: Molgraph, ring: tuple[int, ...], first: tuple[int, int], second: tuple[int, int]) -> bool:
    """Return whether two groups on neighbouring ring atoms point to one face.

    Seen from a group, the walk (ring neighbour, other carbon, rest) runs one way at one end and the other way at the
    other end when both groups are on one face.
    """
    (a, on_a), (b, on_b) = first, second
    beyond_a = next(n for n in ring if n in graph.neighbours[a] and n != b)
    beyond_b = next(n for n in ring if n in graph.neighbours[b] and n != a)
    return _turn(graph, a, (on_a, beyond_a, b)) != _turn(graph, b, (on_b, beyond_b, a))


def _turn(graph: Molgraph, atom: int, wanted: tuple[int, ...]) -> bool:
    """Return the sense of rotation at a drawn centre with its neighbours put in an order, the rest behind them."""
    here = graph.mol.GetAtomWithIdx(atom)
    order = [bond.GetOtherAtomIdx(atom) for bond in here.GetBonds()]
    # RDKit counts an implicit hydrogen behind the drawn bonds, which is where the rest stands here too.
    target = [*wanted, *(n for n in order if n not in wanted)]
    swaps = 0
    for place, neighbour in enumerate(target):
        at = order.index(neighbour)
        if at != place:
            order[place], order[at] = order[at], order[place]
            swaps += 1
    return (int(here.GetChiralTag()) == 1) != (swaps % 2 == 1)

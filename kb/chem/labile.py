"""Groups that acid, base or fluoride takes off, and the plain hydrolyses that are no loss of a protecting group.

For each it says which bonds break and which side keeps the electrons; it does not say whether the conditions
do it (that is `kb.assess`) nor draws the product (`fates_loss`). Hydrolysis of an ordinary ester or amide is
listed too, named as what it is (`Fate.OTHER`): it must be recognised so as not to be taken for a
displacement, and it often follows another step in the same flask.

Names are the trade's; the classes of promoter (acid, base, fluoride, thiol...) follow common practice."""

from __future__ import annotations

from dataclasses import dataclass, replace

from kb.chem.carbon import is_diazo_carbon
from kb.chem.molgraph import Molgraph
from kb.chem.promoters import Promoters
from kb.vocabulary import Fate


@dataclass(frozen=True, slots=True)
class BondLoss:
    """A bond that breaks: `kept` stays, `gone` and all behind it go; `gain` as in `skeleton.Cut`."""

    kept: int
    gone: int
    departs: frozenset[int]
    gain: int


@dataclass(frozen=True, slots=True)
class LabileGroup:
    """A group that can come off.

    Attributes:
        name: `Boc`, `tert-butyl ester`, `THP`... in words for a note.
        fate: group-loss, or other for a plain hydrolysis.
        promoter: acid, base, silyl (acid or fluoride), fluoride, hydrogenolysis...: what usually takes it off.
        losses: the bonds that break.
        carbon: the carbon that parts from its heteroatom (for Boc the tert-butyl carbon); where no bond to carbon
            breaks, or one to a carbonyl carbon, the sp3 carbon that carries the freed heteroatom; None = there is none.
        leaving: the atom that parts from that carbon; None when the carbon keeps its heteroatom.
    """

    name: str
    fate: Fate
    promoter: str
    losses: tuple[BondLoss, ...]
    carbon: int | None
    leaving: int | None


def comes_off(group: LabileGroup, promoters: Promoters) -> bool:
    """Return whether what is in the flask fits the loss of a group as acid or base brings it about.

    Schemes often leave reagents out, so acid is assumed where nothing speaks against it. Hydrogenolysis, palladium
    and fluoride on carbon-silicon are chosen, selective steps: they are no loss in this sense unless an acid is there.

    Source: common practice of protecting groups.
    """
    if group.fate is not Fate.GROUP_LOSS:
        return False
    if group.promoter == "acid":
        return promoters.is_acidic or not promoters.strong_base
    if group.promoter == "base":
        return not promoters.hydrogenation
    if group.promoter == "silyl":
        return promoters.is_acidic or promoters.fluoride or promoters.strong_base
    return (promoters.strong_acid or promoters.lewis_acid) and not promoters.hydrogenation


def find_labile_groups(graph: Molgraph) -> tuple[LabileGroup, ...]:
    """Return every group of a fragment that can come off by acid, base, fluoride or water."""
    known = graph.memo.get("labile")
    if known is None:
        found: list[LabileGroup] = []
        for atom, element in enumerate(graph.elements):
            if element in (7, 8, 16):
                found.extend(_groups_on(graph, atom))
                phthaloyl = _phthaloyl(graph, atom) if element == 7 else None
                if phthaloyl is not None:
                    found.append(phthaloyl)
            elif element == 6:
                acetal = _acetal(graph, atom)
                if acetal is not None:
                    found.append(acetal)
                if is_diazo_carbon(graph, atom):
                    found.extend(_silyl_on_diazo(graph, atom))
                ketal = _diol_acetal(graph, atom)
                if ketal is not None:
                    found.append(ketal)
        known = tuple(found)
        graph.memo["labile"] = known
    return known  # type: ignore[return-value]


def _silyl_on_diazo(graph: Molgraph, carbon: int) -> list[LabileGroup]:
    """Return the silyl group of a silyldiazomethane, which methanol takes off."""
    losses = [_loss(graph, carbon, n, 1) for n in graph.neighbours[carbon] if graph.elements[n] == 14]
    return [LabileGroup("C-silyl", Fate.OTHER, "any", (loss,), carbon, None) for loss in losses if loss]


def _loss(graph: Molgraph, kept: int, gone: int, gain: int) -> BondLoss | None:
    """Return the loss of everything behind a bond; None when a ring holds it."""
    departs = graph.side_of(gone, kept)
    return None if departs is None else BondLoss(kept, gone, frozenset(departs), gain)


def _groups_on(graph: Molgraph, atom: int) -> list[LabileGroup]:
    """Return the groups that one N, O or S atom can lose."""
    found = []
    bonds = graph.neighbours[atom]
    if graph.has_multiple_bond(atom):
        return []
    if len(bonds) == 1:
        return _last_bond(graph, atom)
    for n, code in bonds.items():
        if code not in (1, 4) or (graph.aromatic[atom] and graph.aromatic[n]):
            continue
        element = graph.elements[n]
        if element == 14:
            loss = _loss(graph, atom, n, 1)
            if loss:
                found.append(LabileGroup("silyl", Fate.GROUP_LOSS, "silyl", (loss,), _carrier(graph, atom, n), None))
        elif element == 5:
            loss = _loss(graph, atom, n, 1)
            if loss:
                found.append(LabileGroup("boryl", Fate.OTHER, "any", (loss,), n, atom))
        elif element == 6:
            group = _carbon_group(graph, atom, n)
            if group is not None:
                found.append(group)
        elif element == 16 and graph.has_multiple_bond(n, 8) and _is_sulfo(graph, atom, n):
            loss = _loss(graph, atom, n, 1)
            if loss:
                found.append(LabileGroup("sulfonyl", Fate.OTHER, "any", (loss,), n, atom))
    return found


def _last_bond(graph: Molgraph, atom: int) -> list[LabileGroup]:
    """Return the loss of all that a heteroatom carries, for when it has attacked first (acetate, benzylamine)."""
    (carrier,) = graph.neighbours[atom]
    group = _carbon_group(graph, atom, carrier) if graph.elements[carrier] == 6 else None
    return [] if group is None else [replace(group, fate=Fate.OTHER)]


def _is_sulfo(graph: Molgraph, atom: int, sulfur: int) -> bool:
    """Return whether N or O can be freed from a sulfonyl sulfur: a sulfonamide, or the half ester of sulfuric acid."""
    if graph.elements[atom] == 7:
        return True
    return graph.elements[atom] == 8 and any(
        n != atom and graph.elements[n] in (7, 8) and code == 1 for n, code in graph.neighbours[sulfur].items()
    )


def _carrier(graph: Molgraph, heteroatom: int, lost: int) -> int | None:
    """Return the sp3 carbon that carries a heteroatom freed from `lost`; None when there is none."""
    return next((n for n in graph.neighbours[heteroatom] if n != lost and graph.is_sp3_carbon(n)), None)


def _carbon_group(graph: Molgraph, atom: int, carbon: int) -> LabileGroup | None:
    """Return the group that is lost by breaking a bond from N, O or S to carbon, the heteroatom keeping the pair."""
    loss = _loss(graph, atom, carbon, 1)
    if loss is None:
        return None
    oxo = any(graph.elements[n] == 8 and code == 2 for n, code in graph.neighbours[carbon].items())
    if oxo:
        return _acyl_group(graph, atom, carbon, loss)
    if not graph.is_sp3_carbon(carbon):
        return None
    if graph.elements[atom] == 8 and _is_on_carbamate(graph, atom):
        return None
    name, promoter, fate = _alkyl_group(graph, atom, carbon)
    is_acid_part = graph.elements[atom] == 8 and any(graph.elements[n] == 16 for n in graph.neighbours[atom])
    fate = Fate.OTHER if is_acid_part else fate  # a leaving group on that carbon, no protected acid
    return LabileGroup(name, fate, promoter, (loss,), carbon, atom)


def _is_on_carbamate(graph: Molgraph, oxygen: int) -> bool:
    """Return whether an oxygen is the alkoxy one of a carbamate or carbonate, which goes with its carbon dioxide."""
    return any(
        graph.has_multiple_bond(n, 8)
        and any(m != oxygen and code == 1 and graph.elements[m] in (7, 8) for m, code in graph.neighbours[n].items())
        for n in graph.neighbours[oxygen]
        if graph.elements[n] == 6
    )


def _acyl_group(graph: Molgraph, atom: int, carbon: int, loss: BondLoss) -> LabileGroup:
    """Return the acyl, carbamate or carbonate group on a heteroatom."""
    where = {7: "N", 8: "O", 16: "S"}[graph.elements[atom]]
    alkoxy = [
        n
        for n, code in graph.neighbours[carbon].items()
        if n != atom and code == 1 and graph.elements[n] == 8 and len(graph.neighbours[n]) == 2
    ]
    if alkoxy and graph.side_of(carbon, alkoxy[0]) is not None:
        oxygen = alkoxy[0]
        root = next(n for n in graph.neighbours[oxygen] if n != carbon)
        name, promoter = _carbamate_name(graph, root)
        if name:
            return LabileGroup(f"{where}-{name}", Fate.GROUP_LOSS, promoter, (loss,), root, oxygen)
        return LabileGroup(f"{where}-alkoxycarbonyl", Fate.OTHER, "base", (loss,), carbon, atom)
    beyond = [n for n in graph.neighbours[carbon] if n != atom and graph.elements[n] == 6]
    if where != "N" and len(loss.departs) <= 3 and not graph.in_ring[carbon]:
        name = "acetyl" if beyond else "formyl"
        return LabileGroup(name, Fate.GROUP_LOSS, "base", (loss,), _carrier(graph, atom, carbon), None)
    if beyond and sum(graph.elements[n] == 9 for n in graph.neighbours[beyond[0]]) == 3:
        return LabileGroup("trifluoroacetyl", Fate.GROUP_LOSS, "base", (loss,), _carrier(graph, atom, carbon), None)
    return LabileGroup("acyl", Fate.OTHER, "base", (loss,), carbon, atom)


def _carbamate_name(graph: Molgraph, root: int) -> tuple[str, str]:
    """Return (name, promoter) of the alkyl part of a carbamate or carbonate; empty for an ordinary one."""
    if not graph.is_sp3_carbon(root):
        return "", ""
    carbons = [n for n in graph.neighbours[root] if graph.elements[n] == 6]
    if len(carbons) == 3:
        return ("Boc", "acid") if all(graph.hydrogens[n] == 3 for n in carbons) else ("tert-alkoxycarbonyl", "acid")
    if len(carbons) == 1 and graph.aromatic[carbons[0]]:
        return "Cbz", "hydrogenolysis"
    if len(carbons) == 1 and graph.elements[carbons[0]] == 6:
        ring = carbons[0]
        if sum(graph.aromatic[n] for n in graph.neighbours[ring]) == 2:
            return "Fmoc", "base"
        if any(graph.elements[n] == 14 for n in graph.neighbours[ring]):
            return "Teoc", "fluoride"
        if graph.has_multiple_bond(ring, 6):
            return "Alloc", "palladium"
    return "", ""


def _alkyl_group(graph: Molgraph, atom: int, carbon: int) -> tuple[str, str, Fate]:
    """Return (name, promoter, fate) for an sp3 carbon on N, O or S."""
    holder = _holder_word(graph, atom, carbon)
    carbons = [n for n in graph.neighbours[carbon] if graph.elements[n] == 6]
    aryls = [n for n in carbons if graph.aromatic[n]]
    hetero = [n for n in graph.neighbours[carbon] if n != atom and graph.elements[n] in (7, 8, 16)]
    if any(graph.elements[n] == 14 for n in graph.neighbours[carbon]):
        return f"silylmethyl {holder}", "fluoride", Fate.OTHER
    if hetero:
        oxygen = next((n for n in hetero if graph.elements[n] == 8), None)
        if oxygen is not None and len(graph.neighbours[oxygen]) == 2:
            if graph.in_ring[carbon] and graph.in_ring[oxygen]:
                return f"tetrahydropyranyl-type {holder}", "acid", Fate.GROUP_LOSS
            return f"alkoxymethyl {holder}", "acid", Fate.GROUP_LOSS
        return f"aminal {holder}", "acid", Fate.OTHER
    if len(aryls) == 3:
        return f"trityl {holder}", "acid", Fate.GROUP_LOSS
    if len(aryls) == 2:
        return f"benzhydryl {holder}", "acid", Fate.GROUP_LOSS
    if len(carbons) == 3 and not aryls:
        methyls = sum(graph.hydrogens[n] == 3 for n in carbons)
        name = "tert-butyl" if methyls == 3 else "tert-alkyl"
        return f"{name} {holder}", "acid", Fate.GROUP_LOSS
    if len(carbons) == 3:
        return f"cumyl-type {holder}", "acid", Fate.GROUP_LOSS
    if aryls and len(carbons) == 1:
        if _has_para_donor(graph, aryls[0]):
            return f"methoxybenzyl {holder}", "acid", Fate.GROUP_LOSS
        return f"benzyl {holder}", "hydrogenolysis", Fate.GROUP_LOSS
    return f"alkyl {holder}", "any", Fate.OTHER


def _holder_word(graph: Molgraph, atom: int, carbon: int) -> str:
    """Return ester, ether, amine, amide or sulfide: what the heteroatom was part of."""
    element = graph.elements[atom]
    if element == 16:
        return "sulfide"
    rest = [n for n in graph.neighbours[atom] if n != carbon]
    acylated = any(graph.has_multiple_bond(n, 8) for n in rest)
    if element == 8:
        return "ester" if acylated else "ether"
    return "amide" if acylated else "amine"


def _has_para_donor(graph: Molgraph, ipso: int) -> bool:
    """Return whether an aromatic carbon has a singly bonded oxygen ortho or para to it."""
    ortho = [n for n in graph.neighbours[ipso] if graph.aromatic[n]]
    meta = {m for n in ortho for m in graph.neighbours[n] if graph.aromatic[m] and m != ipso}
    para = {p for m in meta for p in graph.neighbours[m] if graph.aromatic[p] and p not in ortho}
    return any(
        graph.elements[x] == 8 and not graph.aromatic[x] for a in [*para, *ortho] for x in graph.neighbours[a]
    )


def _acetal(graph: Molgraph, carbon: int) -> LabileGroup | None:
    """Return the loss that turns an acetal or ketal carbon into its carbonyl group."""
    if not graph.is_sp3_carbon(carbon):
        return None
    oxygens = [n for n in graph.neighbours[carbon] if graph.elements[n] == 8 and len(graph.neighbours[n]) == 2]
    if len(oxygens) != 2:
        return None
    stays, goes = oxygens
    alkyl = next(n for n in graph.neighbours[stays] if n != carbon)
    if not graph.is_sp3_carbon(alkyl):
        return None
    lost, stack = {goes, alkyl}, [goes, alkyl]
    while stack:
        here = stack.pop()
        for n in graph.neighbours[here]:
            if {here, n} in ({carbon, goes}, {stays, alkyl}) or n in lost:
                continue
            if n in (carbon, stays):
                return None
            lost.add(n)
            stack.append(n)
    losses = (
        BondLoss(stays, alkyl, frozenset(lost), 1),
        BondLoss(carbon, goes, frozenset(lost), -1),
    )
    return LabileGroup("acetal", Fate.GROUP_LOSS, "acid", losses, carbon, goes)


def _diol_acetal(graph: Molgraph, carbon: int) -> LabileGroup | None:
    """Return the loss of a small acetal carbon from a diol or amino alcohol (acetonide, benzylidene, methylene)."""
    if not graph.is_sp3_carbon(carbon) or not graph.in_ring[carbon]:
        return None
    hetero = [n for n in graph.neighbours[carbon] if graph.elements[n] in (7, 8) and graph.in_ring[n]]
    if len(hetero) != 2:
        return None
    lost = {carbon}
    stack = [n for n in graph.neighbours[carbon] if n not in hetero]
    while stack:
        here = stack.pop()
        if here in hetero:
            return None
        if here not in lost:
            lost.add(here)
            stack.extend(n for n in graph.neighbours[here] if n not in lost)
    losses = tuple(BondLoss(h, carbon, frozenset(lost), 1) for h in hetero)
    return LabileGroup("diol acetal", Fate.GROUP_LOSS, "acid", losses, carbon, hetero[0])


def _phthaloyl(graph: Molgraph, nitrogen: int) -> LabileGroup | None:
    """Return the loss of both acyl bonds of a cyclic imide, which frees the amine (phthalimide)."""
    acyls = [n for n in graph.neighbours[nitrogen] if graph.in_ring[n] and graph.has_multiple_bond(n, 8)]
    if len(acyls) != 2 or graph.aromatic[nitrogen]:
        return None
    lost = set(acyls)
    stack = list(acyls)
    while stack:
        here = stack.pop()
        for n in graph.neighbours[here]:
            if n != nitrogen and n not in lost:
                lost.add(n)
                stack.append(n)
    if any(n in lost and n not in acyls for n in graph.neighbours[nitrogen]):
        return None
    losses = tuple(BondLoss(nitrogen, n, frozenset(lost), 1) for n in acyls)
    return LabileGroup("phthaloyl", Fate.OTHER, "hydrazine", losses, acyls[0], nitrogen)

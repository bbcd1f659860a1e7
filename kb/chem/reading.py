"""What a scheme does: the centre, the leaving group, the nucleophile, the fate, or an honest `unresolved`.

It never raises on chemistry it cannot use: text that is no scheme gives a reading with `ok=False` and the reason.
"""

from __future__ import annotations

from kb.chem.centre import LeavingSite, describe_centre, find_leaving_sites
from kb.chem.facts import Centre, NucleophileFact, Reading
from kb.chem.matching import Match, Workbench, find_matches
from kb.chem.scheme import Fragment, Scheme, parse_scheme
from kb.chem.structure import make_visible
from kb.errors import StructureError
from kb.vocabulary import Confidence, Fate


def read_scheme(text: str, *, ignore_maps: bool = False) -> Reading:
    """Return what a scheme does.

    Args:
        text: reaction SMILES, or a substrate alone.
        ignore_maps: read as if no atom were mapped; map numbers are still reported.

    Returns:
        The reading; `ok` is False with a reason when the text is no usable scheme.
    """
    try:
        scheme = parse_scheme(text)
    except StructureError as problem:
        return Reading(
            scheme=make_visible(text, 2000), ok=False, confidence=Confidence.UNRESOLVED, reason=str(problem)
        )
    if scheme.products:
        return _read_with_product(scheme)
    return _read_without_product(scheme)


def _read_with_product(scheme: Scheme) -> Reading:
    bench = Workbench([f.graph for f in scheme.left])
    left = {f.smiles for f in scheme.left}
    products = [f for f in scheme.products if f.smiles not in left]
    for product in sorted(products, key=lambda f: -len(f.graph)):
        matches = find_matches(bench, product.graph)
        if matches:
            return _matched(scheme, matches[0])
    return Reading(
        scheme=scheme.text,
        ok=True,
        confidence=Confidence.UNRESOLVED,
        reason="None of the products that were tried is the stated one.",
    )


def _matched(scheme: Scheme, match: Match) -> Reading:
    left = scheme.left
    centres = []
    for place in ([match.centre] if match.centre else []) + list(match.further):
        part, centre, leaving = place
        if part < len(left):
            centres.append(_centre(left[part], part, centre, leaving))
    nucleophile = None
    if match.nucleophile is not None and match.centre is not None:
        part, atom, word = match.nucleophile
        nucleophile = NucleophileFact(
            component=part,
            atom=left[part].entered[atom],
            atom_map=left[part].maps[atom] or None,
            nucleophile_class=word,
        )
    return Reading(
        scheme=scheme.text,
        ok=True,
        confidence=Confidence.MATCHED,
        fate=match.fate,
        centres=tuple(centres),
        nucleophile=nucleophile,
        reason=match.note,
        substrate=left[match.centre[0]].smiles if match.centre else None,
    )


def _centre(fragment: Fragment, part: int, centre: int, leaving: int | None) -> Centre:
    return describe_centre(
        fragment.graph, centre, leaving, component=part, entered=fragment.entered, maps=fragment.maps
    )


def _read_without_product(scheme: Scheme) -> Reading:
    best: tuple[int, LeavingSite] | None = None
    for part, fragment in enumerate(scheme.reactants):
        for site in find_leaving_sites(fragment.graph):
            if best is None or site.rank > best[1].rank:
                best = (part, site)
    if best is None:
        return Reading(
            scheme=scheme.text,
            ok=True,
            confidence=Confidence.UNRESOLVED,
            reason="No leaving group was found.",
        )
    part, site = best
    fragment = scheme.left[part]
    return Reading(
        scheme=scheme.text,
        ok=True,
        confidence=Confidence.INFERRED,
        fate=None,
        centres=(_centre(fragment, part, site.centre, site.leaving),),
        reason="No product was stated; this is the best leaving group.",
        substrate=fragment.smiles,
    )


__all__ = ["Fate", "read_scheme"]

"""Conditions of a search as masks over the columns: everything but structures.

Names of materials are looked up in the catalogue for their synonyms and structure, so that `DMF` finds what
was written N,N-dimethylformamide. A name that neither the catalogue nor any run knows finds nothing, and
the answer offers the nearest; it is never taken for another.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from kb.record.failure_modes import parse_failure_mode
from kb.search.columns import class_code, leaving_code, verdict_code
from kb.search.words import bend, split_words
from kb.store.searching import word_keys
from kb.vocabulary import Role

if TYPE_CHECKING:
    from collections.abc import Callable

    from numpy.typing import NDArray

    from kb.search.criteria import Criteria
    from kb.search.live import LiveRecord

BASE_ROLES = (Role.BASE, Role.REAGENT, Role.ADDITIVE)
"""Roles under which people enter a base."""
REAGENT_ROLES = (Role.REAGENT, Role.BASE, Role.ACID, Role.ADDITIVE)


def narrow_by_conditions(
    criteria: Criteria, mask: NDArray[np.bool_], live: LiveRecord, notes: list[str]
) -> NDArray[np.bool_]:
    """Return the rows of `mask` that satisfy everything but structures and nested criteria.

    Args:
        criteria: what is asked.
        mask: candidates (n,).
        live: the record.
        notes: sentences for the user are added here.

    Raises:
        QueryError: words without a word in them.
        InvalidRecord: a failure mode that is not on the list.
    """
    columns = live.columns
    mask = mask.copy()
    if criteria.verdict is not None:
        mask &= columns.verdict == verdict_code(criteria.verdict)
    if criteria.carbon_class is not None:
        mask &= columns.carbon_class == class_code(criteria.carbon_class)
    if criteria.leaving_group is not None:
        mask &= columns.leaving_group == leaving_code(criteria.leaving_group)
    if criteria.temp_from_c is not None:
        mask &= columns.temperature_c >= criteria.temp_from_c
    if criteria.temp_to_c is not None:
        mask &= columns.temperature_c <= criteria.temp_to_c
    if criteria.since is not None:
        mask &= columns.date >= criteria.since.toordinal()
    if criteria.until is not None:
        mask &= (columns.date > 0) & (columns.date <= criteria.until.toordinal())
    if criteria.failed is not None:
        mask &= columns.with_failure(parse_failure_mode(criteria.failed))
    if criteria.project is not None:
        mask &= columns.with_project(criteria.project)
    if criteria.solvent is not None:
        names, smiles = _names_of(criteria.solvent, "solvent", columns.is_solvent_name, notes)
        mask &= columns.with_solvent(names, smiles)
    for asked, roles in ((criteria.base, BASE_ROLES), (criteria.reagent, REAGENT_ROLES)):
        if asked is not None:
            names, smiles = _names_of(asked, "reagent", columns.is_component_name, notes)
            mask &= columns.with_component(names, smiles, [str(role) for role in roles])
    if criteria.words is not None and mask.any():
        mask &= columns.rows_of_keys(_keys_with_words(criteria.words, live, notes))
    return mask


def _keys_with_words(text: str, live: LiveRecord, notes: list[str]) -> list[int]:
    pieces = split_words(text)
    book = live.store.book
    found = word_keys(book, [(piece,) for piece in pieces])
    if found:
        return found
    bent = bend(pieces, live.vocabulary())
    notes += bent.notes
    return word_keys(book, bent.wanted) if bent.is_bent else []


def _names_of(
    text: str, kind: str, is_in_book: Callable[[str], bool], notes: list[str]
) -> tuple[list[str], str | None]:
    """Return every spelling of a material and its canonical SMILES."""
    from kb.materials.names import find_material

    match = find_material(text, kind)
    entry = match.exact
    if entry is not None:
        return [text, entry.name, *entry.synonyms], entry.smiles
    smiles = _canonical(text)
    if smiles is None and not is_in_book(text):
        offers = list(dict.fromkeys(offer.entry.name for offer in match.offers))[:3]
        asked = f" Did you mean {' or '.join(offers)}?" if offers else ""
        notes.append(f"No run names a {kind} '{text[:60]}'.{asked}")
    return [text], smiles


def _canonical(text: str) -> str | None:
    """Return canonical SMILES where the text is SMILES of something; None otherwise."""
    from kb.chem.structure import canonical_smiles
    from kb.errors import ChemistryError

    try:
        return canonical_smiles(text)
    except ChemistryError:
        return None

"""From criteria to the structure parts that answer them: texts are read, checked and put in order of cost."""

from __future__ import annotations

from typing import TYPE_CHECKING

from rdkit import Chem

from kb.chem.query import ROOT_MAP, StructureQuery, parse_query, query_of_fragment
from kb.chem.structure import parse_molblock, parse_molecule, standardise
from kb.errors import QueryError, StructureError
from kb.search.part import Part
from kb.search.rooted import CentrePart, TransformationPart
from kb.search.structures import ExactPart, SimilarPart, SubstructurePart
from kb.search.transformation import parse_transformation

if TYPE_CHECKING:
    from kb.search.criteria import Criteria
    from kb.search.index import StructureIndex
    from kb.search.live import LiveRecord


def parts_of(criteria: Criteria, live: LiveRecord, index: StructureIndex) -> list[Part]:
    """Return the structure parts of criteria, nested ones left out, cheapest first.

    Raises:
        QueryError: a part that cannot be searched.
    """
    parts: list[Part] = []
    role = criteria.role
    with_stereo = not criteria.ignore_stereo
    if criteria.exact is not None:
        parts.append(ExactPart(live, index, role, _drawings(criteria.exact), with_stereo))
    if criteria.similar is not None:
        parts.append(SimilarPart(live, index, role, _structure(criteria.similar), criteria.at_least))
    if criteria.substructure is not None:
        query = parse_query(criteria.substructure, ignore_stereo=criteria.ignore_stereo)
        parts.append(SubstructurePart(live, index, role, query))
    if criteria.transformation is not None:
        parts.append(TransformationPart(live, index, parse_transformation(criteria.transformation)))
    if criteria.at_centre is not None:
        query = parse_query(criteria.at_centre, ignore_stereo=criteria.ignore_stereo)
        parts.append(CentrePart(live, index, query if query.root is not None else _rooted_at_first(query)))
    return parts


def _drawings(text: str) -> tuple[Chem.Mol, ...]:
    """Return a structure as it was drawn and as it is standardised; runs keep what was typed."""
    standard = _structure(text)
    as_drawn = parse_molblock(text) if "M  END" in text else parse_molecule(text)
    return (as_drawn, standard)


def _structure(text: str) -> Chem.Mol:
    """Return the standardised structure that is asked for."""
    try:
        return standardise(text).mol
    except StructureError as problem:
        raise QueryError(problem.message, problem.hint, problem.value) from problem


def _rooted_at_first(query: StructureQuery) -> StructureQuery:
    mol = Chem.RWMol(query.mol)
    mol.GetAtomWithIdx(0).SetAtomMapNum(ROOT_MAP)
    rooted = query_of_fragment(mol.GetMol(), query.text)
    return StructureQuery(
        text=query.text, mol=rooted.mol, uses_stereo=query.uses_stereo, root=0, is_loose=query.is_loose
    )

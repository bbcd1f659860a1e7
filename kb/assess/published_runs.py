"""The published expectation for many recorded runs, from their stored facts alone.

It owns the short way from a row of facts to published shares: no scheme is read again and no interval is worked out.
It serves the estimate of yields, where runs are compared with what published rates expect of each. A run whose facts
do not say which bond breaks gives none.
"""

from __future__ import annotations

from functools import lru_cache

from rdkit import Chem, rdBase

from kb.assess.published import NOT_COVERED
from kb.assess.published_centre import describe_centre
from kb.assess.published_medium import medium_of
from kb.assess.record_view import RecordView
from kb.chem.centre import find_leaving_group
from kb.chem.molgraph import molgraph_of
from kb.errors import ChemistryError
from kb.physorg.competition import Quick, compete_quickly
from kb.physorg.step import Centre, StepFacts
from kb.vocabulary import CarbonClass, Fate, LeavingGroup

_NOT_COVERED = frozenset(map(str, NOT_COVERED))


def published_share(view: RecordView, row: int, fate: Fate) -> float:
    """Return what published rates expect of a fate in a run (0..1), NaN where they give no number."""
    quick = published_run(view, row)
    return float("nan") if quick is None else dict(quick.shares).get(fate, 0.0)


def published_run(view: RecordView, row: int) -> Quick | None:
    """Return what published rates expect of a run, None where they give no number."""
    table = view.table
    atom = table.number("centre_atom", row)
    leaving, carbon = table.word("leaving_group", row), table.word("carbon_class", row)
    if atom is None or leaving is None or carbon is None or table.word("fate", row) in _NOT_COVERED:
        return None
    centre = _centre(table.substrate[row], int(atom), leaving, carbon)
    if centre is None:
        return None
    key = ("medium", int(table.profile[row]), table.nucleophile_word(row), leaving)
    if key not in view.memory:
        is_activated = leaving in (LeavingGroup.HYDROXYL, LeavingGroup.ALKOXIDE)
        view.memory[key] = medium_of(view.profile(row), table.nucleophile_word(row), is_activated)
    step = StepFacts(centre=centre, leaving_group=LeavingGroup(leaving), medium=view.memory[key])
    return compete_quickly(step)


@lru_cache(maxsize=16384)
def _centre(substrate: str, atom: int, leaving: str, carbon_class: str) -> Centre | None:
    """Return the centre of a canonical substrate, None where the leaving atom is not found beside it."""
    try:
        graph = molgraph_of(substrate)
    except ChemistryError:
        return None
    if atom >= len(graph):
        return None
    leavers = (n for n in graph.neighbours[atom] if find_leaving_group(graph, atom, n) == leaving)
    departs = next(leavers, None)
    if departs is None:
        return None
    with rdBase.BlockLogs():
        mol = Chem.MolFromSmiles(substrate)
    if mol is None or mol.GetBondBetweenAtoms(atom, departs) is None:
        return None
    return describe_centre(mol, atom, departs, CarbonClass(carbon_class))

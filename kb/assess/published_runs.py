"""The published expectation for many recorded runs, from their stored facts alone.

It owns the short way from a row of facts to published shares: no scheme is read again and no interval is worked out.
It serves the estimate of yields, where runs are compared with what published rates expect of each. A run whose facts
do not say which bond breaks gives none.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from numpy.typing import NDArray
from rdkit import Chem, rdBase

from kb.assess.published import NOT_COVERED
from kb.assess.published_centre import describe_centre
from kb.assess.published_medium import medium_of
from kb.assess.record_view import RecordView
from kb.assess.table import FATES
from kb.chem.centre import find_leaving_group
from kb.chem.molgraph import molgraph_of
from kb.errors import ChemistryError
from kb.materials.profile import ConditionProfile
from kb.physorg.competition import mean_shares
from kb.physorg.step import Centre, StepFacts
from kb.vocabulary import CarbonClass, Fate, LeavingGroup

_NOT_COVERED = frozenset(map(str, NOT_COVERED))


def published_share(view: RecordView, row: int, fate: Fate) -> float:
    """Return what published rates expect of a fate in a run (0..1), NaN where they give no number."""
    table = view.table
    code = int(table.profile[row])
    atom = table.number("centre_atom", row)
    key = (
        "published",
        table.substrate[row],
        atom,
        table.word("leaving_group", row),
        table.nucleophile_word(row),
        table.profiles[code],
    )
    if key not in view.known:
        view.known[key] = _shares(view, row) if atom is not None else None
    shares: NDArray[np.float64] | None = view.known[key]
    return float("nan") if shares is None else float(shares[FATES.index(fate)])


def _shares(view: RecordView, row: int) -> NDArray[np.float64] | None:
    table = view.table
    leaving = table.word("leaving_group", row)
    carbon = table.word("carbon_class", row)
    atom = table.number("centre_atom", row)
    if leaving is None or carbon is None or atom is None or table.word("fate", row) in _NOT_COVERED:
        return None
    centre = _centre(table.substrate[row], int(atom), leaving, carbon)
    if centre is None:
        return None
    return shares_of(centre, LeavingGroup(leaving), view.profile(row), table.nucleophile_word(row))


def shares_of(
    centre: Centre, leaving: LeavingGroup, profile: ConditionProfile, nucleophile: str | None
) -> NDArray[np.float64] | None:
    """Return published shares per fate (8), None where there is no honest number."""
    is_activated = leaving in (LeavingGroup.HYDROXYL, LeavingGroup.ALKOXIDE)
    medium = medium_of(profile, nucleophile, is_activated)
    shares = mean_shares(StepFacts(centre=centre, leaving_group=leaving, medium=medium))
    return np.array([shares.get(fate, 0.0) for fate in FATES]) if shares else None


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

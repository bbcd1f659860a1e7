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
from kb.assess.published_closure import find_closure
from kb.assess.published_medium import medium_of
from kb.assess.record_view import RecordView
from kb.chem.centre import find_leaving_group
from kb.chem.molgraph import molgraph_of
from kb.errors import ChemistryError
from kb.physorg.competition import Quick, compete_quickly
from kb.physorg.conversion import DEFAULT_TIME_H
from kb.physorg.step import Centre, Closure, StepFacts
from kb.vocabulary import CarbonClass, Fate, LeavingGroup

_NOT_COVERED = frozenset(map(str, NOT_COVERED))


def published_share(view: RecordView, row: int, fate: Fate) -> float:
    """Return what published rates expect of a fate after the run's time (0..1), NaN where they give no number."""
    quick = published_run(view, row)
    return float("nan") if quick is None else dict(quick.shares).get(fate, 0.0)


def published_run(view: RecordView, row: int) -> Quick | None:
    """Return what published rates expect of a run, None where they give no number; reckoned once for each run."""
    key = ("published", view.table.codes[row])
    if key not in view.known:
        step = step_of_run(view, row)
        time_h = view.table.number("time_h", row) or DEFAULT_TIME_H
        view.known[key] = None if step is None else compete_quickly(step, time_h)
    found: Quick | None = view.known[key]
    return found


def step_of_run(view: RecordView, row: int) -> StepFacts | None:
    """Return a run as the published models see it, None where its facts do not say which bond breaks."""
    table = view.table
    atom = table.number("centre_atom", row)
    leaving, carbon = table.word("leaving_group", row), table.word("carbon_class", row)
    if atom is None or leaving is None or carbon is None or table.word("fate", row) in _NOT_COVERED:
        return None
    profile = view.profile(row)
    site = _site(table.substrate[row], int(atom), leaving, carbon, profile.base_pkah)
    if site is None:
        return None
    centre, closure = site
    word = table.nucleophile_word(row)
    if closure is not None and word is not None and word not in profile.reagent_classes:
        word = None  # nothing in the flask but the substrate is of that class
    key = ("medium", table.profiles[table.profile[row]], word, leaving)
    if key not in view.known:
        is_activated = leaving in (LeavingGroup.HYDROXYL, LeavingGroup.ALKOXIDE)
        view.known[key] = medium_of(profile, word, is_activated)
    return StepFacts(centre=centre, leaving_group=LeavingGroup(leaving), medium=view.known[key], closure=closure)


@lru_cache(maxsize=16384)
def _site(
    substrate: str, atom: int, leaving: str, carbon_class: str, base_pkah: float | None
) -> tuple[Centre, Closure | None] | None:
    """Return the centre of a canonical substrate and its attack from within; None without a leaving atom beside it."""
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
    centre = describe_centre(mol, atom, departs, CarbonClass(carbon_class))
    is_activated = leaving in (LeavingGroup.HYDROXYL, LeavingGroup.ALKOXIDE)
    return centre, None if is_activated else find_closure(mol, atom, departs, base_pkah)

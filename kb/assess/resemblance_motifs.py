"""The motifs of recorded losses that could concern a plan, each with the runs that failed by it.

It owns the gathering. A failure whose motif the chemist stated speaks by that. Otherwise the motif is worked out from
what was found: the surroundings of the lost atoms are compared with the plan first, and only where the plan holds
them are they widened until they exclude survivors (`motif.generalise`), for at most WIDENED runs of a kind, nearest
first. So a check costs a bounded number of searches however large the book.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from kb.assess.distinct import distinct
from kb.assess.evidence_motif import finder_of
from kb.assess.forcing import is_at_least_as_forcing
from kb.assess.motif import generalise, lost_atoms_of, surrounding, write_motif
from kb.assess.record_view import RecordView
from kb.assess.table import WORDS
from kb.record.failure_modes import modes_that_lose_a_group
from kb.vocabulary import Fate

WIDENED = 8
MOST_FAILURES = 400
"""Most failures without a stated motif that are worked out in one check, nearest first."""


def gather_motifs(
    view: RecordView, concerns: NDArray[np.bool_], similarity: NDArray[np.float64], fragments: Sequence[str]
) -> dict[tuple[str, str], list[int]]:
    """Return (mode, SMARTS) of the losses that could concern a plan, with the rows that failed by each.

    Args:
        view: the runs (n).
        concerns: which runs' conditions the plan is at least as forcing as, or may be (n).
        similarity: of each run to the plan (n), for the order.
        fragments: SMILES of the plan's left side.
    """
    gathered: dict[tuple[str, str], list[int]] = {}
    unstated: list[tuple[int, str]] = []
    for mode in view.modes:
        if mode not in modes_that_lose_a_group():
            continue
        for row in np.flatnonzero(view.failed_in(mode) & concerns).tolist():
            for named, stated in view.failures[row]:
                if named != mode:
                    continue
                if stated:
                    gathered.setdefault((mode, stated), []).append(row)
                else:
                    unstated.append((row, mode))
    unstated.sort(key=lambda pair: -similarity[pair[0]])
    for (mode, core), rows in _by_core(view, unstated[:MOST_FAILURES]).items():
        find = finder_of(core)
        if not any(find(mol) for smiles in fragments if (mol := view.mol(smiles)) is not None):
            continue
        for place, row in enumerate(rows):
            smarts = _widened(view, row) if place < WIDENED else core
            gathered.setdefault((mode, smarts or core), []).append(row)
    return gathered


def _by_core(view: RecordView, failures: Sequence[tuple[int, str]]) -> dict[tuple[str, str], list[int]]:
    """Group failures by mode and by the lost atoms with what they hung on."""
    view.fetch([row for row, _ in failures if ("core", view.table.codes[row]) not in view.known])
    groups: dict[tuple[str, str], list[int]] = {}
    for row, mode in failures:
        key = ("core", view.table.codes[row])
        if key not in view.known:
            view.known[key] = _core(view, row)
        if view.known[key]:
            groups.setdefault((mode, view.known[key]), []).append(row)
    return groups


def _core(view: RecordView, row: int) -> str:
    substrate, lost = view.mol(view.table.substrate[row]), _lost(view, row)
    return write_motif(substrate, surrounding(substrate, lost, 0)) if lost else ""


def _lost(view: RecordView, row: int) -> frozenset[int]:
    """Return the atoms that a run's substrate lost; empty where the record does not show it."""
    found = [p.smiles for p in view.run(row).outcome.products if p.fate is Fate.GROUP_LOSS and p.smiles]
    return lost_atoms_of(view.table.substrate[row], found[0]) if found and view.table.substrate[row] else frozenset()


def _widened(view: RecordView, row: int) -> str:
    key = ("widened", view.table.codes[row])
    if key not in view.memory:
        motif = generalise(view.mol(view.table.substrate[row]), _lost(view, row), lambda s: _is_held(view, row, s))
        view.memory[key] = motif.smarts if motif else ""
    return str(view.memory[key])


def _is_held(view: RecordView, row: int, smarts: str) -> bool:
    """Return whether a run that came through conditions at least as forcing as a failed one's holds a motif."""
    table = view.table
    rows = view.rows_with_motif(smarts)
    worked = table.words["verdict"][rows] == WORDS["verdict"].index("worked")
    other_fate = table.words["fate"][rows] != WORDS["fate"].index("group-loss")
    through = rows[worked & other_fate & ~view.has_failure[rows]]
    failed = view.profile(row)
    codes = distinct(table.profile[through])
    return any(is_at_least_as_forcing(view.profile_of_code(int(code)), failed) for code in codes)

"""Where close precedents contradict each other: which two runs, on what, and what is known to differ between them.

It owns the choice of the pair and its words. A contradiction is the most useful thing that a record can say of a step:
whatever differs between the two runs, or was left unwritten in one of them, is what decides the outcome.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from kb.assess.estimate import DISAGREE_FROM, LEAST_SIMILARITY, weights_of
from kb.assess.precedent import compare, differences
from kb.assess.ranking import best_rows
from kb.assess.record_view import RecordView
from kb.assess.table import FATES
from kb.record.run import Run
from kb.vocabulary import Fate

LEAST_GAP = 0.3
"""Difference in the share of a fate from which two runs contradict each other; judgement."""
CLOSEST = 12
"""How many of the heaviest runs are compared."""


def word_disagreement(view: RecordView, similarity: NDArray[np.float64], fate: Fate) -> str:
    """Return one sentence on the two close runs that disagree most on a fate, "" where none contradict.

    Args:
        view: the runs (n).
        similarity: of each run to the plan (n).
        fate: on whose share they are compared.
    """
    shares = view.table.shares[:, FATES.index(fate)]
    rows = best_rows(similarity, CLOSEST, np.flatnonzero((similarity > LEAST_SIMILARITY) & ~np.isnan(shares)))
    if len(rows) < 2:
        return ""
    weight, share = weights_of(similarity[rows]), shares[rows]
    mean = np.average(share, weights=weight)
    if np.sqrt(np.average((share - mean) ** 2, weights=weight)) < DISAGREE_FROM:
        return ""
    gap = np.abs(share[:, None] - share)
    telling = np.where(gap >= LEAST_GAP, gap * np.sqrt(weight[:, None] * weight), 0.0)
    first, second = sorted(np.unravel_index(int(np.argmax(telling)), telling.shape))
    if not telling[first, second]:
        return ""
    pair = (int(rows[first]), int(rows[second]))
    said = ", ".join(f"{view.table.codes[row]} gave {100 * shares[row]:.0f} % {fate}" for row in pair)
    return f"{said}; {_what_differs(view, *pair)}."


def _what_differs(view: RecordView, first: int, second: int) -> str:
    one, other = view.table.rows(np.array([first])), view.table.rows(np.array([second]))
    parts, _ = compare(one, other)
    words = [f"{view.table.codes[second]}: {word}" for word in differences(one, other, 0, parts)]
    view.fetch([first, second])
    words = _unwritten(view, first, second) + words
    return "what differs: " + "; ".join(words[:4]) if words else "nothing that was recorded differs"


def _unwritten(view: RecordView, first: int, second: int) -> list[str]:
    """Return what one of two runs says and the other leaves out."""
    said = []
    for known, silent in ((first, second), (second, first)):
        a, b = view.profile(known), view.profile(silent)
        if a.water and not b.water:
            codes = view.table.codes
            said.append(f"water in {codes[known]}, water content not recorded in {codes[silent]}")
        left_out = [
            what for what, value in _told(view.run(known)).items() if value and not _told(view.run(silent))[what]
        ]
        said += [f"{what} not recorded in {view.table.codes[silent]}" for what in left_out]
    return said


def _told(run: Run) -> dict[str, object]:
    conditions = run.conditions
    return {
        "temperature": conditions.temperature,
        "time": conditions.time,
        "concentration": conditions.conc_molar,
        "atmosphere": conditions.atmosphere,
        "solvent": conditions.solvents,
    }

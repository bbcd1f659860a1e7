"""Where close precedents contradict each other: which two runs, on what, and what is known to differ between them.

It owns the choice of the pair and its words. A contradiction is the most useful thing that a record can say of a step:
whatever differs between the two runs, or was left unwritten in one of them, is what decides the outcome.
"""

from __future__ import annotations

from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from kb.assess.estimate import DISAGREE_FROM
from kb.assess.precedent import compare, differences
from kb.assess.record_view import RecordView
from kb.assess.table import FATES
from kb.record.run import Run
from kb.vocabulary import Fate

LEAST_GAP = 0.3
"""Difference in the share of a fate from which two runs contradict each other; judgement."""
CLOSEST = 12
"""How many of the heaviest runs are compared."""


def word_disagreement(view: RecordView, weight: NDArray[np.float64], fate: Fate) -> str:
    """Return one sentence on the two close runs that disagree most on a fate, "" where none contradict.

    Args:
        view: the runs (n).
        weight: of each run's say (n), 0..1.
        fate: on whose share they are compared.
    """
    column = FATES.index(fate)
    if _scatter(weight, view.table.shares[:, column]) < DISAGREE_FROM:
        return ""
    shares = view.table.shares[:, column]
    heaviest = [
        int(r) for r in np.argsort(-weight, kind="stable")[:CLOSEST] if weight[r] > 0 and not np.isnan(shares[r])
    ]
    pairs = [(a, b) for a, b in combinations(heaviest, 2) if abs(shares[a] - shares[b]) >= LEAST_GAP]
    if not pairs:
        return ""
    first, second = max(
        pairs, key=lambda p: float(np.sqrt(weight[p[0]] * weight[p[1]]) * abs(shares[p[0]] - shares[p[1]]))
    )
    codes = view.table.codes
    said = ", ".join(f"{codes[row]} gave {100 * shares[row]:.0f} % {fate}" for row in (first, second))
    return f"{said}; {_what_differs(view, first, second)}."


def _scatter(weight: NDArray[np.float64], shares: NDArray[np.float64]) -> float:
    """Return the weighted standard deviation of a share between the runs that speak (0..1)."""
    heard = (weight > 0) & ~np.isnan(shares)
    if not heard.any():
        return 0.0
    mean = np.average(shares[heard], weights=weight[heard])
    return float(np.sqrt(np.average((shares[heard] - mean) ** 2, weights=weight[heard])))


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

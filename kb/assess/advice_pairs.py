"""What a change did in the record: matched pairs of runs that differ in it and in little else.

It owns the pairing and the arithmetic. One run of a pair stands where the plan stands in the condition that changes,
the other where the change would take it; runs of one substrate are paired before others, and no run is used twice.
The effect is the mean difference in the share wanted, with an 80 % interval that also carries a prior scatter, so
that two lucky pairs do not look like a law.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from kb.assess.kernel import centre_likeness
from kb.assess.table import FactTable
from kb.record.finding import Interval

PRIOR_SD = 0.12
"""Scatter of a difference before any pair was seen (0..1)."""
PRIOR_PAIRS = 1.0
MOST_A_SIDE = 40
"""Runs on either side that are paired, the most similar to the plan."""
_Z80 = 1.2816  # 90th centile of the normal distribution


@dataclass(frozen=True, slots=True, kw_only=True)
class Paired:
    """Matched pairs for one change.

    Attributes:
        effect: on the share wanted, -1..1, with 80 % interval.
        pairs: (row where the plan stands, row after the change), best matched first.
        same_substrate: how many pairs are of one substrate.
    """

    effect: Interval
    pairs: tuple[tuple[int, int], ...]
    same_substrate: int


def pair_runs(table: FactTable, here: Sequence[int], there: Sequence[int], share: NDArray[np.float64]) -> Paired | None:
    """Pair runs and return what the change did; None where a side is empty.

    Args:
        table: the runs.
        here, there: rows before and after the change, most similar to the plan first.
        share: of the fate wanted, per row of the table (n), 0..1.
    """
    before, after = list(here)[:MOST_A_SIDE], list(there)[:MOST_A_SIDE]
    if not before or not after:
        return None
    likeness = centre_likeness(table.centre_bits[before], table.centre_bits[after])
    is_same = np.array([[table.substrate[a] == table.substrate[b] for b in after] for a in before])
    score = likeness + 2.0 * is_same
    pairs: list[tuple[int, int]] = []
    same = 0
    for _ in range(min(len(before), len(after))):
        i, j = np.unravel_index(int(np.argmax(score)), score.shape)
        pairs.append((before[i], after[j]))
        same += int(is_same[i, j])
        score[i, :] = -1.0
        score[:, j] = -1.0
    differences = np.array([float(share[b] - share[a]) for a, b in pairs])
    return Paired(effect=mean_effect(differences), pairs=tuple(pairs), same_substrate=same)


def mean_effect(differences: NDArray[np.float64]) -> Interval:
    """Return the mean of some differences, shrunk towards none by PRIOR_PAIRS pairs of scatter PRIOR_SD."""
    n = len(differences)
    mean = float(differences.mean()) * n / (n + PRIOR_PAIRS)
    spread = float(((differences - differences.mean()) ** 2).mean())
    variance = (n * spread + PRIOR_PAIRS * PRIOR_SD**2) / (n - 1 + PRIOR_PAIRS) / n
    half = _Z80 * float(np.sqrt(variance))
    return Interval(mean=round(mean, 3), low=round(max(mean - half, -1), 3), high=round(min(mean + half, 1), 3))

"""How much of a fate is the product that was drawn: a group lost on purpose against another lost beside it.

One word, group loss, covers the deprotection that was wanted and the loss of a bystander; a split says 96 % to both. It
owns the telling apart, from runs that give the structures of what they found: the share of the product drawn in
each, weighed as the estimate weighs them, with the 80 % interval of the next run. It speaks only where such runs
found another product of the same fate, since otherwise the share already says it all.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from kb.assess.estimate import (
    LEAST_SIMILARITY,
    PRIOR_SCATTER,
    SCATTER_RUNS,
    WEIGHT_THAT_COUNTS,
    beta_interval,
    weights_of,
)
from kb.assess.ranking import best_rows
from kb.assess.record_view import RecordView
from kb.assess.table import FATES
from kb.errors import ChemistryError
from kb.record.run import Run
from kb.vocabulary import Fate

CLOSEST = 12
"""How many of the heaviest runs are asked."""
WORTH_TELLING = 0.05
"""Share of another product of the same fate from which the two are told apart; judgement."""


def word_wanted_product(view: RecordView, similarity: NDArray[np.float64], fate: Fate | None) -> str:
    """Return a sentence on the share of the product drawn, "" where the split says it already.

    Args:
        view: the runs (n).
        similarity: of each run to the plan (n).
        fate: wanted in the plan; None = not known.
    """
    if fate is None or fate in (Fate.UNREACTED, Fate.OTHER):
        return ""
    told = view.table.shares[:, FATES.index(fate)] > WORTH_TELLING
    rows = best_rows(similarity, CLOSEST, np.flatnonzero((similarity > LEAST_SIMILARITY) & told))
    view.fetch(int(row) for row in rows)
    found = [(int(row), pair) for row in rows if (pair := shares_of(view.run(int(row)), fate)) is not None]
    if not found or max(aside for _, (_, aside) in found) < WORTH_TELLING:
        return ""
    weight = weights_of(similarity[[row for row, _ in found]])
    if weight.sum() < WEIGHT_THAT_COUNTS:
        return ""
    drawn = np.array([share for _, (share, _) in found])
    mean = float(np.average(drawn, weights=weight))
    spread = float(weight @ (drawn - mean) ** 2) + SCATTER_RUNS * PRIOR_SCATTER**2 * 4 * mean * (1 - mean)
    inside = min(max(mean, 0.002), 0.998)
    room = inside * (1 - inside)
    variance = min(max(spread / (float(weight.sum()) + SCATTER_RUNS), 1e-5), 0.95 * room)
    interval = beta_interval(inside, max(room / variance - 1, 0.05))
    codes = [view.table.codes[row] for row, _ in found]
    named = ", ".join(codes)
    rest = "the rest of it had lost another group as well" if fate is Fate.GROUP_LOSS else "the rest is another product"
    return (
        f"Not all of the {fate} is the product drawn: that alone {100 * interval.mean:.0f} % "
        f"({100 * interval.low:.0f} to {100 * interval.high:.0f}) by the {len(found)} close runs that say which "
        f"({named}); {rest}."
    )


def shares_of(run: Run, fate: Fate) -> tuple[float, float] | None:
    """Return the shares (product drawn, other products of the fate) of a run, 0..1; None where it does not say."""
    from kb.chem.scheme import parse_scheme

    seen = [p for p in run.outcome.products if p.fate is fate and p.share is not None]
    whole = sum(p.share for p in run.outcome.products if p.share is not None)
    if not seen or whole <= 0 or any(p.smiles is None for p in seen):
        return None
    try:
        drawn = {fragment.smiles for fragment in parse_scheme(run.scheme).products}
    except ChemistryError:
        return None
    if not drawn:
        return None
    wanted = sum(p.share for p in seen if p.smiles in drawn and p.share is not None)
    return wanted / whole, sum(p.share for p in seen if p.smiles not in drawn and p.share is not None) / whole

"""The warning that a step may give next to nothing.

It owns the limits and the words; the chance comes from `yields.py`. It speaks only where recorded runs close to the
plan did give next to nothing: what published rates alone expect is said by the estimate.
"""

from __future__ import annotations

import numpy as np

from kb.assess.record_view import RecordView
from kb.assess.yields import NOTHING_PCT, YieldFit
from kb.record.finding import Evidence, Finding
from kb.vocabulary import FindingKind, Severity

LEAST_CHANCE = 0.35
"""Chance of next to nothing from which it is said."""
MOST_YIELD_PCT = 25.0
"""Expected yield above which it is not: a middling figure with a wide interval is no warning. Both limits were looked
at on the deoxyfluorination data (`tests/assess/test_deoxyfluorination.py`); moving either by a seventh changes
little."""
SERIOUS_FROM = 0.6
LEAST_LIKENESS = 0.3
"""Likeness to the plan from which a run is named as evidence; judgement."""
NAMED = 24
"""Most runs named."""


def find_low_yield(
    fit: YieldFit | None, view: RecordView, similarity: np.ndarray, component: int | None, atom: int | None
) -> tuple[Finding, ...]:
    """Return the warning, or nothing.

    Args:
        fit: of the plan; None = no run close enough.
        view: the runs (n).
        similarity: of each run to the plan (n).
        component, atom: the centre, for drawing.
    """
    if fit is None or fit.nothing.mean < LEAST_CHANCE or fit.yield_pct.mean >= MOST_YIELD_PCT:
        return ()
    rows = [row for row in fit.rows if similarity[row] >= LEAST_LIKENESS][:NAMED]
    lost = [row for row in rows if view.table.yield_pct[row] < NOTHING_PCT]
    if not lost:
        return ()
    survived = [row for row in rows if row not in lost]
    codes = view.table.codes
    return (
        Finding(
            rule_id=f"resemblance:next-to-nothing:{codes[lost[0]]}",
            kind=FindingKind.RESEMBLANCE,
            severity=Severity.SERIOUS if fit.nothing.mean >= SERIOUS_FROM and len(lost) >= 2 else Severity.CAUTION,
            title=f"May give next to nothing (under {NOTHING_PCT:.0f} %)",
            why=(
                f"Of the {len(rows)} runs of this book that weigh most here, {len(lost)} gave under "
                f"{NOTHING_PCT:.0f} %. "
                f"The chance weighs each by how alike centre and conditions are; a yield of {fit.yield_pct.mean:.0f} % "
                f"({fit.yield_pct.low:.0f} to {fit.yield_pct.high:.0f}) is expected."
            ),
            component=component,
            atoms=() if atom is None else (atom,),
            evidence=Evidence(
                lost=len(lost),
                survived=len(survived),
                runs=tuple(codes[row] for row in [*lost, *survived]),
                chance=fit.nothing,
            ),
            source="this book; published relative rates as the starting point",
        ),
    )

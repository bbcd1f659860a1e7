"""What counts as a failure when the record is looked at as a whole.

It owns that one judgement, so that clusters, replay and coverage count the same runs: a run failed when the chemist
said so, or when it went only partly and a failure mode was named; a run without a verdict counts by its named
failure, and else not at all.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from kb.assess.record_view import RecordView
from kb.assess.table import WORDS
from kb.record.failure_modes import failure_modes

NOT_CHEMISTRY = frozenset({"emulsion", "isolation-loss", "reagent-quality", "other"})
"""Modes that a record of substrates and conditions cannot foresee: the hand, the bottle, the funnel."""


def failed_rows(view: RecordView) -> NDArray[np.bool_]:
    """Return which rows failed (n)."""
    verdict = view.table.words["verdict"]
    words = WORDS["verdict"]
    named = np.array([bool(pairs) for pairs in view.failures], dtype=bool)
    failed, partly = verdict == words.index("failed"), verdict == words.index("partly")
    return np.asarray(failed | (named & (partly | (verdict < 0))))


def judged_rows(view: RecordView) -> NDArray[np.bool_]:
    """Return which rows say whether they failed (n)."""
    named = np.array([bool(pairs) for pairs in view.failures], dtype=bool)
    return np.asarray((view.table.words["verdict"] >= 0) | named)


def meaning_of(mode: str) -> str:
    """Return a failure mode in plain words; a mode of a later program stands for itself."""
    return {m.word: m.meaning for m in failure_modes()}.get(mode, mode.replace("-", " "))

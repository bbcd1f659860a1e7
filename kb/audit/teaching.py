"""Which experiments would teach a group most: the largest expected drop in the uncertainty of what it means to do.

It owns the reckoning. A step's uncertainty is the variance of the mean share that the record gives for it, sigma^2 /
(n + PRIOR_RUNS): n its effective precedents (the kernel's weights, as in an estimate), sigma the scatter of those
precedents, shrunk towards the estimate's prior scatter. One more run, alike by weight w, makes n into n + w. The gain
of an experiment is the sum of those drops over all steps; experiments are chosen one after another, so that the
second does not teach what the first already has. Groups at risk elsewhere in the molecule are left out of the
likeness here.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kb.assess.estimate import PRIOR_SCATTER, SCATTER_RUNS, weights_of
from kb.assess.precedent import compare
from kb.assess.record_view import RecordView
from kb.assess.table import FactTable, build_table, columns_of
from kb.errors import Cancelled
from kb.progress import Progress
from kb.record.plan import Plan
from kb.store.derivation import account_of_plan

MOST_STEPS = 120
"""Most steps that stand for what a group means to do."""
RECENT_DAYS = 365
PRIOR_RUNS = 0.6
"""Whole runs that general knowledge is worth, as in the estimate."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Experiment:
    """One run that would teach much.

    Attributes:
        like: code of a recorded run whose flask it would repeat or vary; None = a planned step.
        scheme: of that run's substrate or of the planned step.
        words: what it is, in short.
        gain: drop in summed variance of the share (0..1 squared).
        share_of_total: that drop over the summed variance now (0..1).
        serves: how many steps would be surer by a tenth or more of their variance.
        before, after: standard deviation of the mean share of the step itself (0..1).
        precedents: effective precedents now.
        why: plain words.
    """

    like: str | None
    scheme: str
    words: str
    gain: float
    share_of_total: float
    serves: int
    before: float
    after: float
    precedents: float
    why: str

    def as_dict(self) -> dict[str, Any]:
        """Return plain JSON values."""
        return {name: getattr(self, name) for name in self.__slots__}


def teach_most(
    view: RecordView,
    share: NDArray[np.float64],
    planned: Sequence[Plan],
    count: int,
    progress: Progress,
) -> tuple[Experiment, ...]:
    """Return the experiments that would teach most, best first.

    Args:
        share: of the wanted fate of each row (n), NaN = not told.
        planned: what the group means to do; none = its latest year of runs, one for each kind of flask.
        count: how many.

    Raises:
        Cancelled: the user stopped it.
    """
    steps, labels = _steps(view, planned)
    if not labels:
        return ()
    told = ~np.isnan(share)
    known = np.nan_to_num(share)
    n, sigma2 = np.zeros(len(steps)), np.zeros(len(steps))
    alike = np.zeros((len(steps), len(steps)))
    table = view.table
    for place in range(len(steps)):
        if progress.cancelled():
            raise Cancelled("The audit was stopped.", "Nothing was changed.")
        progress.advance(place, len(steps), "steps weighed")
        step = steps.rows(np.array([place]))
        weight = weights_of(compare(step, table)[1]) * told if len(table) else np.zeros(0)
        alike[place] = weights_of(compare(step, steps)[1])
        n[place] = weight.sum()
        mean = float((weight @ known + PRIOR_RUNS * 0.5) / (n[place] + PRIOR_RUNS))
        squares = float(weight @ (known - mean) ** 2)
        prior = PRIOR_SCATTER**2 * 4 * mean * (1 - mean)
        sigma2[place] = (squares + SCATTER_RUNS * prior) / (n[place] + SCATTER_RUNS)
    return _choose(labels, n, sigma2, alike, count)


def _choose(
    labels: list[tuple[str | None, str, str]],
    n: NDArray[np.float64],
    sigma2: NDArray[np.float64],
    alike: NDArray[np.float64],
    count: int,
) -> tuple[Experiment, ...]:
    chosen: list[Experiment] = []
    taken: set[int] = set()
    while len(chosen) < min(count, len(labels)):
        now = sigma2 / (n + PRIOR_RUNS)
        after = sigma2 / (n + alike + PRIOR_RUNS)  # row = experiment, column = step
        gains = (now - after).sum(axis=1)
        gains[list(taken)] = -1.0
        best = int(np.argmax(gains))
        taken.add(best)
        serves = int((after[best] <= 0.9 * now).sum())
        like, scheme, words = labels[best]
        chosen.append(
            Experiment(
                like=like,
                scheme=scheme,
                words=words,
                gain=round(float(gains[best]), 5),
                share_of_total=round(float(gains[best] / now.sum()), 4),
                serves=serves,
                before=round(float(np.sqrt(now[best])), 3),
                after=round(float(np.sqrt(after[best, best])), 3),
                precedents=round(float(n[best]), 2),
                why=_why(float(n[best]), float(np.sqrt(sigma2[best])), serves),
            )
        )
        n = n + alike[best]
    return tuple(chosen)


def _why(n: float, sigma: float, serves: int) -> str:
    if n < 1:
        said = f"The record holds next to nothing alike ({n:.1f} effective runs)"
    elif sigma > 0.2:
        said = f"{n:.1f} effective runs disagree by some {100 * sigma:.0f} points"
    else:
        said = f"{n:.1f} effective runs are alike and agree within {100 * sigma:.0f} points"
    if not serves:
        return f"{said}; one more would change little."
    steps = "one step" if serves == 1 else f"{serves} steps"
    return f"{said}; one more would make {steps} of those looked at surer by a tenth or more."


def _steps(view: RecordView, planned: Sequence[Plan]) -> tuple[FactTable, list[tuple[str | None, str, str]]]:
    """Return a table of the steps that stand for what the group means to do, and (run code, scheme, words) of each."""
    if planned:
        accounts = [(plan, account_of_plan(plan)) for plan in planned[:MOST_STEPS]]
        read = [(plan, account.facts) for plan, account in accounts if account.reading.centre is not None]
        steps = build_table(columns_of([facts for _, facts in read]))
        return steps, [(None, plan.scheme, _words(steps, place)) for place, (plan, _) in enumerate(read)]
    table = view.table
    latest = int(table.date.max()) if len(table) else 0
    recent = np.flatnonzero((table.date > latest - RECENT_DAYS) & (table.words["carbon_class"] >= 0) & (table.date > 0))
    seen: set[tuple[object, ...]] = set()
    chosen: list[int] = []
    for row in recent[np.argsort(-table.date[recent], kind="stable")]:
        kind = (
            int(table.words["carbon_class"][row]),
            int(table.words["leaving_group"][row]),
            int(table.nucleophile[row]),
            int(table.flags[row]),
            int(table.protic[row]),
        )
        if kind in seen:
            continue
        seen.add(kind)
        chosen.append(int(row))
        if len(chosen) == MOST_STEPS:
            break
    labels: list[tuple[str | None, str, str]] = [
        (table.codes[row], table.substrate[row], _words(table, row)) for row in chosen
    ]
    return table.rows(np.array(chosen, dtype=np.intp)), labels


def _words(table: FactTable, row: int) -> str:
    parts = [table.word("carbon_class", row), table.word("leaving_group", row), table.nucleophile_word(row)]
    temperature = table.number("temperature_c", row)
    words = [p.replace("_", " ") for p in parts if p]
    if table.protic[row] >= 0:
        words.append("protic solvent" if table.protic[row] else "aprotic solvent")
    if temperature is not None:
        words.append(f"{temperature:.0f} °C")
    return ", ".join(words)

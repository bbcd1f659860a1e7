"""One change to a step: what published rates say it does to the share of a fate, and to the pace.

It owns the comparison of two steps. Both are sampled together, so that uncertainty which they share (the class of the
centre, the strength of the base) cancels and only what differs is left in the interval.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from kb.physorg.cation import partition
from kb.physorg.channels import Draft, list_channels
from kb.physorg.competition import LEVEL, Share, sample_rates
from kb.physorg.rates import closed_because
from kb.physorg.step import StepFacts
from kb.physorg.terms import Term
from kb.vocabulary import Fate

SAMPLES = 300


@dataclass(frozen=True, slots=True, kw_only=True)
class Contrast:
    """What a change does.

    Attributes:
        effect: change in the share of the fate, in points -1..1, with 80 % interval.
        pace: how many times faster the step becomes (below 1 = slower), central value.
        half_life_h: after the change, at 1 M of reagent [h], to about a factor of ten.
        because: words of the terms that differ, those that move most first.
        sources: of these terms, in the same order.
    """

    effect: Share
    pace: float
    half_life_h: float
    because: tuple[str, ...] = ()
    sources: tuple[str, ...] = ()


def contrast(before: StepFacts, after: StepFacts, fate: Fate) -> Contrast | None:
    """Return what going from one step to another does to a fate; None where either has no honest number."""
    sides = []
    for step in (before, after):
        if closed_because(step):
            return None
        ways = partition(step)
        drafts = list_channels(step, ways)
        if not drafts:
            return None
        sides.append((drafts, ways))
    rates = sample_rates(sides, SAMPLES)
    shares = []
    for (drafts, _), of_channels in zip(sides, rates, strict=True):
        of_fate = [i for i, d in enumerate(drafts) if d.fate is fate]
        shares.append(of_channels[of_fate].sum(axis=0) / of_channels.sum(axis=0))
    change = shares[1] - shares[0]
    mean = float(change.mean())
    low, high = np.quantile(change, [(1 - LEVEL) / 2, (1 + LEVEL) / 2])
    whole = [r.sum(axis=0) for r in rates]
    moved = _moved(sides[0][0], sides[1][0])
    return Contrast(
        effect=Share(mean=mean, low=min(float(low), mean), high=max(float(high), mean)),
        pace=float(np.median(whole[1] / whole[0])),
        half_life_h=float(np.log(2) / np.median(whole[1]) / 3600),
        because=tuple(dict.fromkeys(t.because for t in moved)),
        sources=tuple(dict.fromkeys(t.source for t in moved if t.source)),
    )


def _moved(before: Sequence[Draft], after: Sequence[Draft]) -> list[Term]:
    """Return the terms of the second step that the first has not, or has with another value, largest change first."""
    old = {t.because: t.log10 for d in before for t in d.terms}
    new = {t.because: t for d in after for t in d.terms}
    changes = [(abs(t.log10 - old.get(because, 0.0)), t) for because, t in new.items() if old.get(because) != t.log10]
    return [t for size, t in sorted(changes, key=lambda pair: -pair[0]) if size > 0.01]

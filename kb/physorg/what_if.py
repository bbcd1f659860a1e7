"""One change to a step: what published rates say it does to the share of a fate, and to the pace.

Where a nucleophile was brought, what the solvent takes is not what was wanted, though it is substitution too.

It owns the comparison of a step with others. All are sampled together, so that uncertainty which they share (the
class of the centre, the strength of the base) cancels and only what differs is left in the interval.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from kb.physorg.cation import Branch, partition
from kb.physorg.channels import Draft, list_channels
from kb.physorg.competition import LEVEL, Share, sample_rates
from kb.physorg.rates import closed_because
from kb.physorg.step import StepFacts
from kb.physorg.terms import Term
from kb.vocabulary import Fate

SAMPLES = 300
WORTH_TELLING = 0.02
"""Share of a channel from which its terms are told."""


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


def contrasts(before: StepFacts, after: Sequence[StepFacts], fate: Fate) -> list[Contrast | None]:
    """Return what going from one step to each of some others does to a fate; None where there is no honest number."""
    sides = [_open(step) for step in (before, *after)]
    start = sides[0]
    if start is None:
        return [None] * len(after)
    sampled = iter(sample_rates([side for side in sides if side is not None], SAMPLES))
    rates = [None if side is None else next(sampled) for side in sides]
    first = rates[0]
    found: list[Contrast | None] = []
    for side, of_side in zip(sides[1:], rates[1:], strict=True):
        if side is None or of_side is None or first is None:
            found.append(None)
        else:
            found.append(_contrast(start[0], first, side[0], of_side, fate, before.medium.nucleophile is not None))
    return found


def _open(step: StepFacts) -> tuple[list[Draft], Sequence[Branch]] | None:
    """Return the channels of a step, None where none is open."""
    if closed_because(step):
        return None
    ways = partition(step)
    drafts = list_channels(step, ways)
    return (drafts, ways) if drafts else None


def _contrast(
    drafts: Sequence[Draft],
    rates: NDArray[np.float64],
    new_drafts: Sequence[Draft],
    new_rates: NDArray[np.float64],
    fate: Fate,
    has_nucleophile: bool,
) -> Contrast:
    whole, new_whole = rates.sum(axis=0), new_rates.sum(axis=0)
    share = rates[[i for i, d in enumerate(drafts) if _is_wanted(d, fate, has_nucleophile)]].sum(axis=0) / whole
    new_share = (
        new_rates[[i for i, d in enumerate(new_drafts) if _is_wanted(d, fate, has_nucleophile)]].sum(axis=0) / new_whole
    )
    change = new_share - share
    mean = float(change.mean())
    low, high = np.quantile(change, [(1 - LEVEL) / 2, (1 + LEVEL) / 2])
    moved = _moved(_that_count(drafts, rates / whole), _that_count(new_drafts, new_rates / new_whole))
    return Contrast(
        effect=Share(mean=mean, low=min(float(low), mean), high=max(float(high), mean)),
        pace=float(np.median(new_whole / whole)),
        half_life_h=float(np.log(2) / np.median(new_whole) / 3600),
        because=tuple(dict.fromkeys(t.because for t in moved)),
        sources=tuple(dict.fromkeys(t.source for t in moved if t.source)),
    )


def _is_wanted(draft: Draft, fate: Fate, has_nucleophile: bool) -> bool:
    """Return whether a channel gives what is wanted; the solvent's product is not, where a nucleophile was brought."""
    by_solvent = draft.kind == "solvent" or (draft.is_capture and "capture by the solvent" in draft.name)
    return draft.fate is fate and not (has_nucleophile and fate is Fate.SUBSTITUTION and by_solvent)


def _that_count(drafts: Sequence[Draft], shares: NDArray[np.float64]) -> dict[tuple[str, int], Draft]:
    """Return the channels that take a share worth telling, by kind and place within the kind."""
    found: dict[tuple[str, int], Draft] = {}
    for draft, share in zip(drafts, shares.mean(axis=1), strict=True):
        if share >= WORTH_TELLING:
            found[draft.kind, sum(kind == draft.kind for kind, _ in found)] = draft
    return found


def _moved(before: Mapping[tuple[str, int], Draft], after: Mapping[tuple[str, int], Draft]) -> list[Term]:
    """Return the terms by which channels open on both sides differ, largest change first."""
    changes: list[tuple[float, Term]] = []
    for key in before.keys() & after.keys():
        old = {t.because: t for t in before[key].terms}
        new = {t.because: t for t in after[key].terms}
        changes += [(abs(t.log10 - old[b].log10), t) for b, t in new.items() if b in old]
        changes += [(abs(t.log10), t) for b, t in new.items() if b not in old]
        changes += [(abs(t.log10), t) for b, t in old.items() if b not in new]
    told = sorted(changes, key=lambda pair: (-pair[0], pair[1].because))
    return [t for size, t in told if size > 0.01]

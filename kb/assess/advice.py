"""The change most likely to help: matched pairs from the record.

It owns the pairing. Two runs form a pair for a change when they share carbon class, leaving group and nucleophile
class, one stands where the plan stands in the condition that changes and the other where the change would take it, and
nothing else that is recorded differs much (kernel parts at least `ALIKE`). Each pair gives a difference in the share
wanted; the effect is their mean with an 80 % interval that also carries a prior scatter, so that two lucky pairs do
not look like a law. Published trends are added by the caller.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Callable, Hashable

import numpy as np
from numpy.typing import NDArray

from kb.assess.table import FATES, FactTable
from kb.record.assessment import Advice
from kb.record.finding import Interval
from kb.vocabulary import Basis, Fate

ALIKE = 0.6
"""Least likeness of each part that is not being changed; judgement."""
PRIOR_SD = 0.12
PRIOR_PAIRS = 1.0
LEAST_EFFECT = 0.02
_Z80 = 1.2816  # 90th centile of the normal distribution
_TEMPERATURE_STEP_K = 20.0
_PAIRED_PARTS = ("centre", "leaving group", "nucleophile")


def advise(
    plan: FactTable,
    table: FactTable,
    parts: dict[str, NDArray[np.float64]],
    wanted: Fate,
    names: dict[str, Callable[[int], str | None]],
    top: int = 3,
) -> tuple[Advice, ...]:
    """Rank single changes by what matched pairs say they do to the wanted share.

    Args:
        plan: one row.
        table: the runs (n).
        parts: likeness of each run to the plan.
        wanted: the fate whose share should rise.
        names: condition part ("solvent", "base", "temperature") to a callable giving a row's word for it.
        top: how many to return.

    Returns:
        Helpful changes only, best first.
    """
    column = FATES.index(wanted)
    share = table.shares[:, column]
    usable = ~np.isnan(share)
    for name in _PAIRED_PARTS:
        usable &= parts[name] >= ALIKE
    advice = []
    for what in ("temperature", "base", "solvent"):
        others = [p for p in ("temperature", "base", "solvent", "promoter") if p != what]
        rows = usable.copy()
        for other in others:
            rows &= parts[other] >= ALIKE
        groups: dict[Hashable, list[int]] = defaultdict(list)
        for row in np.flatnonzero(rows):
            word = names[what](int(row))
            if word is not None:
                groups[word].append(int(row))
        here = names[what](-1)
        if here is None or here not in groups:
            continue
        for word, members in groups.items():
            if word == here:
                continue
            differences = [float(share[m] - share[h]) for m in members for h in groups[here]]
            pairs = min(len(members), len(groups[here]))
            effect = _effect(np.array(differences), pairs)
            if effect.mean >= LEAST_EFFECT:
                advice.append(
                    Advice(
                        change=f"{word} instead of {here}",
                        effect=effect,
                        pairs=pairs,
                        basis=Basis.RECORD,
                        why=f"{len(members)} runs against {len(groups[here])}, alike in all else that was recorded.",
                    )
                )
    return tuple(sorted(advice, key=lambda a: -a.effect.low - 0.25 * a.effect.mean))[:top]


def temperature_band(temperature_c: float | None) -> str | None:
    """Name a temperature by its band of 20 K, so that 58 and 62 degC pair up."""
    if temperature_c is None:
        return None
    return f"about {_TEMPERATURE_STEP_K * round(temperature_c / _TEMPERATURE_STEP_K):.0f} °C"


def _effect(differences: NDArray[np.float64], pairs: int) -> Interval:
    mean = float(differences.mean()) * pairs / (pairs + PRIOR_PAIRS)
    spread = float(((differences - differences.mean()) ** 2).mean())
    variance = (pairs * spread + PRIOR_PAIRS * PRIOR_SD**2) / (pairs + PRIOR_PAIRS) / pairs
    half = _Z80 * float(np.sqrt(variance))
    return Interval(mean=round(mean, 3), low=round(max(mean - half, -1), 3), high=round(min(mean + half, 1), 3))

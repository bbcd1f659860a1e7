"""The change most likely to help: matched pairs from the record, and published trends over what the group has used.

It owns the ranking and the refusals. A change is measured by pairs of runs where the record has them
(`advice_pairs.py`), else by what published rates say (`kb.physorg.what_if`), and is labelled for what it is. Never
advised: a change that raises a serious finding which the plan does not have, or heats a solvent above its boiling
point, found by making the findings anew for the changed plan against the runs nearest to it; a protic solvent for a
reagent that it destroys; a change after which published rates expect the step to stall. A change
whose interval reaches below zero may do nothing or harm: small ones are left out, others come last and say so.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Callable, Sequence

import numpy as np
from numpy.typing import NDArray

from kb.assess.advice_options import Option, leaving_group_options, list_options, words_of_rows
from kb.assess.advice_pairs import Paired, pair_runs
from kb.assess.data_findings import ABOVE_BOILING
from kb.assess.published_medium import ACTIVATORS, medium_of
from kb.assess.ranking import best_rows
from kb.assess.record_view import RecordView
from kb.assess.table import FATES
from kb.materials.classes import profile_of
from kb.physorg.step import StepFacts
from kb.physorg.what_if import Contrast, contrasts
from kb.record.assessment import Advice
from kb.record.finding import Finding, Interval
from kb.record.plan import Plan
from kb.store.derivation import Account, account_of_plan
from kb.vocabulary import Basis, Fate, LeavingGroup, Role, Severity

ALIKE = 0.6
"""Least likeness of each part that is not being changed; judgement."""
ALIKE_REAGENTS = 0.45
LEAST_EFFECT = 0.02
"""Smallest gain in the share wanted that is worth a line."""
LEAST_TREND = 0.03
LEAST_IF_UNSURE, LEAST_OF_ONE_PAIR = 0.03, 0.05
"""Smallest gain that is worth a line where the interval reaches zero; where a single pair says so."""
WORST = -0.10
"""Low end of an effect below which it is not advised, unless the gain expected is twice as large."""
NEAR = 600
"""Runs with a like nucleophile whose conditions are offered."""
TOP = 4
MOST_CHECKED = 7
"""Candidates whose findings are made anew before giving up."""
SLOW = 0.1
"""Pace after a change below which the gain must be LEAST_TREND_IF_SLOW and the half-life still short."""
LEAST_TREND_IF_SLOW = 0.1
OVERNIGHT_H = 16.0
EATEN = ACTIVATORS | {
    "metal_hydride", "aluminium_hydride", "borane", "organolithium", "alkyllithium", "grignard", "organometallic",
    "metal_amide", "acyl_halide", "chloroformate", "isocyanate", "silyl_chloride",
}  # fmt: skip
"""Reagent classes that water and alcohols destroy (common practice)."""
UNDER_PRESSURE = "hazard-pressure"
_PART_OF = {"temperature": "temperature", "solvent": "solvent", "base": "base"}
_MATCHED = ("centre", "leaving group", "nucleophile", "promoter", "solvent", "temperature", "base", "groups at risk")

SeriousOf = Callable[[Plan], frozenset[str]]


def advise(
    plan: Plan,
    account: Account,
    view: RecordView,
    parts: dict[str, NDArray[np.float64]],
    similarity: NDArray[np.float64],
    wanted: Fate | None,
    step: StepFacts | None,
    findings: Sequence[Finding],
    serious_of: SeriousOf,
) -> tuple[Advice, ...]:
    """Rank single changes by what they are likely to do to the wanted share.

    Args:
        plan, account: as planned.
        view: the runs (n).
        parts, similarity: of each run to the plan.
        wanted: the fate whose share should rise; None = not known, no advice.
        step: as the published models see the plan; None = they do not cover it.
        findings: of the plan as it stands.
        serious_of: from a changed plan to the ids of its serious findings.

    Returns:
        Helpful changes only, best first.
    """
    is_open = wanted is not None and wanted not in (Fate.UNREACTED, Fate.OTHER)
    if wanted is None or not is_open or account.reading.centre is None or not len(view.table):
        return ()
    like = np.flatnonzero(parts["nucleophile"] >= 0.5)
    near = best_rows(similarity, NEAR, like)
    options = list_options(plan, account.profile, view, near)
    options = [o for o in options if not _is_destroyed(o, account)]
    if step is not None:
        options += leaving_group_options(plan, account.reading, view)
    by_record = [_by_record(option, view, parts, similarity, wanted) for option in options]
    candidates = [(found, option) for found, option in zip(by_record, options, strict=True) if found is not None]
    if step is not None:
        others = [option for found, option in zip(by_record, options, strict=True) if found is None]
        candidates += _by_trend(others, account, step, wanted)
    candidates = [pair for pair in candidates if _is_worth_a_line(pair[0])]
    candidates.sort(key=lambda pair: (is_unsure(pair[0]), -_rank(pair[0])))
    already = frozenset(_kind(f.rule_id) for f in findings if is_barred(f))
    advised: list[Advice] = []
    for found, option in candidates[:MOST_CHECKED]:
        if {_kind(rule_id) for rule_id in serious_of(option.plan)} <= already:
            advised.append(found)
            if len(advised) == TOP:
                break
    return tuple(advised)


def is_barred(finding: Finding) -> bool:
    """Return whether no advice may raise a finding: what is serious, and heat above the boiling point."""
    return finding.severity is Severity.SERIOUS or finding.rule_id in (ABOVE_BOILING, UNDER_PRESSURE)


def _is_destroyed(option: Option, account: Account) -> bool:
    """Return whether a solvent on offer would eat the reagent, as water and alcohols do hydrides and activators."""
    if option.kind != "solvent" or not account.profile.reagent_classes & EATEN:
        return False
    return "protic" in profile_of(option.plan.conditions).solvent_classes


def _rank(advice: Advice) -> float:
    return advice.effect.low + 0.25 * advice.effect.mean + (0.05 if advice.basis is Basis.RECORD else 0.0)


def is_unsure(advice: Advice) -> bool:
    """Return whether the interval holds no change, or harm."""
    return advice.effect.low <= 0


def _is_worth_a_line(advice: Advice) -> bool:
    effect = advice.effect
    if not is_unsure(advice):
        return True
    least = LEAST_OF_ONE_PAIR if advice.pairs == 1 else LEAST_IF_UNSURE
    return effect.mean >= least and effect.low >= min(WORST, -effect.mean / 2)


def _kind(rule_id: str) -> str:
    """Return a finding's id without the run that it is named after."""
    return rule_id.rsplit(":", 1)[0] if rule_id.startswith("resemblance:") else rule_id


def _by_record(
    option: Option,
    view: RecordView,
    parts: dict[str, NDArray[np.float64]],
    similarity: NDArray[np.float64],
    wanted: Fate,
) -> Advice | None:
    """Return what matched pairs say of a change: in the share wanted, or where that says nothing, in yield.

    Where the loss of a group is wanted its share says nothing: another group that goes counts as the same fate.
    """
    if option.kind not in _PART_OF:
        return None
    shares = view.table.shares[:, FATES.index(wanted)]
    yields = np.clip(view.table.yield_pct / 100, 0, 1)
    measures = [(yields, "in yield")] if wanted is Fate.GROUP_LOSS else [(shares, ""), (yields, "in yield")]
    found = ((_pairs(option, view, parts, similarity, values), words) for values, words in measures)
    paired, measured = next(((p, words) for p, words in found if p is not None), (None, ""))
    if paired is None or paired.effect.mean < LEAST_EFFECT:
        return None
    return Advice(
        change=f"{option.word} instead of {option.here}",
        effect=paired.effect,
        pairs=len(paired.pairs),
        basis=Basis.RECORD,
        why=_pairs_in_words(paired, view, measured) + _doubt(paired.effect),
        runs=tuple((view.table.codes[a], view.table.codes[b]) for a, b in paired.pairs),
    )


def _pairs(
    option: Option,
    view: RecordView,
    parts: dict[str, NDArray[np.float64]],
    similarity: NDArray[np.float64],
    values: NDArray[np.float64],
) -> Paired | None:
    usable = ~np.isnan(values)
    for name in _MATCHED:
        if name != _PART_OF[option.kind]:
            usable &= parts[name] >= ALIKE
    if option.kind != "base":
        usable &= parts["reagents"] >= ALIKE_REAGENTS
    rows = best_rows(similarity, NEAR, np.flatnonzero(usable))
    words = words_of_rows(view, option.kind, rows)
    sides = [[int(r) for r, w in zip(rows, words, strict=True) if w == word] for word in (option.here, option.word)]
    return pair_runs(view.table, sides[0], sides[1], values)


def _pairs_in_words(paired: Paired, view: RecordView, measured: str) -> str:
    codes = view.table.codes
    named = ", ".join(f"{codes[a]} and {codes[b]}" for a, b in paired.pairs[:3])
    of_one = f", in {paired.same_substrate} of them both of one substrate" if paired.same_substrate else ""
    pairs = "pair" if len(paired.pairs) == 1 else "pairs"
    said = f"{len(paired.pairs)} {pairs} of runs alike in all else that was compared{of_one}"
    return f"{said}{f', {measured}' if measured else ''}: {named}."


def _by_trend(
    options: Sequence[Option], account: Account, step: StepFacts, wanted: Fate
) -> list[tuple[Advice, Option]]:
    """Return what published rates expect of some changes, those worth trying only."""
    found = contrasts(step, [_changed_step(option, account, step) for option in options], wanted)
    return [
        (_advice_of(one, option), option)
        for one, option in zip(found, options, strict=True)
        if one is not None and _is_worth_trying(one, option.plan)
    ]


def _is_worth_trying(found: Contrast, changed: Plan) -> bool:
    gain = LEAST_TREND_IF_SLOW if found.pace < SLOW else LEAST_TREND
    if found.effect.mean < gain or found.effect.low < WORST:
        return False
    hours = changed.conditions.time.h if changed.conditions.time is not None else None
    return found.pace >= SLOW or found.half_life_h <= max(hours or 0.0, OVERNIGHT_H) / 3


def _advice_of(found: Contrast, option: Option) -> Advice:
    # Adding zero takes the sign from a rounded -0.0.
    mean, low, high = (round(value, 3) + 0.0 for value in (found.effect.mean, found.effect.low, found.effect.high))
    effect = Interval(mean=mean, low=low, high=high)
    return Advice(
        change=f"{option.word} instead of {option.here}",
        effect=effect,
        pairs=0,
        basis=Basis.PUBLISHED,
        why=_trend_in_words(found) + _doubt(effect),
    )


def _doubt(effect: Interval) -> str:
    """Return words where an effect may be none, or harm; "" where the whole interval is a gain."""
    return " The interval reaches zero or below, so it may not help." if effect.low <= 0 else ""


def _changed_step(option: Option, account: Account, step: StepFacts) -> StepFacts:
    """Return the step after a change; with another base the nucleophile is read anew (it may stay undeprotonated)."""
    if option.leaving_group is not None:
        return dataclasses.replace(step, leaving_group=option.leaving_group)
    if option.kind == "base":
        account = account_of_plan(option.plan)
        profile = account.profile
    else:
        centre = account.reading.centre
        others = [s for i, s in enumerate(account.fragments) if centre is None or i != centre.component]
        profile = profile_of(option.plan.conditions, others)
    nucleophile = account.reading.nucleophile
    medium = medium_of(
        profile,
        nucleophile.nucleophile_class if nucleophile else None,
        step.leaving_group in (LeavingGroup.HYDROXYL, LeavingGroup.ALKOXIDE),
        next((c.smiles for c in option.plan.conditions.components if c.role is Role.BASE and c.smiles), None),
    )
    return dataclasses.replace(step, medium=medium)


def _trend_in_words(found: Contrast) -> str:
    said = "Published relative rates"
    if found.because:
        said += f" ({'; '.join(found.because[:2])})"
    if found.pace < 0.5:
        said += f"; about {1 / found.pace:.0f} times slower" if found.pace > 1e-3 else "; far slower"
    elif found.pace > 2:
        said += f"; about {found.pace:.0f} times faster" if found.pace < 1e3 else "; far faster"
    return f"{said}. {'; '.join(found.sources[:2])}".rstrip(" .") + "."

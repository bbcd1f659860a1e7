"""Whether a plan's conditions are at least as forcing as those under which something went wrong.

It owns the order of conditions, acid by acid level and temperature, base by pKaH and temperature, otherwise by likeness
of the medium and temperature. Three-valued: None = something needed was not recorded. The margins are judgements:
a bath 10 K cooler or a base 1.5 pKaH units weaker is not yet a different case.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from kb.assess.table import WORDS, FactTable
from kb.materials.profile import LEVELS, ConditionProfile

MARGIN_K = 10.0
MARGIN_PKAH = 1.5
STRONG_BASE_PKAH = 8.0
"""From here a base, rather than the solvent or the nucleophile, is taken to do the forcing."""
HALVING_K = 10.0
"""A witness under other conditions counts half for each 10 K: a rate doubles or so with 10 K (common practice)."""
STEP_K = 20.0
"""What one level of acidity is worth [K]; judgement."""
PKAH_K = 3.0
"""What one unit of pKaH of the base is worth [K]; judgement."""
SAME_WITHIN_K = 5.0


@dataclass(frozen=True, slots=True)
class Force:
    """What makes conditions forcing.

    Attributes:
        acidity, lewis_acid: levels, 0 = none; None = cannot tell.
        base_pkah: of the strongest base; None = none known.
        ionising: see `ConditionProfile`.
        temperature_c: most forcing [degC]; None = not recorded.
        has_unknown_reagent: so that absence proves nothing.
    """

    acidity: int | None
    lewis_acid: int | None
    base_pkah: float | None
    ionising: bool | None
    temperature_c: float | None
    has_unknown_reagent: bool


def force_of(profile: ConditionProfile) -> Force:
    """Return what makes a set of conditions forcing."""
    return Force(
        _level(profile, "acidity"),
        _level(profile, "lewis_acid"),
        profile.base_pkah,
        profile.ionising,
        profile.temperature_c,
        profile.has_unknown_reagent,
    )


def is_at_least_as_forcing(plan: ConditionProfile, failed: ConditionProfile) -> bool | None:
    """Compare a plan with conditions that failed.

    Returns:
        True or False; None where a temperature or the components are not recorded and nothing else decides.
    """
    return forces_as_much(force_of(plan), force_of(failed))


def is_no_more_forcing(plan: ConditionProfile, failed: ConditionProfile) -> bool | None:
    """Compare the other way round: for runs that failed because nothing happened."""
    return is_at_least_as_forcing(failed, plan)


def forces_as_much(plan: Force, failed: Force) -> bool | None:
    """Do what `is_at_least_as_forcing` does, for forces worked out before."""
    answers = (_driver(plan, failed), _temperature(plan, failed))
    if False in answers:
        return False
    return None if None in answers else True


def forces_no_more(plan: Force, failed: Force) -> bool | None:
    """Do what `is_no_more_forcing` does, for forces worked out before."""
    return forces_as_much(failed, plan)


def _level(profile: ConditionProfile, fact: str) -> int | None:
    word = getattr(profile, fact)
    return LEVELS[fact].index(word) if word is not None else None


def _driver(plan: Force, failed: Force) -> bool | None:
    """Compare what does the forcing: the acid, the Lewis acid, the base, or failing these the medium."""
    acid = max(failed.acidity or 0, failed.lewis_acid or 0)
    if acid:
        if max(plan.acidity or 0, plan.lewis_acid or 0) >= acid:
            return True
        is_open = plan.acidity is None or plan.lewis_acid is None
        return None if is_open and plan.has_unknown_reagent else False
    if failed.base_pkah is not None and failed.base_pkah >= STRONG_BASE_PKAH:
        if plan.base_pkah is None:
            return None if plan.has_unknown_reagent else False
        return plan.base_pkah >= failed.base_pkah - MARGIN_PKAH
    if failed.ionising is not None and plan.ionising is not None and failed.ionising != plan.ionising:
        return bool(plan.ionising)
    return True


def _temperature(plan: Force, failed: Force) -> bool | None:
    if failed.temperature_c is None or plan.temperature_c is None:
        return None
    return plan.temperature_c >= failed.temperature_c - MARGIN_K


def harsher_by_k(plan: FactTable, table: FactTable, rows: NDArray[np.intp]) -> NDArray[np.float64]:
    """Return how much more forcing some runs were than the plan, put in kelvin; negative = milder.

    The difference in temperature, plus STEP_K for each level of acid (or, where neither has acid, PKAH_K for each
    unit of a base above STRONG_BASE_PKAH). What is not recorded on either side adds nothing.

    Args:
        plan: a table of one row.
        table: the runs.
        rows: row numbers (m).
    """
    temperature = plan.number("temperature_c", 0)
    harsher = np.zeros(len(rows)) if temperature is None else table.numbers["temperature_c"][rows] - temperature
    harsher = np.nan_to_num(harsher)
    no_acid = np.ones(len(rows), dtype=bool)
    for column in ("acidity", "lewis_acid"):
        mine, theirs = int(plan.words[column][0]), table.words[column][rows]
        harsher += np.where((theirs >= 0) & (mine >= 0), STEP_K * (theirs.astype(np.float64) - mine), 0.0)
        no_acid &= (theirs <= WORDS[column].index("none")) & (mine <= WORDS[column].index("none"))
    pkah = plan.number("base_pkah", 0)
    if pkah is not None:
        theirs_pkah = table.numbers["base_pkah"][rows]
        counts = no_acid & (np.maximum(theirs_pkah, pkah) >= STRONG_BASE_PKAH)
        harsher += np.where(counts, PKAH_K * np.nan_to_num(theirs_pkah - pkah), 0.0)
    return harsher


def say_of(harsher: NDArray[np.float64], is_lost: NDArray[np.bool_]) -> NDArray[np.float64]:
    """Return how much each witness counts, 0..1.

    A loss under conditions no harsher than the plan's, and a survival under conditions no milder, count in full: they
    hold for the plan all the more. A loss under harsher and a survival under milder conditions count half for each
    HALVING_K.
    """
    aside = np.where(is_lost, harsher, -harsher) - SAME_WITHIN_K
    return np.asarray(0.5 ** (np.maximum(aside, 0.0) / HALVING_K))

"""Whether a plan's conditions are at least as forcing as those under which something went wrong.

It owns the order of conditions, acid by acid level and temperature, base by pKaH and temperature, otherwise by likeness
of the medium and temperature. Three-valued: None = something needed was not recorded. The margins are judgements:
a bath 10 K cooler or a base 1.5 pKaH units weaker is not yet a different case.
"""

from __future__ import annotations

from kb.materials.profile import LEVELS, ConditionProfile

MARGIN_K = 10.0
MARGIN_PKAH = 1.5
STRONG_BASE_PKAH = 8.0
"""From here a base, rather than the solvent or the nucleophile, is taken to do the forcing."""


def is_at_least_as_forcing(plan: ConditionProfile, failed: ConditionProfile) -> bool | None:
    """Compare a plan with conditions that failed.

    Returns:
        True or False; None where a temperature or the components are not recorded and nothing else decides.
    """
    answers = [_driver(plan, failed), _temperature(plan, failed)]
    if False in answers:
        return False
    return None if None in answers else True


def is_no_more_forcing(plan: ConditionProfile, failed: ConditionProfile) -> bool | None:
    """Compare the other way round: for runs that failed because nothing happened."""
    return is_at_least_as_forcing(failed, plan)


def _level(profile: ConditionProfile, fact: str) -> int | None:
    word = getattr(profile, fact)
    return LEVELS[fact].index(word) if word is not None else None


def _driver(plan: ConditionProfile, failed: ConditionProfile) -> bool | None:
    """Compare what does the forcing: the acid, the Lewis acid, the base, or failing these the medium."""
    acid = max(_level(failed, "acidity") or 0, _level(failed, "lewis_acid") or 0)
    if acid:
        mine = [_level(plan, "acidity"), _level(plan, "lewis_acid")]
        if max((m for m in mine if m is not None), default=0) >= acid:
            return True
        return None if None in mine and plan.has_unknown_reagent else False
    if failed.base_pkah is not None and failed.base_pkah >= STRONG_BASE_PKAH:
        if plan.base_pkah is None:
            return None if plan.has_unknown_reagent else False
        return plan.base_pkah >= failed.base_pkah - MARGIN_PKAH
    if failed.ionising is not None and plan.ionising is not None and failed.ionising != plan.ionising:
        return bool(plan.ionising)
    return True


def _temperature(plan: ConditionProfile, failed: ConditionProfile) -> bool | None:
    if failed.temperature_c is None or plan.temperature_c is None:
        return None
    return plan.temperature_c >= failed.temperature_c - MARGIN_K

"""The condition profile of a set of conditions: which classes are in the flask, and what they amount to.

It owns the putting together: contents (`flask.py`), medium (`medium.py`), acid and base (`acid_base.py`), pairs
(`in_situ.py`) and nucleophile (`nucleophile.py`) become one `ConditionProfile`. It judges nothing; rules are for
`kb.assess`.

Three values throughout: where a component is unknown, or nothing at all is recorded, what would need it is None.
A positive find stands whatever else is unknown. "none" and False are statements: everything is known, and it is not
there. `reagent_classes` leave out solvents, except those that act as acid, base or amine.
"""

from __future__ import annotations

import re
from collections.abc import Sequence

from kb.materials.acid_base import Balance, settle
from kb.materials.class_names import OXIDANT_CLASSES, REAGENT_CLASSES, SOLVENT_CLASSES, add_wider
from kb.materials.flask import Flask, fill
from kb.materials.in_situ import made_in_situ
from kb.materials.nucleophile import Nucleophile, find_nucleophile
from kb.materials.profile import LEVELS, ConditionProfile
from kb.record.conditions import Conditions

__all__ = ["OXIDANT_CLASSES", "REAGENT_CLASSES", "SOLVENT_CLASSES", "add_wider", "profile_of"]

PROLONGED_ABOVE_H = 12.0  # what stands longer than overnight stands long (judgement)
STRONG_BASE_FROM = 12.0  # pKaH from which a base keeps a solvent or Lewis acid from ionising anything (judgement)

_PEROXIDES = ("hydrogen_peroxide", "hydroperoxide", "dialkyl_peroxide", "peracid")
_CATALYSTS = ("metal_catalyst", "copper", "hydrogenation_catalyst")
_PASSIVE_MEDIUM = {"alcohol", "water"}
_ACID_WORDS = {
    "bronsted_acid",
    "mineral_acid",
    "sulfonic_acid",
    "perfluoro_acid",
    "hydrogen_halide",
    "hydrogen_chloride",
    "hydrogen_bromide",
    "hydrogen_iodide",
    "hbr_or_tmsi",
}


def profile_of(conditions: Conditions, scheme_fragments: Sequence[str] = ()) -> ConditionProfile:
    """Return what a set of conditions is, as facts that rules can ask about.

    Args:
        conditions: as recorded.
        scheme_fragments: SMILES of the left-side fragments of the scheme, the substrate left out; salts as ions.
            What is both recorded and in the scheme counts once.

    Returns:
        The profile; a fact is None where it cannot be told.
    """
    flask = fill(conditions, scheme_fragments)
    high_c, low_c = _temperatures(conditions, flask)
    if not flask.is_recorded:
        return ConditionProfile(
            temperature_c=high_c,
            temperature_low_c=low_c,
            time_h=_hours(conditions),
            prolonged=_is_prolonged(conditions),
        )
    balance = settle(flask)
    made = made_in_situ(flask, balance)
    words = _reagent_words(flask, balance) | made
    nucleophile = find_nucleophile(flask, balance, made)
    base = balance.base
    acidity = _acidity(flask, balance)
    lewis = _highest("lewis_acid", [i.facts.lewis for i in flask.ingredients], flask)
    halophile = _halophile(words, flask)
    medium = flask.medium
    return ConditionProfile(
        reagent_classes=words,
        solvent_classes=flask.solvent_classes,
        has_unknown_reagent=flask.has_unknown_reagent,
        has_unknown_solvent=medium.has_unknown,
        base_pkah=base.facts.pkah if base else None,
        base_bulk=base.facts.bulk if base else None,
        acidity=acidity,
        nucleophile=_highest("nucleophile", [nucleophile.level] if nucleophile else [], flask),
        lewis_acid=lewis,
        hydride=_highest("hydride", [i.facts.hydride for i in flask.ingredients], flask),
        halophile=halophile,
        water=_any(flask.has_water, flask.has_unknown_reagent or medium.has_unknown),
        alcohol=_any(
            bool({"alcohol", "fluorinated_alcohol"} & flask.solvent_classes) or flask.has("alcohol"),
            flask.has_unknown_reagent or medium.has_unknown,
        ),
        peroxide=_any(bool(words & set(_PEROXIDES)), flask.has_unknown_reagent),
        fluoride=_any(bool(words & {"fluoride", "hydrogen_fluoride"}), flask.has_unknown_reagent),
        metal_catalyst=_any(bool(words & set(_CATALYSTS)), flask.has_unknown_reagent),
        hydrogenolysis=_hydrogenolysis(words, conditions.atmosphere, flask),
        dissolving_metal=_dissolving_metal(words, flask),
        organometallic=_any("organometallic" in words, flask.has_unknown_reagent),
        oxidants=words & OXIDANT_CLASSES,
        ionising=_ionising(flask, balance, acidity, lewis, halophile, nucleophile),
        solvent_alkoxy=_alkoxy(flask),
        permittivity=medium.permittivity,
        et30_kcal_mol=medium.et30_kcal_mol,
        winstein_y=medium.winstein_y,
        bp_c=medium.bp_c,
        mp_c=medium.mp_c,
        nucleophile_name=nucleophile.ingredient.name if nucleophile else None,
        base_name=base.name if base else None,
        acid_name=balance.acid.name if balance.acid and balance.acidity != "none" else None,
        nucleophile_class=nucleophile.word if nucleophile else None,
        swain_scott_n=nucleophile.ingredient.facts.swain_scott_n if nucleophile else None,
        temperature_c=high_c,
        temperature_low_c=low_c,
        time_h=_hours(conditions),
        prolonged=_is_prolonged(conditions),
    )


def _reagent_words(flask: Flask, balance: Balance) -> frozenset[str]:
    """Return the classes of everything but the solvents; acids, bases and amines among the solvents are kept.

    A neutralised acid is no acid any more, so its acid words are left out.
    """
    words: set[str] = set()
    for ingredient in flask.ingredients:
        own = ingredient.facts.classes
        own = own - _PASSIVE_MEDIUM if ingredient.is_medium else own
        words |= own - _ACID_WORDS if ingredient in balance.spent else own
    return frozenset(words)


def _any(is_there: bool, could_be_there: bool) -> bool | None:
    return True if is_there else None if could_be_there else False


def _highest(fact: str, levels: Sequence[str], flask: Flask) -> str | None:
    """Return the highest level found; None where nothing was found and something is unknown."""
    order = LEVELS[fact]
    highest = max(levels, key=order.index, default=order[0])
    return None if highest == order[0] and flask.has_unknown_reagent else highest


def _acidity(flask: Flask, balance: Balance) -> str | None:
    """Return the acidity; an unknown component beside a strong base cannot be an acid that lasts."""
    if balance.acidity != "none" or not flask.has_unknown_reagent:
        return balance.acidity
    return "none" if balance.base is not None and (balance.base.facts.pkah or 0.0) >= STRONG_BASE_FROM else None


def _halophile(words: frozenset[str], flask: Flask) -> str | None:
    for word in ("silver", "mercury"):
        if word in words:
            return word
    return None if flask.has_unknown_reagent else "none"


def _hydrogenolysis(words: frozenset[str], atmosphere: str | None, flask: Flask) -> bool | None:
    """Return True for a hydrogen source with a catalyst; None for a supported catalyst whose gas is not named."""
    has_gas = bool(re.search(r"\bH2\b|\bhydrogen\b", atmosphere or "", re.IGNORECASE))
    has_catalyst = bool(words & {"hydrogenation_catalyst", "palladium"})
    if has_catalyst and (has_gas or words & {"hydrogen", "formate"}):
        return True
    return None if flask.has_unknown_reagent or "hydrogenation_catalyst" in words or has_gas else False


def _dissolving_metal(words: frozenset[str], flask: Flask) -> bool | None:
    """Return True for an alkali metal in ammonia or an amine; None elsewhere, since it may only make alkoxide."""
    if "alkali_metal" not in words:
        return None if flask.has_unknown_reagent else False
    return True if "ammonia" in words or {"ammonia", "amine"} & flask.medium.classes else None


def _ionising(
    flask: Flask,
    balance: Balance,
    acidity: str | None,
    lewis: str | None,
    halophile: str | None,
    nucleophile: Nucleophile | None,
) -> bool | None:
    """Return whether a leaving group is helped off: strong acid, Lewis acid, silver, or a protic ionising solvent
    with only a weak nucleophile, no strong base and no hydride."""
    if acidity == "strong" or halophile in ("silver", "mercury"):
        return True
    has_strong_base = balance.base is not None and (balance.base.facts.pkah or 0.0) >= STRONG_BASE_FROM
    if has_strong_base or any(i.facts.hydride != "none" for i in flask.ingredients):
        return False
    if lewis in ("mild", "strong"):
        return True
    if nucleophile is not None and nucleophile.level == "good":
        return None if acidity is None or lewis is None else False
    by_solvent = flask.medium.is_ionising
    if by_solvent is True and not flask.has_unknown_reagent:
        return True
    return None if flask.has_unknown_reagent or by_solvent is None else by_solvent


def _alkoxy(flask: Flask) -> frozenset[str]:
    """Return the alcohols whose alkoxides are or could be there: of alkoxides, and of alcohol solvents."""
    from_reagents = {i.facts.alkoxy for i in flask.ingredients if i.facts.alkoxy and i.has("alkoxide")}
    solvents = (*flask.medium.solvents, *flask.beside)
    from_solvents = {s.smiles for s in solvents if {"alcohol", "fluorinated_alcohol"} & s.classes}
    return frozenset(from_reagents | from_solvents)


def _temperatures(conditions: Conditions, flask: Flask) -> tuple[float | None, float | None]:
    """Return the highest and lowest temperature [degC], reflux taken at the lowest boiling point of the solvents."""
    temperature = conditions.temperature
    if temperature is None:
        return None, None
    known = list(temperature.known_c)
    if temperature.is_reflux:
        if flask.medium.bp_c is None:
            return None, min(known, default=None)
        known.append(flask.medium.bp_c)
    return max(known, default=None), min(known, default=None)


def _hours(conditions: Conditions) -> float | None:
    return conditions.time.h if conditions.time is not None else None


def _is_prolonged(conditions: Conditions) -> bool | None:
    hours = _hours(conditions)
    return hours > PROLONGED_ABOVE_H if hours is not None else None

"""The words of the condition language: which facts a rule may ask about, what each takes, how each is said.

It owns names and phrases only; parsing is `predicate_parse`, evaluation is `predicate`. Facts are the
fields of `ConditionProfile`, classes those of `kb.materials.class_names`. Hyphens in words count as
underscores.
"""

from __future__ import annotations

from collections.abc import Iterable
from functools import lru_cache

from kb.materials.class_names import OXIDANT_CLASSES, REAGENT_CLASSES, SOLVENT_CLASSES
from kb.materials.profile import LEVELS, ConditionProfile

SETS: dict[str, tuple[str, str]] = {
    "reagent": ("reagent_classes", "has_unknown_reagent"),
    "solvent": ("solvent_classes", "has_unknown_solvent"),
    "oxidant": ("oxidants", "has_unknown_reagent"),
}
"""Fact to (profile field, flag that makes absence unproven)."""

CHOICES: dict[str, tuple[str, ...]] = {
    "base_bulk": ("unhindered", "hindered"),
    "halophile": ("none", "silver", "mercury"),
    "nucleophile_class": (),
}
"""Facts that hold one word; nucleophile_class takes any reagent class."""

NUMBERS: dict[str, tuple[str, str]] = {
    "base_pkah": ("pKaH of the strongest base", ""),
    "temperature_c": ("temperature", " °C"),
    "temperature_low_c": ("lowest temperature", " °C"),
    "time_h": ("time", " h"),
    "permittivity": ("permittivity of the solvent", ""),
    "et30_kcal_mol": ("E_T(30) of the solvent", " kcal/mol"),
    "winstein_y": ("ionising power Y of the solvent", ""),
    "bp_c": ("boiling point of the solvent", " °C"),
    "mp_c": ("melting point of the solvent", " °C"),
    "swain_scott_n": ("nucleophilicity n", ""),
}
"""Fact to (its name in a sentence, its unit)."""

BOOLEANS: dict[str, tuple[str, str]] = {
    "water": ("water is present", "no water is present"),
    "alcohol": ("an alcohol is present", "no alcohol is present"),
    "peroxide": ("peroxide is present", "no peroxide is present"),
    "fluoride": ("fluoride is present", "no fluoride is present"),
    "metal_catalyst": ("a metal catalyst is present", "no metal catalyst is present"),
    "hydrogenolysis": ("hydrogen and a catalyst are present", "no catalytic hydrogenation"),
    "dissolving_metal": ("a dissolving metal is present", "no dissolving metal is present"),
    "organometallic": ("an organometallic is present", "no organometallic is present"),
    "ionising": ("the conditions ionise the leaving group", "the conditions do not ionise the leaving group"),
    "prolonged": ("the run is long (above 12 h)", "the run is not long"),
}
"""Fact to how it is said when asked for, and when asked to be absent."""

ALIASES: dict[str, str] = {
    "reagents": "reagent",
    "reagent_class": "reagent",
    "reagent_classes": "reagent",
    "solvents": "solvent",
    "solvent_class": "solvent",
    "solvent_classes": "solvent",
    "oxidants": "oxidant",
    "temperature": "temperature_c",
    "temp": "temperature_c",
    "time": "time_h",
    "pkah": "base_pkah",
}

_LEVEL_NAMES = {
    "acidity": ("acid", "no acid is present", "an acid is present"),
    "nucleophile": ("nucleophile", "no nucleophile is present", "a nucleophile is present"),
    "lewis_acid": ("Lewis acid", "no Lewis acid is present", "a Lewis acid is present"),
    "hydride": ("hydride reductant", "no hydride reductant is present", "a hydride reductant is present"),
}
_FROM_SOLVENT = ("permittivity", "et30_kcal_mol", "winstein_y", "bp_c", "mp_c", "solvent")
_ALSO_FROM_SOLVENT = ("ionising", "water", "alcohol", "nucleophile", "acidity")


NO_SOLVENT = "solvent not given or not recognised"
"""What is missing where a rule asks for the solvent."""


def field_of(name: str) -> str | None:
    """Return the profile field behind a fact, None where there is no such fact."""
    if name in SETS:
        return SETS[name][0]
    return name if name in NUMBERS or name in BOOLEANS or name in LEVELS or name in CHOICES else None


@lru_cache(maxsize=32)
def words_of(name: str) -> frozenset[str]:
    """Return the words that a fact may be compared with, underscores for hyphens; empty for numbers."""
    source: Iterable[str]
    if name in ("reagent", "nucleophile_class"):
        source = REAGENT_CLASSES
    elif name == "solvent":
        source = SOLVENT_CLASSES
    elif name == "oxidant":
        source = OXIDANT_CLASSES
    else:
        source = LEVELS.get(name) or CHOICES.get(name, ())
    return frozenset(word.replace("-", "_") for word in source)


def nearest(word: str, known: Iterable[str]) -> str | None:
    """Return the known word that looks most like `word`, None where none does."""
    from rapidfuzz import fuzz, process  # kept out of start-up: only a mistake needs it

    hit = process.extractOne(word.replace("-", "_").lower(), sorted(known), scorer=fuzz.WRatio, score_cutoff=60)
    return hit[0] if hit else None


def missing_words(name: str, profile: ConditionProfile) -> str:
    """Return what would have to be known, in plain words; facts that hang on one cause share one sentence."""
    if name in ("temperature_c", "temperature_low_c"):
        return "temperature not given"
    if name in ("time_h", "prolonged"):
        return "time not given"
    if name in _FROM_SOLVENT:
        return NO_SOLVENT
    if name == "peroxide":
        return "it is not recorded whether peroxide is kept out"
    if profile.has_unknown_reagent:
        return "a reagent could not be classified"
    if name in _ALSO_FROM_SOLVENT and profile.has_unknown_solvent:
        return NO_SOLVENT
    return "the reagents are not recorded"


def phrase(name: str, operator: str, words: tuple[str, ...], number: float | None) -> str:
    """Return one comparison in plain words ("the temperature is 60 °C or more")."""
    if name in BOOLEANS:
        return BOOLEANS[name][0 if operator == "is" else 1]
    if name in NUMBERS:
        said, unit = NUMBERS[name]
        how = {
            ">=": "{} or more",
            ">": "above {}",
            "<=": "{} or less",
            "<": "below {}",
            "==": "{}",
            "!=": "not {}",
        }
        return f"the {said} is {how[operator].format(f'{number:g}{unit}')}"
    listed = _listed(words)
    if name == "solvent":
        return f"the solvent is {listed}" if operator == "in" else f"the solvent is not {listed}"
    if name in SETS:
        return f"{listed} is present" if operator == "in" else f"{listed} is absent"
    if name in _LEVEL_NAMES:
        return _level_phrase(name, operator, words)
    said = {"base_bulk": "the base", "halophile": "the halophile", "nucleophile_class": "the nucleophile"}[name]
    return f"{said} is {listed}" if operator in ("==", "in") else f"{said} is not {listed}"


def reason(name: str, operator: str, words: tuple[str, ...], number: float | None, profile: ConditionProfile) -> str:
    """Return why a comparison holds on this profile, in plain words; a limit is marked as judged."""
    if name in NUMBERS:
        said, unit = NUMBERS[name]
        value = getattr(profile, name)
        who = f" ({profile.base_name})" if name == "base_pkah" and profile.base_name else ""
        return f"{said}{who} {value:g}{unit}, judged limit {number:g}{unit}"
    if name in SETS:
        field = SETS[name][0]
        present = {w.replace("-", "_") for w in getattr(profile, field)}
        found = sorted(present & set(words), key=words.index)
        return f"{_listed(tuple(found))} {'as solvent' if name == 'solvent' else 'present'}"
    if name == "acidity" and profile.acid_name:
        return f"{profile.acidity} acid present ({profile.acid_name})"
    if name in _LEVEL_NAMES:
        return f"{getattr(profile, name)} {_LEVEL_NAMES[name][0]} present"
    if name == "nucleophile_class":
        return f"{_plain(str(profile.nucleophile_class))} as nucleophile"
    if name == "base_bulk":
        return f"{profile.base_bulk} base" + (f" ({profile.base_name})" if profile.base_name else "")
    return phrase(name, operator, words, number)


def _level_phrase(name: str, operator: str, words: tuple[str, ...]) -> str:
    said, absent, present = _LEVEL_NAMES[name]
    word, levels = words[0], LEVELS[name]
    if operator == ">=" and word == levels[1]:
        return present
    if (operator, word) in (("==", "none"), ("<", levels[1])):
        return absent
    if operator == ">=" and word == levels[-1]:
        return f"a {word} {said} is present"
    if operator in ("==", "in", "!=", "not in"):
        verb = "is" if operator in ("==", "in") else "is not"
        return f"the {said} {verb} {_listed(words)}"
    how = {">=": f"{word} or more", ">": f"above {word}", "<=": f"{word} or less", "<": f"below {word}"}[operator]
    return f"the {said} is {how}"


def _listed(words: tuple[str, ...]) -> str:
    plain = [_plain(word) for word in words]
    return plain[0] if len(plain) == 1 else f"{', '.join(plain[:-1])} or {plain[-1]}"


def _plain(word: str) -> str:
    special = {"can": "cerium(IV)", "ddq": "DDQ", "hbr_or_tmsi": "HBr, HI or TMSI", "thf": "THF"}
    return special.get(word, word.replace("polar_aprotic", "polar aprotic").replace("_", " "))

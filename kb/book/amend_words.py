"""Amendments from words: "yield=72", "temp=60C", "note=...", "failed=elimination, stalled".

It owns which word changes which field of a run. An empty value means not recorded.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Callable, Sequence
from typing import Any

from kb.book.plan_words import conditions_from_words
from kb.book.words import outcome_from_words, parse_date, scheme_from_argument
from kb.errors import InvalidRecord
from kb.record.conditions import Conditions
from kb.record.failure_modes import parse_failure_mode
from kb.record.outcome import Failure
from kb.record.run import Run
from kb.vocabulary import Role, Verdict

_TEXTS = {"note": "note", "by": "by", "ref": "reference", "project": "project", "series": "series"}
_CONDITIONS = {
    "temp": ("temperature", "temperature"),
    "time": ("time", "time"),
    "conc": ("concentration", "conc_molar"),
    "scale": ("scale", "scale_mmol"),
    "atmosphere": ("atmosphere", "atmosphere"),
    "vessel": ("vessel", "vessel"),
    "workup": ("workup", "workup"),
}
_COMPONENTS = {"with": ("reagents", Role.REAGENT), "base": ("bases", Role.BASE), "acid": ("acids", Role.ACID)} | {
    "add": ("additives", Role.ADDITIVE)
}
_PERCENTS = {
    "yield": ("isolated", "isolated_yield_pct"),
    "assay-yield": ("assay", "assay_yield_pct"),
    "conversion": ("conversion", "conversion_pct"),
    "ee": ("ee", "ee_pct"),
}
_OTHERS = ("scheme", "verdict", "date", "solvent", "split", "failed", "dr")
WORDS = (*_TEXTS, *_CONDITIONS, *_COMPONENTS, *_PERCENTS, *_OTHERS)
"""Every word that may stand before the "="."""


def changes_from_words(run: Run, texts: Sequence[str]) -> dict[str, Any]:
    """Turn "FIELD=VALUE" texts into changes of a run.

    Args:
        run: as it stands; parts that are not named stay.
        texts: several for one list field ("base=K2CO3", "base=NaI") are put together.

    Returns:
        Field of Run to its new value, for `Book.amend`.

    Raises:
        InvalidRecord: no "=", or a field that cannot be amended.
        QuantityError, NameUnknown: a value that cannot be read.
    """
    given: dict[str, list[str]] = {}
    for text in texts:
        word, equals, value = text.partition("=")
        word = word.strip().lower().replace("_", "-")
        if not equals or word not in WORDS:
            what = f"{text!r} has no =." if not equals else f"A run has no field {word!r} to amend."
            raise InvalidRecord(what, f"Write FIELD=VALUE, FIELD one of: {', '.join(WORDS)}.", text)
        given.setdefault(word, []).append(value.strip())
    changes: dict[str, Any] = {}
    conditions, outcome = run.conditions, run.outcome
    for word, values in given.items():
        last = values[-1]
        if word in _TEXTS:
            changes[_TEXTS[word]] = last if last or word == "note" else None
        elif word in _CONDITIONS:
            entry, field = _CONDITIONS[word]
            read = conditions_from_words({entry: last})
            conditions = dataclasses.replace(conditions, **{field: getattr(read, field)})
        elif word in _COMPONENTS or word == "solvent":
            conditions = _with_materials(conditions, word, [v for v in values if v])
        elif word in _PERCENTS:
            entry, field = _PERCENTS[word]
            value = getattr(_outcome(run, **{entry: last}), field) if last else None
            outcome = dataclasses.replace(outcome, **{field: value})
        elif word == "split":
            outcome = dataclasses.replace(outcome, products=_outcome(run, split=last).products)
        elif word == "failed":
            modes = [m for v in values for m in v.split(",") if m.strip()]
            failures = tuple(Failure(mode=parse_failure_mode(m)) for m in modes)
            outcome = dataclasses.replace(outcome, failures=failures)
        elif word == "dr":
            outcome = dataclasses.replace(outcome, dr=last or None)
        else:
            changes[word] = _READERS[word](last)
    if conditions != run.conditions:
        changes["conditions"] = conditions
    if outcome != run.outcome:
        changes["outcome"] = outcome
    return changes


def _with_materials(conditions: Conditions, word: str, values: list[str]) -> Conditions:
    if word == "solvent":
        return dataclasses.replace(conditions, solvents=conditions_from_words({"solvents": values}).solvents)
    entry, role = _COMPONENTS[word]
    kept = tuple(c for c in conditions.components if c.role is not role)
    return dataclasses.replace(conditions, components=kept + conditions_from_words({entry: values}).components)


def _outcome(run: Run, **words: str) -> Any:
    nothing: dict[str, Any] = dict.fromkeys(("split", "isolated", "assay", "conversion", "ee"))
    return outcome_from_words(
        scheme=run.scheme, method=None, products=(), failed=(), motif=None, cause=None, **(nothing | words)
    )


def _verdict(text: str) -> Verdict | None:
    if not text:
        return None
    try:
        return Verdict(text.lower())
    except ValueError:
        raise InvalidRecord(f"{text!r} is no verdict.", f"Use one of: {', '.join(Verdict)}.", text) from None


_READERS: dict[str, Callable[[str], Any]] = {
    "scheme": scheme_from_argument,
    "verdict": _verdict,
    "date": lambda text: parse_date(text) if text else None,
}

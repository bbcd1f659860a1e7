"""Amendments from words: "yield=72", "temp=60C", "note=...", "failed=elimination, stalled".

It owns which word changes which field of a run; the words are those of the flags of `record`, so "by" is the method of
the split and "as" who ran it. An empty value means not recorded. A list field is given whole; what hangs on a share or
a failure and is not named again (the method, the motif, the cause) is kept where it still fits.
"""

from __future__ import annotations

import dataclasses
import difflib
from collections.abc import Callable, Mapping, Sequence
from enum import StrEnum
from typing import Any

from kb.book.plan_words import conditions_from_words
from kb.book.words import check_motif, check_scheme, outcome_from_words, parse_run_date, scheme_from_argument
from kb.errors import InvalidRecord
from kb.record.conditions import Conditions
from kb.record.failure_modes import parse_failure_mode
from kb.record.outcome import Failure, Outcome
from kb.record.run import Run
from kb.vocabulary import Cause, Method, Role, Verdict

_TEXTS = {"note": "note", "as": "by", "ref": "reference", "project": "project", "series": "series"}
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
_OTHERS = ("scheme", "verdict", "date", "solvent", "split", "by", "failed", "motif", "cause", "dr")
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
            what = f"{text[:60]!r} has no =." if not equals else f"A run has no field {word[:60]!r} to amend."
            near = difflib.get_close_matches(word, WORDS, n=1)
            hint = f"Did you mean {near[0]}?" if near and equals else f"Write FIELD=VALUE, FIELD one of: {_ALL}."
            raise InvalidRecord(what, hint, text)
        given.setdefault(word, []).append(value if word == "note" else value.strip())
    if doubled := [word for word, values in given.items() if len(values) > 1 and word not in _LISTS]:
        raise InvalidRecord(f"{doubled[0]} is given twice.", "Give it once.", doubled[0])
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
            number: Any = getattr(_outcome(run, **{entry: last}), field) if last else None
            outcome = dataclasses.replace(outcome, **{field: number})
        elif word == "dr":
            outcome = dataclasses.replace(outcome, dr=last or None)
        elif word in _READERS:
            changes[word] = _READERS[word](last)
    outcome = _with_failures(_with_split(outcome, run, given), given)
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


def _with_split(outcome: Outcome, run: Run, given: Mapping[str, Sequence[str]]) -> Outcome:
    """Return the outcome with the split and its method as given; a new split keeps the one method of the old."""
    products = outcome.products
    if "split" in given:
        methods = {p.method for p in products}
        method = methods.pop() if len(methods) == 1 else None
        read = _outcome(run, split=given["split"][-1]).products
        products = tuple(dataclasses.replace(p, method=method) for p in read)
    if "by" in given:
        if not products:
            raise InvalidRecord("There is no split whose method this could be.", "Give it too: --set split=...")
        how = _word(given["by"][-1], Method, "method")
        products = tuple(dataclasses.replace(p, method=how) for p in products)
    return dataclasses.replace(outcome, products=products)


def _with_failures(outcome: Outcome, given: Mapping[str, Sequence[str]]) -> Outcome:
    """Return the outcome with failures, motif and cause as given; a mode that stays keeps its motif and cause."""
    failures = outcome.failures
    if "failed" in given:
        before = {f.mode: f for f in failures}
        modes = [parse_failure_mode(m) for v in given["failed"] for m in v.split(",") if m.strip()]
        failures = tuple(before.get(mode, Failure(mode=mode)) for mode in modes)
    for word in ("motif", "cause"):
        if word not in given:
            continue
        if not failures:
            raise InvalidRecord(f"There is no failure that has a {word}.", "Give it too: --set failed=MODE.", word)
        text = given[word][-1]
        value: Any = None
        if text:
            value = check_motif(text) if word == "motif" else _word(text, Cause, "cause")
        failures = tuple(dataclasses.replace(f, **{word: value}) for f in failures)
    return dataclasses.replace(outcome, failures=failures)


def _outcome(run: Run, **words: str) -> Any:
    nothing: dict[str, Any] = dict.fromkeys(("split", "isolated", "assay", "conversion", "ee"))
    return outcome_from_words(
        scheme=run.scheme, method=None, products=(), failed=(), motif=None, cause=None, **(nothing | words)
    )


def _word(text: str, words: type[StrEnum], what: str) -> Any:
    """Return a controlled word, None where the text is empty."""
    if not text:
        return None
    try:
        return words(text.lower())
    except ValueError:
        raise InvalidRecord(f"{text[:60]!r} is no {what}.", f"Use one of: {', '.join(words)}.", text) from None


def _scheme(text: str) -> str:
    if not text:
        raise InvalidRecord("A run cannot be without a scheme.", "Give a reaction SMILES or a substrate.", text)
    return check_scheme(scheme_from_argument(text))


_READERS: dict[str, Callable[[str], Any]] = {
    "scheme": _scheme,
    "verdict": lambda text: _word(text, Verdict, "verdict"),
    "date": lambda text: parse_run_date(text) if text else None,
}
_LISTS = {"with", "base", "acid", "add", "solvent", "failed"}
_ALL = ", ".join(WORDS)

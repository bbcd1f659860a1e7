"""The distinct condition profiles of a book as coded columns, and condition lines asked of many runs at once.

It owns the coding. A large book holds nearly as many sets of conditions as runs, but a line asks for one or two facts,
which take few values: so each fact is coded by its distinct values, and a line is evaluated once for each combination
of values of the facts that it reads. Answers are those of `kb.assess.predicate` on the whole profile (tested). Whole
profiles are not kept: a hundred thousand of them would fill a quarter of a gigabyte.
"""

from __future__ import annotations

import json
from collections.abc import Collection
from dataclasses import fields
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kb.assess.predicate import parse_predicate
from kb.assess.predicate_words import field_of
from kb.assess.record_view import RecordView
from kb.materials.profile import ConditionProfile

_ALSO_READ = {"base_bulk": ("base_pkah",)}
_ALWAYS_READ = ("has_unknown_reagent", "has_unknown_solvent")
"""Facts that a test may read beside the one it names: what makes an absence certain."""
_ANSWER = {True: 1, False: 0, None: -1}


class ProfileTable:
    """The distinct condition profiles of a view, and where each row's stands; answers are kept by line."""

    def __init__(self, view: RecordView) -> None:
        self.of_row: NDArray[np.intp] = np.asarray(view.table.profile, dtype=np.intp)
        self._texts = view.table.profiles
        self._groups: dict[tuple[str, ...], tuple[NDArray[np.int32], list[ConditionProfile]]] = {}
        self._answers: dict[str, NDArray[np.int8]] = {}

    def told(self, line: str, rows: NDArray[np.intp]) -> NDArray[np.int8]:
        """Return what a line says of some rows: 1 true, 0 false, -1 cannot tell (len(rows))."""
        parts = _chain(line)
        if len(parts) > 1:  # each test by itself: facts taken together have many more combinations
            answers = np.stack([self.told(part, rows) for part in parts])
            return np.where((answers == 0).any(axis=0), 0, answers.min(axis=0)).astype(np.int8)
        predicate = parse_predicate(line)
        group, profiles = self._grouped({field_of(test.name) or test.name for test in predicate.tests()})
        if line not in self._answers:
            self._answers[line] = np.array([_ANSWER[predicate.evaluate(p)] for p in profiles], dtype=np.int8)
        return np.asarray(self._answers[line][group[self.of_row[rows]]])

    def holds(self, line: str, rows: NDArray[np.intp]) -> NDArray[np.bool_]:
        """Return in which rows a line holds for certain (len(rows))."""
        return np.asarray(self.told(line, rows) > 0)

    def values(self, fact: str, rows: NDArray[np.intp]) -> list[Any]:
        """Return a fact of some rows, as their profiles hold it."""
        codes, values = self._coded[fact]
        return [values[code] for code in codes[self.of_row[rows]].tolist()]

    def alike(self, facts: Collection[str], rows: NDArray[np.intp]) -> list[tuple[int, ConditionProfile]]:
        """Return, for each row, a number that rows of equal facts share, and a profile with those facts."""
        group, profiles = self._grouped(facts)
        return [(number, profiles[number]) for number in group[self.of_row[rows]].tolist()]

    def _grouped(self, facts: Collection[str]) -> tuple[NDArray[np.int32], list[ConditionProfile]]:
        """Return which combination of facts each profile has, and for each combination a profile of just these."""
        wanted = sorted({*facts, *(also for fact in facts for also in _ALSO_READ.get(fact, ())), *_ALWAYS_READ})
        key = tuple(wanted)
        if key not in self._groups:
            group = np.zeros(len(self._texts), dtype=np.int64)
            for fact in wanted:
                codes, values = self._coded[fact]
                _, group = np.unique(group * len(values) + codes, return_inverse=True)
            _, first = np.unique(group, return_index=True)
            parts = [(fact, *self._coded[fact]) for fact in wanted]
            profiles = [
                ConditionProfile(**{fact: values[codes[place]] for fact, codes, values in parts})
                for place in first.tolist()
            ]
            self._groups[key] = (group.astype(np.int32), profiles)
        return self._groups[key]

    @cached_property
    def _coded(self) -> dict[str, tuple[NDArray[np.int32], list[Any]]]:
        """Return for each fact the code of its value in each profile, and the values."""
        facts = {f.name: _default(f) for f in fields(ConditionProfile)}
        places: dict[str, dict[Any, int]] = {fact: {} for fact in facts}
        codes = {fact: np.zeros(len(self._texts), dtype=np.int32) for fact in facts}
        for number, text in enumerate(self._texts):
            given = json.loads(text)
            for fact, default in facts.items():
                value = given.get(fact, default)
                known = places[fact]
                codes[fact][number] = known.setdefault(tuple(value) if isinstance(value, list) else value, len(known))
        decoded = {
            fact: [frozenset(value) if isinstance(value, tuple) else value for value in known]
            for fact, known in places.items()
        }
        return {fact: (codes[fact], decoded[fact]) for fact in facts}


def _chain(line: str) -> list[str]:
    """Return the tests of a line that only joins tests by `and`; any other line as it is."""
    parts = line.split(" and ")
    is_plain = " or " not in line and line.count("(") == line.count(" in (")
    return [part.strip() for part in parts] if is_plain else [line]


def _default(of: Any) -> Any:
    return of.default if not callable(of.default_factory) else of.default_factory()

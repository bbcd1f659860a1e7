"""A condition line that tells failures of one kind from runs at the same place that came through.

It owns the search: candidate tests are read off the failures themselves, in the language of `kb.assess.predicate`,
and joined by `and`, best first, as long as the line gets better. It judges a line by the F1 of members warned of
against successes warned of; it adopts nothing. A test that only names what was *not* there is never proposed: absence
explains nothing.
"""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kb.assess.predicate_words import words_of
from kb.audit.profile_table import ProfileTable
from kb.materials.profile import LEVELS

MOST_TESTS = 3
LEAST_COVER = 0.6
"""Share of the members that a proposed line must still hold for; judgement."""
LEAST_GAIN = 0.02
"""Gain in F1 that a further test must bring to be worth a reader's time; judgement."""
_SHARED = 0.6
"""Share of the members that must hold a class before it is tried; judgement."""
_HANDICAP = {"solvent": 0.05, "prolonged": 0.1, "temperature_c": 0.02, "reagent": 0.01}
_WORD_HANDICAP = 0.02
"""What a test must be better by than a plain acid, base or nucleophile: a medium explains less than what reacts, a long
time least, and each further word of a list fits by luck more easily. Judgement."""
_SPECTATORS = frozenset({"aryl_halide", "alkyl_halide", "nitrile", "alkene", "alkyne", "crown_ether", "polyol"})


@dataclass(frozen=True, slots=True, kw_only=True)
class Line:
    """A proposed line with what it does at the place: members warned of, successes warned of."""

    text: str
    members: int
    alarms: int
    quality: float


def propose_line(
    table: ProfileTable,
    members: NDArray[np.intp],
    successes: NDArray[np.intp],
    first: str = "",
    nothing_happened: bool = False,
) -> Line | None:
    """Return the line that best tells members from successes; None where no line covers enough of the members.

    Args:
        members: rows of the failures.
        successes: rows at the same place that came through.
        first: a test that the line must begin with ("nucleophile_class == primary_amine"); "" = none.
        nothing_happened: failures of too mild conditions: ask for an upper temperature instead of a lower one.
    """
    chosen = [first] if first else []
    best = _line(table, chosen, members, successes) if chosen else None
    candidates = _candidates(table, members, nothing_happened)
    while len(chosen) < MOST_TESTS:
        tried = [_line(table, [*chosen, test], members, successes) for test in candidates if test not in chosen]
        tried = [line for line in tried if line.members >= LEAST_COVER * len(members)]
        if not tried:
            break
        found = max(tried, key=lambda line: (line.quality, line.members))  # the first of equals: the plainer test
        if best is not None and found.quality < best.quality + LEAST_GAIN:
            break
        best, chosen = found, found.text.split(" and ")
    return best if best is not None and best.members >= LEAST_COVER * len(members) else None


def _line(table: ProfileTable, tests: Sequence[str], members: NDArray[np.intp], successes: NDArray[np.intp]) -> Line:
    hit, alarm = np.ones(len(members), dtype=bool), np.ones(len(successes), dtype=bool)
    for test in tests:
        hit &= table.holds(test, members)
        alarm &= table.holds(test, successes)
    hits, alarms = int(hit.sum()), int(alarm.sum())
    quality = 2 * hits / (2 * hits + alarms + (len(members) - hits)) if hits else 0.0
    quality -= sum(_handicap(test) for test in tests)
    return Line(text=" and ".join(tests), members=hits, alarms=alarms, quality=quality)


def _handicap(test: str) -> float:
    return _HANDICAP.get(test.split()[0], 0.0) + _WORD_HANDICAP * test.count(",")


def _candidates(table: ProfileTable, members: NDArray[np.intp], nothing_happened: bool) -> list[str]:
    """Return tests worth trying, plainest first."""
    enough = _SHARED * len(members)

    def of(fact: str) -> list[Any]:
        return table.values(fact, members)

    tests: list[str] = []
    for fact in ("acidity", "lewis_acid", "hydride"):
        order = LEVELS[fact]
        met = [order.index(word) for word in of(fact) if word in order]
        tests += [f"{fact} >= {order[level]}" for level in (2, 1) if sum(m >= level for m in met) >= enough]
    tests += _numbers("base_pkah", of("base_pkah"), 0.5)
    tests += [
        fact
        for fact in ("water", "alcohol", "ionising", "organometallic", "prolonged")
        if sum(value is True for value in of(fact)) >= enough
    ]
    tests += _sets("solvent", of("solvent_classes"))
    tests += _sets("nucleophile_class", [frozenset({word or ""}) for word in of("nucleophile_class")])
    tests += _sets("reagent", [held - _SPECTATORS for held in of("reagent_classes")])
    for fact, words in (("base_bulk", ("hindered", "unhindered")), ("halophile", ("silver", "mercury"))):
        met_words = Counter(of(fact))
        tests += [f"{fact} == {word}" for word in words if met_words[word] >= enough]
    temperatures = of("temperature_c")
    if nothing_happened:
        known = [t for t in temperatures if t is not None]
        return [*tests, *([f"temperature_c <= {_up(max(known), 5):g}"] if known else [])]
    return tests + _numbers("temperature_c", temperatures, 5.0)


def _numbers(fact: str, values: Iterable[float | None], step: float) -> list[str]:
    """Return lower limits at the least and at the lower fifth of the values met, rounded down to a step."""
    known = sorted(v for v in values if v is not None)
    if not known:
        return []
    limits = {_down(known[0], step), _down(known[len(known) // 5], step), _down(known[len(known) // 3], step)}
    return [f"{fact} >= {limit:g}" for limit in sorted(limits)]


def _sets(fact: str, classes: Sequence[frozenset[str]]) -> list[str]:
    known = words_of(fact)
    met = Counter(word.replace("-", "_") for held in classes for word in held)
    usual = sorted((w for w in met if w in known), key=lambda w: (-met[w], w))  # equals by name: one book, one answer
    tests = [f"{fact} in ({w})" for w in usual if met[w] >= _SHARED * len(classes)]
    for size in (2, 3):  # two or three classes that cover the members between them
        group: list[str] = []
        left = [frozenset(w.replace("-", "_") for w in held) for held in classes]
        while left and len(group) < size:
            counts = Counter(w for held in left for w in held if w in known)
            if not counts:
                break
            top = max(counts.values())
            word = min((w for w, n in counts.items() if n == top), key=lambda w: (met[w], w))  # the narrower word
            group.append(word)
            left = [held for held in left if word not in held]
        test = f"{fact} in ({', '.join(sorted(group))})"
        if len(group) == size and test not in tests:
            tests.append(test)
    return tests


def _down(value: float, step: float) -> float:
    return math.floor(value / step) * step


def _up(value: float, step: float) -> float:
    return math.ceil(value / step) * step

"""The condition language: one readable line that says under which conditions a rule applies.

    reagent in (hydroxide, alkoxide) and base_pkah >= 15 and base_bulk == unhindered
    acidity >= strong or lewis_acid >= strong
    solvent in (amide, sulfoxide) and not water and temperature_c >= 60

It owns three-valued evaluation on a `ConditionProfile`, and saying in plain words what a line asks, why
it holds and what is missing. Reading the line is `predicate_parse`, its vocabulary `predicate_words`.
Text is parsed by the standard library's `ast` and never executed; an unknown word is refused with the
nearest good one.

Values are True, False or None = cannot tell (not recorded). A test on a missing fact is None, never
False. Every number in a line divides classes of conditions: a judgement, never a measured limit.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from functools import lru_cache

from kb.assess.predicate_parse import Both, Comparison, Either, Node, read_line
from kb.assess.predicate_words import BOOLEANS, NUMBERS, SETS, field_of, missing_words, phrase, reason
from kb.materials.profile import LEVELS, ConditionProfile

_Truth = Callable[[ConditionProfile], bool | None]


class Predicate:
    """A parsed line.

    Attributes:
        text: the line as written.
    """

    __slots__ = ("_root", "_truth", "text")

    def __init__(self, text: str, root: Node) -> None:
        self.text = text
        self._root = root
        self._truth = _compile(root)

    def __repr__(self) -> str:
        return f"Predicate({self.text!r})"

    def __eq__(self, other: object) -> bool:
        return isinstance(other, Predicate) and other.text == self.text

    def __hash__(self) -> int:
        return hash(self.text)

    def __reduce__(self) -> tuple[type[Predicate], tuple[str, Node]]:
        """Return how to make it again from its tree; the closures are compiled anew."""
        return Predicate, (self.text, self._root)

    def evaluate(self, profile: ConditionProfile) -> bool | None:
        """Return True, False or None = cannot tell."""
        return self._truth(profile)

    def tests(self) -> tuple[Comparison, ...]:
        """Return every comparison, in reading order."""
        return tuple(_walk(self._root))

    def unknowns(self, profile: ConditionProfile) -> tuple[str, ...]:
        """Return what is missing, in plain words; empty where the answer is known."""
        if self.evaluate(profile) is not None:
            return ()
        found = (missing_words(t.name, profile) for t in self.tests() if _test_value(t, profile) is None)
        return tuple(dict.fromkeys(found))

    def deciding_gaps(self, profile: ConditionProfile) -> tuple[str, ...]:
        """Return each single missing thing that would decide the line, in plain words.

        A gap decides where one way of meeting the line has every other test met, at least one of them by
        something that *is* in the flask. So nothing at all recorded gives no gaps: every rule would have one.
        """
        if self.evaluate(profile) is not None:
            return ()
        ways = _open_ways(self._root, profile)
        return tuple(dict.fromkeys(next(iter(gaps)) for gaps, speaks in ways if speaks and len(gaps) == 1))

    def reasons(self, profile: ConditionProfile) -> tuple[str, ...]:
        """Return the positive tests that hold, in plain words; limits are marked as judged."""
        return tuple(dict.fromkeys(_reasons(self._root, profile)))

    def as_sentence(self) -> str:
        """Return the line as one plain English sentence."""
        text = _sentence(self._root, is_top=True)
        note = " (numbers are judged limits)" if any(t.number is not None for t in self.tests()) else ""
        return f"Applies when {text}{note}."


@lru_cache(maxsize=1024)
def parse_predicate(text: str) -> Predicate:
    """Parse one line.

    Args:
        text: as in the module's examples; `None`, true and false are no facts.

    Returns:
        The predicate.

    Raises:
        QueryError: where the line cannot be read or names something unknown; the hint offers a good word.
    """
    line, root = read_line(text)
    return Predicate(line, root)


def _compile(node: Node) -> _Truth:
    """Return a closure; evidence asks one line of tens of thousands of profiles."""
    if isinstance(node, Comparison):
        return _compile_test(node)
    parts = tuple(_compile(part) for part in node.parts)
    decisive = isinstance(node, Either)

    def truth(profile: ConditionProfile) -> bool | None:
        answer: bool | None = not decisive
        for part in parts:
            value = part(profile)
            if value is decisive:
                return decisive
            if value is None:
                answer = None
        return answer

    return truth


def _compile_test(test: Comparison) -> _Truth:
    field = field_of(test.name) or test.name
    if test.name in SETS:
        wanted = frozenset(test.words)
        open_flag = SETS[test.name][1]
        is_asked = test.operator == "in"

        def member(profile: ConditionProfile) -> bool | None:
            present = getattr(profile, field)
            if not wanted.isdisjoint(present) or any("-" in w and w.replace("-", "_") in wanted for w in present):
                return is_asked
            return None if getattr(profile, open_flag) else not is_asked

        return member
    if test.name in BOOLEANS:
        expected = test.operator == "is"

        def holds(profile: ConditionProfile) -> bool | None:
            value = getattr(profile, field)
            return None if value is None else bool(value) is expected

        return holds
    if test.name in NUMBERS:
        return _compile_number(test, field)
    return _compile_word(test, field)


def _compile_number(test: Comparison, field: str) -> _Truth:
    compare, limit = _COMPARE[test.operator], test.number
    is_base = test.name == "base_pkah"

    def above(profile: ConditionProfile) -> bool | None:
        value = getattr(profile, field)
        if value is None:
            # No base is known: with every component classified that means there is none.
            return None if not is_base or profile.has_unknown_reagent else test.operator in ("<", "<=", "!=")
        return compare(value, limit)

    return above


def _compile_word(test: Comparison, field: str) -> _Truth:
    if test.name in LEVELS:
        order = {word: i for i, word in enumerate(LEVELS[test.name])}
        if test.operator in (">=", ">", "<=", "<"):
            compare, limit = _COMPARE[test.operator], order[test.words[0]]

            def level(profile: ConditionProfile) -> bool | None:
                value = getattr(profile, field)
                return None if value is None else compare(order.get(value, 0), limit)

            return level
    wanted, is_asked = frozenset(test.words), test.operator in ("==", "in")
    is_base = test.name == "base_bulk"

    def equal(profile: ConditionProfile) -> bool | None:
        value = getattr(profile, field)
        if value is None:
            no_base = is_base and profile.base_pkah is None and not profile.has_unknown_reagent
            return (not is_asked) if no_base else None
        return (value.replace("-", "_") in wanted) is is_asked

    return equal


_COMPARE: dict[str, Callable[..., bool]] = {
    ">=": lambda a, b: a >= b,
    ">": lambda a, b: a > b,
    "<=": lambda a, b: a <= b,
    "<": lambda a, b: a < b,
    "==": lambda a, b: a == b,
    "!=": lambda a, b: a != b,
}


@lru_cache(maxsize=4096)
def _truth_of(test: Comparison) -> _Truth:
    return _compile_test(test)


def _test_value(test: Comparison, profile: ConditionProfile) -> bool | None:
    return _truth_of(test)(profile)


def _walk(node: Node) -> Iterator[Comparison]:
    if isinstance(node, Comparison):
        yield node
    else:
        for part in node.parts:
            yield from _walk(part)


def _value(node: Node, profile: ConditionProfile) -> bool | None:
    if isinstance(node, Comparison):
        return _test_value(node, profile)
    values = [_value(part, profile) for part in node.parts]
    decisive = isinstance(node, Either)
    if decisive in values:
        return decisive
    return None if None in values else not decisive


def _open_ways(node: Node, profile: ConditionProfile) -> list[tuple[frozenset[str], bool]]:
    """Return the ways an undecided node could hold: what each lacks, and whether anything speaks for it."""
    if isinstance(node, Comparison):
        return [(frozenset((missing_words(node.name, profile),)), False)]
    values = [(part, _value(part, profile)) for part in node.parts]
    undecided = [_open_ways(part, profile) for part, value in values if value is None]
    if isinstance(node, Either):
        return [way for ways in undecided for way in ways]
    is_supported = any(value and _speaks(part, profile) for part, value in values)
    combined: list[tuple[frozenset[str], bool]] = [(frozenset(), is_supported)]
    for ways in undecided:
        combined = [(a | b, s or t) for a, s in combined for b, t in ways][:64]
    return combined


def _speaks(node: Node, profile: ConditionProfile) -> bool:
    """Return True where a node that holds does so by something that is there, the solvent not counted.

    A solvent alone speaks for too little: every run in DMF would ask for its temperature.
    """
    return any(t.is_positive and t.name != "solvent" and _test_value(t, profile) for t in _walk(node))


def _reasons(node: Node, profile: ConditionProfile) -> Iterator[str]:
    if _value(node, profile) is not True:
        return
    if isinstance(node, Comparison):
        if node.is_positive:
            yield reason(node.name, node.operator, node.words, node.number, profile)
        return
    for part in node.parts:
        yield from _reasons(part, profile)


def _sentence(node: Node, *, is_top: bool = False) -> str:
    if isinstance(node, Comparison):
        return phrase(node.name, node.operator, node.words, node.number)
    joined = (" and " if isinstance(node, Both) else " or ").join(_sentence(part) for part in node.parts)
    return joined if is_top else f"({joined})"

"""Reading one condition line into comparisons, without ever running it.

It owns the grammar: comparisons of known facts with known words or numbers, joined by and, or, not. Text is
parsed by the standard library's `ast`, only whitelisted nodes are accepted, nothing is evaluated. Negation is
pushed down to the comparisons, so that what is left are comparisons under `Both` and `Either`.
"""

from __future__ import annotations

import ast
from collections.abc import Iterable
from dataclasses import dataclass
from typing import TypeAlias

from kb.assess.predicate_words import ALIASES, BOOLEANS, CHOICES, NUMBERS, SETS, field_of, nearest, words_of
from kb.errors import QueryError
from kb.materials.profile import LEVELS

MAX_LENGTH = 2000
"""Longest line that is parsed [characters]; the longest shipped rule is well below it."""

_MAX_NODES = 800
_OPERATORS: dict[type[ast.cmpop], str] = {
    ast.GtE: ">=",
    ast.Gt: ">",
    ast.LtE: "<=",
    ast.Lt: "<",
    ast.Eq: "==",
    ast.NotEq: "!=",
    ast.In: "in",
    ast.NotIn: "not in",
}
_FLIPPED = {">=": "<=", ">": "<", "<=": ">=", "<": ">", "==": "==", "!=": "!="}
_OPPOSITE = {
    ">=": "<",
    "<": ">=",
    ">": "<=",
    "<=": ">",
    "==": "!=",
    "!=": "==",
    "in": "not in",
    "not in": "in",
    "is": "is not",
    "is not": "is",
}


@dataclass(frozen=True, slots=True, kw_only=True)
class Comparison:
    """One comparison: a fact of the profile, an operator, and words or a number.

    Attributes:
        name: the fact (`reagent`, `temperature_c`).
        operator: one of `>= > <= < == != in`, `not in`, or `is` / `is not` for a bare fact.
        words: the words asked for; empty for numbers and bare facts.
        number: in the unit of the fact; None for words.
    """

    name: str
    operator: str
    words: tuple[str, ...] = ()
    number: float | None = None

    @property
    def is_positive(self) -> bool:
        """Return True where it asks that something be there, False where it asks that it be absent."""
        if self.operator in ("in", "is"):
            return "none" not in self.words
        if self.name in LEVELS or self.name in CHOICES:
            return self.operator in (">=", ">", "==") and "none" not in self.words
        return self.number is not None


@dataclass(frozen=True, slots=True)
class Both:
    """All parts hold."""

    parts: tuple[Node, ...]


@dataclass(frozen=True, slots=True)
class Either:
    """At least one part holds."""

    parts: tuple[Node, ...]


Node: TypeAlias = "Comparison | Both | Either"


def read_line(text: str) -> tuple[str, Node]:
    """Read one line.

    Args:
        text: the line, any white space.

    Returns:
        The line tidied, and its tree.

    Raises:
        QueryError: where it cannot be read or names something unknown; the hint offers the nearest word.
    """
    line = " ".join(text.split())
    if not line:
        raise QueryError("The condition line is empty.", "Write for instance: acidity >= strong", text)
    if len(line) > MAX_LENGTH:
        raise QueryError(
            f"The condition line has {len(line)} characters; {MAX_LENGTH} is the most.",
            "Split the rule.",
            text[:80],
        )
    try:
        tree = ast.parse(line, mode="eval")
        if sum(1 for _ in ast.walk(tree)) > _MAX_NODES:
            raise QueryError("The condition line is too long to follow.", "Split the rule.", text[:80])
        return line, _read(tree.body, is_negated=False, line=line)
    except (SyntaxError, RecursionError, MemoryError) as error:
        raise QueryError(
            f"The condition line {_short(line)} cannot be read.",
            "Join comparisons with and, or, not, such as: reagent in (hydroxide) and temperature_c >= 60",
            text,
        ) from error


def _read(node: ast.expr, *, is_negated: bool, line: str) -> Node:
    if isinstance(node, ast.BoolOp):
        parts = tuple(_read(value, is_negated=is_negated, line=line) for value in node.values)
        return Both(parts) if isinstance(node.op, ast.And) is not is_negated else Either(parts)
    if isinstance(node, ast.UnaryOp) and isinstance(node.op, ast.Not):
        return _read(node.operand, is_negated=not is_negated, line=line)
    if isinstance(node, ast.Name):
        name = _fact(node.id)
        if name not in BOOLEANS:
            raise QueryError(f"{node.id} cannot stand alone in {_short(line)}.", f"Compare it: {_example(name)}", line)
        return Comparison(name=name, operator="is not" if is_negated else "is")
    if isinstance(node, ast.Compare):
        return _read_compare(node, is_negated=is_negated, line=line)
    raise QueryError(
        f"{_short(_source(node, line))} is no comparison that a rule may use.",
        "Use comparisons of facts with words or numbers, joined with and, or, not.",
        line,
    )


def _read_compare(node: ast.Compare, *, is_negated: bool, line: str) -> Node:
    sides = [node.left, *node.comparators]
    tests: list[Comparison] = []
    for left, op, right in zip(sides, node.ops, sides[1:], strict=False):
        operator = _OPERATORS.get(type(op))
        if operator is None:
            raise QueryError(f"{_short(line)} uses an operator that rules do not know.", "Use == or in.", line)
        if not _is_fact(left):
            left, right = right, left
            operator = _FLIPPED.get(operator, "")
        if not _is_fact(left) or not operator:
            raise QueryError(
                f"{_short(_source(node, line))} compares no known fact.", _fact_hint(_first_name(node)), line
            )
        tests.append(_build(_fact(_text(left) or ""), operator, right, line=line))
    if is_negated:
        tests = [_negate(t) for t in tests]
        return tests[0] if len(tests) == 1 else Either(tuple(tests))
    return tests[0] if len(tests) == 1 else Both(tuple(tests))


def _negate(test: Comparison) -> Comparison:
    return Comparison(name=test.name, operator=_OPPOSITE[test.operator], words=test.words, number=test.number)


def _build(name: str, operator: str, value: ast.expr, *, line: str) -> Comparison:
    if name in NUMBERS:
        number = _number(value)
        if number is None or operator in ("in", "not in"):
            raise QueryError(
                f"{name} must be compared with a number in {_short(line)}.",
                f"Write for instance: {_example(name)}",
                line,
            )
        return Comparison(name=name, operator=operator, number=number)
    if name in BOOLEANS:
        truth = _text(value)
        if operator not in ("==", "!=") or truth is None or truth.lower() not in ("true", "false", "yes", "no"):
            raise QueryError(f"{name} is yes or no in {_short(line)}.", f"Write: {name}, or: not {name}", line)
        is_asked = (truth.lower() in ("true", "yes")) is (operator == "==")
        return Comparison(name=name, operator="is" if is_asked else "is not")
    words = _words(value, line)
    known = words_of(name)
    for word in words:
        if word not in known:
            raise QueryError(f"{_short(word)} is no word for {name} in {_short(line)}.", _word_hint(word, known), word)
    if name in SETS:
        if operator not in ("in", "not in", "==", "!="):
            raise QueryError(f"{name} has no order in {_short(line)}.", f"Write: {name} in (...)", line)
        return Comparison(name=name, operator="in" if operator in ("in", "==") else "not in", words=words)
    if operator in (">=", ">", "<=", "<"):
        if name not in LEVELS or len(words) != 1:
            raise QueryError(
                f"{name} {operator} ... in {_short(line)} compares no single level.",
                f"Write: {_example(name)}",
                line,
            )
        return Comparison(name=name, operator=operator, words=words)
    if len(words) > 1:
        return Comparison(name=name, operator="in" if operator in ("in", "==") else "not in", words=words)
    return Comparison(name=name, operator="==" if operator in ("in", "==") else "!=", words=words)


def _words(value: ast.expr, line: str) -> tuple[str, ...]:
    items = value.elts if isinstance(value, ast.Tuple | ast.List | ast.Set) else [value]
    words = [_text(item) for item in items]
    if not words or any(w is None for w in words):
        raise QueryError(
            f"{_short(_source(value, line))} is no list of words.",
            "Write words in brackets: (hydroxide, alkoxide)",
            line,
        )
    return tuple(w.replace("-", "_").lower() for w in words if w is not None)


def _text(node: ast.expr) -> str | None:
    """Return a bare word; `polar-aprotic` parses as a difference of names and is read as one word."""
    if isinstance(node, ast.Name):
        return node.id
    if isinstance(node, ast.Constant) and isinstance(node.value, str | bool):
        return str(node.value)
    if isinstance(node, ast.BinOp) and isinstance(node.op, ast.Sub):
        left, right = _text(node.left), _text(node.right)
        return f"{left}_{right}" if left and right else None
    return None


def _number(node: ast.expr) -> float | None:
    if isinstance(node, ast.UnaryOp) and isinstance(node.op, ast.USub | ast.UAdd):
        inner = _number(node.operand)
        return None if inner is None else (-inner if isinstance(node.op, ast.USub) else inner)
    if not isinstance(node, ast.Constant) or isinstance(node.value, bool):
        return None
    return float(node.value) if isinstance(node.value, int | float) and abs(node.value) < 1e9 else None


def _is_fact(node: ast.expr) -> bool:
    text = _text(node)
    return text is not None and field_of(ALIASES.get(text, text)) is not None


def _fact(word: str) -> str:
    name = ALIASES.get(word, word)
    if field_of(name) is None:
        raise QueryError(f"{_short(word)} is no fact that a rule can ask about.", _fact_hint(word), word)
    return name


def _first_name(node: ast.AST) -> str:
    return next((n.id for n in ast.walk(node) if isinstance(n, ast.Name)), "")


def _fact_hint(word: str) -> str:
    best = nearest(word, [*SETS, *LEVELS, *CHOICES, *NUMBERS, *BOOLEANS]) if word else None
    if best:
        return f"Did you mean {best}?"
    return "Facts are for instance reagent, solvent, acidity, temperature_c, water."


def _word_hint(word: str, known: Iterable[str]) -> str:
    best = nearest(word, known)
    return f"Did you mean {best}?" if best else f"Known words: {', '.join(sorted(known)[:12])} ..."


def _example(name: str) -> str:
    if name in NUMBERS:
        return f"{name} >= 60"
    word = next((w for w in words_of(name) if w != "none"), "none")
    return f"{name} >= {word}" if name in LEVELS else f"{name} in ({word})"


def _source(node: ast.expr, line: str) -> str:
    return ast.get_source_segment(line, node) or line


def _short(text: str) -> str:
    return f"'{text}'" if len(text) <= 60 else f"'{text[:57]}...'"

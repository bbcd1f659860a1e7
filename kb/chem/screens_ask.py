"""What a query asks of a screen, as a tree: bits, all of some parts, one of some parts.

A list such as `[Cl,Br,I]` is one bit or another, never none; hence a tree and not a row of bits. It knows no chemistry.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from typing import TypeAlias


@dataclass(frozen=True, slots=True)
class AllOf:
    """Every part must hold. No parts = nothing is asked."""

    parts: tuple[Ask, ...] = ()


@dataclass(frozen=True, slots=True)
class OneOf:
    """At least one part must hold."""

    parts: tuple[Ask, ...]


Ask: TypeAlias = int | AllOf | OneOf
"""A bit number of the augmented screen, or a tree of them."""

NOTHING = AllOf()

def bits_in(ask: Ask) -> Iterator[int]:
    """Yield every bit number in a tree, repeats included."""
    if isinstance(ask, int):
        yield ask
    else:
        for part in ask.parts:
            yield from bits_in(part)


def holds(ask: Ask, mask: int) -> bool:
    """Return whether a structure's screen satisfies what is asked.

    Args:
        ask: the tree.
        mask: the structure's augmented bits as one integer.
    """
    if isinstance(ask, int):
        return bool(mask >> ask & 1)
    if isinstance(ask, AllOf):
        return all(holds(part, mask) for part in ask.parts)
    return any(holds(part, mask) for part in ask.parts)


def one_of(parts: Iterable[Ask]) -> Ask:
    """Return the alternatives as one ask; one alternative that asks for nothing makes it nothing."""
    distinct = list(dict.fromkeys(parts))
    if not distinct or NOTHING in distinct:
        return NOTHING
    return distinct[0] if len(distinct) == 1 else OneOf(tuple(distinct))


def all_of(parts: Iterable[Ask]) -> Ask:
    """Return a conjunction, as its one part where it has but one."""
    flat = flatten(parts)
    return flat[0] if len(flat) == 1 else AllOf(tuple(flat))


def flatten(asks: Iterable[Ask]) -> list[Ask]:
    """Return the parts of a conjunction without nesting or repeats."""
    flat: dict[Ask, None] = {}
    for ask in asks:
        for part in flatten(ask.parts) if isinstance(ask, AllOf) else (ask,):
            flat[part] = None
    return list(flat)

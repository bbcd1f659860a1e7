"""A rate as a sum of terms that a person can read: each with words, a value in log10, a spread and a source.

It owns the sum and nothing about chemistry. Every channel of the competition model is such a sum, so "why
80 %?" is answered by listing it.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass

from kb.physorg.constants import Constant, find_constant, get_constant


@dataclass(frozen=True, slots=True, kw_only=True)
class Term:
    """One contribution.

    Attributes:
        because: plain words.
        log10: what it adds to log10 of the rate constant.
        sigma: one standard deviation of it.
        source: where it is from; "" for arithmetic.
    """

    because: str
    log10: float
    sigma: float = 0.0
    source: str = ""


def from_constant(constant: Constant, because: str, times: float = 1.0) -> Term:
    """Return a term from a row of the tables, scaled."""
    mark = "" if constant.obtained == "seen" else f" ({constant.obtained})"
    return Term(
        because=because,
        log10=times * constant.value,
        sigma=abs(times) * constant.sigma,
        source=constant.source + mark,
    )


def term(quantity: str, key: str, because: str, times: float = 1.0) -> Term:
    """Return a term by quantity and key; LookupError where the tables do not hold it."""
    return from_constant(get_constant(quantity, key), because, times)


def find_term(quantity: str, key: str, because: str, times: float = 1.0) -> Term | None:
    """Return a term, or None where the tables are silent."""
    constant = find_constant(quantity, key)
    return None if constant is None else from_constant(constant, because, times)


def total(terms: Iterable[Term]) -> float:
    """Return the sum of the terms, log10."""
    return math.fsum(t.log10 for t in terms)


def spread(terms: Iterable[Term]) -> float:
    """Return the standard deviation of the sum, terms taken as independent."""
    return math.sqrt(math.fsum(t.sigma**2 for t in terms))

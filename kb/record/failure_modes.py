"""The controlled failure modes and their plain meanings, read once from `kb/data/failure_modes.toml`.

It owns the reading and the offer of a nearest word; what a mode implies for a rule is said where the rule is.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

from kb.errors import InvalidRecord
from kb.paths import PACKAGE


@dataclass(frozen=True, slots=True, kw_only=True)
class FailureMode:
    """One word, what it means, and whether a group of the substrate was lost, attacked or moved."""

    word: str
    meaning: str
    loses_group: bool


@cache
def failure_modes() -> tuple[FailureMode, ...]:
    """Return the modes in the order of the file."""
    import tomllib

    text = (PACKAGE / "data" / "failure_modes.toml").read_text(encoding="utf-8")
    return tuple(FailureMode(**entry) for entry in tomllib.loads(text)["mode"])


@cache
def modes_that_lose_a_group() -> frozenset[str]:
    """Return the words for which a motif makes sense."""
    return frozenset(m.word for m in failure_modes() if m.loses_group)


def parse_failure_mode(text: str) -> str:
    """Return the controlled word.

    Raises:
        InvalidRecord: not on the list; the hint gives the nearest word or the list.
    """
    word = "-".join(text.strip().lower().replace("_", "-").split())
    words = [m.word for m in failure_modes()]
    if word in words:
        return word
    from rapidfuzz import process

    near = process.extractOne(word, words, score_cutoff=70)
    hint = f"Did you mean {near[0]}?" if near else f"Use one of: {', '.join(words)}."
    raise InvalidRecord(f"Failure mode {text!r} is not on the list.", hint, text)

"""Choices between the values of a conflict from words: "isolated_yield_pct=2" is the second value that was given.

It owns the words; what a conflict is and what settling does is the store's.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from kb.errors import InvalidRecord
from kb.record.run import Run

if TYPE_CHECKING:
    from kb.store.values import Conflict


def choices_from_words(conflicts: Sequence[Conflict], run: Run, texts: Sequence[str]) -> dict[str, Any]:
    """Return disputed field to the value that shall stand.

    Args:
        conflicts: all that wait in the book.
        run: whose conflicts are settled.
        texts: "FIELD=NUMBER" each; the field as listed, or its last word; numbers count from 1.

    Raises:
        InvalidRecord: the run has no conflict, no such field is disputed, or there is no such number.
    """
    mine = {c.field: c for c in conflicts if c.run_id == run.run_id}
    if not mine:
        raise InvalidRecord(f"Nothing about {run.code} waits to be settled.", "See `sidepath conflicts`.", run.code)
    chosen: dict[str, Any] = {}
    for text in texts:
        word, equals, number = text.rpartition("=")
        word = word.strip().replace(" ", "_")
        fields = [f for f in mine if word in (f, f.rpartition(".")[2])]
        if not equals or len(fields) != 1:
            raise InvalidRecord(f"{text[:60]!r} names no disputed field.", f"Disputed: {', '.join(mine)}.", text)
        claims = mine[fields[0]].claims
        if not number.strip().isdecimal() or not 1 <= int(number) <= len(claims):
            raise InvalidRecord(f"{fields[0]} has no value {number[:20]!r}.", f"Give 1 to {len(claims)}.", text)
        chosen[fields[0]] = claims[int(number) - 1].value
    return chosen

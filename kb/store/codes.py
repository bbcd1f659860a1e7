"""Short codes: what people call a run aloud. How one is written, read back, and kept apart after a merge.

A code is `R-` and a number, counted up in each book ("R-0042"). Two books that counted apart and are then
merged hold two runs of one number; both then get two letters of their own UUID behind it ("R-0042kt",
"R-0042wb"), the same in every book and whichever way round the merge went, and the bare number is refused as
ambiguous instead of meaning the wrong one of them. It refuses nothing that a person could mean: case, zeros,
the hyphen and the R are free.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from uuid import UUID

LETTERS = "bcdfghjkmnpqrstvwxz"
"""No vowels (no words arise), no l and y (misread as 1 and v)."""

PATTERN = re.compile(r"\s*(?:[rR]\s*-?\s*)?0*(\d{1,9})\s*([a-zA-Z]*)\s*")


def write_code(number: int, mark: str = "") -> str:
    """Return the code of a number.

    >>> write_code(42), write_code(12345, "kt")
    ('R-0042', 'R-12345kt')
    """
    return f"R-{number:04d}{mark}"


def parse_code(text: str) -> tuple[int, str] | None:
    """Return number and mark of a code as people type it; None where it is none.

    >>> parse_code("r42"), parse_code("R-0042KT"), parse_code("42"), parse_code("aspirin")
    ((42, ''), (42, 'kt'), (42, ''), None)
    """
    found = PATTERN.fullmatch(text)
    if found is None or not text.isascii():
        return None
    return int(found[1]), found[2].lower()


def marks_of(claimed: Mapping[UUID, str]) -> dict[UUID, str]:
    """Return the marks that keep runs of one number apart.

    A function of the set only: order and history do not matter. A run keeps the mark that it claims; one alone needs
    none; otherwise two letters of its UUID, and more for all of them until all differ.

    Args:
        claimed: run to the mark that its first history entry bears ("" = none).
    """
    if len(claimed) < 2:
        return dict(claimed)
    spelled = {run_id: _letters(run_id) for run_id in claimed}
    found = {run_id: mark or spelled[run_id][:2] for run_id, mark in claimed.items()}
    length = 2
    while len(set(found.values())) < len(found):
        found = {run_id: letters[:length] for run_id, letters in spelled.items()}
        length += 1
    return found


def _letters(run_id: UUID) -> str:
    value, letters = run_id.int, []
    for _ in range(31):  # 19 ** 31 > 2 ** 128, so different UUIDs spell differently
        value, digit = divmod(value, len(LETTERS))
        letters.append(LETTERS[digit])
    return "".join(letters)

"""A reading that balances, as a value."""

from __future__ import annotations

from dataclasses import dataclass

from kb.chem.labile import LabileGroup
from kb.chem.skeleton import Edit
from kb.vocabulary import Fate

Place = tuple[int, int, int | None]
"""(part, atom, leaving atom or None), numbers within the part."""


@dataclass(frozen=True, slots=True)
class Match:
    """A reading that balances.

    Attributes:
        fate: its word.
        edit: the bond changes; None when the reading did not come from a balance.
        centres: principal centre first; empty for `other`.
        nucleophile: (part, atom in part, class word), or None.
        note: plain words for how.
        rank: to choose among equally plain ones, higher first.
        cost: assumptions needed.
        lost: groups that came off besides.
        landing: (part, atom) where the nucleophile of the leading step lands; None for losses and eliminations.
    """

    fate: Fate
    edit: Edit | None
    centres: tuple[Place, ...] = ()
    nucleophile: tuple[int, int, str] | None = None
    note: str = ""
    rank: int = 0
    cost: int = 0
    lost: tuple[LabileGroup, ...] = ()
    landing: tuple[int, int] | None = None

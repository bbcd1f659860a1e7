"""What is asked of the record, as one frozen value.

Every part that is given must hold. `all_of`, `any_of` and `none_of` take criteria of their own, so that
"and", "or" and "not" nest; only their conditions count, not their pages. What can be checked without a book
is refused here.

    Criteria(substructure="CC(C)(C)OC(=O)N", role=Role.SUBSTRATE, failed="group-loss")
    Criteria(any_of=(Criteria(solvent="DMF"), Criteria(solvent="DMSO")), none_of=(Criteria(words="wet"),))
"""

from __future__ import annotations

import datetime as dt
from collections.abc import Iterator
from dataclasses import dataclass
from enum import StrEnum

from kb.errors import QueryError
from kb.vocabulary import CarbonClass, LeavingGroup, Role, Verdict

MAX_LIMIT = 10_000
MAX_NESTING = 8
DEFAULT_AT_LEAST = 0.4
"""Lowest Tanimoto similarity that is worth showing, where nobody says (common practice for these fingerprints)."""


class Order(StrEnum):
    """How answers are sorted; runs that lack the figure come last."""

    BEST = "best"
    NEWEST = "newest"
    OLDEST = "oldest"
    CODE = "code"


@dataclass(frozen=True, slots=True, kw_only=True)
class Criteria:
    """What is asked.

    Attributes:
        substructure: SMARTS, SMILES or a molfile that a structure of the run holds.
        ignore_stereo: stereo marks of `substructure`, `exact` and `at_centre` do not count.
        similar: SMILES or molfile to which a structure of the run is similar.
        at_least: lowest Tanimoto similarity, 0..1, for `similar`.
        exact: SMILES or molfile that a structure of the run is.
        at_centre: SMARTS that the substrate holds with its atom 1 (`[C:1]`; the first atom where none is marked) at the
            reacting centre.
        transformation: "C-Br>>C-N": what changed at the reacting centre.
        role: role of the structure that `substructure`, `similar` and `exact` speak of; None = any.
        words: of note, materials, failure modes, labels; each must begin a word there, quotes hold together.
        solvent, base: name or SMILES of a solvent, of a base.
        reagent: name or SMILES of anything else in the flask.
        temp_from_c, temp_to_c: bounds on the most forcing temperature [degC], both included.
        failed: failure mode.
        verdict, carbon_class, leaving_group: controlled words.
        project: as written.
        since, until: bounds on the day it was run, both included; runs without a date are left out then.
        all_of, any_of, none_of: further criteria: all, at least one, none of which hold.
        order, limit, page: how answers are sorted and cut into pages (from 1).
    """

    substructure: str | None = None
    ignore_stereo: bool = False
    similar: str | None = None
    at_least: float = DEFAULT_AT_LEAST
    exact: str | None = None
    at_centre: str | None = None
    transformation: str | None = None
    role: Role | None = None
    words: str | None = None
    solvent: str | None = None
    base: str | None = None
    reagent: str | None = None
    temp_from_c: float | None = None
    temp_to_c: float | None = None
    failed: str | None = None
    verdict: Verdict | None = None
    carbon_class: CarbonClass | None = None
    leaving_group: LeavingGroup | None = None
    project: str | None = None
    since: dt.date | None = None
    until: dt.date | None = None
    all_of: tuple[Criteria, ...] = ()
    any_of: tuple[Criteria, ...] = ()
    none_of: tuple[Criteria, ...] = ()
    order: Order = Order.BEST
    limit: int = 20
    page: int = 1

    def __post_init__(self) -> None:
        if not 0 < self.at_least <= 1:
            raise QueryError(
                f"A similarity of {self.at_least:g} cannot be asked for.", "Give more than 0, up to 1.", self.at_least
            )
        if not 1 <= self.limit <= MAX_LIMIT:
            raise QueryError(f"{self.limit} answers a page cannot be.", f"Give 1 to {MAX_LIMIT}.", self.limit)
        if self.page < 1:
            raise QueryError(f"There is no page {self.page}.", "Pages count from 1.", self.page)
        for low, high, what in (
            (self.temp_from_c, self.temp_to_c, "temperatures"),
            (self.since, self.until, "dates"),
        ):
            if low is not None and high is not None and low > high:  # type: ignore[operator]
                raise QueryError(f"The {what} from {low} to {high} leave nothing.", "Swap the two.", (low, high))
        if _depth(self) > MAX_NESTING:
            raise QueryError(f"Criteria nest more than {MAX_NESTING} deep.", "Search in steps.", MAX_NESTING)

    @property
    def asks_for_structure(self) -> bool:
        """Return whether any part, nested ones included, is about structures."""
        own = (self.substructure, self.similar, self.exact, self.at_centre, self.transformation)
        return any(part is not None for part in own) or any(c.asks_for_structure for c in self.parts())

    @property
    def asks_for_facts(self) -> bool:
        """Return whether this part, nested ones left out, rests on what was read from schemes and conditions."""
        own = (
            self.carbon_class,
            self.leaving_group,
            self.at_centre,
            self.transformation,
            self.temp_from_c,
            self.temp_to_c,
        )
        return any(part is not None for part in own)

    def parts(self) -> Iterator[Criteria]:
        """Yield the criteria directly inside."""
        yield from self.all_of
        yield from self.any_of
        yield from self.none_of


def _depth(criteria: Criteria) -> int:
    return 1 + max((_depth(part) for part in criteria.parts()), default=0)

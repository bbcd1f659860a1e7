"""The record as it stood on the morning of each run: views that hold earlier runs only.

It owns the order in time and the cut, and judges nothing. A run sees the runs of earlier *days*: what was set up the
same day had no outcome yet. Undated runs neither see nor are seen, since nobody can say what they knew. All views
share one set of caches (profiles, runs, molecules, motif hits), which hold no outcome of a later run: a profile, a
molecule and a motif hit follow from the row itself.
"""

from __future__ import annotations

import datetime as dt
from collections.abc import Sequence
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from kb.assess.record_view import RecordView
from kb.audit.likeness import SubstrateLikeness
from kb.materials.profile import ConditionProfile
from kb.record.run import Run
from kb.store.values import HouseRule


class DatedRecord:
    """The dated runs of a book in date order; runs of one day keep the record's order."""

    def __init__(self, view: RecordView, house_rules: Sequence[HouseRule] = ()) -> None:
        """Put the runs in order.

        Args:
            view: the whole book.
            house_rules: retired ones included; each speaks from the day it was adopted until it was retired.
        """
        dates = view.table.date
        order = np.argsort(dates, kind="stable")
        self.view = view
        self.rows = order[dates[order] > 0]
        self.undated = int((dates <= 0).sum())
        self.dates = dates[self.rows]
        self.table = view.table.rows(self.rows)
        self.failures = [view.failures[int(row)] for row in self.rows]
        self._likeness = SubstrateLikeness(view, self.rows)
        self._rules = tuple(house_rules)
        self._motif_rows: dict[str, NDArray[np.intp]] = {}
        self._failed_in: dict[str, NDArray[np.bool_]] = {}

    def __len__(self) -> int:
        return len(self.rows)

    def earlier(self, place: int) -> int:
        """Return how many runs are of an earlier day than the run at a place: they come first, without a gap."""
        return int(np.searchsorted(self.dates, self.dates[place], side="left"))

    def before(self, place: int) -> RecordView:
        """Return what stood in the book on the morning of the run at a place."""
        return _EarlierView(self, self.earlier(place))

    def rules_on(self, place: int) -> tuple[HouseRule, ...]:
        """Return the house rules in force on the morning of the run at a place."""
        day = dt.date.fromordinal(int(self.dates[place]))
        return tuple(
            rule
            for rule in self._rules
            if (rule.created_at is not None and rule.created_at.date() < day)
            and (rule.retired_at is None or rule.retired_at.date() >= day)
        )

    def rest(self, substrate: str | None, count: int) -> NDArray[np.float64] | None:
        """Return the whole-molecule similarity of the first `count` runs to a substrate."""
        return self._likeness.to_first(substrate, count)

    def run(self, place: int) -> Run:
        """Return the whole run at a place."""
        return self.view.run(int(self.rows[place]))

    def profile(self, place: int) -> ConditionProfile:
        """Return the conditions of the run at a place."""
        return self.view.profile(int(self.rows[place]))

    def places_with_motif(self, smarts: str) -> NDArray[np.intp]:
        """Return the places of all dated runs that hold a motif, ascending."""
        if smarts not in self._motif_rows:
            places = self._place_of[self.view.rows_with_motif(smarts)]
            self._motif_rows[smarts] = np.sort(places[places >= 0])
        return self._motif_rows[smarts]

    def failed_in(self, mode: str) -> NDArray[np.bool_]:
        """Return which places failed in a mode (n)."""
        if mode not in self._failed_in:
            self._failed_in[mode] = self.view.failed_in(mode)[self.rows]
        return self._failed_in[mode]

    @cached_property
    def first_of_mode(self) -> dict[str, int]:
        """Return the place of the first failure of each mode."""
        first: dict[str, int] = {}
        for place, pairs in enumerate(self.failures):
            for mode, _ in pairs:
                first.setdefault(mode, place)
        return first

    @cached_property
    def _place_of(self) -> NDArray[np.intp]:
        places = np.full(len(self.view.table), -1, dtype=np.intp)
        places[self.rows] = np.arange(len(self.rows))
        return places


class _EarlierView(RecordView):
    """The first `count` runs of a dated record, on the record's own caches."""

    def __init__(self, dated: DatedRecord, count: int) -> None:
        super().__init__(
            dated.table.first(count),
            None,
            dated.failures[:count],
            dated.view,  # type: ignore[arg-type]  # run() below never asks it by code
            lambda smarts: _below(dated.places_with_motif(smarts), count),
            dated.view,
        )
        self._dated = dated
        self._count = count

    def profile(self, row: int) -> ConditionProfile:
        return self._dated.profile(self._checked(row))

    def run(self, row: int) -> Run:
        return self._dated.run(self._checked(row))

    def mol(self, smiles: str) -> object:
        return self._dated.view.mol(smiles)

    @cached_property
    def modes(self) -> tuple[str, ...]:
        return tuple(sorted(mode for mode, place in self._dated.first_of_mode.items() if place < self._count))

    def failed_in(self, mode: str) -> NDArray[np.bool_]:
        return self._dated.failed_in(mode)[: self._count]

    def _checked(self, row: int) -> int:
        if not 0 <= row < self._count:
            raise IndexError(f"Row {row} lies beyond the {self._count} earlier runs.")
        return int(row)


def _below(places: NDArray[np.intp], count: int) -> NDArray[np.intp]:
    return places[: int(np.searchsorted(places, count, side="left"))]

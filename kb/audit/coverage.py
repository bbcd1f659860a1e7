"""What the record covers: counts, best split and spread by class of centre, leaving group, reagent and solvent.

It owns the cells, which of them are thin, and where like flasks disagree; which experiments would teach most is
`teaching.py`. The *share* of a run is that of the fate that its scheme wanted (0..1); where no split was measured the
yield stands in for it. A cell's reagent is the nucleophile's class, or the base's where nothing bonds; its solvent is
the coarse class. Limits below are judgements.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kb.assess.record_view import RecordView
from kb.assess.table import WORDS, FactTable
from kb.audit.profile_table import ProfileTable
from kb.audit.teaching import Experiment, teach_most
from kb.materials.profile import ConditionProfile
from kb.progress import Progress, Silent
from kb.record.plan import Plan
from kb.showing import ShowsItself

THIN = 2
"""At most so many runs make a cell thin."""
DISAGREES = 0.35
"""Difference of share (0..1) from which two like flasks contradict each other."""
_BAND_K = 10.0
_BAND_PKAH = 2.0
_FLASK = ("base_pkah", "base_bulk", "acidity", "lewis_acid", "has_unknown_reagent", "solvent_classes")
"""What `_flask_words` reads."""
_COARSE = ("protic", "polar-aprotic", "weakly-polar", "nonpolar")


@dataclass(frozen=True, slots=True, kw_only=True)
class Cell:
    """One combination that the record holds.

    Attributes:
        carbon_class, leaving_group, reagent, solvent: words; "not read" or "not recorded" where they are missing.
        runs: how many. measured: how many of them tell a share.
        best: highest share, with `best_run`; None = none told.
        mean, spread: of the share and its standard deviation (0..1); None below two.
        failed: how many failed by the chemist's word.
        is_thin: THIN runs or fewer.
        codes: of its runs, in the order of the book; not part of the JSON.
    """

    carbon_class: str
    leaving_group: str
    reagent: str
    solvent: str
    runs: int
    measured: int
    best: float | None
    best_run: str | None
    mean: float | None
    spread: float | None
    failed: int
    is_thin: bool
    codes: tuple[str, ...] = ()

    def as_dict(self) -> dict[str, Any]:
        """Return plain JSON values."""
        return {name: getattr(self, name) for name in self.__slots__ if name != "codes"}


@dataclass(frozen=True, slots=True, kw_only=True)
class Contradiction:
    """Like flasks that came out differently: the lowest and the highest of `runs` runs."""

    cell: tuple[str, str, str, str]
    low_run: str
    low: float
    high_run: str
    high: float
    runs: int

    def as_dict(self) -> dict[str, Any]:
        """Return plain JSON values."""
        return {
            "cell": list(self.cell),
            "low_run": self.low_run,
            "low": self.low,
            "high_run": self.high_run,
            "high": self.high,
            "runs": self.runs,
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class Coverage(ShowsItself):
    """The record by cells, fullest first; contradictions widest first; experiments most telling first."""

    runs: int
    cells: tuple[Cell, ...]
    contradictions: tuple[Contradiction, ...]
    experiments: tuple[Experiment, ...]

    @property
    def thin(self) -> int:
        """Return how many cells are thin."""
        return sum(c.is_thin for c in self.cells)

    def as_dict(self) -> dict[str, Any]:
        """Return the JSON object of `audit coverage`."""
        return {
            "runs": self.runs,
            "cells": [c.as_dict() for c in self.cells],
            "thin": self.thin,
            "contradictions": [c.as_dict() for c in self.contradictions],
            "experiments": [e.as_dict() for e in self.experiments],
        }


def measure_coverage(
    view: RecordView, planned: Sequence[Plan] = (), experiments: int = 3, progress: Progress | None = None
) -> Coverage:
    """Measure what a book covers.

    Args:
        view: the whole book.
        planned: steps that the group means to run; none = the runs of its last year stand for them.
        experiments: how many to propose.
    """
    progress = progress or Silent()
    table = view.table
    share = wanted_share(table)
    keys = cell_keys(view)
    rows_of: dict[tuple[str, str, str, str], list[int]] = defaultdict(list)
    for row, key in enumerate(keys):
        rows_of[key].append(row)
    progress.advance(1, 3, "cells counted")
    cells = [_cell(table, key, np.array(rows, dtype=np.intp), share) for key, rows in rows_of.items()]
    contradictions = _contradictions(table, rows_of, share)
    progress.advance(2, 3, "contradictions looked for")
    taught = teach_most(view, share, planned, experiments, progress) if experiments else ()
    progress.advance(3, 3, "experiments weighed")
    return Coverage(
        runs=len(table),
        cells=tuple(sorted(cells, key=lambda c: (-c.runs, c.carbon_class, c.leaving_group, c.reagent, c.solvent))),
        contradictions=tuple(sorted(contradictions, key=lambda c: (c.low - c.high, c.low_run))),
        experiments=taught,
    )


def wanted_share(table: FactTable) -> NDArray[np.float64]:
    """Return the share of the wanted fate of each row (n), 0..1; NaN where neither a split nor a yield tells."""
    fate = table.words["fate"].astype(np.intp)
    rows = np.arange(len(table))
    measured = table.shares[rows, np.maximum(fate, 0)] if len(table) else np.zeros(0)
    by_yield = np.clip(table.yield_pct / 100, 0, 1)
    return np.asarray(np.where((fate < 0) | np.isnan(measured), by_yield, np.clip(measured, 0, 1)))


def cell_keys(view: RecordView) -> list[tuple[str, str, str, str]]:
    """Return the cell of each run (n): carbon class, leaving group, nucleophile or base, solvent class."""
    table = view.table
    alike = ProfileTable(view).alike(_FLASK, np.arange(len(table)))
    words = {number: _flask_words(profile) for number, profile in dict(alike).items()}
    flasks = [words[number] for number, _ in alike]
    carbon = [*WORDS["carbon_class"], "not read"]
    leaving = [*WORDS["leaving_group"], "none"]
    nucleophiles = [*table.nucleophile_words, ""]
    return [
        (carbon[c], leaving[g], nucleophiles[n].replace("_", " ") or flask[0], flask[1])
        for c, g, n, flask in zip(
            table.words["carbon_class"].tolist(),
            table.words["leaving_group"].tolist(),
            table.nucleophile.tolist(),
            flasks,
            strict=True,
        )
    ]


def _flask_words(profile: ConditionProfile) -> tuple[str, str]:
    """Return (base or promoter, solvent) of a set of conditions in words."""
    if profile.base_pkah is not None:
        strength = "strong" if profile.base_pkah >= 12 else "weak"
        reagent = f"{strength} base" if profile.base_bulk is None else f"{strength} {profile.base_bulk} base"
    elif profile.acidity in ("weak", "strong"):
        reagent = f"{profile.acidity} acid"
    elif profile.lewis_acid in ("mild", "strong"):
        reagent = f"{profile.lewis_acid} Lewis acid"
    else:
        reagent = "not recorded" if profile.has_unknown_reagent or profile.acidity is None else "none"
    solvent = next((word for word in _COARSE if word in profile.solvent_classes), "")
    return reagent, solvent or "not recorded"


def _cell(table: FactTable, key: tuple[str, str, str, str], rows: NDArray[np.intp], share: NDArray[np.float64]) -> Cell:
    told = rows[~np.isnan(share[rows])]
    best = told[np.argmax(share[told])] if len(told) else None
    failed = WORDS["verdict"].index("failed")
    return Cell(
        carbon_class=key[0],
        leaving_group=key[1],
        reagent=key[2],
        solvent=key[3],
        runs=len(rows),
        measured=len(told),
        best=round(float(share[best]), 3) if best is not None else None,
        best_run=table.codes[best] if best is not None else None,
        mean=round(float(share[told].mean()), 3) if len(told) else None,
        spread=round(float(share[told].std(ddof=1)), 3) if len(told) > 1 else None,
        failed=int((table.words["verdict"][rows] == failed).sum()),
        is_thin=len(rows) <= THIN,
        codes=tuple(table.codes[row] for row in rows),
    )


def _contradictions(
    table: FactTable, rows_of: dict[tuple[str, str, str, str], list[int]], share: NDArray[np.float64]
) -> list[Contradiction]:
    """Find like flasks that disagree: one cell, the same flags, temperature and base within one band."""
    temperature = np.floor(np.nan_to_num(table.numbers["temperature_c"], nan=-999.0) / _BAND_K)
    strength = np.floor(np.nan_to_num(table.numbers["base_pkah"], nan=-99.0) / _BAND_PKAH)
    found = []
    for key, rows in rows_of.items():
        alike: dict[tuple[int, float, float, int], list[int]] = defaultdict(list)
        for row in rows:
            if not np.isnan(share[row]):
                promoter = int(table.words["acidity"][row])
                alike[(int(table.flags[row]), temperature[row], strength[row], promoter)].append(row)
        for group in alike.values():
            low, high = min(group, key=lambda r: share[r]), max(group, key=lambda r: share[r])
            if share[high] - share[low] >= DISAGREES:
                found.append(
                    Contradiction(
                        cell=key,
                        low_run=table.codes[low],
                        low=round(float(share[low]), 3),
                        high_run=table.codes[high],
                        high=round(float(share[high]), 3),
                        runs=len(group),
                    )
                )
    return found

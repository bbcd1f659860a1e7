"""Failures counted one way after another: by quarter, by failure mode, by what reacted and in what.

It owns the counting and keeps the codes behind every count; what counts as a failure is `failing.py`, the classes are
those of `coverage.py`. Runs that do not say how they went are in `runs` and speak nowhere else. Undated runs stand
in no quarter.
"""

from __future__ import annotations

import datetime as dt
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kb.assess.record_view import RecordView
from kb.audit.coverage import cell_keys
from kb.audit.failing import failed_rows, judged_rows

BY_QUARTER, BY_MODE = "quarter", "failure mode"
BY_CLASS = ("carbon class", "leaving group", "nucleophile or base", "solvent class")
MOST_WORDS = 24
"""Words that one way of counting lists at most; the rarer ones are gathered under "other"."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Tallied:
    """One word and what the runs under it did.

    Attributes:
        word: a quarter ("2025-Q2"), a mode or a class.
        runs: how many stand under it.
        failed, fine: codes in the order of the book.
    """

    word: str
    runs: int
    failed: tuple[str, ...]
    fine: tuple[str, ...]

    @property
    def share(self) -> float | None:
        """Return the share that failed of those that say how they went (0..1); None = none says."""
        judged = len(self.failed) + len(self.fine)
        return len(self.failed) / judged if judged else None

    def as_dict(self) -> dict[str, Any]:
        """Return plain JSON values."""
        return {"word": self.word, "runs": self.runs, "failed": list(self.failed), "fine": list(self.fine)}


@dataclass(frozen=True, slots=True, kw_only=True)
class Tally:
    """A book counted.

    Attributes:
        runs, failed: in the book.
        ways: (way of counting, words); quarters in order, all else most failures first. By mode a run with two
            modes counts in both, and `fine` is empty, since a run that worked has no mode.
    """

    runs: int
    failed: int
    ways: tuple[tuple[str, tuple[Tallied, ...]], ...]

    def as_dict(self) -> dict[str, Any]:
        """Return plain JSON values."""
        ways = {way: [t.as_dict() for t in words] for way, words in self.ways}
        return {"runs": self.runs, "failed": self.failed, "by": ways}


def tally_failures(view: RecordView) -> Tally:
    """Count the failures of a book."""
    failed, judged = failed_rows(view), judged_rows(view)
    fine = judged & ~failed
    codes = view.table.codes
    quarters = _gathered(codes, _quarters(view), failed, fine, in_order=True)
    ways = [(BY_QUARTER, quarters), (BY_MODE, _modes(view, failed))]
    keys = cell_keys(view)
    for place, way in enumerate(BY_CLASS):
        ways.append((way, _gathered(codes, [key[place] for key in keys], failed, fine)))
    return Tally(runs=len(codes), failed=int(failed.sum()), ways=tuple(ways))


def _quarters(view: RecordView) -> list[str]:
    words: dict[int, str] = {0: ""}
    for day in np.unique(view.table.date[view.table.date > 0]).tolist():
        date = dt.date.fromordinal(day)
        words[day] = f"{date.year}-Q{(date.month + 2) // 3}"
    return [words[max(day, 0)] for day in view.table.date.tolist()]


def _modes(view: RecordView, failed: NDArray[np.bool_]) -> tuple[Tallied, ...]:
    under: dict[str, list[str]] = {}
    for row in np.flatnonzero(failed).tolist():
        for mode in dict.fromkeys(mode for mode, _ in view.failures[row]) or ("not named",):
            under.setdefault(mode, []).append(view.table.codes[row])
    found = [Tallied(word=word, runs=len(of), failed=tuple(of), fine=()) for word, of in under.items()]
    return tuple(sorted(found, key=lambda t: (-len(t.failed), t.word)))


def _gathered(
    codes: tuple[str, ...],
    words: Iterable[str],
    failed: NDArray[np.bool_],
    fine: NDArray[np.bool_],
    in_order: bool = False,
) -> tuple[Tallied, ...]:
    """Gather runs by their words; "" = stands nowhere."""
    under: dict[str, tuple[list[int], list[str], list[str]]] = {}
    for code, word, lost, well in zip(codes, words, failed.tolist(), fine.tolist(), strict=True):
        if word:
            count, losses, successes = under.setdefault(word, ([0], [], []))
            count[0] += 1
            if lost:
                losses.append(code)
            elif well:
                successes.append(code)
    found = [
        Tallied(word=word, runs=count[0], failed=tuple(losses), fine=tuple(well))
        for word, (count, losses, well) in under.items()
    ]
    if in_order:
        return tuple(sorted(found, key=lambda t: t.word))
    found.sort(key=lambda t: (-len(t.failed), -t.runs, t.word))
    return (
        tuple(found)
        if len(found) <= MOST_WORDS
        else (*found[: MOST_WORDS - 1], _others(found[MOST_WORDS - 1 :]))
    )


def _others(rest: list[Tallied]) -> Tallied:
    return Tallied(
        word=f"{len(rest)} others",
        runs=sum(t.runs for t in rest),
        failed=tuple(code for t in rest for code in t.failed),
        fine=tuple(code for t in rest for code in t.fine),
    )

"""The desk's questions about the record as a whole: asked in a process of their own, answered to a worker thread.

It owns which of `kb.book` answers which question of `tui.ports`; how books are lent is the desk's. Only `adopt` writes.
"""

from __future__ import annotations

from collections.abc import Callable
from contextlib import AbstractContextManager
from dataclasses import replace
from typing import TYPE_CHECKING, Any

from kb.progress import Progress

if TYPE_CHECKING:
    from kb.audit.calibration import Calibration
    from kb.audit.coverage import Coverage
    from kb.audit.recurrence_values import Proposal, Recurrence
    from kb.audit.replay_report import ReplayReport
    from kb.audit.tally import Tally
    from kb.book import Book

    Lending = Callable[[], AbstractContextManager[Book]]


class WholeRecord:
    """What a desk answers about its whole book."""

    def __init__(self, address: str, lend_for_looking: Lending, lend_for_writing: Lending) -> None:
        self._address = address
        self._lend_for_looking = lend_for_looking
        self._lend_for_writing = lend_for_writing

    def recurring(self, progress: Progress) -> Recurrence:
        """Return what keeps going wrong."""
        found: Recurrence = self._ask_beside("recurring", progress)
        return found

    def tally(self, progress: Progress) -> Tally:
        """Return the failures counted by quarter, mode and class."""
        tally: Tally = self._ask_beside("tally", progress)
        return tally

    def replay(self, progress: Progress) -> ReplayReport:
        """Return each run checked against the record of its morning; one that was stopped is taken up."""
        report: ReplayReport = self._ask_beside("replay", progress)
        return report

    def coverage(self, progress: Progress) -> Coverage:
        """Return what the record covers."""
        coverage: Coverage = self._ask_beside("coverage", progress)
        return coverage

    def calibration(self, progress: Progress) -> Calibration:
        """Return how well estimates hold."""
        found: Calibration = self._ask_beside("calibration", progress)
        return found

    def _ask_beside(self, question: str, progress: Progress) -> Any:
        from kb.book import ask_beside
        from kb.paths import replays_folder

        return ask_beside(self._address, question, progress, replays_folder())

    def adopt(self, proposal: Proposal, title: str, why: str, who: str) -> str:
        """Adopt a proposed house rule under a title and a reason; return its id."""
        from kb.book import adopt_proposal

        worded = replace(proposal, rule=replace(proposal.rule, title=title, why=why))
        with self._lend_for_writing() as book:
            return adopt_proposal(book, worded, who=who).rule_id

    def markdown(self, audit: object) -> str:
        """Return an audit as Markdown to hand round."""
        from kb.book import markdown_of

        with self._lend_for_looking() as book:
            return markdown_of(book, audit)

"""Invented audits for the interface's tests: values of the real kinds, figures that stand for nothing.

`FakeAudits` answers at once, or, while `hold` is set, reports progress until it is let go or asked to stop.
"""

from __future__ import annotations

import datetime as dt
import threading
from dataclasses import replace
from typing import Any

from kb.assess.house_rules import RuleTrial
from kb.audit.calibration import Calibration, MainShare, Measure, ReliabilityRow
from kb.audit.coverage import Cell, Contradiction, Coverage
from kb.audit.recurrence_values import Cluster, Proposal, Recurrence
from kb.audit.replay import Hindsight
from kb.audit.replay_report import ReplayReport, report_replay
from kb.audit.tally import Tallied, Tally
from kb.audit.teaching import Experiment
from kb.errors import Cancelled, SidepathError
from kb.progress import Progress
from kb.store.values import HouseRule
from kb.vocabulary import Severity

ETHER = "CC(C)(C)OCCCBr"
"""Holds a tertiary alkyl ether at atoms 1, 4 and 5."""


def a_cluster(**changes: Any) -> Cluster:
    """Return an invented kind of failure: ethers lost in acid."""
    cluster = Cluster(
        name="group-loss/tertiary-alkyl-ether",
        mode="group-loss",
        meaning="a labile group elsewhere was lost",
        place="tertiary alkyl ether",
        smarts="[CX4][OX2][CX4;H0]",
        conditions="a strong acid is present",
        runs=("R-0001", "R-0004", "R-0007"),
        first=dt.date(2025, 2, 3),
        last=dt.date(2025, 11, 20),
        quarters=(("2025-Q1", 1), ("2025-Q4", 2)),
        projects=(("Larch", 2), ("Tern", 1)),
        lost_mmol=12.5,
        lost_mmol_runs=2,
        days=3.5,
        days_runs=3,
        repeats=(("R-0004", "R-0001"), ("R-0007", "R-0001")),
        came_through=("R-0002", "R-0003"),
        covered_by=(),
        proposal=a_proposal(),
        example=(ETHER, (1, 4, 5)),
        foreseeable=True,
    )
    return replace(cluster, **changes)


def a_proposal() -> Proposal:
    """Return an invented rule with two hits and a false alarm."""
    rule = HouseRule(
        title="Group loss at tertiary alkyl ether",
        motif="[CX4][OX2][CX4;H0]",
        when="acidity >= strong",
        severity=Severity.SERIOUS,
        why="In 3 runs of this book: a labile group elsewhere was lost.",
        author="audit",
    )
    trial = RuleTrial(
        hits=("R-0001", "R-0004"), false_alarms=("R-0002",), undecided=("R-0005",), failures_in_book=6
    )
    return Proposal(rule=rule, trial=trial)


def a_recurrence(adopted: str = "") -> Recurrence:
    """Return three kinds of failure; the first is covered where a rule was adopted for it."""
    ether = a_cluster()
    if adopted:
        ether = a_cluster(covered_by=((adopted, 3),), proposal=None)
    alkene = a_cluster(
        name="elimination/secondary-halide",
        mode="elimination",
        meaning="alkene formed where substitution was wanted",
        place="secondary carbon bearing a halide or sulfonate",
        smarts="[CX4;H1][Br]",
        conditions="the temperature is 70 °C or more",
        runs=("R-0008", "R-0009", "R-0010", "R-0011"),
        last=dt.date(2025, 6, 1),
        lost_mmol=4.0,
        covered_by=(("hot-sulfonates-abcd", 2),),
        example=("CCC(C)Br", (2, 4)),
    )
    hand = a_cluster(
        name="emulsion/hand",
        mode="emulsion",
        meaning="layers did not part",
        place="the work-up or the bottle, not the molecule",
        smarts="",
        conditions="",
        runs=("R-0005", "R-0006"),
        first=None,
        last=None,
        projects=(),
        lost_mmol=0.0,
        lost_mmol_runs=0,
        days_runs=0,
        repeats=(),
        came_through=(),
        proposal=None,
        example=("CCBr", ()),
        foreseeable=False,
    )
    return Recurrence(clusters=(ether, alkene, hand), runs=12, failures=9, in_clusters=9, unplaced=0)


def a_tally() -> Tally:
    """Return counts in two ways."""
    quarters = (
        Tallied(word="2025-Q1", runs=5, failed=("R-0001", "R-0005"), fine=("R-0002", "R-0003")),
        Tallied(word="2025-Q2", runs=7, failed=("R-0008", "R-0009", "R-0010"), fine=("R-0012",)),
    )
    modes = (
        Tallied(word="elimination", runs=4, failed=("R-0008", "R-0009", "R-0010", "R-0011"), fine=()),
        Tallied(word="group-loss", runs=3, failed=("R-0001", "R-0004", "R-0007"), fine=()),
    )
    classes = (Tallied(word="secondary", runs=12, failed=("R-0001", "R-0008"), fine=("R-0002",)),)
    return Tally(
        runs=12, failed=9, ways=(("quarter", quarters), ("failure mode", modes), ("carbon class", classes))
    )


def a_replay(stopped: bool = False) -> ReplayReport:
    """Return a replay of eight runs, counted by the real counting."""
    told = (
        ("R-0001", True, False, 0.2),
        ("R-0002", False, False, 0.1),
        ("R-0003", False, True, 0.6),
        ("R-0004", True, True, 0.8),
        ("R-0007", True, True, 0.9),
        ("R-0008", True, False, 0.3),
        ("R-0009", True, True, 0.7),
        ("R-0012", False, False, 0.2),
    )
    runs = [
        Hindsight(
            run=run,
            date=dt.date(2025, 1 + number, 5),
            failed=failed,
            modes=("elimination",) if failed else (),
            warned=warned,
            by_record=warned,
            worry=worry,
            findings=(("n-boc-strong-acid", "serious"),) if warned else (),
            precedents=("R-0001",) if warned and failed else (),
        )
        for number, (run, failed, warned, worry) in enumerate(told)
    ]
    return report_replay(runs[:4] if stopped else runs, undated=1, stopped=stopped)


def a_coverage() -> Coverage:
    """Return three cells, one thin, one torn, and an experiment."""

    def cell(carbon: str, runs: tuple[str, ...], best: float | None) -> Cell:
        return Cell(
            carbon_class=carbon,
            leaving_group="bromide",
            reagent="azide",
            solvent="polar-aprotic",
            runs=len(runs),
            measured=len(runs),
            best=best,
            best_run=runs[0] if best is not None else None,
            mean=None if best is None else best - 0.1,
            spread=0.08 if len(runs) > 1 else None,
            failed=len(runs) // 2,
            is_thin=len(runs) <= 2,
            codes=runs,
        )

    return Coverage(
        runs=12,
        cells=(
            cell("secondary", ("R-0001", "R-0002", "R-0003", "R-0004"), 0.9),
            cell("primary", ("R-0005", "R-0006", "R-0007"), 0.97),
            cell("tertiary", ("R-0008",), None),
        ),
        contradictions=(
            Contradiction(
                cell=("secondary", "bromide", "azide", "polar-aprotic"),
                low_run="R-0002",
                low=0.2,
                high_run="R-0001",
                high=0.9,
                runs=4,
            ),
        ),
        experiments=(
            Experiment(
                like="R-0008",
                scheme="CC(C)(C)Br>>CC(C)(C)N=[N+]=[N-]",
                words="tertiary, bromide, azide, aprotic solvent, 25 °C",
                gain=0.02,
                share_of_total=0.1,
                serves=2,
                before=0.2,
                after=0.15,
                precedents=1.1,
                why="1.1 effective runs disagree by some 20 points (invented).",
            ),
        ),
    )


def a_calibration() -> Calibration:
    """Return a calibration on four runs."""
    shares = (
        MainShare(run="R-0001", expected=0.9, low=0.7, high=0.95, found=0.85, precedents=4.0),
        MainShare(run="R-0002", expected=0.85, low=0.7, high=0.95, found=0.2, precedents=2.0),
        MainShare(run="R-0003", expected=0.5, low=0.3, high=0.7, found=0.6, precedents=0.5),
        MainShare(run="R-0004", expected=1.0, low=0.8, high=1.0, found=0.9, precedents=12.0),
    )
    measure = Measure(
        runs=4, error=22.5, same_class_error=30.0, all_runs_error=31.0, coverage=0.75, width=31.0
    )
    return Calibration(
        runs=12,
        asked=4,
        with_substrate=False,
        level=0.8,
        main_share=measure,
        all_shares_error=20.0,
        main_fate_right=0.75,
        yields=replace(measure, error=None, coverage=None),
        reliability=(
            ReliabilityRow(low=0.4, high=0.6, runs=1, expected=0.5, measured=0.6, coverage=1.0),
            ReliabilityRow(low=0.8, high=1.0, runs=3, expected=0.92, measured=0.65, coverage=0.67),
        ),
        by_support=(
            (0.25, 1.0, 1, 10.0),
            (1.0, 3.0, 1, 65.0),
            (3.0, 10.0, 1, 5.0),
            (10.0, float("inf"), 1, 10.0),
        ),
        main_shares=shares,
    )


class FakeAudits:
    """The audits of a fake book; `asked` counts the questions by kind."""

    broken: dict[str, BaseException]

    def __init__(self) -> None:
        self.hold: threading.Event | None = None
        self.asked: list[str] = []
        self.adopted: list[tuple[str, str, str]] = []

    def _answer(self, kind: str, progress: Progress, answer: Any, part: Any = None) -> Any:
        self.asked.append(kind)
        if kind in self.broken:
            raise self.broken[kind]
        progress.advance(0, 12, "runs looked at")
        while self.hold is not None and not self.hold.wait(0.01):
            progress.advance(5, 12, "runs looked at")
            if progress.cancelled():
                if part is not None:
                    return part
                raise Cancelled("The audit was stopped.", "Nothing was changed.")
        return answer

    def recurring(self, progress: Progress) -> Recurrence:
        found: Recurrence = self._answer(
            "recurring", progress, a_recurrence("ethers-wxyz" if self.adopted else "")
        )
        return found

    def tally(self, progress: Progress) -> Tally:
        tally: Tally = self._answer("tally", progress, a_tally())
        return tally

    def replay(self, progress: Progress) -> ReplayReport:
        report: ReplayReport = self._answer("replay", progress, a_replay(), a_replay(stopped=True))
        return report

    def coverage(self, progress: Progress) -> Coverage:
        coverage: Coverage = self._answer("coverage", progress, a_coverage())
        return coverage

    def calibration(self, progress: Progress) -> Calibration:
        found: Calibration = self._answer("calibration", progress, a_calibration())
        return found

    def adopt(self, proposal: Proposal, title: str, why: str, who: str) -> str:
        if "adopt" in self.broken:
            raise self.broken["adopt"]
        if title == "refused":
            raise SidepathError("This rule cannot be kept.", "Change its words.")
        self.adopted.append((title, why, who))
        return "ethers-wxyz"

    def markdown(self, audit: object) -> str:
        return f"## {type(audit).__name__} (invented)"

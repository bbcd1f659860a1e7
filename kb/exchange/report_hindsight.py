"""Pages of the record held against itself: hindsight replay and calibration.

It owns what is said of each and in which order: the answer first, then the figures behind it. Nobody is named on them.
"""

from __future__ import annotations

from kb.audit.calibration import Calibration
from kb.audit.replay_report import ReplayReport
from kb.exchange.report_blocks import Block, Page, Section, Table, Words
from kb.exchange.report_plots import curve, interval_bars, stacked_columns
from kb.exchange.report_words import counted, interval_words

MOST_MISSED = 40
ENOUGH = 5
"""Runs from which a point of a plot says something."""


def replay_page(report: ReplayReport, source: str = "") -> Page:
    """Lay out a replay."""
    lead = (
        f"Checked against what stood in the book that morning, {report.warned} of "
        f"{counted(report.failures, 'failure')} would have been warned of, {report.warned_by_record} of them by "
        f"recorded losses or house rules; {report.false_alarms} of "
        f"{counted(report.successes, 'success', 'successes')} too."
    )
    if report.stopped:
        lead = "Stopped before the end. " + lead
    bars = [
        (name, interval)
        for name, interval in (
            ("failures warned of", report.recall),
            ("warnings that were right", report.precision),
            ("successes warned of", report.false_alarm_share),
        )
        if interval is not None
    ]
    modes = Table(
        caption="By failure mode (a run with two modes counts in both)",
        header=("Mode", "Failures", "Warned of", "Share, 80 % interval"),
        rows=tuple(
            (m.mode.replace("-", " "), str(m.failures), str(m.warned), interval_words(m.share)) for m in report.by_mode
        ),
        figures=(1, 2, 3),
    )
    periods = report.periods
    over_time: tuple[Block, ...] = (
        stacked_columns(
            "Failures by quarter",
            [p.name for p in periods],
            [p.warned for p in periods],
            [p.failures - p.warned for p in periods],
            ("warned of", "missed"),
        ),
        stacked_columns(
            "Successes by quarter",
            [p.name for p in periods],
            [p.false_alarms for p in periods],
            [p.successes - p.false_alarms for p in periods],
            ("warned of all the same", "left in peace"),
        ),
    )
    points = [(p.false_alarm_share, p.recall) for p in report.curve]
    now = (report.false_alarm_share.mean, report.recall.mean) if report.recall and report.false_alarm_share else None
    rows = tuple(
        (
            f"{p.threshold:.2f}",
            f"{100 * p.recall:.0f} %",
            "none" if p.precision is None else f"{100 * p.precision:.0f} %",
            str(p.false_alarms),
        )
        for p in report.curve[:: max(1, len(report.curve) // 12)]
    )
    missed = [r for r in report.runs if r.failed and not r.warned]
    return Page(
        title="Would the record have told us?",
        kind="hindsight replay",
        lead=lead,
        sections=(
            Section(heading="In all", blocks=(interval_bars("With 80 % intervals", bars),) if bars else ()),
            Section(heading="By failure mode", blocks=(modes,)),
            Section(heading="Over time", blocks=over_time if periods else ()),
            Section(
                heading="Other thresholds",
                blocks=(
                    curve(
                        "Failures warned of against successes warned of",
                        points,
                        "successes warned of",
                        "failures warned of",
                        now,
                    ),
                    Words(
                        text="The ring is the rule in use: a liability, resemblance or house rule of caution or more.",
                        tone="quiet",
                    ),
                    Table(
                        caption="What a threshold on the worry would do",
                        header=("Worry from", "Failures warned of", "Warnings right", "False alarms"),
                        rows=rows,
                        figures=(0, 1, 2, 3),
                    ),
                ),
            ),
            Section(
                heading="Missed",
                blocks=(
                    Words(
                        text=", ".join(f"{r.run} ({', '.join(r.modes) or 'no mode'})" for r in missed[:MOST_MISSED])
                        + (f" and {len(missed) - MOST_MISSED} more" if len(missed) > MOST_MISSED else "")
                        or "None."
                    ),
                ),
            ),
        ),
        source=source
        + (
            f" {report.undated} undated and {report.unjudged} unjudged runs are left out."
            if report.undated or report.unjudged
            else ""
        ),
    )


def calibration_page(found: Calibration, source: str = "") -> Page:
    """Lay out how well the estimates hold."""
    rows = found.reliability
    table = Table(
        caption="Main share, by what was expected",
        header=("Expected", "Runs", "Mean expected", "Mean found", "Inside their interval"),
        rows=tuple(
            (
                f"{100 * r.low:.0f} to {100 * r.high:.0f} %",
                str(r.runs),
                f"{100 * r.expected:.0f} %",
                f"{100 * r.measured:.0f} %",
                f"{100 * r.coverage:.0f} %",
            )
            for r in rows
        ),
        figures=(1, 2, 3, 4),
    )
    support = Table(
        caption="Error of the main share, by effective precedents",
        header=("Precedents", "Runs", "Error [points]"),
        rows=tuple(
            (f"{low:g} to {high:g}" if high < float("inf") else f"above {low:g}", str(n), f"{error:.1f}")
            for low, high, n, error in found.by_support
        ),
        figures=(1, 2),
    )
    points = [(r.expected, r.measured) for r in rows if r.runs >= ENOUGH]
    plots: tuple[Block, ...] = (
        (curve("Found against expected; on the diagonal they agree", points, "expected", "found", diagonal=True), table)
        if rows
        else ()
    )
    return Page(
        title="How far to trust the estimates",
        kind="calibration",
        lead=found.words[0],
        sections=(
            Section(heading="In words", blocks=tuple(Words(text=words) for words in found.words[1:])),
            *((Section(heading="Expected and found", blocks=plots),) if plots else ()),
            *((Section(heading="With few and with many precedents", blocks=(support,)),) if found.by_support else ()),
        ),
        source=source,
    )

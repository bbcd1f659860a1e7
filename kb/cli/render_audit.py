"""Audits and routes as text for a terminal: the answer first, then the figures behind it.

It owns what a terminal shows of them; the pages (`--html`) show all. Everything that came from a person is made safe
by the functions of `render`.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from kb.audit.sayings import (
    say_cluster,
    say_coverage,
    say_experiment,
    say_projects,
    say_recurrence,
    say_replay,
    say_rule,
    say_trial,
)
from kb.cli.render import bar, heading, severity_word, table, wrapped
from kb.route.worth import figure_words
from kb.vocabulary import Severity

if TYPE_CHECKING:
    from kb.audit.calibration import Calibration
    from kb.audit.coverage import Coverage
    from kb.audit.recurrence_values import Cluster, Recurrence
    from kb.audit.replay_report import ReplayReport
    from kb.record.finding import Interval
    from kb.route.entries import Ledger

FEW = 8
"""Clusters shown without --verbose."""


def render_recurring(found: Recurrence, *, verbose: bool = False) -> str:
    """Return the recurring failures, costliest first, numbered for `--adopt`."""
    lines = wrapped(say_recurrence(found))
    shown = found.clusters if verbose else found.clusters[:FEW]
    for number, cluster in enumerate(shown, 1):
        lines += ["", *_cluster(cluster, number, verbose=verbose)]
    left = len(found.clusters) - len(shown)
    if left:
        lines += ["", f"and {left} more: --verbose shows all, --html FILE draws them"]
    return "\n".join(lines)


def _cluster(c: Cluster, number: int, *, verbose: bool) -> list[str]:
    lines = wrapped(c.title, 4, first=f"{number:>2}  ")
    for words in say_cluster(c):
        lines += wrapped(words, 4)
    if c.proposal is not None:
        lines += wrapped(say_rule(c.proposal), 4)
        lines += wrapped(f"{say_trial(c.proposal)}; adopt it with --adopt {number}", 4)
    if verbose:
        lines += wrapped(say_projects(c), 4)
        lines += wrapped("runs: " + ", ".join(c.runs), 4)
    return lines


def render_replay(report: ReplayReport, *, verbose: bool = False) -> str:
    """Return what a replay came to."""
    lines = ["Stopped before the end; these are the runs that were checked.", ""] if report.stopped else []
    lines += wrapped(say_replay(report))
    lines += ["", heading("With 80 % intervals")]
    for name, share in (
        ("failures warned of", report.recall),
        ("warnings that were right", report.precision),
        ("successes warned of", report.false_alarm_share),
    ):
        if share is not None:
            lines.append(f"  {name:<26}{bar(share.mean):<20}  {_share(share)}")
    lines += ["", heading("By failure mode")]
    rows = [(m.mode.replace("-", " "), str(m.failures), str(m.warned), _share(m.share)) for m in report.by_mode]
    lines += table(rows, ("mode", "failures", "warned of", "share"), (20, 8, 9, 24))
    lines += ["", heading("Over time")]
    periods = [(p.name, str(p.failures), str(p.warned), str(p.successes), str(p.false_alarms)) for p in report.periods]
    lines += table(periods, ("quarter", "failures", "warned of", "successes", "false alarms"), (8, 8, 9, 9, 12))
    lines += ["", heading("Other thresholds on the worry")]
    points = report.curve if verbose else report.curve[:: max(1, len(report.curve) // 10)]
    thresholds = [
        (
            f"{p.threshold:.2f}",
            f"{100 * p.recall:.0f} %",
            "none" if p.precision is None else f"{100 * p.precision:.0f} %",
            str(p.false_alarms),
        )
        for p in points
    ]
    lines += table(thresholds, ("from", "failures warned", "warnings right", "false alarms"), (6, 15, 14, 12))
    if verbose:
        missed = [f"{r.run} ({', '.join(r.modes)})" for r in report.runs if r.failed and not r.warned]
        lines += ["", *wrapped("Missed: " + (", ".join(missed) or "none"))]
    if report.undated or report.unjudged:
        lines += ["", *wrapped(f"Left out: {report.undated} undated, {report.unjudged} that do not say how they went.")]
    return "\n".join(lines)


def render_coverage(coverage: Coverage, *, verbose: bool = False) -> str:
    """Return the cells, contradictions and experiments."""
    lines = wrapped(say_coverage(coverage))
    lines += ["", heading("Experiments that would teach most")]
    for number, e in enumerate(coverage.experiments, 1):
        what, why = say_experiment(e)
        lines += wrapped(what, 5, first=f"{number:>3}  ")
        lines += wrapped(why, 5)
    if coverage.contradictions:
        lines += ["", heading("Like flasks that disagree")]
        for c in coverage.contradictions if verbose else coverage.contradictions[:FEW]:
            lines += wrapped(
                f"{', '.join(c.cell)}: {100 * c.low:.0f} % ({c.low_run}) against {100 * c.high:.0f} % ({c.high_run})", 2
            )
    lines += ["", heading("Fullest combinations")]
    rows = [
        (
            c.carbon_class,
            c.leaving_group,
            c.reagent,
            c.solvent,
            str(c.runs),
            "" if c.best is None else f"{100 * c.best:.0f} %",
            "" if c.mean is None else f"{100 * c.mean:.0f}" + ("" if c.spread is None else f"±{100 * c.spread:.0f}"),
        )
        for c in (coverage.cells if verbose else coverage.cells[:20])
    ]
    header = ("carbon", "leaving", "reagent", "solvent", "runs", "best", "mean")
    return "\n".join([*lines, *table(rows, header, (10, 12, 16, 13, 4, 5, 7))])


def render_calibration(found: Calibration) -> str:
    """Return how well the estimates hold."""
    lines = [line for words in found.words for line in wrapped(words)]
    if found.reliability:
        lines += ["", heading("Main share: expected against found")]
        rows = [
            (
                f"{100 * r.low:.0f} to {100 * r.high:.0f} %",
                str(r.runs),
                f"{100 * r.expected:.0f} %",
                f"{100 * r.measured:.0f} %",
                f"{100 * r.coverage:.0f} %",
            )
            for r in found.reliability
        ]
        lines += table(rows, ("expected", "runs", "mean", "found", "inside their interval"), (12, 5, 6, 6, 22))
    if found.by_support:
        lines += ["", heading("Error by effective precedents")]
        support = [
            (f"{low:g} to {high:g}" if high < float("inf") else f"above {low:g}", str(n), f"{error:.1f}")
            for low, high, n, error in found.by_support
        ]
        lines += table(support, ("precedents", "runs", "points"), (14, 5, 8))
    return "\n".join(lines)


def render_route(ledger: Ledger, lead: str, *, verbose: bool = False) -> str:
    """Return a ledger: the answer, the steps, what goes in."""
    lines = [heading(ledger.route.title), *wrapped(lead, 2), "", heading("Steps")]
    for number, e in enumerate(ledger.entries, 1):
        y = e.step.yield_pct
        lines += wrapped(f"{e.step.name}: {_percent(y.pct)} ({y.basis}: {y.note})", 5, first=f"{number:>3}  ")
        flow = f"{figure_words(e.input_mmol)} mmol in, {figure_words(e.product_mmol)} mmol out"
        lines += wrapped(f"{flow}; {e.so_far_pct:.3g} % so far", 5)
        if e.step.forgiven:
            lines += wrapped(f"a poor yield does not matter: {', '.join(e.step.forgiven)}", 5)
        if e.improvement is not None and (verbose or not e.step.forgiven):
            i = e.improvement
            lines += wrapped(f"at {i.at_pct:.3g} % the route would save {figure_words(i.saves)} {i.unit}", 5)
        for severity, title in e.step.findings if verbose else e.step.findings[:2]:
            lines += wrapped(title, 13, first=f"     {severity_word(Severity(severity))} ")
    lines += ["", heading("Material, at the mean yields and between")]
    for need in ledger.needed:
        grams = f", {figure_words(need.grams)} g" if need.grams is not None else ""
        cost = f", {figure_words(need.cost)} {ledger.route.money}".rstrip() if need.cost is not None else ""
        between = f"{figure_words(need.low)} to {figure_words(need.high)}"
        lines += wrapped(f"{need.material}: {figure_words(need.mmol)} mmol ({between}){grams}{cost}", 2)
    if ledger.counted_pct is not None:
        lines += wrapped(f"Without the steps where yield does not matter: {ledger.counted_pct:.3g} % overall.", 2)
    if ledger.unpriced:
        lines += wrapped(f"No price, so not in the cost: {', '.join(ledger.unpriced)}.", 2)
    closed = _percent(ledger.closed_form_pct)
    lines += ["", *wrapped(f"In closed form {closed}; sampling error {ledger.sampling_error_pct:.2g} points.")]
    return "\n".join(lines)


def _share(interval: Interval | None) -> str:
    if interval is None:
        return ""
    return f"{100 * interval.mean:.0f} % ({100 * interval.low:.0f} to {100 * interval.high:.0f})"


def _percent(interval: Interval) -> str:
    if interval.low == interval.high:
        return f"{interval.mean:.3g} %"
    return f"{interval.mean:.3g} % ({interval.low:.3g} to {interval.high:.3g})"

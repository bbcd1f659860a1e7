"""The sentences of an audit: what every front end says of clusters, replays, coverage and experiments.

It owns the wording, so that the command line, the terminal interface and whoever comes next say the same of the same
figures; laying out is theirs. The answer comes first, and nobody is named.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from kb.plain import counted

if TYPE_CHECKING:
    from kb.audit.coverage import Coverage
    from kb.audit.recurrence_values import Cluster, Proposal, Recurrence
    from kb.audit.replay_report import ReplayReport
    from kb.audit.teaching import Experiment


def say_recurrence(found: Recurrence) -> str:
    """Return how many failures there are, and how many of them recur."""
    since = f" since {found.since}" if found.since else ""
    return (
        f"{counted(found.failures, 'failure')}{since} in {counted(found.runs, 'run')}; {found.in_clusters} of them "
        f"recur, as {counted(len(found.clusters), 'kind')}. {found.unplaced} do not say what was hit."
    )


def say_cluster(c: Cluster) -> tuple[str, ...]:
    """Return what is known of a cluster beside its title: how often and when, cost, earlier records, house rules."""
    span = f"{c.first} to {c.last}" if c.first else "not dated"
    lines = [f"{counted(len(c.runs), 'run')}, {span}; {len(c.came_through)} came through at the same place"]
    cost = []
    if c.lost_mmol_runs:
        cost.append(f"{c.lost_mmol:.3g} mmol lost over the {c.lost_mmol_runs} that record a scale")
    if c.days_runs:
        cost.append(f"{c.days:.3g} days of reaction time")
    if cost:
        lines.append("; ".join(cost))
    if c.repeats:
        run, earlier = c.repeats[-1]
        lines.append(f"{len(c.repeats)} had an earlier record (the last: {run} after {earlier})")
    if c.covered_by:
        lines.append("house rules: " + ", ".join(f"{rule} warns of {n}" for rule, n in c.covered_by))
    return tuple(lines)


def say_projects(c: Cluster) -> str:
    """Return the projects of a cluster with their counts."""
    return "projects: " + (", ".join(f"{project} {n}" for project, n in c.projects) or "not recorded")


def say_rule(proposal: Proposal) -> str:
    """Return a proposed rule in its own words."""
    rule = proposal.rule
    return f"proposed rule: when {rule.when}" + (f"; motif {rule.motif}" if rule.motif else "")


def say_trial(proposal: Proposal) -> str:
    """Return what a proposed rule would have done on the whole book."""
    trial = proposal.trial
    return (
        f"on this book it warns of {counted(len(trial.hits), 'failure')}, with "
        f"{counted(len(trial.false_alarms), 'false alarm')}"
    )


def say_replay(report: ReplayReport) -> str:
    """Return what a replay came to."""
    return (
        f"Each of {counted(len(report.runs), 'run')} was checked against what stood in the book that morning. "
        f"{report.warned} of {counted(report.failures, 'failure')} would have been warned of "
        f"({report.warned_by_record} by recorded losses or house rules), {report.missed} not; "
        f"{report.false_alarms} of {counted(report.successes, 'success', 'successes')} would have been warned of too."
    )


def say_coverage(coverage: Coverage) -> str:
    """Return how much of what there is to cover the record covers."""
    return (
        f"{counted(coverage.runs, 'run')} in {counted(len(coverage.cells), 'combination')}; {coverage.thin} hold two "
        f"runs or fewer, {len(coverage.contradictions)} contradict themselves."
    )


def say_experiment(e: Experiment) -> tuple[str, str]:
    """Return what an experiment is, and why it would teach much."""
    like = f" (like {e.like})" if e.like else ""
    doubt = f"Its own doubt: ±{100 * e.before:.0f} points now, ±{100 * e.after:.0f} after."
    return e.words + like, f"{e.why} {doubt}"

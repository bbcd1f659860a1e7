"""The record as a whole as cells, lines and groups of runs: what the place *failures* says, pure and without widgets.

Sentences that the command line says too come from `kb.audit.sayings`. `Behind` is what stands behind a figure: named
groups of run codes, each with a note per run where there is something to say. Nobody is named and nobody is ranked.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from kb.audit.sayings import say_cluster, say_projects, say_rule, say_trial
from kb.plain import counted
from tui.present import safe, words_of

if TYPE_CHECKING:
    from kb.audit.calibration import Calibration, MainShare
    from kb.audit.coverage import Cell, Contradiction, Coverage
    from kb.audit.recurrence_values import Cluster
    from kb.audit.replay import Hindsight
    from kb.audit.replay_report import CurvePoint, ReplayReport
    from kb.audit.tally import Tallied, Tally
    from kb.record.finding import Interval


@dataclass(frozen=True, slots=True, kw_only=True)
class RunGroup:
    """Some runs under a heading; `notes` is empty or holds one note for each."""

    title: str
    codes: tuple[str, ...]
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Behind:
    """The runs behind a figure; groups without a run are left out."""

    title: str
    groups: tuple[RunGroup, ...]


def behind(title: str, *groups: RunGroup) -> Behind | None:
    """Return what stands behind a figure, None where no run does."""
    held = tuple(group for group in groups if group.codes)
    return Behind(title=title, groups=held) if held else None


# what recurs

ORDERS: tuple[tuple[str, Callable[[Cluster], object]], ...] = (
    ("material lost", lambda c: (-c.lost_mmol, -len(c.runs), c.name)),
    ("how often", lambda c: (-len(c.runs), c.name)),
    ("latest", lambda c: (-c.last.toordinal() if c.last else 0, c.name)),
)


def rule_word(c: Cluster) -> str:
    """Return how a cluster stands to the house rules: "covered", "in part", "proposed" or "none"."""
    if c.covered_by:
        return "covered" if c.covered_by[0][1] >= len(c.runs) else "in part"
    return "proposed" if c.proposal is not None else "none"


def cluster_cells(c: Cluster) -> tuple[str, ...]:
    """Return a row: mode, place, conditions, runs, how many had an earlier record, material lost, latest, rule."""
    return (
        words_of(c.mode),
        safe(c.place),
        safe(c.conditions.removeprefix("the ")) or "any",
        str(len(c.runs)),
        str(len(c.repeats)),
        f"{c.lost_mmol:.3g}" if c.lost_mmol_runs else "",
        f"{c.last:%Y-%m}" if c.last else "",
        rule_word(c),
    )


def cluster_lines(c: Cluster) -> tuple[str, ...]:
    """Return what the runs of a cluster share, what they cost, and what might be done, a sentence each."""
    meaning = f"{c.meaning[:1].upper()}{c.meaning[1:]}."
    shared = f"They share: {c.place}" + (
        f"; {c.conditions}" if c.conditions else "; no condition tells them apart"
    )
    lines = [meaning, f"{shared}.", *(f"{words[:1].upper()}{words[1:]}." for words in say_cluster(c))]
    lines.append(
        f"{say_projects(c).capitalize()}." if not c.projects else f"Projects: {say_projects(c)[10:]}."
    )
    if not c.covered_by:
        lines.append("No house rule covers it.")
    if c.proposal is not None:
        rule, trial = say_rule(c.proposal), say_trial(c.proposal)
        lines.append(f"{rule[:1].upper()}{rule[1:]}; {trial}.")
    return tuple(safe(line) for line in lines)


def cluster_behind(c: Cluster) -> Behind | None:
    """Return the runs behind every figure of a cluster."""
    earlier = dict(c.repeats)
    groups = [
        RunGroup(
            title="went wrong so",
            codes=c.runs,
            notes=tuple(f"after {earlier[run]}" if run in earlier else "" for run in c.runs),
        ),
        RunGroup(
            title="had an earlier record",
            codes=tuple(run for run, _ in c.repeats),
            notes=tuple(f"after {before}" for _, before in c.repeats),
        ),
        RunGroup(title="came through there", codes=c.came_through),
    ]
    if c.proposal is not None:
        trial = c.proposal.trial
        groups += [
            RunGroup(title="failures the rule warns of", codes=trial.hits),
            RunGroup(title="false alarms of the rule", codes=trial.false_alarms),
            RunGroup(title="the rule cannot tell", codes=trial.undecided),
        ]
    return behind(c.title, *groups)


# when and where


def tally_word(t: Tallied) -> str:
    """Return the word of a count as it is read: a quarter as it stands, a controlled word without hyphens."""
    return t.word if t.word[:1].isdigit() else words_of(t.word)


def tally_cells(t: Tallied) -> tuple[str, ...]:
    """Return a row: word, failures, runs, share that failed."""
    share = t.share if t.fine or len(t.failed) < t.runs else None
    return (
        tally_word(t),
        str(len(t.failed)),
        str(t.runs),
        "" if share is None else f"{100 * share:.0f} %",
    )


def tally_behind(way: str, t: Tallied) -> Behind | None:
    """Return the runs of one count."""
    return behind(
        f"{way.capitalize()}: {tally_word(t)}",
        RunGroup(title="failed", codes=t.failed),
        RunGroup(title="came through", codes=t.fine),
    )


def say_tally(tally: Tally) -> str:
    """Return how much of a book failed."""
    return (
        f"{counted(tally.failed, 'failure')} in {counted(tally.runs, 'run')}. What the chemist called failed, or "
        "partly with something named that went wrong, counts as a failure."
    )


def tally_markdown(tally: Tally) -> str:
    """Return every count as Markdown."""
    lines = ["## Failures counted", "", say_tally(tally)]
    for way, words in tally.ways:
        lines += ["", f"| {way} | failed | runs | share |", "|---|---|---|---|"]
        lines += [
            "| " + " | ".join(cell.replace("|", "\\|") for cell in tally_cells(t)) + " |" for t in words
        ]
    return "\n".join(lines)


# hindsight


def share_words(interval: Interval | None) -> str:
    """Return "69 % (64 to 73)", "" for nothing to count."""
    if interval is None:
        return ""
    return f"{100 * interval.mean:.0f} % ({100 * interval.low:.0f} to {100 * interval.high:.0f})"


def point_cells(p: CurvePoint) -> tuple[str, ...]:
    """Return a row: threshold, failures warned of, warnings that were right, false alarms."""
    right = "none" if p.precision is None else f"{100 * p.precision:.0f} %"
    return (f"{p.threshold:.2f}", f"{100 * p.recall:.0f} %", right, str(p.false_alarms))


def hindsight_behind(
    title: str, runs: Iterable[Hindsight], warns: Callable[[Hindsight], bool]
) -> Behind | None:
    """Return replayed runs by whether they failed and whether they were warned of."""
    told = list(runs)

    def group(words: str, failed: bool, warned: bool) -> RunGroup:
        held = [r for r in told if r.failed is failed and warns(r) is warned]
        return RunGroup(
            title=words, codes=tuple(r.run for r in held), notes=tuple(_warned_by(r) for r in held)
        )

    return behind(
        title,
        group("failures warned of", True, True),
        group("failures missed", True, False),
        group("successes warned of", False, True),
        group("successes left in peace", False, False),
    )


def _warned_by(run: Hindsight) -> str:
    parts = [f"after {run.precedents[0]}"] if run.precedents else [rule for rule, _ in run.findings[:1]]
    return "; ".join([*parts, *(words_of(mode) for mode in run.modes[:1])])


def replay_notes(report: ReplayReport) -> str:
    """Return what a replay left out, and whether it went to its end."""
    parts = (
        ["Stopped before the end: these are the runs checked so far, F9 goes on."] if report.stopped else []
    )
    if report.undated or report.unjudged:
        parts.append(f"Left out: {report.undated} undated, {report.unjudged} that do not say how they went.")
    return " ".join(parts)


# coverage

CELL_FILTERS = ("all", "thin", "contradictory")


def cell_mark(cell: Cell, contradictions: Sequence[Contradiction]) -> str:
    """Return "◌" for a thin cell, "⇅" for one in which like flasks disagree, both or ""."""
    marks = ["⇅"] if any(c.cell == cell_key(cell) for c in contradictions) else []
    return " ".join([*marks, *(["◌"] if cell.is_thin else [])])


def cell_key(cell: Cell) -> tuple[str, str, str, str]:
    """Return the four words of a cell."""
    return (cell.carbon_class, cell.leaving_group, cell.reagent, cell.solvent)


def cell_cells(cell: Cell, contradictions: Sequence[Contradiction]) -> tuple[str, ...]:
    """Return a row: the four words, runs, failed, best, mean with spread, mark."""
    mean = "" if cell.mean is None else f"{100 * cell.mean:.0f}"
    spread = "" if cell.spread is None else f"±{100 * cell.spread:.0f}"
    best = "" if cell.best is None else f"{100 * cell.best:.0f} %"
    words = tuple(safe(word) for word in cell_key(cell))
    return (*words, str(cell.runs), str(cell.failed), best, mean + spread, cell_mark(cell, contradictions))


def chosen_cells(coverage: Coverage, which: str) -> tuple[Cell, ...]:
    """Return the cells of one of CELL_FILTERS."""
    if which == "thin":
        return tuple(c for c in coverage.cells if c.is_thin)
    if which == "contradictory":
        torn = {c.cell for c in coverage.contradictions}
        return tuple(c for c in coverage.cells if cell_key(c) in torn)
    return coverage.cells


def cell_behind(cell: Cell, contradictions: Sequence[Contradiction]) -> Behind | None:
    """Return the runs of a cell, and those that disagree."""
    torn = [c for c in contradictions if c.cell == cell_key(cell)]
    pairs = [(c.low_run, f"{100 * c.low:.0f} % of what was wanted") for c in torn]
    pairs += [(c.high_run, f"{100 * c.high:.0f} % of what was wanted") for c in torn]
    return behind(
        ", ".join(cell_key(cell)),
        RunGroup(
            title="runs",
            codes=cell.codes,
            notes=tuple("best" if code == cell.best_run else "" for code in cell.codes),
        ),
        RunGroup(
            title="like flasks that disagree",
            codes=tuple(run for run, _ in pairs),
            notes=tuple(n for _, n in pairs),
        ),
    )


# trust


def reliability_lines(found: Calibration) -> list[tuple[tuple[str, ...], tuple[MainShare, ...]]]:
    """Return rows by expected main share (expected, runs, mean, found, inside their interval) with their runs."""
    lines: list[tuple[tuple[str, ...], tuple[MainShare, ...]]] = []
    for r in found.reliability:
        is_last = r.high >= 1
        held = tuple(
            m for m in found.main_shares if r.low <= m.expected < r.high or (is_last and m.expected >= r.high)
        )
        cells = (
            f"{100 * r.low:.0f} to {100 * r.high:.0f} %",
            str(r.runs),
            f"{100 * r.expected:.0f} %",
            f"{100 * r.measured:.0f} %",
            f"{100 * r.coverage:.0f} %",
        )
        lines.append((cells, held))
    return lines


def support_lines(found: Calibration) -> list[tuple[tuple[str, ...], tuple[MainShare, ...]]]:
    """Return rows by effective precedents (precedents, runs, error in points) with their runs."""
    lines: list[tuple[tuple[str, ...], tuple[MainShare, ...]]] = []
    for low, high, runs, error in found.by_support:
        words = f"{low:g} to {high:g}" if high < float("inf") else f"above {low:g}"
        held = tuple(m for m in found.main_shares if low <= m.precedents < high)
        lines.append(((words, str(runs), f"{error:.1f}"), held))
    return lines


def trust_behind(title: str, shares: Sequence[MainShare]) -> Behind | None:
    """Return runs that were left out and expected, those that missed their interval first."""

    def group(words: str, inside: bool) -> RunGroup:
        held = [m for m in shares if (m.low <= m.found <= m.high) is inside]
        held.sort(key=lambda m: -abs(m.expected - m.found))
        notes = tuple(f"{100 * m.expected:.0f} % expected, {100 * m.found:.0f} % found" for m in held)
        return RunGroup(title=words, codes=tuple(m.run for m in held), notes=notes)

    return behind(title, group("outside their interval", False), group("inside it", True))

"""Pages of the record as a whole: recurring failures and coverage.

It owns what is said of each and in which order: the answer first, then where it comes from. Nobody is named on them.
"""

from __future__ import annotations

from kb.audit.coverage import Coverage
from kb.audit.recurrence_values import Cluster, Recurrence
from kb.exchange.report_blocks import Block, Facts, Page, Section, Table, Words
from kb.exchange.report_drawings import fragment
from kb.exchange.report_plots import stacked_columns
from kb.exchange.report_words import counted

MOST_CELLS = 60


def recurrence_page(found: Recurrence, source: str = "") -> Page:
    """Lay out recurring failures, costliest first."""
    since = f" since {found.since.isoformat()}" if found.since else ""
    top = sum(len(c.runs) for c in found.clusters[:3])
    lead = f"{counted(found.failures, 'failure')}{since} in {counted(found.runs, 'run')}; "
    lead += f"{found.in_clusters} of them recur."
    if found.clusters:
        lead += f" The {min(3, len(found.clusters))} costliest recurring failures make {top} of them."
    table = Table(
        caption="Recurring failures, costliest in material first",
        header=("What", "Runs", "Earlier record", "Material lost (runs that tell)", "Days", "House rule"),
        rows=tuple(
            (
                c.title,
                str(len(c.runs)),
                f"{len(c.repeats)} of {len(c.runs)}",
                f"{c.lost_mmol:.3g} mmol ({c.lost_mmol_runs})" if c.lost_mmol_runs else "not recorded",
                f"{c.days:.3g}" if c.days_runs else "not recorded",
                ", ".join(rule for rule, _ in c.covered_by) or ("proposed" if c.proposal else "none"),
            )
            for c in found.clusters
        ),
        figures=(1, 2, 3, 4),
    )
    return Page(
        title="What keeps going wrong",
        kind="recurring failures",
        lead=lead,
        sections=(
            Section(
                heading="At a glance",
                blocks=(table,) if found.clusters else (Words(text="No failure was recorded twice."),),
            ),
            *(_cluster(c) for c in found.clusters),
        ),
        source=source,
    )


def _cluster(c: Cluster) -> Section:
    blocks: list[Block] = [Words(text=f"{c.meaning[:1].upper()}{c.meaning[1:]}.", tone="quiet")]
    smiles, atoms = c.example
    figure = (
        fragment(smiles, atoms, f"The latest of them, {c.runs[-1]}: {c.place}") if smiles and c.foreseeable else None
    )
    blocks += [figure] if figure is not None else []
    span = f"{c.first} to {c.last}" if c.first and c.last else "not dated"
    pairs = [
        ("Runs", f"{len(c.runs)}, {span}"),
        ("Projects", ", ".join(f"{p} {n}" for p, n in c.projects) or "not recorded"),
        (
            "Material lost",
            f"{c.lost_mmol:.3g} mmol, over the {c.lost_mmol_runs} that record a scale"
            if c.lost_mmol_runs
            else "not recorded",
        ),
        ("Reaction time spent", f"{c.days:.3g} d, over {c.days_runs}" if c.days_runs else "not recorded"),
        ("Came through at the same place", str(len(c.came_through))),
        ("House rules", ", ".join(f"{r} warns of {n}" for r, n in c.covered_by) or "none covers it"),
    ]
    blocks.append(Facts(pairs=tuple(pairs)))
    if len(c.quarters) > 1:
        quarters, counts = zip(*c.quarters, strict=True)
        blocks.append(stacked_columns("Runs by quarter", quarters, counts, [0] * len(counts), ("runs", "")))
    if c.repeats:
        shown = "; ".join(f"{run} after {earlier}" for run, earlier in c.repeats[:12])
        more = f" and {len(c.repeats) - 12} more" if len(c.repeats) > 12 else ""
        blocks.append(
            Words(
                text=f"An earlier run under conditions no harsher stood in the book before {len(c.repeats)} of them: "
                f"{shown}{more}."
            )
        )
    if c.proposal is not None:
        rule, trial = c.proposal.rule, c.proposal.trial
        blocks += [
            Words(text="Proposed house rule:"),
            Facts(
                pairs=(
                    ("When", rule.when),
                    ("Motif", rule.motif or "any substrate"),
                    ("Severity", str(rule.severity)),
                    (
                        "On this book",
                        f"warns of {counted(len(trial.hits), 'failure')}, "
                        f"{counted(len(trial.false_alarms), 'false alarm')}",
                    ),
                )
            ),
        ]
    blocks.append(Words(text="Runs: " + ", ".join(c.runs[:60]) + (" ..." if len(c.runs) > 60 else ""), tone="quiet"))
    return Section(heading=c.title, blocks=tuple(blocks))


def coverage_page(coverage: Coverage, source: str = "") -> Page:
    """Lay out coverage."""
    cells = coverage.cells
    lead = (
        f"{counted(coverage.runs, 'run')} in {counted(len(cells), 'combination')}; {coverage.thin} hold two runs or "
        f"fewer, {counted(len(coverage.contradictions), 'place')} contradict themselves."
    )
    experiments = tuple(
        Section(
            heading=f"{number}. {e.words}",
            blocks=(
                Words(text=e.why),
                *(
                    (figure,)
                    if (figure := fragment(e.scheme.split(">")[0].split(".")[0], (), "The substrate")) is not None
                    else ()
                ),
                Facts(
                    pairs=(
                        ("Like", e.like or "a planned step"),
                        ("Steps made surer", str(e.serves)),
                        (
                            "Doubt about the step itself",
                            f"± {100 * e.before:.0f} points now, ± {100 * e.after:.0f} after",
                        ),
                    )
                ),
            ),
        )
        for number, e in enumerate(coverage.experiments, 1)
    )
    return Page(
        title="What the record covers",
        kind="coverage",
        lead=lead,
        sections=(
            Section(
                heading="Experiments that would teach most",
                blocks=() if experiments else (Words(text="Nothing to propose."),),
                parts=experiments,
            ),
            Section(
                heading="Like flasks that disagree",
                blocks=(
                    Table(
                        caption="Lowest and highest share of what was wanted, widest apart first",
                        header=("Where", "Lowest", "Highest", "Runs"),
                        rows=tuple(
                            (
                                ", ".join(c.cell),
                                f"{100 * c.low:.0f} % ({c.low_run})",
                                f"{100 * c.high:.0f} % ({c.high_run})",
                                str(c.runs),
                            )
                            for c in coverage.contradictions[:MOST_CELLS]
                        ),
                        figures=(1, 2, 3),
                    ),
                )
                if coverage.contradictions
                else (Words(text="None found."),),
            ),
            Section(
                heading="The combinations",
                blocks=(
                    Table(
                        caption=f"The {min(len(cells), MOST_CELLS)} fullest; share is that of what was wanted",
                        header=(
                            "Carbon",
                            "Leaving group",
                            "Reagent",
                            "Solvent",
                            "Runs",
                            "Best",
                            "Mean",
                            "Spread",
                            "Failed",
                        ),
                        rows=tuple(
                            (
                                c.carbon_class,
                                c.leaving_group,
                                c.reagent,
                                c.solvent,
                                str(c.runs),
                                "not told" if c.best is None else f"{100 * c.best:.0f} % ({c.best_run})",
                                "" if c.mean is None else f"{100 * c.mean:.0f} %",
                                "" if c.spread is None else f"{100 * c.spread:.0f}",
                                str(c.failed),
                            )
                            for c in cells[:MOST_CELLS]
                        ),
                        figures=(4, 5, 6, 7, 8),
                    ),
                ),
            ),
        ),
        source=source,
    )

"""The page of an assessment: what to worry about, what to expect, what is closest, what to try; in that order.

It owns the order and which findings are drawn: those with atoms, the motif marked. Every figure keeps its source.
"""

from __future__ import annotations

from kb.chem.layout import split_scheme
from kb.errors import StructureError
from kb.exchange.report_blocks import Block, Facts, Items, Page, Section, Table, Warn, Words
from kb.exchange.report_drawings import fragment, scheme_blocks
from kb.exchange.report_plots import interval_bars
from kb.exchange.report_words import conditions_words, counted, interval_words
from kb.record.assessment import Advice, Assessment
from kb.record.finding import Finding
from kb.record.sayings import BASIS_WORDS, NO_RUNS, say_counts
from kb.vocabulary import Severity


def assessment_page(assessment: Assessment, source: str = "") -> Page:
    """Lay out an assessment."""
    findings = assessment.findings
    serious = sum(f.severity is Severity.SERIOUS for f in findings)
    expected = assessment.estimate.fates[0] if assessment.estimate.fates else None
    lead = (
        f"{counted(serious, 'serious worry', 'serious worries')} of {counted(len(findings), 'finding')}."
        if findings
        else "Nothing known speaks against it."
    )
    if expected is not None:
        lead += f" Expect {expected[0]} {interval_words(expected[1])}"
        lead += (
            f", yield {interval_words(assessment.estimate.yield_pct, 1.0)}." if assessment.estimate.yield_pct else "."
        )
    fragments = _fragments(assessment.plan.scheme)
    return Page(
        title="A planned step, checked",
        kind="assessment",
        lead=lead,
        sections=(
            Section(
                heading="The plan",
                blocks=(
                    *scheme_blocks(assessment.plan.scheme, assessment.reading),
                    Words(text=conditions_words(assessment.plan.conditions)),
                    *_reading(assessment),
                ),
            ),
            Section(
                heading="Worry about",
                blocks=tuple(_warn(f, fragments) for f in findings)
                or (Words(text="No liability, recorded failure or caution fits this plan."),),
            ),
            Section(heading="Expect", blocks=_estimate(assessment)),
            Section(heading="Closest in the record", blocks=_precedents(assessment)),
            *((Section(heading="Worth trying", blocks=_advice(assessment.advice)),) if assessment.advice else ()),
        ),
        source=source,
    )


def _fragments(scheme: str) -> tuple[str, ...]:
    try:
        left, agents, _, _ = split_scheme(scheme)
    except StructureError:
        return ()
    return left + agents


def _reading(assessment: Assessment) -> tuple[Block, ...]:
    reading = assessment.reading
    centre = reading.centre
    if centre is None:
        return (Words(text=f"Not read: {reading.reason}", tone="quiet"),)
    pairs = [
        ("Read as", str(reading.fate or "no single fate")),
        ("Centre", ", ".join([str(centre.carbon_class), *map(str, centre.flags)])),
        ("Leaving group", str(centre.leaving_group or "none")),
    ]
    if reading.nucleophile is not None:
        pairs.append(("Nucleophile", reading.nucleophile.nucleophile_class.replace("_", " ")))
    return (Facts(pairs=tuple(pairs)),)


def _warn(finding: Finding, fragments: tuple[str, ...]) -> Warn:
    blocks: list[Block] = [Words(text=finding.why)]
    if finding.component is not None and finding.atoms and finding.component < len(fragments):
        figure = fragment(fragments[finding.component], finding.atoms, f"Motif of: {finding.title}")
        blocks += [figure] if figure is not None else []
    if finding.evidence is not None:
        counts = say_counts(finding.evidence, finding.kind)
        blocks.append(Words(text=f"In this book: {counts}." if counts else NO_RUNS))
        if finding.evidence.runs:
            blocks.append(Words(text="Runs: " + ", ".join(finding.evidence.runs[:24]), tone="quiet"))
    if finding.side_product:
        blocks.append(Words(text=f"Would give {finding.side_product}", tone="quiet"))
    if finding.do_instead:
        blocks += [Words(text="Instead:"), Items(texts=finding.do_instead)]
    if finding.source:
        blocks.append(Words(text=f"Source: {finding.source}", tone="quiet"))
    return Warn(severity=str(finding.severity), title=finding.title, blocks=tuple(blocks))


def _estimate(assessment: Assessment) -> tuple[Block, ...]:
    estimate = assessment.estimate
    blocks: list[Block] = []
    rows = [(str(fate), interval) for fate, interval in estimate.fates]
    if rows:
        blocks.append(interval_bars(f"Shares to expect, with {100 * estimate.level:.0f} % intervals", rows))
    if estimate.yield_pct is not None:
        blocks.append(Words(text=f"Yield {interval_words(estimate.yield_pct, 1.0)}."))
    blocks.append(
        Words(
            text=f"Rests on {BASIS_WORDS[estimate.basis]}; {estimate.effective_precedents:.1f} effective precedents. "
            f"{estimate.note}"
        )
    )
    told = estimate.alkenes_in_words()
    return tuple([*blocks, Words(text=told)] if told else blocks)


def _precedents(assessment: Assessment) -> tuple[Block, ...]:
    if not assessment.precedents:
        return (Words(text="No run of this book is close enough to be shown."),)
    return (
        Table(
            caption="Recorded runs, closest first",
            header=("Run", "Alike", "What differs", "Split", "Yield", "Verdict"),
            rows=tuple(
                (
                    p.run,
                    f"{100 * p.similarity:.0f} %",
                    ", ".join(p.differs) or "nothing that was compared",
                    ", ".join(f"{fate} {100 * share:.0f} %" for fate, share in p.split) or "not measured",
                    "not recorded" if p.yield_pct is None else f"{p.yield_pct:.0f} %",
                    str(p.verdict or "not given"),
                )
                for p in assessment.precedents
            ),
            figures=(1, 4),
        ),
    )


def _advice(advice: tuple[Advice, ...]) -> tuple[Block, ...]:
    return (
        Table(
            caption="Changes and what they are likely to do to the share wanted, in points",
            header=("Change", "Effect", "Rests on", "Why"),
            rows=tuple(
                (
                    a.change,
                    f"{100 * a.effect.mean:+.0f} ({100 * a.effect.low:+.0f} to {100 * a.effect.high:+.0f})",
                    counted(a.pairs, "pair of runs", "pairs of runs") if a.pairs else "published trend",
                    a.why,
                )
                for a in advice
            ),
            figures=(1,),
        ),
    )

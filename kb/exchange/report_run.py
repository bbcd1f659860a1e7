"""The page of one run: what was done, what came out, how it failed, what was noted.

It owns the order of a run's page. Notes are quoted to the letter; None is said as "not recorded", never left to be
guessed.
"""

from __future__ import annotations

from kb.chem.facts import Reading
from kb.exchange.report_blocks import Block, Facts, Page, Section, Table, Words
from kb.exchange.report_drawings import fragment, scheme_blocks
from kb.exchange.report_plots import interval_bars
from kb.exchange.report_words import conditions_words
from kb.record.failure_modes import failure_modes
from kb.record.finding import Interval
from kb.record.outcome import Failure
from kb.record.run import Run


def run_page(run: Run, reading: Reading | None = None, source: str = "") -> Page:
    """Lay out a run."""
    outcome = run.outcome
    best = max(outcome.split.items(), key=lambda pair: pair[1], default=None)
    said = [str(run.verdict).capitalize() if run.verdict else "No verdict recorded"]
    if best is not None:
        said.append(f"mostly {best[0]} ({100 * best[1]:.0f} %)")
    if outcome.yield_pct is not None:
        said.append(f"yield {outcome.yield_pct:g} %")
    withdrawn = f" Withdrawn: {run.withdrawn_why}" if run.is_withdrawn else ""
    sections = [
        Section(
            heading="What was done",
            blocks=(
                *scheme_blocks(run.scheme, reading),
                Words(text=conditions_words(run.conditions)),
                Facts(pairs=_about(run)),
            ),
        ),
        Section(heading="What came out", blocks=_outcome(run)),
    ]
    if outcome.failures:
        sections.append(Section(heading="How it failed", blocks=tuple(_failure(f) for f in outcome.failures)))
    if run.note:
        sections.append(Section(heading="Note", blocks=(Words(text=run.note, tone="quote"),)))
    return Page(
        title=f"Run {run.code or 'not yet recorded'}",
        kind="one run",
        lead=", ".join(said) + "." + withdrawn,
        sections=tuple(sections),
        source=source,
    )


def _about(run: Run) -> tuple[tuple[str, str], ...]:
    conditions = run.conditions
    pairs = (
        ("Run by", run.by),
        ("Day", run.date.isoformat() if run.date else None),
        ("Notebook", run.reference),
        ("Project", run.project),
        ("Series", run.series),
        ("Scale", None if conditions.scale_mmol is None else f"{conditions.scale_mmol:g} mmol"),
        ("Concentration", None if conditions.conc_molar is None else f"{conditions.conc_molar:g} M"),
        ("Atmosphere", conditions.atmosphere),
        ("Vessel", conditions.vessel),
        ("Work-up", conditions.workup),
        ("Attached", ", ".join(a.name for a in run.attachments) or None),
    )
    unsaid = ("Run by", "Day", "Scale")
    return tuple((name, value or "not recorded") for name, value in pairs if value or name in unsaid)


def _outcome(run: Run) -> tuple[Block, ...]:
    outcome = run.outcome
    blocks: list[Block] = []
    shares = sorted(outcome.split.items(), key=lambda pair: -pair[1])
    if shares:
        rows = [(str(fate), Interval(mean=min(s, 1), low=min(s, 1), high=min(s, 1))) for fate, s in shares]
        bounds = {p.fate: p for p in outcome.products if p.share_low is not None and p.share_high is not None}
        for place, (fate, share) in enumerate(shares):
            one = bounds.get(fate)
            if one is not None and one.share == share and one.share_low is not None and one.share_high is not None:
                rows[place] = (str(fate), Interval(mean=share, low=one.share_low, high=one.share_high))
        blocks.append(interval_bars("Molar split", rows))
    figures = (
        ("Isolated yield", outcome.isolated_yield_pct),
        ("Assay yield", outcome.assay_yield_pct),
        ("Conversion", outcome.conversion_pct),
        ("Enantiomeric excess", outcome.ee_pct),
    )
    pairs = [(name, f"{value:g} %") for name, value in figures if value is not None]
    if outcome.dr:
        pairs.append(("Diastereomer ratio", outcome.dr))
    if pairs:
        blocks.append(Facts(pairs=tuple(pairs)))
    drawn = [(p, p.smiles) for p in outcome.products if p.smiles]
    if outcome.products:
        blocks.append(
            Table(
                caption="Products looked for",
                header=("Fate", "Structure", "Share", "By"),
                rows=tuple(
                    (
                        str(p.fate),
                        p.smiles or "not stated",
                        "not measured" if p.share is None else f"{100 * p.share:.0f} %",
                        str(p.method or "not recorded"),
                    )
                    for p in outcome.products
                ),
                figures=(2,),
            )
        )
    for product, smiles in drawn[:4]:
        figure = fragment(smiles, (), f"{product.fate}: what was seen")
        blocks += [figure] if figure is not None else []
    return tuple(blocks) or (Words(text="Nothing measured is recorded."),)


def _failure(failure: Failure) -> Block:
    meaning = {m.word: m.meaning for m in failure_modes()}.get(failure.mode, "")
    cause = f"cause {failure.cause}" if failure.cause else "cause not stated"
    motif = f"; motif {failure.motif}" if failure.motif else ""
    return Words(text=f"{failure.mode.replace('-', ' ').capitalize()}: {meaning or 'see the note'} ({cause}{motif}).")

"""Model to words and cells: what the screens say, pure and without widgets.

Every text that a person typed passes `safe` before it is shown. Numbers carry their unit; a figure without
an interval is one that was measured, never an estimate.
"""

from __future__ import annotations

import datetime as dt
from collections.abc import Sequence

from kb.chem.facts import Centre, Reading
from kb.plain import plain, shortened
from kb.quantity import format_concentration, format_duration, format_number, format_temperature
from kb.record.assessment import Advice, Estimate, Precedent
from kb.record.conditions import Conditions
from kb.record.finding import Evidence, Finding, Interval
from kb.record.run import Run
from kb.record.sayings import BASIS_WORDS, NO_RUNS, say_counts
from kb.vocabulary import Basis, Confidence, Fate, FindingKind, Severity

SEVERITY_MARKS: dict[Severity, str] = {Severity.SERIOUS: "!!", Severity.CAUTION: "! ", Severity.NOTE: "· "}
"""Told by shape as well as by colour and by the word."""

FATE_WORDS: dict[Fate, str] = {
    Fate.SUBSTITUTION: "substitution",
    Fate.ELIMINATION: "elimination",
    Fate.REARRANGED: "rearranged",
    Fate.TRANSPOSED: "transposed",
    Fate.GROUP_LOSS: "group lost",
    Fate.ADDITION: "addition",
    Fate.UNREACTED: "unreacted",
    Fate.OTHER: "other",
}

FATE_SHORT: dict[Fate, str] = {
    Fate.SUBSTITUTION: "subst",
    Fate.ELIMINATION: "elim",
    Fate.REARRANGED: "rearr",
    Fate.TRANSPOSED: "transp",
    Fate.GROUP_LOSS: "lost",
    Fate.ADDITION: "addn",
    Fate.UNREACTED: "left",
    Fate.OTHER: "other",
}
"""For narrow columns only; everywhere else the whole word."""


def safe(text: object, width: int | None = None, *, keep_lines: bool = False) -> str:
    """Return text that cannot act on the terminal, cut to `width` characters where given."""
    shown = plain(str(text), keep_lines=keep_lines)
    return shown if width is None else shortened(shown, width)


def words_of(word: object) -> str:
    """Return a controlled word as read aloud: "group-loss" as "group loss"."""
    return str(word).replace("-", " ").replace("_", " ")


def percent(share: float) -> str:
    """Return a share 0..1 as whole percent; below one, "<1 %"."""
    if 0 < share < 0.005:
        return "<1 %"
    return f"{100 * share:.0f} %"


def interval_words(interval: Interval, factor: float = 100.0) -> str:
    """Return the bounds as "70 to 92"."""
    return f"{factor * interval.low:.0f} to {factor * interval.high:.0f}"


def bounds_short(interval: Interval) -> str:
    """Return the bounds of a share as "(70–92)" [%]."""
    return f"({100 * interval.low:.0f}–{100 * interval.high:.0f})"


def points_words(effect: Interval) -> str:
    """Return an effect on a share, in points: "+6 (2 to 11)"."""
    return f"{100 * effect.mean:+.0f} ({100 * effect.low:+.0f} to {100 * effect.high:+.0f}) points"


def centre_words(centre: Centre) -> str:
    """Return one reacting carbon in words."""
    parts = [f"{centre.carbon_class} carbon", *(words_of(flag) for flag in centre.flags)]
    if centre.leaving_group:
        parts.append(f"loses {centre.leaving_group}")
    count = centre.beta_hydrogens
    parts.append(f"{count} β-hydrogen{'' if count == 1 else 's'}" if count else "no β-hydrogens")
    if centre.is_stereocentre:
        parts.append("stereocentre")
    return ", ".join(parts)


def reading_words(reading: Reading) -> str:
    """Return what a scheme does, in one sentence."""
    if not reading.ok or reading.centre is None:
        return safe(reading.reason) or "This scheme could not be read."
    parts = [centre_words(reading.centre)]
    if reading.nucleophile:
        parts.append(f"{words_of(reading.nucleophile.nucleophile_class)} as nucleophile")
    if reading.fate:
        parts.append(f"drawn as {FATE_WORDS[reading.fate]}")
    if reading.confidence is Confidence.UNRESOLVED:
        parts.append(f"not resolved: {safe(reading.reason)}")
    elif len(reading.centres) > 1:
        parts.append(f"{len(reading.centres) - 1} more such carbon{'s' if len(reading.centres) > 2 else ''}")
    return "; ".join(parts)


def bar_cells(interval: Interval, width: int) -> str:
    """Return a bar of `width` characters on a scale of 0 to 1.

    Solid up to the lower bound, shaded to the upper, the mean as an upright: readable without colour.
    """
    if width < 1:
        return ""

    def cell(share: float) -> int:
        return max(0, min(width, round(share * width)))

    low, high, mean = cell(interval.low), cell(interval.high), min(width - 1, cell(interval.mean))
    bar = ["█"] * low + ["▒"] * (high - low) + ["·"] * (width - high)
    bar[mean] = "┃"
    return "".join(bar)


def estimate_rest(estimate: Estimate) -> str:
    """Return what the figures rest on."""
    if not estimate.fates:
        return safe(estimate.note) or "No honest number can be given."
    runs = estimate.effective_precedents
    text = f"{BASIS_WORDS[estimate.basis]}; worth {runs:.1f} close runs; {estimate.level:.0%} intervals"
    if estimate.yield_pct:
        low, high = estimate.yield_pct.low, estimate.yield_pct.high
        text = f"yield {estimate.yield_pct.mean:.0f} % ({low:.0f} to {high:.0f}); {text}"
    return " ".join(filter(None, (f"{text}.", safe(estimate.alkenes_in_words()), safe(estimate.note))))


def evidence_words(evidence: Evidence | None, kind: FindingKind = FindingKind.LIABILITY) -> str:
    """Return what the book knows of a motif, in one line; "" without evidence."""
    return "" if evidence is None else safe(say_counts(evidence, kind) or NO_RUNS)


def finding_line(finding: Finding) -> str:
    """Return the severity mark, its word and the title."""
    doubt = " (cannot tell)" if finding.is_uncertain else ""
    return f"{SEVERITY_MARKS[finding.severity]} {finding.severity}: {safe(finding.title)}{doubt}"


def split_words(split: Sequence[tuple[Fate, float]]) -> str:
    """Return shares as "84 substitution, 12 elimination" [%], largest first; "not measured" when empty."""
    if not split:
        return "not measured"
    ordered = sorted(split, key=lambda pair: -pair[1])
    return ", ".join(f"{100 * share:.0f} {FATE_WORDS[fate]}" for fate, share in ordered)


def split_short(split: Sequence[tuple[Fate, float]]) -> str:
    """Return the two largest shares as "90 subst 10 elim" [%], for narrow columns; "" when not measured."""
    ordered = sorted(split, key=lambda pair: -pair[1])[:2]
    return " ".join(f"{100 * share:.0f} {FATE_SHORT[fate]}" for fate, share in ordered)


def precedent_cells(precedent: Precedent) -> tuple[str, ...]:
    """Return a row: run, likeness, split, what differs, yield, verdict."""
    return (
        safe(precedent.run),
        f"{precedent.similarity:.2f}",
        split_short(precedent.split),
        safe("; ".join(precedent.differs)) or "nothing that is recorded",
        "" if precedent.yield_pct is None else f"{precedent.yield_pct:.0f} %",
        str(precedent.verdict or ""),
    )


def advice_line(advice: Advice) -> tuple[str, str]:
    """Return the change, and its effect with what it rests on."""
    if advice.basis is Basis.PUBLISHED or not advice.pairs:
        rest = "published trend"
    else:
        rest = f"{advice.pairs} matched pair{'' if advice.pairs == 1 else 's'}"
    return safe(advice.change), f"{points_words(advice.effect)}, {rest}"


def arrow_words(conditions: Conditions) -> tuple[str, str]:
    """Return what stands above and below the arrow of a scheme."""
    above = ", ".join(
        safe(c.name) + (f" ({format_number(c.equiv)})" if c.equiv is not None else "") for c in conditions.components
    )
    below = [" / ".join(safe(s.name) for s in conditions.solvents)]
    if conditions.temperature:
        below.append(safe(format_temperature(conditions.temperature)))
    if conditions.time:
        below.append(safe(format_duration(conditions.time)))
    return above, ", ".join(part for part in below if part)


def conditions_words(conditions: Conditions) -> str:
    """Return all conditions in one line; "conditions not recorded" when there are none."""
    above, below = arrow_words(conditions)
    parts = [part for part in (above, below) if part]
    if conditions.conc_molar is not None:
        parts.append(format_concentration(conditions.conc_molar))
    if conditions.scale_mmol is not None:
        parts.append(f"{format_number(conditions.scale_mmol)} mmol")
    parts.extend(safe(w) for w in (conditions.atmosphere, conditions.vessel, conditions.workup) if w)
    return "; ".join(parts) or "conditions not recorded"


def run_cells(run: Run) -> tuple[str, ...]:
    """Return a row: code, date, who, verdict, split, yield, failure, conditions."""
    state = "withdrawn" if run.is_withdrawn else str(run.verdict or "")
    return (
        safe(run.code or "—"),
        day(run.date),
        safe(run.by or ""),
        state,
        split_short(tuple(run.outcome.split.items())),
        "" if run.outcome.yield_pct is None else f"{run.outcome.yield_pct:.0f} %",
        ", ".join(words_of(f.mode) for f in run.outcome.failures),
        conditions_words(run.conditions),
    )


def day(date: dt.date | None) -> str:
    """Return the date as 2026-03-01, "no date" when not recorded."""
    return date.isoformat() if date else "no date"


def run_lines(run: Run) -> list[tuple[str, str]]:
    """Return a run as (word, value) lines; what was not recorded is left out."""
    outcome = run.outcome
    lines = [
        (
            "run",
            f"{safe(run.code or 'not stored yet')}, {day(run.date)}, by {safe(run.by or 'nobody named')}",
        ),
        ("verdict", str(run.verdict or "not given")),
        ("conditions", conditions_words(run.conditions)),
    ]
    if run.is_withdrawn:
        lines.insert(1, ("withdrawn", safe(run.withdrawn_why)))
    figures = (
        ("isolated yield", outcome.isolated_yield_pct),
        ("assay yield", outcome.assay_yield_pct),
        ("conversion", outcome.conversion_pct),
        ("ee", outcome.ee_pct),
    )
    lines.extend((word, f"{value:.3g} %") for word, value in figures if value is not None)
    if outcome.dr:
        lines.append(("dr", safe(outcome.dr)))
    if not outcome.products:
        lines.append(("split", "not measured"))
    for seen in outcome.products:
        share = "seen, not measured" if seen.share is None else percent(seen.share)
        if seen.share_low is not None and seen.share_high is not None:
            share += f" ({100 * seen.share_low:.0f} to {100 * seen.share_high:.0f})"
        how = f" by {seen.method}" if seen.method else ""
        lines.append((FATE_WORDS[seen.fate], f"{share}{how}  {safe(seen.smiles or '')}".rstrip()))
    for failure in outcome.failures:
        cause = f", {failure.cause}" if failure.cause else ""
        motif = f", motif {safe(failure.motif)}" if failure.motif else ""
        lines.append(("went wrong", f"{words_of(failure.mode)}{cause}{motif}"))
    for word, value in (("project", run.project), ("series", run.series), ("notebook", run.reference)):
        if value:
            lines.append((word, safe(value)))
    if run.note:
        lines.append(("note", safe(run.note, keep_lines=True)))
    lines.append(("scheme", safe(run.scheme)))
    return lines

"""An assessment as text: what to worry about, what to expect, what is closest, what to try; in that order."""

from __future__ import annotations

import re

from kb.cli.render import bar, counted, heading, percent, severity_word, split_words, width, wrapped
from kb.physorg.conversion import in_words
from kb.plain import plain, shortened
from kb.record.assessment import Advice, Assessment, Estimate, Precedent
from kb.record.component import Component
from kb.record.conditions import Conditions
from kb.record.finding import Evidence, Finding
from kb.record.sayings import BASIS_WORDS, NO_RUNS, say_counts
from kb.vocabulary import Basis, FindingKind, Severity

NO_PERMISSION = (
    "An estimate is not permission. Hazards are for your local rules and the people "
    "responsible for safety where you work to judge."
)

def render_assessment(assessment: Assessment, *, verbose: bool = False) -> str:
    """Return the whole assessment as text of at most 80 columns.

    Args:
        assessment: to show.
        verbose: also the parts of each similarity, sources of notes, and side products.
    """
    lines = _plan(assessment)
    lines += ["", heading("Worry about")]
    worries = assessment.findings if verbose else _few(assessment.findings)
    for finding in worries:
        lines += _finding(finding, verbose=verbose)
    if not assessment.findings:
        lines += wrapped("Nothing known: no liability, recorded failure or caution fits this plan.", 2)
    left_out = len(assessment.findings) - len(worries)
    if left_out:
        lines += [f"  and {left_out} more of lesser weight: --verbose shows all"]
    lines += ["", heading("Expect"), *_estimate(assessment.estimate, verbose=verbose)]
    lines += ["", heading("Closest in the record"), *_precedents(assessment.precedents, verbose=verbose)]
    if assessment.advice:
        lines += ["", heading("Worth trying")]
        for advice in assessment.advice:
            lines += _advice(advice, verbose=verbose)
    lines += ["", *wrapped(NO_PERMISSION)]
    return "\n".join(lines)


def conditions_line(conditions: Conditions) -> str:
    """Return conditions in one line: components, solvents, temperature, time."""
    words = [c.name + _amount(c) for c in conditions.components]
    if conditions.solvents:
        names = "/".join(s.name for s in conditions.solvents)
        parts = [s.parts for s in conditions.solvents]
        given = len(parts) > 1 and all(p is not None for p in parts)
        words.append(names + (" " + ":".join(f"{p:g}" for p in parts) if given else ""))
    if conditions.temperature:
        text = conditions.temperature.text
        words.append(text if re.search(r"[^\d\s.,+-]", text) else f"{text} °C")
    if conditions.time:
        words.append(conditions.time.text)
    return ", ".join(words) or "no conditions given"


def _amount(component: Component) -> str:
    """Return the amounts of a component in brackets, as given; nothing where none was."""
    given = [
        f"{value:g} {unit}"
        for value, unit in (
            (component.equiv, "equiv"),
            (component.loading_mol_pct, "mol %"),
            (component.amount_mmol, "mmol"),
            (component.mass_mg, "mg"),
            (component.volume_ml, "mL"),
            (component.conc_molar, "M"),
        )
        if value is not None
    ]
    return f" ({', '.join(given)})" if given else ""


def _few(findings: tuple[Finding, ...]) -> tuple[Finding, ...]:
    """Keep every serious finding and every caution about hazards; of the rest the first ones."""
    kept = [f for f in findings if f.severity is Severity.SERIOUS or f.kind is FindingKind.CAUTION]
    room = max(8 - len(kept), 2)
    others = [f for f in findings if f not in kept][:room]
    return tuple(f for f in findings if f in kept or f in others)


def _plan(assessment: Assessment) -> list[str]:
    reading = assessment.reading
    lines = [heading("Planned step"), *wrapped(shortened(plain(assessment.plan.scheme), 300), 2)]
    lines += wrapped(conditions_line(assessment.plan.conditions), 2)
    centre = reading.centre
    if centre is None:
        return lines + wrapped(f"Not read: {reading.reason}", 2)
    words = [str(centre.carbon_class), *map(str, centre.flags)]
    if centre.leaving_group:
        words.append(f"leaving group {centre.leaving_group}")
    if reading.nucleophile:
        words.append(f"nucleophile {reading.nucleophile.nucleophile_class.replace('_', ' ')}")
    fate = f"{reading.fate} at " if reading.fate else "centre: "
    return lines + wrapped(f"{fate}{', '.join(words)}", 2)


def _finding(finding: Finding, *, verbose: bool) -> list[str]:
    lines = wrapped(finding.title, 10, first=f"  {severity_word(finding.severity)} ")
    lines += wrapped(finding.why, 10)
    if finding.evidence is not None:
        lines += wrapped(evidence_words(finding.evidence, finding.kind, most=None if verbose else 8), 10)
    if finding.side_product and (verbose or finding.severity is Severity.SERIOUS):
        lines += wrapped(f"Would give {finding.side_product}", 10)
    if finding.do_instead:
        shown = finding.do_instead if verbose else finding.do_instead[:2]
        lines += wrapped("Instead: " + "; ".join(shown), 10)
    if finding.source and (verbose or finding.severity is not Severity.NOTE):
        lines += wrapped(f"Source: {finding.source}", 10)
    return lines


def evidence_words(evidence: Evidence, kind: FindingKind, most: int | None = 8) -> str:
    """Return evidence in one sentence with the runs named, `most` of them (None = all)."""
    counts = say_counts(evidence, kind)
    if not counts:
        return NO_RUNS
    runs = ", ".join(evidence.runs[:most]) + (" …" if most is not None and len(evidence.runs) > most else "")
    return f"In this book: {counts}. Runs: {runs}."


def _estimate(estimate: Estimate, *, verbose: bool) -> list[str]:
    lines = []
    for fate, interval in estimate.fates[:5]:
        span = f"({100 * interval.low:.0f} to {100 * interval.high:.0f})"
        room = min(20, width() - 37)
        drawn = bar(interval.mean, room) if room >= 5 else ""
        lines.append(f"  {fate!s:<14} {percent(interval.mean):>5} {span:<12} {drawn}".rstrip())
    if estimate.yield_pct is not None:
        y = estimate.yield_pct
        lines.append(f"  {'yield':<14} {y.mean:>3.0f} % ({y.low:.0f} to {y.high:.0f})")
    if estimate.fates:
        lines += wrapped(
            f"Intervals hold {100 * estimate.level:.0f} %; basis: {BASIS_WORDS[estimate.basis]}. {estimate.note}",
            2,
        )
        told = estimate.alkenes_in_words()
        lines += wrapped(told, 2) if told else []
    else:
        lines += wrapped(estimate.note or "No number is honest here.", 2)
    return lines + (_grounds(estimate) if verbose else [])


def _grounds(estimate: Estimate) -> list[str]:
    """Return what each figure rests on: the runs with their weights, and published rates with their sources."""
    lines: list[str] = []
    if estimate.runs:
        said = "Shares rest on " + ", ".join(f"{run} ({weight:.2f})" for run, weight in estimate.runs)
        lighter = estimate.effective_precedents - sum(weight for _, weight in estimate.runs)
        lines += wrapped(said + (f", and lighter runs worth {lighter:.2f} together" if lighter >= 0.05 else ""), 2)
    if estimate.yield_runs:
        lines += wrapped("Yield rests on " + ", ".join(estimate.yield_runs), 2)
    if estimate.half_life_h is not None:
        half = estimate.half_life_h
        low, high = in_words(half.low), in_words(half.high)
        lines += wrapped(f"Half-life at 1 M of reagent: {in_words(half.mean)} ({low} to {high})", 2)
    for sentence in estimate.published:
        lines += wrapped(sentence, 2)
    return lines


def _precedents(precedents: tuple[Precedent, ...], *, verbose: bool) -> list[str]:
    if not precedents:
        return wrapped("No run close enough to say anything.", 2)
    lines = []
    for p in precedents:
        outcome = split_words(p.split) or "no split recorded"
        if p.yield_pct is not None:
            outcome += f"; yield {percent(p.yield_pct / 100)}"
        lines += wrapped(f"{p.similarity:.2f}  {p.verdict or 'no verdict'}: {outcome}", 12, first=f"  {p.run:<10}")
        lines += wrapped("differs: " + ("; ".join(p.differs[:4]) if p.differs else "nothing that is recorded"), 18)
        if verbose:
            lines += wrapped("parts: " + ", ".join(f"{n} {v:.2f}" for n, v in p.parts), 18)
    return lines


def _advice(advice: Advice, *, verbose: bool) -> list[str]:
    effect = advice.effect
    points = f"{100 * effect.mean:+.0f} points ({100 * effect.low:.0f} to {100 * effect.high:.0f})"
    basis = counted(advice.pairs, "pair") if advice.basis is Basis.RECORD else "published trend"
    lines = wrapped(f"{advice.change}: {points}, {basis}", 4, first="  - ") + wrapped(advice.why, 4)
    if verbose and advice.runs:
        lines += wrapped("All pairs: " + ", ".join(f"{a} and {b}" for a, b in advice.runs), 4)
    return lines

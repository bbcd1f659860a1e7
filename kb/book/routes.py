"""A route's yields, looked up in an open book: recorded runs, estimates of planned steps, and their findings.

It owns what a yield from the record is taken to mean for the *next* time: a recorded yield is one draw, so it carries
the scatter between repeats (REPEAT_SD_PCT, or that of the runs named, whichever is larger). The arithmetic is
`kb.route`.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from kb.errors import InvalidRecord
from kb.logs import tame_rdkit
from kb.record.finding import Interval
from kb.route.sequence import Z80, Route, Step, StepYield
from kb.vocabulary import Severity

if TYPE_CHECKING:
    from kb.book.asked import AskedBook
    from kb.route.ledger import Ledger
    from kb.route.routefile import RouteDraft, StepDraft

REPEAT_SD_PCT = 5.0
"""Standard deviation of a yield between repeats of one procedure [points]; common practice, a judgement."""
_WIDEST = Interval(mean=50.0, low=10.0, high=90.0)


def reckon_route(book: AskedBook, path: Path, what_if: Sequence[str] = ()) -> Ledger:
    """Read a route file, look its yields up in the book, and reckon it.

    Args:
        what_if: "STEP=PCT": another yield to reckon with.

    Raises:
        ImportFileError, InvalidRecord, QuantityError, NameUnknown, RecordNotFound: as their names say.
    """
    from kb.route.ledger import reckon, with_yield
    from kb.route.routefile import parse_yield, read_route

    route = resolve_route(book, read_route(path))
    for text in what_if:
        step, equals, pct = text.rpartition("=")
        if not equals:
            raise InvalidRecord(f"{text!r} names no step and yield.", "Write it as STEP=PCT, such as amine=90.", text)
        route = with_yield(route, step.strip(), parse_yield(pct, f"The yield of {step.strip()!r}").mean)
    return reckon(route)


def route_lead(ledger: Ledger) -> str:
    """Return the answer of a route in two or three sentences."""
    from kb.exchange.report_route import route_lead as lead

    return lead(ledger)


def resolve_route(book: AskedBook, draft: RouteDraft) -> Route:
    """Look up the yields of a draft."""
    tame_rdkit()
    return Route(
        title=draft.title,
        steps=tuple(_resolve(book, step) for step in draft.steps),
        materials=draft.materials,
        target_mmol=draft.target_mmol,
        target_molar_mass=draft.target_molar_mass,
        money=draft.money,
    )


def _resolve(book: AskedBook, draft: StepDraft) -> Step:
    step = Step(
        name=draft.name,
        yield_pct=StepYield(pct=draft.given or _WIDEST, basis="given", note="as given in the file"),
        inputs=draft.inputs,
        cost_per_mmol=draft.cost_per_mmol,
        forgiven=draft.forgiven,
        product=draft.product,
    )
    if draft.given is not None:
        return step
    if draft.plan is not None:
        return _estimated(book, step, draft)
    return dataclasses.replace(step, yield_pct=_recorded(book, draft))


def _recorded(book: AskedBook, draft: StepDraft) -> StepYield:
    yields = []
    for code in draft.runs:
        got = book.get(code).outcome.yield_pct
        if got is None:
            raise InvalidRecord(
                f"Run {code}, named by step {draft.name!r}, records no yield.",
                "Name another run, or give `yield`.",
                code,
            )
        yields.append(min(got, 100.0))
    mean = max(sum(yields) / len(yields), 0.2)
    between = sum((y - mean) ** 2 for y in yields) / (len(yields) - 1) if len(yields) > 1 else 0.0
    half = Z80 * max(between**0.5, REPEAT_SD_PCT)
    return StepYield(
        pct=Interval(
            mean=round(mean, 1), low=round(max(mean - half, 0.0), 1), high=round(max(min(mean + half, 100.0), mean), 1)
        ),
        basis="recorded",
        runs=draft.runs,
        note=f"{len(yields)} recorded {'run' if len(yields) == 1 else 'runs'}; interval for the next time",
    )


def _estimated(book: AskedBook, step: Step, draft: StepDraft) -> Step:
    from kb.book.plan_words import plan_from_words

    if "scheme" not in (draft.plan or {}):
        raise InvalidRecord(f"The plan of step {draft.name!r} has no scheme.", 'Give scheme = "substrate>>product".')
    assessment = book.check(plan_from_words(dict(draft.plan or {})))
    if not assessment.reading.ok:
        raise InvalidRecord(
            f"The plan of step {draft.name!r} cannot be read: {assessment.reading.reason}", "Mend its scheme."
        )
    estimate, wanted = assessment.estimate, assessment.reading.fate
    share = dict(estimate.fates).get(wanted) if wanted else None
    runs = tuple(p.run for p in assessment.precedents)
    if estimate.yield_pct is not None:
        pct, note = estimate.yield_pct, f"estimate from {estimate.effective_precedents:.1f} effective runs"
    elif share is not None:
        pct = Interval(mean=100 * share.mean, low=100 * share.low, high=100 * share.high)
        note = f"estimated share of {wanted}, no yield on record: isolation is not counted"
    else:
        pct, note = _WIDEST, "nothing known: any yield is possible"
    mean = max(round(pct.mean, 1), 0.2)
    known = StepYield(
        pct=Interval(mean=mean, low=round(min(pct.low, mean), 1), high=round(min(max(pct.high, mean), 100.0), 1)),
        basis="unknown" if pct is _WIDEST else "estimated",
        runs=runs,
        note=note,
    )
    shown = [f for f in assessment.findings if f.severity is not Severity.NOTE]
    return dataclasses.replace(step, yield_pct=known, findings=tuple((str(f.severity), f.title) for f in shown))

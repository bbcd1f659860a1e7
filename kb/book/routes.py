"""A route's yields, looked up in an open book: recorded runs, estimates of planned steps, and their findings.

It owns what a yield from the record is taken to mean for the *next* time: a recorded yield is one draw, so it carries
the scatter between repeats (REPEAT_SD_PCT, or that of the runs named, whichever is larger). A recorded step is checked
like a planned one, for its findings only; what it says about the very runs it rests on is no news and left out. The
arithmetic is `kb.route`.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from kb.errors import Cancelled, InvalidRecord, SidepathError
from kb.logs import tame_rdkit
from kb.progress import Progress, Silent
from kb.record.finding import Interval
from kb.route.sequence import Z80, Route, Step, StepYield
from kb.vocabulary import Basis, Severity

if TYPE_CHECKING:
    from kb.book.asked import AskedBook
    from kb.record.assessment import Assessment
    from kb.record.plan import Plan
    from kb.route.entries import Ledger
    from kb.route.routefile import RouteDraft, StepDraft

REPEAT_SD_PCT = 5.0
"""Standard deviation of a yield between repeats of one procedure [points]; common practice, a judgement."""
ISOLATED = 0.9
"""What isolation leaves of a product that was formed, where no yield is on record; common practice, a judgement."""
PRECEDENTS = 8
_SHARE_FROM = {
    Basis.RECORD: "own runs",
    Basis.PUBLISHED: "published rates",
    Basis.BOTH: "own runs and published rates",
    Basis.NONE: "nothing firm",
}
_WIDEST = Interval(mean=50.0, low=10.0, high=90.0)


def reckon_route(
    book: AskedBook, path: Path, what_if: Sequence[str] = (), target: str = "", progress: Progress | None = None
) -> Ledger:
    """Read a route file, look its yields up in the book, and reckon it.

    Args:
        what_if: "STEP=PCT": another yield to reckon with.
        target: another amount wanted, "2 g" or "5 mmol"; "" = that of the file.

    Raises:
        ImportFileError, InvalidRecord, QuantityError, NameUnknown, RecordNotFound: as their names say.
        Cancelled: the user asked to stop.
    """
    from kb.route.imagined import with_target, with_yield
    from kb.route.ledger import reckon
    from kb.route.routefile import parse_yield

    route = open_route(book, path, progress)
    for text in what_if:
        step, equals, pct = text.rpartition("=")
        if not equals:
            raise InvalidRecord(f"{text!r} names no step and yield.", "Write it as STEP=PCT, such as amine=90.", text)
        route = with_yield(route, step.strip(), parse_yield(pct, f"The yield of {step.strip()!r}"))
    return reckon(with_target(route, target) if target else route)


def open_route(book: AskedBook, path: Path, progress: Progress | None = None) -> Route:
    """Read a route file and look its yields up in the book; see `reckon_route` for what it raises."""
    from kb.route.routefile import read_route

    return resolve_route(book, read_route(path), progress)


def route_lead(ledger: Ledger) -> str:
    """Return the answer of a route in two or three sentences."""
    from kb.exchange.report_route import route_lead as lead

    return lead(ledger)


def resolve_route(book: AskedBook, draft: RouteDraft, progress: Progress | None = None) -> Route:
    """Look up the yields of a draft; nothing is looked up before the shape of the route is known to be good.

    Raises:
        Cancelled: the user asked to stop.
    """
    tame_rdkit()
    progress = progress or Silent()
    unresolved = Route(
        title=draft.title,
        steps=tuple(_unresolved(step) for step in draft.steps),
        materials=draft.materials,
        target_mmol=draft.target_mmol,
        target_molar_mass=draft.target_molar_mass,
        money=draft.money,
    )
    steps = []
    for done, step in enumerate(draft.steps):
        if progress.cancelled():
            raise Cancelled("Stopped while the route was being looked up.", "Open it again.")
        progress.advance(done, len(draft.steps), step.name)
        steps.append(_resolve(book, step))
    progress.advance(len(steps), len(steps))
    return dataclasses.replace(unresolved, steps=tuple(steps))


def recheck_step(book: AskedBook, step: Step, plan: Plan) -> Step:
    """Return a step with its plan changed: checked anew, its yield now the estimate for that plan.

    Raises:
        InvalidRecord: the scheme cannot be read.
    """
    tame_rdkit()
    return _estimated(book, step, plan)


def _unresolved(draft: StepDraft) -> Step:
    return Step(
        name=draft.name,
        yield_pct=StepYield(pct=draft.given or _WIDEST, basis="given", note="as given in the file"),
        inputs=draft.inputs,
        cost_per_mmol=draft.cost_per_mmol,
        forgiven=draft.forgiven,
        product=draft.product,
    )


def _resolve(book: AskedBook, draft: StepDraft) -> Step:
    step = _unresolved(draft)
    if draft.runs:
        return _recorded(book, step, draft)
    if draft.plan is None:
        return step
    plan = _plan(draft)
    estimated = _estimated(book, step, plan)
    return estimated if draft.given is None else dataclasses.replace(estimated, yield_pct=step.yield_pct)


def _plan(draft: StepDraft) -> Plan:
    from kb.book.plan_words import plan_from_words

    words = dict(draft.plan or {})
    if not isinstance(words.get("scheme"), str) or not words["scheme"].strip():
        raise InvalidRecord(f"The plan of step {draft.name!r} has no scheme.", 'Give scheme = "substrate>>product".')
    try:
        return plan_from_words(words)
    except SidepathError as error:
        raise type(error)(f"Step {draft.name!r}: {error.message}", error.hint, error.value) from error


def _recorded(book: AskedBook, step: Step, draft: StepDraft) -> Step:
    runs = [book.get(code) for code in draft.runs]
    yields = []
    for code, run in zip(draft.runs, runs, strict=True):
        got = run.outcome.yield_pct
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
    known = StepYield(
        pct=Interval(
            mean=round(mean, 1), low=round(max(mean - half, 0.0), 1), high=round(max(min(mean + half, 100.0), mean), 1)
        ),
        basis="recorded",
        runs=draft.runs,
        note=f"{len(yields)} recorded {'run' if len(yields) == 1 else 'runs'}; interval for the next time",
    )
    plan = runs[0].plan
    assessment = book.check(plan, top=PRECEDENTS)
    own = {f"resemblance:{code}" for code in draft.runs}
    news = dataclasses.replace(assessment, findings=tuple(f for f in assessment.findings if f.rule_id not in own))
    return dataclasses.replace(step, yield_pct=known, plan=plan, assessment=news, findings=_worries(news))


def _estimated(book: AskedBook, step: Step, plan: Plan) -> Step:
    assessment = book.check(plan, top=PRECEDENTS)
    if not assessment.reading.ok:
        raise InvalidRecord(
            f"The plan of step {step.name!r} cannot be read: {assessment.reading.reason}", "Mend its scheme."
        )
    estimate, wanted = assessment.estimate, assessment.reading.fate
    share = dict(estimate.fates).get(wanted) if wanted else None
    if estimate.yield_pct is not None:
        pct, note = estimate.yield_pct, f"estimate from {estimate.effective_precedents:.1f} effective runs"
        runs = estimate.yield_runs
    elif share is not None:
        pct = Interval(mean=100 * ISOLATED * share.mean, low=100 * ISOLATED * share.low, high=100 * share.high)
        note = f"share of {wanted} from {_SHARE_FROM[estimate.basis]}, less a tenth for isolation; no yield on record"
        runs = tuple(code for code, _ in estimate.runs)
    else:
        pct, note, runs = _WIDEST, "nothing known: any yield is possible", ()
    mean = max(round(pct.mean, 1), 0.2)
    known = StepYield(
        pct=Interval(mean=mean, low=round(min(pct.low, mean), 1), high=round(min(max(pct.high, mean), 100.0), 1)),
        basis="unknown" if pct is _WIDEST else "estimated",
        runs=runs,
        note=note,
    )
    return dataclasses.replace(
        step, yield_pct=known, plan=plan, assessment=assessment, findings=_worries(assessment)
    )


def _worries(assessment: Assessment) -> tuple[tuple[str, str], ...]:
    return tuple((str(f.severity), f.title) for f in assessment.findings if f.severity is not Severity.NOTE)

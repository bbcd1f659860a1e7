"""`check` and `demo`: the assessment of a planned step."""

from __future__ import annotations

import datetime as dt
import shlex
from dataclasses import replace
from typing import TYPE_CHECKING, Annotated, Optional

import typer

from kb.cli import exit_codes
from kb.cli.conditions import (
    AcidFlag,
    AddFlag,
    AtmosphereFlag,
    BaseFlag,
    ConcFlag,
    ScaleFlag,
    SolventFlag,
    TempFlag,
    TimeFlag,
    WithFlag,
    parse_conditions,
)
from kb.cli.session import Session, current_session, put
from kb.errors import StoreMissing, StructureError
from kb.plain import plain
from kb.vocabulary import Severity

if TYPE_CHECKING:
    from kb.record.assessment import Assessment
    from kb.record.plan import Plan


def register(app: typer.Typer) -> None:
    """Add the commands of this file."""
    app.command("check")(check)
    app.command("demo")(demo)


def check(
    scheme: Annotated[str, typer.Argument(help="Reaction SMILES, a substrate, a name, or a path to an RXN/mol file.")],
    reagents: WithFlag = None,
    bases: BaseFlag = None,
    acids: AcidFlag = None,
    additives: AddFlag = None,
    solvents: SolventFlag = None,
    temp: TempFlag = None,
    time: TimeFlag = None,
    conc: ConcFlag = None,
    scale: ScaleFlag = None,
    atmosphere: AtmosphereFlag = None,
    top: Annotated[
        Optional[int],  # noqa: UP045 - read at run time
        typer.Option("--top", metavar="N", min=0, max=200, help="How many precedents; by the settings, else 5."),
    ] = None,
    fail_on: Annotated[
        Optional[Severity],  # noqa: UP045 - read at run time
        typer.Option("--fail-on", help="Exit with 3 when a finding is at least this severe."),
    ] = None,
    at_date: Annotated[
        Optional[str],  # noqa: UP045
        typer.Option("--at-date", metavar="YYYY-MM-DD", help="Leave later runs out."),
    ] = None,
) -> int:
    """Check a planned step against the record, known liabilities and hazards."""
    from kb.book import parse_date, scheme_from_argument
    from kb.record.plan import Plan

    session = current_session()
    conditions = parse_conditions(reagents, bases, acids, additives, solvents, temp, time, conc, scale, atmosphere)
    plan = Plan(scheme=scheme_from_argument(scheme), conditions=conditions)
    top = session.settings.precedents if top is None else top
    assessment = _assess(session, plan, top, parse_date(at_date) if at_date else None)
    if not assessment.reading.ok:
        raise StructureError(assessment.reading.reason, "", plan.scheme)
    show_assessment(session, assessment)
    if fail_on is not None and any(f.severity.rank >= fail_on.rank for f in assessment.findings):
        return exit_codes.FAIL_ON
    return exit_codes.DONE


def _assess(session: Session, plan: Plan, top: int, at_date: dt.date | None) -> Assessment:
    """Check against the book; where nobody named one and there is none yet, against published chemistry alone."""
    try:
        with session.opened(read_only=True) as book:
            return book.check(plan, top=top, at_date=at_date)
    except StoreMissing:
        if session.settings.book is not None:
            raise
        from kb.book import check_unrecorded

        session.say("There is no record book yet: published chemistry alone. `sidepath new` makes one.")
        return check_unrecorded(plan)


def demo() -> None:
    """Build the demo book, check one planned step against it, and say what to open next."""
    from kb.book import build_demo, demo_plan

    session = current_session()
    with session.progress("Building the demo book") as progress:
        path, built = build_demo(session.book, progress)
    session.say(f"{'Built' if built else 'Using'} the demo book (invented runs) at {path}")
    session = replace(session, book=str(path))
    with session.opened(read_only=True) as book:
        assessment = book.check(demo_plan())
        count = book.count()
    show_assessment(session, assessment)
    if not session.as_json:
        put(
            f"\nChecked against {count} invented runs. Open the book in the terminal interface with\n"
            f"  sidepath --book {plain(shlex.quote(str(path)))} tui"
        )


def show_assessment(session: Session, assessment: Assessment) -> None:
    """Print an assessment as text or JSON."""
    from kb.cli.render_assessment import render_assessment

    if session.as_json:
        session.print_json(assessment.as_dict())
    else:
        put(render_assessment(assessment, verbose=session.verbose))

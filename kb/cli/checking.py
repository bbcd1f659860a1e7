"""Answering `check`, whoever parsed the command line: the plan, the book, the assessment, the exit status.

It loads no parser, so that the short way (`quick.py`) does not wait for one.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from kb.cli import exit_codes
from kb.cli.session import Session, put
from kb.errors import InvalidRecord, StoreMissing, StructureError
from kb.vocabulary import Severity

if TYPE_CHECKING:
    from kb.record.assessment import Assessment
    from kb.record.plan import Plan


def answer_check(
    session: Session,
    scheme: str,
    words: Mapping[str, Any],
    *,
    top: int | None = None,
    fail_on: Severity | None = None,
    at_date: str | None = None,
    acknowledge: str | None = None,
    because: str | None = None,
) -> int:
    """Check a planned step, print the assessment and return the exit status.

    Args:
        session: options of every command.
        scheme: reaction SMILES, a substrate, a name, or a path to a file.
        words: the conditions, as `kb.book.plan_words.conditions_from_words` names them.
        top: how many precedents; None = by the settings.
        fail_on: FAIL_ON is returned when a finding is at least this severe.
        at_date: leave later runs out.
        acknowledge, because: id of a finding that is seen and taken on, and the reason; both or neither.
    """
    from kb.book import conditions_from_words, parse_date, scheme_from_argument
    from kb.record.plan import Plan

    plan = Plan(scheme=scheme_from_argument(scheme), conditions=conditions_from_words(words))
    top = session.settings.precedents if top is None else top
    day = parse_date(at_date) if at_date else None
    from kb.book.short_check import check_shortly, keep_for_next_time

    settings = session.settings
    if acknowledge is not None or because is not None:
        _acknowledge(session, plan, acknowledge, because)
    assessment = check_shortly(settings.book, plan, top=top, at_date=day, wait_s=settings.wait_s)
    if assessment is not None:
        return _tell(session, assessment, fail_on)
    try:
        with session.opened(read_only=True) as book:
            status = _tell(session, book.check(plan, top=top, at_date=day), fail_on)
            if day is None:
                keep_for_next_time(book)
            return status
    except StoreMissing:
        if settings.book is not None:
            raise
        from kb.book import check_unrecorded

        session.say("There is no record book yet: published chemistry alone. `sidepath new` makes one.")
        return _tell(session, check_unrecorded(plan), fail_on)


def show_assessment(session: Session, assessment: Assessment) -> None:
    """Print an assessment as text or JSON."""
    from kb.cli.render_assessment import render_assessment

    if session.as_json:
        session.print_json(assessment.as_dict())
    else:
        put(render_assessment(assessment, verbose=session.verbose))


def _acknowledge(session: Session, plan: Plan, finding_id: str | None, because: str | None) -> None:
    """Keep that a finding was seen and is taken on, with the name and the reason."""
    if not finding_id or not because:
        raise InvalidRecord(
            "An acknowledgement needs the finding and the reason.",
            "Give --acknowledge ID and --because REASON.",
            finding_id,
        )
    with session.opened() as book:
        book.acknowledge(plan, finding_id, who=session.initials, why=because)
    session.say(f"Acknowledged {finding_id}. It is told as before, with your name and reason behind it.")


def _tell(session: Session, assessment: Assessment, fail_on: Severity | None) -> int:
    """Print an assessment and return the exit status.

    Raises:
        StructureError: the scheme could not be read, so there is nothing to assess.
    """
    if not assessment.reading.ok:
        raise StructureError(assessment.reading.reason, "", assessment.plan.scheme)
    show_assessment(session, assessment)
    if fail_on is not None and any(f.severity.rank >= fail_on.rank for f in assessment.findings):
        return exit_codes.FAIL_ON
    return exit_codes.DONE

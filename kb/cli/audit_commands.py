"""`audit recurring`, `audit replay`, `audit coverage`, `audit calibration`: the record as a whole."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any, Optional

import typer

from kb.cli import exit_codes
from kb.cli.session import Session, current_session
from kb.errors import RecordNotFound

if TYPE_CHECKING:
    from kb.book import Book

Word = Optional[str]  # noqa: UP045 - typer reads the annotations at run time
File = Optional[Path]  # noqa: UP045
SinceFlag = Annotated[Word, typer.Option("--since", metavar="YYYY-MM-DD", help="Count only runs from this day on.")]
HtmlFlag = Annotated[File, typer.Option("--html", metavar="FILE", help="Also write a page to hand round.")]
MarkdownFlag = Annotated[File, typer.Option("--md", metavar="FILE", help="Also write it as Markdown.")]


def register(app: typer.Typer) -> None:
    """Add the group of commands of this file."""
    audits = typer.Typer(rich_markup_mode=None, help="The record as a whole: failures, hindsight, gaps, calibration.")
    audits.command("recurring")(recurring)
    audits.command("replay")(replay)
    audits.command("coverage")(coverage)
    audits.command("calibration")(calibration)
    app.add_typer(audits, name="audit")


def recurring(
    since: SinceFlag = None,
    html: HtmlFlag = None,
    md: MarkdownFlag = None,
    adopt: Annotated[
        Word, typer.Option("--adopt", metavar="NUMBER-or-NAME", help="Adopt the house rule proposed for this one.")
    ] = None,
) -> None:
    """What keeps going wrong, what it cost, and whether the record could have told."""
    from kb.book import adopt_proposal, find_recurring_failures, parse_date
    from kb.cli.render_audit import render_recurring

    session = current_session()
    day = parse_date(since) if since else None
    with session.opened(read_only=adopt is None) as book, session.progress("Looking") as progress:
        found = find_recurring_failures(book, day, progress)
        progress.check_stopped()
        write_pages(session, book, found, html, md)
        if adopt is None:
            session.answer(found.as_dict(), render_recurring(found, verbose=session.verbose))
            return
        names = [c.name for c in found.clusters]
        number = names.index(adopt) if adopt in names else int(adopt) - 1 if adopt.isdecimal() else -1
        cluster = found.clusters[number] if 0 <= number < len(found.clusters) else None
        if cluster is None or cluster.proposal is None:
            raise RecordNotFound(
                f"No rule is proposed for {adopt!r}.", "`sidepath audit recurring --verbose` numbers them.", adopt
            )
        rule = adopt_proposal(book, cluster.proposal, who=session.initials)
    answer = {"id": rule.rule_id} | cluster.proposal.as_dict()
    session.answer(answer, f"Rule {rule.rule_id} adopted: {rule.title}, when {rule.when}.")


def replay(
    since: SinceFlag = None,
    html: HtmlFlag = None,
    md: MarkdownFlag = None,
    processes: Annotated[
        Optional[int],  # noqa: UP045
        typer.Option("--processes", min=1, max=64, help="How many work side by side. Default: one for each core."),
    ] = None,
    keep: Annotated[
        File,
        typer.Option("--keep", metavar="FILE", help="Keep results as they come; a stopped replay goes on from it."),
    ] = None,
) -> int:
    """Check each run against what stood in the book that morning: would the record have told us?"""
    from kb.book import parse_date, processes_for, replay_book
    from kb.cli.render_audit import render_replay

    session = current_session()
    day = parse_date(since) if since else None
    with session.opened(read_only=True) as book, session.progress("Replaying") as progress:
        report = replay_book(book, day, progress, processes or processes_for(book), keep)
        write_pages(session, book, report, html, md)
    session.answer(report.as_dict(), render_replay(report, verbose=session.verbose))
    return exit_codes.INTERRUPTED if report.stopped else exit_codes.DONE


def coverage(
    html: HtmlFlag = None,
    md: MarkdownFlag = None,
    planned: Annotated[
        Optional[list[Path]],  # noqa: UP045
        typer.Option("--plan", metavar="FILE.toml", help="A step you mean to run; repeatable. Default: the last year."),
    ] = None,
    experiments: Annotated[int, typer.Option("--experiments", min=0, max=50, help="How many to propose.")] = 3,
) -> None:
    """What the record covers, where it is thin or contradicts itself, and what would teach most."""
    from kb.book import measure_book_coverage, plan_from_file
    from kb.cli.render_audit import render_coverage

    session = current_session()
    plans = [plan_from_file(path) for path in planned or []]
    with session.opened(read_only=True) as book, session.progress("Measuring") as progress:
        found = measure_book_coverage(book, plans, experiments, progress)
        progress.check_stopped()
        write_pages(session, book, found, html, md)
    session.answer(found.as_dict(), render_coverage(found, verbose=session.verbose))


def calibration(
    html: HtmlFlag = None,
    md: MarkdownFlag = None,
    with_substrate: Annotated[
        bool, typer.Option("--new-molecules", help="Leave out every run of a substrate: for molecules nobody has run.")
    ] = False,
) -> int:
    """How far the estimates of this book can be trusted: each run expected from the others."""
    from kb.book import calibrate_book
    from kb.cli.render_audit import render_calibration

    session = current_session()
    with session.opened(read_only=True) as book, session.progress("Expecting") as progress:
        found = calibrate_book(book, with_substrate, progress)
        write_pages(session, book, found, html, md)
    session.answer(found.as_dict(), render_calibration(found))
    return exit_codes.INTERRUPTED if found.stopped else exit_codes.DONE


def write_pages(session: Session, book: Book, thing: Any, html: Path | None, md: Path | None) -> None:
    """Write the pages that were asked for and say so."""
    from kb.book import save_page

    for path in (html, md.with_suffix(".md") if md is not None else None):
        if path is not None:
            save_page(book, thing, path)
            session.say(f"Wrote {path}.")

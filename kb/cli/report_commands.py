"""`report WHAT --html FILE`: a page to hand round, of a run, an audit, a route or a planned step."""

from __future__ import annotations

from typing import Annotated

import typer

from kb.cli.audit_commands import HtmlFlag, MarkdownFlag, write_pages
from kb.cli.session import current_session


def register(app: typer.Typer) -> None:
    """Add the command of this file."""
    app.command("report")(report)


def report(
    what: Annotated[
        str,
        typer.Argument(
            metavar="WHAT",
            help="A run's code; recurring, replay, coverage or calibration; a reaction SMILES; a route or plan file "
            "(.toml, .json).",
        ),
    ],
    html: HtmlFlag = None,
    md: MarkdownFlag = None,
) -> None:
    """Write a self-contained page, or Markdown."""
    from kb.book import thing_named

    session = current_session()
    if html is None and md is None:
        raise typer.BadParameter("say where to: --html FILE or --md FILE")
    with session.opened(read_only=True) as book, session.progress("Reading") as progress:
        thing = thing_named(book, what, progress)
        progress.check_stopped()
        write_pages(session, book, thing, html, md)
    session.answer({"what": what, "html": str(html) if html else None, "md": str(md) if md else None}, "")

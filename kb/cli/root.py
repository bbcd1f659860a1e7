"""The command tree: which file holds which commands, and the global options."""

from __future__ import annotations

import sys
from typing import Annotated, Optional

import typer

from kb.cli import (
    audit_commands,
    book_commands,
    check_command,
    file_commands,
    find_command,
    look_commands,
    record_commands,
    report_commands,
    route_commands,
    rule_commands,
    settling_commands,
    split_command,
)
from kb.cli.session import Session, set_session
from kb.cli.strict import make_strict

ORDER = (
    *("demo", "new", "read", "check", "record"),
    *("runs", "show", "history", "amend", "withdraw", "reinstate", "find", "split", "lookup", "route", "report"),
    *("import", "export", "template", "mappings", "merge", "conflicts", "settle"),
    *("backup", "restore", "verify", "migrate", "tui"),
)
"""Commands in the order of a working day; others follow as they are registered."""

app = typer.Typer(
    name="sidepath",
    no_args_is_help=False,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
    help="A group's shared record of substitution and elimination runs, checked before the next step is set up.",
)


@app.callback(invoke_without_command=True)
def root(
    ctx: typer.Context,
    book: Annotated[
        Optional[str],  # noqa: UP045 - read at run time
        typer.Option("--book", envvar="SIDEPATH_BOOK", metavar="PATH-or-URL", help="The record book."),
    ] = None,
    who: Annotated[
        Optional[str],  # noqa: UP045
        typer.Option("--as", envvar="SIDEPATH_AS", metavar="INITIALS", help="Who is writing."),
    ] = None,
    as_json: Annotated[bool, typer.Option("--json", help="Answer in JSON on stdout.")] = False,
    quiet: Annotated[bool, typer.Option("--quiet", "-q", help="Only results and errors.")] = False,
    verbose: Annotated[bool, typer.Option("--verbose", "-v", help="More detail, with sources.")] = False,
    version: Annotated[bool, typer.Option("--version", help="Say which version this is.")] = False,
) -> None:
    """Sidepath."""
    if version:
        typer.echo(f"sidepath {_version()}")
        raise typer.Exit
    session = Session(book=book, who=who, as_json=as_json, quiet=quiet, verbose=verbose)
    set_session(session)
    if ctx.invoked_subcommand is None:
        if sys.stdin.isatty() and sys.stdout.isatty():
            book_commands.open_terminal_interface(session)
        else:
            typer.echo(ctx.get_help())


for _module in (
    book_commands,
    file_commands,
    look_commands,
    check_command,
    record_commands,
    find_command,
    rule_commands,
    settling_commands,
    split_command,
    route_commands,
    report_commands,
    audit_commands,
):
    _module.register(app)
_place = {name: number for number, name in enumerate(ORDER)}
app.registered_commands.sort(key=lambda command: _place.get(str(command.name), len(ORDER)))
make_strict(app)


def _version() -> str:
    from importlib.metadata import PackageNotFoundError, version

    try:
        return version("sidepath")
    except PackageNotFoundError:
        return "(from a folder, not installed)"

"""`new`, `verify`, `migrate`, `backup`, `restore`, `move`, `merge`, `tui`: the book as a whole."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Any, Optional

import typer

from kb.cli import exit_codes
from kb.cli.render import counted, wrapped
from kb.cli.session import Session, current_session
from kb.errors import SidepathError
from kb.plain import excerpt

Word = Optional[str]  # noqa: UP045 - typer reads the annotations at run time


def register(app: typer.Typer) -> None:
    """Add the commands of this file."""
    app.command("new")(new)
    app.command("verify")(verify)
    app.command("migrate")(migrate)
    app.command("backup")(backup)
    app.command("restore")(restore)
    app.command("move")(move)
    app.command("merge")(merge)
    app.command("tui")(tui)


def new() -> None:
    """Create an empty record book where --book says (else in your data directory); never overwrites."""
    from kb.book.keeping import create_book, grants_file

    session = current_session()
    path = create_book(session.settings.book)
    lines = wrapped(f"New record book at {path}")
    grants = grants_file(path)
    if grants is not None:
        lines += wrapped(f"Only you may use it so far. Grants for readers, contributors and curators: {grants}")
    session.answer({"book": path}, "\n".join(lines))


def verify() -> int:
    """Check the book from the file up to the facts derived from its runs."""
    session = current_session()
    with session.opened_if_possible() as book, session.progress("Verifying") as progress:
        checks = book.verify(progress)
    progress.check_stopped()
    ok = all(c.ok for c in checks)
    lines = [
        line for c in checks for line in wrapped(c.detail, 22, first=f"  {'ok ' if c.ok else 'BAD'} {c.name:<15} ")
    ]
    data = {"ok": ok, "checks": [{"name": c.name, "ok": c.ok, "detail": c.detail} for c in checks]}
    session.answer(data, "\n".join(["The book is sound." if ok else "The book has trouble:", *lines]))
    return exit_codes.DONE if ok else exit_codes.BOOK_TROUBLE


def migrate() -> None:
    """Bring an older book up to this program, after a backup; rebuild what an older recipe derived."""
    from kb.book import migrate_book

    session = current_session()
    with session.progress("Rebuilding") as progress:
        said = migrate_book(session.settings.book, progress)
    progress.check_stopped()
    session.answer({"done": said}, "\n".join(wrapped(said)))


def backup(
    target: Annotated[str, typer.Argument(help="File to write, or a folder for dated copies.")],
) -> None:
    """Copy the book while others may be writing; the copy is verified."""
    session = current_session()
    with session.opened(read_only=True) as book:
        path = book.backup(Path(target), keep=session.settings.backups_kept)
    session.answer({"backup": str(path)}, "\n".join(wrapped(f"Backed up to {path}; the copy was verified.")))


def restore(
    source: Annotated[str, typer.Argument(help="A backup.")],
    target: Annotated[str, typer.Argument(help="A new file, or a database without a book; never overwritten.")],
) -> None:
    """Make a book from a backup, in a new place, and verify it."""
    from kb.book import restore_book

    session = current_session()
    path = restore_book(source, target)
    text = f"Restored to {path} and verified. Move it where the group opens it."
    session.answer({"book": path}, "\n".join(wrapped(text)))


def move(
    target: Annotated[str, typer.Argument(metavar="TO", help="A new file, or the URL of a database without a book.")],
) -> None:
    """Carry the whole book over to a server or a file, compare row by row, and leave the old one as it is."""
    session = current_session()
    with session.opened(read_only=True) as book, session.progress("Moving") as progress:
        old = book.path
        moved = book.move(target, who=session.initials, progress=progress)
    text = (
        f"{counted(moved.rows['run'], 'run')} with all history, drafts, house rules and attached files are now at "
        f"{moved.book}; everything was read back and is the same. {old} was left as it is: write in the new book only. "
        "What is still written in the old one, `sidepath merge` takes over."
    )
    session.answer(moved.as_dict(), "\n".join(wrapped(text)))


def merge(other: Annotated[str, typer.Argument(help="The other book.")]) -> int:
    """Take in another book; twice, or the other way round, comes to the same."""
    session = current_session()
    with session.opened() as book, session.progress("Merging") as progress:
        report = book.merge(other, who=session.initials, progress=progress)
    added = counted(report.added, "run")
    lines = wrapped(f"{added} added, {report.updated} brought up to date, {report.same} the same.")
    for conflict in report.conflicts:
        lines += wrapped(
            f"{conflict.code}, {conflict.field}: "
            + " or ".join(f"{excerpt(repr(c.value), 100)} ({c.who})" for c in conflict.claims)
            + "; the first stands until somebody settles it (`sidepath settle`).",
            2,
        )
    if report.stopped:
        lines.append("Stopped; merge again to go on. Nothing is doubled.")
    session.answer(report.as_dict(), "\n".join(lines))
    return exit_codes.INTERRUPTED if report.stopped else exit_codes.DONE


def tui(
    serve: Annotated[bool, typer.Option("--serve", help="In a browser, on this machine only.")] = False,
    port: Annotated[int, typer.Option(min=1, max=65535)] = 8317,
) -> None:
    """Open the terminal interface."""
    session = current_session()
    if serve:
        from tui.serving import serve_on_loopback

        serve_on_loopback(session.settings.book, session.who, port)
        return
    open_terminal_interface(session)


def open_terminal_interface(session: Session) -> None:
    """Run the terminal interface until it is closed.

    Raises:
        SidepathError: there is no terminal to draw on.
    """
    import os
    import sys

    is_served = "TEXTUAL_DRIVER" in os.environ  # a browser session draws through pipes
    if not is_served and not (sys.stdin.isatty() and sys.stdout.isatty()):
        raise SidepathError("There is no terminal to draw on.", "Run `sidepath tui` in a terminal.")
    run_application: Any
    from tui.application import run_application

    run_application(session.settings.book, session.who)

"""`conflicts`, `settle`, `reinstate`: what two books said differently, and a withdrawal taken back."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Optional

import typer

from kb.cli.render import wrapped
from kb.cli.session import current_session

if TYPE_CHECKING:
    from kb.store.values import Conflict

Numbers = Optional[list[str]]  # noqa: UP045 - typer reads the annotations at run time


def register(app: typer.Typer) -> None:
    """Add the commands of this file."""
    app.command("conflicts")(conflicts)
    app.command("settle")(settle)
    app.command("reinstate")(reinstate)


def conflicts() -> None:
    """List what two merged books say differently of one run, and wait for somebody to settle."""
    session = current_session()
    with session.opened(read_only=True) as book:
        found = book.conflicts()
    data = [conflict.as_dict() for conflict in found]
    session.answer(data, "\n".join(_lines(found)) or "Nothing waits to be settled.")


def settle(
    code: Annotated[str, typer.Argument(help="The run's code.")],
    why: Annotated[str, typer.Option("--why", help="Reason, kept in the history.")],
    keep: Annotated[
        Numbers, typer.Option("--keep", metavar="FIELD=N", help="Number of the value that shall stand; repeatable.")
    ] = None,
) -> None:
    """Settle what two books said differently of a run; without --keep, what stands is what stays."""
    from kb.book import choices_from_words

    session = current_session()
    with session.opened() as book:
        choices = choices_from_words(book.conflicts(), book.get(code), keep or ())
        run = book.settle(code, choices, who=session.initials, why=why)
    told = ", ".join(f"{field.rpartition('.')[2].replace('_', ' ')} {value!r}" for field, value in choices.items())
    said = f"{run.code} settled{': ' + told if told else ', as it stood'}."
    session.answer({"run": run.code, "settled": choices}, "\n".join(wrapped(said)))


def reinstate(
    code: Annotated[str, typer.Argument(help="The run's code.")],
    why: Annotated[str, typer.Option("--why", help="Reason, kept in the history.")],
) -> None:
    """Take a withdrawal back: the run speaks again."""
    from kb.record.portable import run_to_dict

    session = current_session()
    with session.opened() as book:
        run = book.reinstate(code, why=why, who=session.initials)
    session.answer(run_to_dict(run), f"{run.code} stands again.")


def _lines(found: tuple[Conflict, ...]) -> list[str]:
    lines: list[str] = []
    for conflict in found:
        lines += wrapped(f"{conflict.code}, {conflict.field}:")
        for number, claim in enumerate(conflict.claims, start=1):
            stands = ", stands" if number == 1 else ""
            when = claim.at.strftime("%Y-%m-%d %H:%M UTC")
            lines += wrapped(f"{claim.value!r} ({claim.who}, {when}{stands})", 6, first=f"  {number:>2}  ")
    if lines:
        lines += wrapped("Settle with: sidepath settle CODE --keep FIELD=NUMBER --why REASON")
    return lines

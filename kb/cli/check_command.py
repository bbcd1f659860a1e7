"""`check` and `demo`: the assessment of a planned step."""

from __future__ import annotations

import shlex
from dataclasses import replace
from typing import Annotated, Optional

import typer

from kb.cli.checking import answer_check, show_assessment
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
)
from kb.cli.session import current_session, put
from kb.plain import plain
from kb.vocabulary import Severity


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
    acknowledge: Annotated[
        Optional[str],  # noqa: UP045
        typer.Option("--acknowledge", metavar="ID", help="Finding that is seen and taken on; it stays."),
    ] = None,
    because: Annotated[
        Optional[str],  # noqa: UP045
        typer.Option("--because", metavar="REASON", help="Why, for --acknowledge; kept with your initials."),
    ] = None,
) -> int:
    """Check a planned step against the record, known liabilities and hazards."""
    words = {
        "reagents": reagents,
        "bases": bases,
        "acids": acids,
        "additives": additives,
        "solvents": solvents,
        "temperature": temp,
        "time": time,
        "concentration": conc,
        "scale": scale,
        "atmosphere": atmosphere,
    }
    return answer_check(
        current_session(),
        scheme,
        words,
        top=top,
        fail_on=fail_on,
        at_date=at_date,
        acknowledge=acknowledge,
        because=because,
    )


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

"""`find`: runs by structure, transformation, words and conditions together."""

from __future__ import annotations

from typing import Annotated, Optional

import typer

from kb.cli.render import table, wrapped
from kb.cli.session import current_session
from kb.vocabulary import CarbonClass, LeavingGroup, Verdict

Word = Optional[str]  # noqa: UP045 - typer reads the annotations at run time


def register(app: typer.Typer) -> None:
    """Add the command of this file."""
    app.command("find")(find)


def find(
    substructure: Annotated[Word, typer.Option("--substructure", metavar="SMARTS")] = None,
    similar: Annotated[Word, typer.Option("--similar", metavar="SMILES")] = None,
    at_least: Annotated[float, typer.Option("--at-least", min=0, max=1, help="Least Tanimoto of --similar.")] = 0.4,
    exact: Annotated[Word, typer.Option("--exact", metavar="SMILES")] = None,
    transformation: Annotated[Word, typer.Option("--transformation", metavar="SMARTS>>SMARTS")] = None,
    role: Annotated[str, typer.Option(help="substrate, product, reagent or any.")] = "any",
    words: Annotated[Word, typer.Option("--words", help="In notes, titles and references.")] = None,
    solvent: Annotated[Word, typer.Option("--solvent")] = None,
    base: Annotated[Word, typer.Option("--base")] = None,
    temp_from: Annotated[Word, typer.Option("--temp-from", metavar="T")] = None,
    temp_to: Annotated[Word, typer.Option("--temp-to", metavar="T")] = None,
    failed: Annotated[Word, typer.Option("--failed", metavar="MODE")] = None,
    verdict: Annotated[Optional[Verdict], typer.Option("--verdict")] = None,  # noqa: UP045
    carbon_class: Annotated[Optional[CarbonClass], typer.Option("--carbon-class")] = None,  # noqa: UP045
    leaving_group: Annotated[Optional[LeavingGroup], typer.Option("--leaving-group")] = None,  # noqa: UP045
    since: Annotated[Word, typer.Option("--since", metavar="YYYY-MM-DD")] = None,
    limit: Annotated[int, typer.Option(min=1, max=1000)] = 20,
    page: Annotated[int, typer.Option(min=1)] = 1,
) -> None:
    """Find runs; every option given must hold."""
    from kb.book import criteria_from_words

    session = current_session()
    criteria = criteria_from_words(
        substructure=substructure,
        similar=similar,
        at_least=at_least,
        exact=exact,
        transformation=transformation,
        role=role,
        words=words,
        solvent=solvent,
        base=base,
        temp_from=temp_from,
        temp_to=temp_to,
        failed=failed,
        verdict=verdict,
        carbon_class=carbon_class,
        leaving_group=leaving_group,
        since=since,
        limit=limit,
        page=page,
    )
    with session.opened(read_only=True) as book:
        result = book.find(criteria)
        lines = {} if session.as_json else {item.run: book.one_line(item.run) for item in result.items}
    if session.as_json:
        session.print_json(result.as_dict())
        return
    for remark in result.notes:
        session.say(remark)
    if not result.items:
        typer.echo("No run fits." if result.total == 0 else f"No run on this page; {result.total} fit.")
        return
    rows = [(i.run, "" if i.score is None else f"{i.score:.2f}", *lines[i.run]) for i in result.items]
    typer.echo("\n".join(table(rows, ("run", "score", "date", "verdict", "what"), (7, 5, 10, 7, 43))))
    typer.echo(f"{len(result.items)} of {result.total} shown, {result.elapsed_ms:.0f} ms")
    if not result.complete:
        session.say("\n".join(wrapped("The search was stopped at its deadline: this is only part of the answer.")))

"""`find`: runs by structure, transformation, words and conditions together."""

from __future__ import annotations

from typing import Annotated, Optional

import typer

from kb.cli.look_commands import LAST_PAGE
from kb.cli.render import counted, table, wrapped
from kb.cli.session import current_session, put
from kb.plain import excerpt
from kb.vocabulary import CarbonClass, LeavingGroup, Verdict

Word = Optional[str]  # noqa: UP045 - typer reads the annotations at run time


def register(app: typer.Typer) -> None:
    """Add the command of this file."""
    app.command("find")(find)


def find(
    substructure: Annotated[Word, typer.Option("--substructure", metavar="SMARTS", help="What it holds.")] = None,
    similar: Annotated[Word, typer.Option("--similar", metavar="SMILES", help="What it is like; best first.")] = None,
    at_least: Annotated[
        float, typer.Option("--at-least", metavar="T", min=0, max=1, help="Least Tanimoto of --similar.")
    ] = 0.4,
    exact: Annotated[Word, typer.Option("--exact", metavar="SMILES", help="The very structure.")] = None,
    transformation: Annotated[
        Word, typer.Option("--transformation", metavar="SMARTS>>SMARTS", help="What becomes of what.")
    ] = None,
    role: Annotated[str, typer.Option(help="Of the structure: substrate, product, reagent or any.")] = "any",
    words: Annotated[Word, typer.Option("--words", help="In notes, titles and references.")] = None,
    solvent: Annotated[Word, typer.Option("--solvent", metavar="NAME")] = None,
    base: Annotated[Word, typer.Option("--base", metavar="NAME")] = None,
    temp_from: Annotated[Word, typer.Option("--temp-from", metavar="T", help="At least this hot.")] = None,
    temp_to: Annotated[Word, typer.Option("--temp-to", metavar="T", help="At most this hot.")] = None,
    failed: Annotated[Word, typer.Option("--failed", metavar="MODE", help="How it failed.")] = None,
    verdict: Annotated[Optional[Verdict], typer.Option("--verdict")] = None,  # noqa: UP045
    carbon_class: Annotated[
        Optional[CarbonClass],  # noqa: UP045
        typer.Option("--carbon-class", metavar="WORD", help="primary, tertiary, aryl..."),
    ] = None,
    leaving_group: Annotated[
        Optional[LeavingGroup],  # noqa: UP045
        typer.Option("--leaving-group", metavar="WORD", help="bromide, mesylate, epoxide..."),
    ] = None,
    since: Annotated[Word, typer.Option("--since", metavar="YYYY-MM-DD", help="Run on or after this day.")] = None,
    limit: Annotated[int, typer.Option(metavar="N", min=1, max=1000, help="Runs on a page.")] = 20,
    page: Annotated[int, typer.Option(metavar="N", min=1, max=LAST_PAGE)] = 1,
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
        session.say(excerpt(remark, 200))
    if not result.items:
        put("No run fits." if result.total == 0 else f"No run on this page; {result.total} fit.")
        return
    if any(item.score is not None for item in result.items):
        scored = [(i.run, "" if i.score is None else f"{i.score:.2f}", *lines[i.run]) for i in result.items]
        text = table(scored, ("run", "score", "date", "verdict", "what"), (7, 5, 10, 7, 43))
    else:
        text = table([(i.run, *lines[i.run]) for i in result.items], ("run", "date", "verdict", "what"), (7, 10, 7, 50))
    first = (page - 1) * limit
    shown = f"{first + 1} to {first + len(result.items)} of {counted(result.total, 'run')}"
    put("\n".join([*text, f"{shown}, {result.elapsed_ms:.0f} ms"]))
    if not result.complete:
        session.say("\n".join(wrapped("The search was stopped at its deadline: this is only part of the answer.")))

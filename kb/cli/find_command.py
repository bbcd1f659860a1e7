"""`find`: runs by structure, transformation, words and conditions together."""

from __future__ import annotations

from typing import Annotated, Optional

import typer

from kb.cli.look_commands import LAST_PAGE
from kb.cli.render import counted, table
from kb.cli.session import current_session, put
from kb.plain import excerpt
from kb.search.criteria import Order
from kb.vocabulary import CarbonClass, LeavingGroup, Verdict

Words = Optional[list[str]]  # noqa: UP045 - typer reads the annotations at run time
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
    at_centre: Annotated[
        Word,
        typer.Option("--at-centre", metavar="SMARTS", help="What the substrate holds, [C:1] the reacting carbon."),
    ] = None,
    transformation: Annotated[
        Word, typer.Option("--transformation", metavar="SMARTS>>SMARTS", help="What becomes of what.")
    ] = None,
    role: Annotated[str, typer.Option(help="Of the structure: substrate, product, reagent or any.")] = "any",
    ignore_stereo: Annotated[
        bool, typer.Option("--ignore-stereo", help="Stereo marks of a query do not count.")
    ] = False,
    words: Annotated[Word, typer.Option("--words", help="In notes, titles and references.")] = None,
    solvent: Annotated[Word, typer.Option("--solvent", metavar="NAME")] = None,
    base: Annotated[Word, typer.Option("--base", metavar="NAME")] = None,
    reagent: Annotated[Word, typer.Option("--reagent", metavar="NAME", help="Anything else in the flask.")] = None,
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
    until: Annotated[Word, typer.Option("--until", metavar="YYYY-MM-DD", help="Run on or before this day.")] = None,
    project: Annotated[Word, typer.Option("--project", metavar="NAME")] = None,
    any_of: Annotated[
        Words, typer.Option("--any-of", metavar="'FIELD=VALUE'", help="Repeatable; at least one of these must hold.")
    ] = None,
    none_of: Annotated[
        Words, typer.Option("--none-of", metavar="'FIELD=VALUE'", help="Repeatable; none of these may hold.")
    ] = None,
    order: Annotated[Order, typer.Option("--order", help="best (of --similar, else newest), newest, oldest, code.")] = (
        Order.BEST
    ),
    deadline: Annotated[
        float, typer.Option("--deadline", metavar="S", min=0.1, max=3600, help="Answer with what was found by then.")
    ] = 60.0,
    limit: Annotated[int, typer.Option(metavar="N", min=1, max=1000, help="Runs on a page.")] = 20,
    page: Annotated[int, typer.Option(metavar="N", min=1, max=LAST_PAGE)] = 1,
) -> None:
    """Find runs; every option given must hold.

    FIELD is an option of this command without its hyphens; several are joined by " and ":
    --any-of 'solvent=DMF' --any-of 'solvent=DMSO and temp-to=40C' --none-of 'words=wet'
    """
    from kb.book import criteria_from_words

    session = current_session()
    criteria = criteria_from_words(
        substructure=substructure,
        similar=similar,
        at_least=at_least,
        exact=exact,
        at_centre=at_centre,
        transformation=transformation,
        ignore_stereo=ignore_stereo,
        role=role,
        words=words,
        solvent=solvent,
        base=base,
        reagent=reagent,
        temp_from=temp_from,
        temp_to=temp_to,
        failed=failed,
        verdict=verdict,
        carbon_class=carbon_class,
        leaving_group=leaving_group,
        since=since,
        until=until,
        project=project,
        any_of=any_of,
        none_of=none_of,
        order=order,
        limit=limit,
        page=page,
    )
    with session.opened(read_only=True) as book, session.progress("Searching") as progress:
        result = book.find(criteria, deadline_s=deadline, progress=progress)
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

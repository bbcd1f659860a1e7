"""`read`, `runs`, `show`, `history`, `lookup`: looking without changing anything."""

from __future__ import annotations

from enum import StrEnum
from typing import Annotated, Optional

import typer

from kb.cli import exit_codes
from kb.cli.session import current_session
from kb.errors import NameUnknown, StructureError
from kb.plain import excerpt

Word = Optional[str]  # noqa: UP045 - typer reads the annotations at run time
LAST_PAGE = 1_000_000


class SortWord(StrEnum):
    """By what `runs` sorts, latest, highest or last first."""

    DATE = "date"
    CODE = "code"
    RECORDED = "recorded"
    YIELD = "yield"
    VERDICT = "verdict"
    PROJECT = "project"
    BY = "by"


def register(app: typer.Typer) -> None:
    """Add the commands of this file."""
    app.command("read")(read)
    app.command("runs")(runs)
    app.command("show")(show)
    app.command("history")(history)
    app.command("lookup")(lookup)


def read(
    scheme: Annotated[Word, typer.Argument(help="Reaction SMILES, a substrate, a name, or a file.")] = None,
    ignore_maps: Annotated[bool, typer.Option("--ignore-maps", help="Read without the atom maps.")] = False,
    batch: Annotated[Word, typer.Option("--batch", metavar="FILE.csv", help="Read a column of schemes.")] = None,
    column: Annotated[Word, typer.Option("--column", metavar="NAME", help="Its heading.")] = None,
) -> int:
    """Say what a scheme does: centre, leaving group, fate, and what else could form."""
    from kb.book import read_scheme, scheme_from_argument
    from kb.cli.render_reading import render_reading

    if (batch is None) == (scheme is None):
        raise typer.BadParameter("Give a scheme, or --batch FILE.csv --column NAME.")
    if (batch is None) != (column is None):
        raise typer.BadParameter("--batch and --column go together.")
    if batch is not None and column is not None:
        return _read_batch(batch, column, ignore_maps=ignore_maps)
    session = current_session()
    try:
        text = scheme_from_argument(scheme or "")
    except StructureError as error:
        session.refuse(read_scheme(scheme or "", ignore_maps=ignore_maps).as_dict(), error)
        return exit_codes.REFUSED
    reading = read_scheme(text, ignore_maps=ignore_maps)
    if not reading.ok:
        session.refuse(reading.as_dict(), StructureError(reading.reason))
        return exit_codes.REFUSED
    session.answer(reading.as_dict(), "" if session.as_json else render_reading(reading))
    return exit_codes.DONE


def _read_batch(path: str, column: str, *, ignore_maps: bool) -> int:
    """Write one JSON line a row, in order, as the rows are read."""
    from kb.book import iter_scheme_column, read_scheme

    session = current_session()
    read_rows = failed = 0
    with session.progress("Reading") as progress:
        for text in iter_scheme_column(path, column):
            if progress.cancelled():
                break
            reading = read_scheme(text, ignore_maps=ignore_maps)
            read_rows += 1
            failed += not reading.ok
            session.print_json(reading.as_dict())
            progress.advance(read_rows, None)
    if failed:
        session.say(f"{failed} of {read_rows} rows could not be read; their lines say why.")
    if progress.stopped:
        session.say(f"Stopped after {read_rows} rows.")
        return exit_codes.INTERRUPTED
    return exit_codes.REFUSED if failed else exit_codes.DONE


def runs(
    limit: Annotated[int, typer.Option(metavar="N", min=1, max=1000, help="Runs on a page.")] = 30,
    page: Annotated[int, typer.Option(metavar="N", min=1, max=LAST_PAGE)] = 1,
    sort: Annotated[SortWord, typer.Option(help="Latest or highest first.")] = SortWord.DATE,
    withdrawn: Annotated[bool, typer.Option("--withdrawn", help="Also the withdrawn ones.")] = False,
) -> None:
    """List the runs of the book."""
    from kb.cli.render_run import render_runs
    from kb.record.portable import run_to_dict

    session = current_session()
    with session.opened(read_only=True) as book:
        got = book.page(offset=(page - 1) * limit, limit=limit, sort=sort.value, withdrawn=withdrawn)
    session.answer(
        {"total": got.total, "page": page, "items": [run_to_dict(r) for r in got.items]},
        render_runs(got.items, got.total, (page - 1) * limit),
    )


def show(code: Annotated[str, typer.Argument(help="The run's code.")]) -> None:
    """Show one run in full."""
    from kb.cli.render_run import render_run
    from kb.record.portable import run_to_dict

    session = current_session()
    with session.opened(read_only=True) as book:
        run = book.get(code)
        reading = "" if session.as_json else book.reading_words(run)
    session.answer(run_to_dict(run), "" if session.as_json else render_run(run, reading))


def history(code: Annotated[str, typer.Argument(help="The run's code.")]) -> None:
    """Show who changed a run, when, why and from what."""
    from kb.cli.render_run import render_history

    session = current_session()
    with session.opened(read_only=True) as book:
        run, entries = book.get(code), book.history_as_dicts(code)
    session.answer({"run": run.code, "history": entries}, render_history(entries))


def lookup(
    name: Annotated[str, typer.Argument(help="Name, abbreviation or SMILES.")],
    kind: Annotated[Word, typer.Option(help="solvent or reagent.")] = None,
) -> int:
    """Look a solvent or reagent up; near names are offered, not taken."""
    from kb.book import lookup_material
    from kb.cli.render_material import render_lookup

    session = current_session()
    found = lookup_material(name, kind)
    if found["match"] is None and not found["offers"] and not found["also"]:
        what = kind or "material"
        error = NameUnknown(f"No {what} is called {excerpt(name, 60)!r}.", "Try another name, or its SMILES.", name)
        session.refuse(found, error)
        return exit_codes.REFUSED
    session.answer(found, render_lookup(found))
    return exit_codes.DONE

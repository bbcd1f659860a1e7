"""`read`, `runs`, `show`, `history`, `lookup`: looking without changing anything."""

from __future__ import annotations

import json
from typing import Annotated, Any, Optional

import typer

from kb.cli import exit_codes
from kb.cli.render import wrapped
from kb.cli.session import current_session
from kb.plain import plain

Word = Optional[str]  # noqa: UP045 - typer reads the annotations at run time


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
    from kb.book import iter_scheme_column, read_scheme, scheme_from_argument

    session = current_session()
    if batch is not None:
        if column is None:
            raise typer.BadParameter("--batch needs --column NAME.")
        failed = 0
        for text in iter_scheme_column(batch, column):
            reading = read_scheme(text, ignore_maps=ignore_maps)
            failed += not reading.ok
            session.print_json(reading.as_dict())
        if failed:
            session.say(f"{failed} rows could not be read; their lines say why.")
        return exit_codes.REFUSED if failed else exit_codes.DONE
    if scheme is None:
        raise typer.BadParameter("Give a scheme, or --batch FILE.csv --column NAME.")
    reading = read_scheme(scheme_from_argument(scheme), ignore_maps=ignore_maps)
    if session.as_json:
        session.print_json(reading.as_dict())
    elif reading.ok:
        typer.echo(_reading_text(reading))
    if not reading.ok:
        session.say(f"sidepath: {reading.reason}")
        return exit_codes.REFUSED
    return exit_codes.DONE


def runs(
    limit: Annotated[int, typer.Option(min=1, max=1000)] = 30,
    page: Annotated[int, typer.Option(min=1)] = 1,
    sort: Annotated[str, typer.Option(help="date, code or yield; newest first.")] = "date",
    withdrawn: Annotated[bool, typer.Option("--withdrawn", help="Also the withdrawn ones.")] = False,
) -> None:
    """List the runs of the book."""
    from kb.cli.render_run import render_runs
    from kb.record.portable import run_to_dict

    session = current_session()
    with session.opened(read_only=True) as book:
        got = book.page(offset=(page - 1) * limit, limit=limit, sort=sort, withdrawn=withdrawn)
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
    session.answer(run_to_dict(run), render_run(run))


def history(code: Annotated[str, typer.Argument(help="The run's code.")]) -> None:
    """Show who changed a run, when, why and from what."""
    from kb.cli.render_run import render_history

    session = current_session()
    with session.opened(read_only=True) as book:
        entries = book.history_as_dicts(code)
    if session.as_json:
        typer.echo(json.dumps({"run": code, "history": entries}, ensure_ascii=False, default=str))
    else:
        typer.echo(render_history(entries))


def lookup(
    name: Annotated[str, typer.Argument(help="Name, abbreviation or SMILES.")],
    kind: Annotated[Word, typer.Option(help="solvent or reagent.")] = None,
) -> int:
    """Look a solvent or reagent up; near names are offered, not taken."""
    from kb.book import lookup_material

    session = current_session()
    found = lookup_material(name, kind)
    session.answer(found, _lookup_text(name, found))
    return exit_codes.DONE if found["match"] or found["offers"] else exit_codes.REFUSED


def _lookup_text(name: str, found: dict[str, Any]) -> str:
    match = found["match"]
    if match is None:
        offers = [f"  {o['name']} ({o['score']:.0f})" for o in found["offers"]]
        said = f"No material is called {plain(name)!r}."
        return "\n".join([said, "Near names:" if offers else "Nothing near either.", *offers])
    lines = [plain(match["name"])]
    for key, value in match.items():
        if key != "name" and value not in (None, "", [], ()):
            shown = ", ".join(map(str, value)) if isinstance(value, (list, tuple)) else str(value)
            lines += wrapped(shown, 22, first=f"  {key.replace('_', ' '):<20}")
    return "\n".join(lines)


def _reading_text(reading: Any) -> str:
    lines = [f"{reading.confidence}: {reading.fate or 'no single fate'}"]
    if reading.reason:
        lines += wrapped(reading.reason, 2)
    for centre in reading.centres:
        words = [str(centre.carbon_class), *map(str, centre.flags)]
        if centre.leaving_group:
            words.append(f"loses {centre.leaving_group}")
        words.append(f"{centre.beta_hydrogens} beta hydrogens")
        lines += wrapped(f"component {centre.component}, atom {centre.atom}: {', '.join(words)}", 2)
    if reading.nucleophile:
        lines += wrapped(f"nucleophile: {reading.nucleophile.nucleophile_class.replace('_', ' ')}", 2)
    if reading.possible:
        lines.append("could form")
        for possible in reading.possible[:20]:
            lines += wrapped(f"{possible.fate}: {possible.product}", 4)
            lines += wrapped(possible.note, 8) if possible.note else []
        if len(reading.possible) > 20:
            lines.append(f"    and {len(reading.possible) - 20} more (--json lists all)")
    return "\n".join(lines)

"""`import`, `export`, `template`, `mappings`: runs from files and into files."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any, Literal, Optional

import typer

from kb.cli import exit_codes
from kb.cli.render import counted, wrapped
from kb.cli.session import Session, current_session
from kb.errors import Cancelled, ImportFileError
from kb.plain import excerpt

if TYPE_CHECKING:
    from kb.exchange.headings import ColumnMapping
    from kb.exchange.loading import LoadReport

FEW = 10
"""Rejections and unknown names that are listed; --json has more."""
Word = Optional[str]  # noqa: UP045 - typer reads the annotations at run time
DateOrder = Optional[Literal["dmy", "mdy"]]  # noqa: UP045

SURE = ("exact", "synonym", "chosen")
"""How a heading was matched where nobody need be asked."""


def register(app: typer.Typer) -> None:
    """Add the commands of this file."""
    app.command("import")(import_file)
    app.command("export")(export_file)
    app.command("template")(template)
    app.command("mappings")(mappings)


def import_file(
    file: Annotated[str, typer.Argument(help="CSV, XLSX, JSON Lines, RDfile, RXN, SDF or SMILES list.")],
    dry_run: Annotated[bool, typer.Option("--dry-run", help="Say what would be stored; store nothing.")] = False,
    rejects: Annotated[Word, typer.Option("--rejects", metavar="FILE", help="Rows that could not be read.")] = None,
    mapping: Annotated[
        Word, typer.Option("--mapping", metavar="NAME", help="Headings to fields: a saved name, or FILE.json.")
    ] = None,
    save_as: Annotated[
        Word, typer.Option("--save-mapping", metavar="NAME", help="Save what the headings were taken for.")
    ] = None,
    sheet: Annotated[Word, typer.Option("--sheet", metavar="NAME", help="Which sheet of a workbook.")] = None,
    dates: Annotated[DateOrder, typer.Option("--dates", help="Order of dates like 03/04/2024.")] = None,
    yes: Annotated[bool, typer.Option("--yes", help="Do not ask about headings that only resemble a field.")] = False,
) -> int:
    """Take runs in from a file; run again, nothing is doubled."""
    from kb.book.mappings import load_mapping, save_mapping, with_date_order

    session = current_session()
    if rejects is not None and Path(rejects).exists() and Path(file).exists() and Path(rejects).samefile(file):
        raise ImportFileError(f"{rejects} is the file that is read.", "Name another one for the rejects.", rejects)
    fields = with_date_order(load_mapping(mapping) if mapping is not None else None, dates)
    _confirm(session, Path(file), fields, sheet, is_sure=yes or dry_run)
    with session.opened() as book, session.progress("Importing") as progress:
        report = book.import_file(
            Path(file),
            who=session.initials,
            dry_run=dry_run,
            rejects=Path(rejects) if rejects else None,
            mapping=fields,
            sheet=sheet,
            progress=progress,
        )
    if save_as is not None:
        if report.mapping is None:
            raise ImportFileError(f"{file} has no headings to save.", "Mappings are for tables.", file)
        session.say(f"The mapping is saved: {save_mapping(save_as, report.mapping)}")
    session.answer(report.as_dict(), _import_text(report, rejects, dry_run=dry_run))
    if report.stopped:
        return exit_codes.INTERRUPTED
    return exit_codes.REFUSED if report.rejected else exit_codes.DONE


def export_file(
    file: Annotated[str, typer.Argument(help="File to write; its ending tells the format.")],
) -> None:
    """Write every run of the book to a file."""
    session = current_session()
    with session.opened(read_only=True) as book, session.progress("Exporting") as progress:
        count = book.export_file(Path(file), progress)
    text = f"{counted(count, 'run')} written to {file}"
    session.answer({"file": file, "runs": count}, "\n".join(wrapped(text)))


def template(
    file: Annotated[str, typer.Argument(help="New file: .csv or .xlsx for an empty table, .json for the JSON Schema.")],
) -> None:
    """Write an empty table to fill in, or the JSON Schema of a run."""
    from kb.book.mappings import write_template

    what = write_template(Path(file))
    current_session().answer({"file": file}, "\n".join(wrapped(f"{file}: {what}.")))


def mappings(
    name: Annotated[Word, typer.Argument(help="Show this one.")] = None,
) -> None:
    """List the saved mappings of headings to fields, or show one."""
    from kb.book.mappings import load_mapping, saved_mappings

    session = current_session()
    if name is None:
        names = saved_mappings()
        text = "\n".join(names) or "No mapping is saved yet: `sidepath import FILE --save-mapping NAME` saves one."
        session.answer(list(names), "\n".join(wrapped(text)) if not names else text)
        return
    found = load_mapping(name)
    columns: dict[str, Any] = found.get("columns", found)
    lines = [f"{excerpt(str(heading), 40)}: {_use_words(use)}" for heading, use in columns.items()]
    session.answer(found, "\n".join(line for text in lines for line in wrapped(text)))


def _confirm(session: Session, file: Path, fields: Any, sheet: str | None, *, is_sure: bool) -> None:
    """Show what the headings of a table are taken for, and ask where that is not sure and somebody is there to answer.

    Raises:
        Cancelled: the answer was no.
    """
    from kb.book.mappings import headings_of

    is_asked = sys.stdin.isatty() and sys.stderr.isatty() and not (is_sure or session.quiet or session.as_json)
    if not is_asked:
        return
    found = headings_of(file, fields, sheet)
    if found is None:
        return
    session.say("\n".join(_heading_lines(found)))
    if any(c.how not in (*SURE, "blank") for c in found.columns) and not typer.confirm(
        "Take the columns so?", default=True, err=True
    ):
        raise Cancelled(
            "Nothing was imported.", "Give --mapping, or rename the headings; `sidepath template FILE.csv` shows them."
        )


def _heading_lines(mapping: ColumnMapping) -> list[str]:
    """Return a line for each column: what it is taken for, and how surely."""
    lines = []
    for column in mapping.columns:
        if column.how == "blank":
            continue
        unit = f" [{column.unit}]" if column.unit else ""
        words = f"{column.field}{unit}" if column.field else "not used"
        reason = {
            "resembles": " (resembles it)",
            "unclear": " (could be one of two fields)",
            "spare": " (another column gives that already)",
            "unknown": " (no field is called so)" if not column.field else "",
        }.get(column.how, "")
        lines += wrapped(f"{excerpt(column.heading, 40)}: {words}{reason}", 4, first="  ")
    return lines


def _use_words(use: Any) -> str:
    if isinstance(use, dict):
        unit = f" [{use['unit']}]" if use.get("unit") else ""
        return f"{use.get('field') or 'not used'}{unit}"
    return str(use or "not used")


def _import_text(report: LoadReport, rejects: str | None, *, dry_run: bool) -> str:
    """Return what an import did, with the first rejections."""
    lines = wrapped(
        f"{counted(report.read, 'row')} read: {report.stored:,} {'would be stored' if dry_run else 'stored'}, "
        f"{report.duplicate:,} already there, {report.rejected:,} rejected."
    )
    if dry_run and report.mapping is not None:
        lines += ["The columns are taken for:", *_heading_lines(report.mapping)]
    for rejection in report.rejections[:FEW]:
        lines += wrapped(f"row {rejection.row}, {rejection.column or 'whole row'}: {rejection.reason}", 2)
    if report.rejected > FEW:
        lines.append(f"  and {report.rejected - FEW:,} more")
    if report.unknown_names:
        names = ", ".join(f"{name} ({count})" for name, count in report.unknown_names[:FEW])
        more = f" and {len(report.unknown_names) - FEW} more" if len(report.unknown_names) > FEW else ""
        lines += wrapped(f"Not in the catalogue, kept as written: {names}{more}.")
    if report.rejected and rejects:
        lines += wrapped(f"The rejected rows are in {rejects}: mend them there and import that file.")
    elif report.rejected:
        lines += wrapped("With --rejects FILE they are kept in a file to mend and import.")
    if report.stopped:
        lines.append("Stopped; import the file again to go on. Nothing is doubled.")
    return "\n".join(lines)

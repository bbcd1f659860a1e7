"""`record`, `amend`, `withdraw`: writing to the record."""

from __future__ import annotations

import sys
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any, Optional

import typer

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
    parse_conditions,
)
from kb.cli.render import wrapped
from kb.cli.session import Session, current_session, put
from kb.errors import ImportFileError, RecordConflict, SidepathError
from kb.plain import excerpt
from kb.vocabulary import Cause, Method, Verdict

if TYPE_CHECKING:
    from kb.book import Book
    from kb.record.run import Run

Words = Optional[list[str]]  # noqa: UP045 - typer reads the annotations at run time
Word = Optional[str]  # noqa: UP045


def register(app: typer.Typer) -> None:
    """Add the commands of this file."""
    app.command("record")(record)
    app.command("amend")(amend)
    app.command("withdraw")(withdraw)


def record(
    scheme: Annotated[Word, typer.Argument(help="Reaction SMILES, a substrate, a name, or a file.")] = None,
    from_file: Annotated[
        Word,
        typer.Option("--from", metavar="FILE.json", help="Whole runs as JSON: one, a list, or one a line; - = stdin."),
    ] = None,
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
    split: Annotated[Word, typer.Option(metavar="FATE=PCT,...", help="substitution=88,elimination=10.")] = None,
    by: Annotated[Optional[Method], typer.Option("--by", help="How the split was measured.")] = None,  # noqa: UP045
    isolated: Annotated[Word, typer.Option("--yield", metavar="PCT", help="Isolated yield.")] = None,
    assay: Annotated[Word, typer.Option("--assay-yield", metavar="PCT", help="Yield against a standard.")] = None,
    conversion: Annotated[Word, typer.Option("--conversion", metavar="PCT")] = None,
    ee: Annotated[Word, typer.Option("--ee", metavar="PCT", help="Enantiomeric excess.")] = None,
    product: Annotated[
        Words, typer.Option("--product", metavar="SMILES=SHARE", help="Seen product; repeatable.")
    ] = None,
    failed: Annotated[Words, typer.Option("--failed", metavar="MODE", help="Failure mode; repeatable.")] = None,
    motif: Annotated[Word, typer.Option("--motif", metavar="SMARTS", help="What the failure hit.")] = None,
    cause: Annotated[Optional[Cause], typer.Option("--cause", help="How sure you are.")] = None,  # noqa: UP045
    note: Annotated[str, typer.Option("--note", help="Free words, kept to the letter.")] = "",
    ref: Annotated[Word, typer.Option("--ref", help="Notebook reference.")] = None,
    project: Annotated[Word, typer.Option("--project")] = None,
    date: Annotated[Word, typer.Option("--date", metavar="YYYY-MM-DD", help="Day of the run; default today.")] = None,
    verdict: Annotated[Optional[Verdict], typer.Option("--verdict", help="In a word.")] = None,  # noqa: UP045
) -> None:
    """Add a run to the record."""
    from kb.book import check_scheme, outcome_from_words, parse_run_date, scheme_from_argument, today
    from kb.record.run import Run

    session = current_session()
    conditions = (reagents, bases, acids, additives, solvents, temp, time, conc, scale, atmosphere)
    if from_file is not None:
        others = (scheme, *conditions, split, by, isolated, assay, conversion, ee, product, failed, motif, cause)
        if any(v is not None for v in (*others, ref, project, date, verdict)) or note:
            raise typer.BadParameter("--from brings whole runs; give it alone, and amend afterwards.")
        _record_file(session, from_file)
        return
    if scheme is None:
        raise typer.BadParameter("Give a scheme, or --from FILE.json.")
    text = check_scheme(scheme_from_argument(scheme))
    run = Run(
        scheme=text,
        conditions=parse_conditions(*conditions),
        outcome=outcome_from_words(
            scheme=text,
            split=split,
            method=by,
            isolated=isolated,
            assay=assay,
            conversion=conversion,
            ee=ee,
            products=product or (),
            failed=failed or (),
            motif=motif,
            cause=cause,
        ),
        verdict=verdict,
        note=note,
        by=session.initials,
        date=parse_run_date(date) if date else today(),
        reference=ref,
        project=project,
    )
    _store(session, [run])


def amend(
    code: Annotated[str, typer.Argument(help="The run's code.")],
    why: Annotated[str, typer.Option("--why", help="Reason, kept in the history.")],
    changes: Annotated[
        list[str],
        typer.Option(
            "--set",
            metavar="FIELD=VALUE",
            help="note, verdict, temp, time, yield, split, date...; repeatable; nothing behind the = takes it away.",
        ),
    ],
) -> None:
    """Change a run; the old values, who, when and why are kept."""
    from kb.cli.render_run import change_words

    session = current_session()
    with session.opened() as book:
        run = book.amend(code, book.changes_from_words(code, changes), who=session.initials, why=why)
        changed = book.history_as_dicts(code)[-1]["changed"]
        _remark(session, book, run)
    lines = [f"{run.code} amended (revision {run.revision})."]
    for change in changed:
        lines += wrapped(change_words(change), 2)
    session.answer(_as_dict(run), "\n".join(lines))


def withdraw(
    code: Annotated[str, typer.Argument(help="The run's code.")],
    why: Annotated[str, typer.Option("--why", help="Reason, kept in the history.")],
) -> None:
    """Withdraw a run: it stays in the record but no longer speaks."""
    session = current_session()
    with session.opened() as book:
        before = book.get(code)
        if before.withdrawn_why is not None:
            why_then = excerpt(before.withdrawn_why, 80)
            hint = f"See `sidepath history {before.code}`."
            raise RecordConflict(f"{before.code} is withdrawn already ({why_then}).", hint, code)
        run = book.withdraw(code, why=why, who=session.initials)
    session.answer(_as_dict(run), f"{run.code} withdrawn. It stays in the history and can be read with `show`.")


def _as_dict(run: Run) -> dict[str, Any]:
    from kb.record.portable import run_to_dict

    return run_to_dict(run)


def _record_file(session: Session, name: str) -> None:
    from kb.book import runs_from_json

    place = "Standard input" if name == "-" else name
    try:
        text = sys.stdin.read() if name == "-" else Path(name).read_text(encoding="utf-8-sig")
    except UnicodeDecodeError as error:
        raise ImportFileError(f"{place} is not UTF-8 text.", "Save it as UTF-8.", name) from error
    _store(session, runs_from_json(text.removeprefix("\ufeff"), place))


def _store(session: Session, runs: Sequence[Run]) -> None:
    """Keep runs, tell what they were read as and what does not add up; all are new, or none is kept."""
    stored: list[Run] = []
    with session.opened() as book:
        there = book.known(runs)
        if there:
            names = ", ".join(f"{run.code}" for run in there[:5]) + (" ..." if len(there) > 5 else "")
            raise RecordConflict(f"In the book already: {names}.", "Amend what is there instead.", str(there[0].run_id))
        try:
            for run in runs:
                stored.append(book.add(run, who=session.initials))
        except SidepathError as error:
            if not stored:
                raise
            message = f"{error.message} Kept: {len(stored)} of {len(runs)}, up to {stored[-1].code}."
            raise type(error)(message, error.hint, error.value) from error
        for given, run in zip(runs, stored, strict=True):
            _remark(session, book, run, given.code)
        readings = [book.reading_words(run) for run in stored]
    if session.as_json:
        session.print_json(_as_dict(stored[0]) if len(stored) == 1 else [_as_dict(r) for r in stored])
    elif len(stored) > MANY:
        put(f"{len(stored)} runs recorded, {stored[0].code} to {stored[-1].code}.")
    else:
        put("\n\n".join(_recorded(run, words) for run, words in zip(stored, readings, strict=True)))


def _recorded(run: Run, reading: str) -> str:
    """Return a run just recorded, its long texts cut: whoever typed them knows them."""
    import dataclasses

    from kb.cli.render_run import render_run

    brief = dataclasses.replace(run, scheme=excerpt(run.scheme, BRIEF), note=excerpt(run.note, BRIEF))
    return render_run(brief, reading)


def _remark(session: Session, book: Book, run: Run, wanted_code: str | None = None) -> None:
    """Say what does not add up in a run, and that it got another code than it brought."""
    for finding in book.remarks(run, wanted_code):
        session.say("\n".join(wrapped(f"{str(finding.severity).upper()}: {finding.title}. {finding.why}")))


MANY = 5
"""Runs beyond which only their codes are told."""
BRIEF = 400
"""Longest scheme or note of a run just recorded that is shown [characters]."""

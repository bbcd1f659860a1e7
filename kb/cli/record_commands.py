"""`record`, `amend`, `withdraw`: writing to the record."""

from __future__ import annotations

import json
import sys
from collections.abc import Sequence
from pathlib import Path
from typing import Annotated, Any, Optional

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
from kb.cli.render_run import render_run
from kb.cli.session import Session, current_session
from kb.errors import ImportFileError, InvalidRecord
from kb.record.run import Run
from kb.vocabulary import Cause, Method, Verdict

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
        Word, typer.Option("--from", metavar="FILE.json", help="A whole run as JSON; - = stdin.")
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
    assay: Annotated[Word, typer.Option("--assay-yield", metavar="PCT")] = None,
    conversion: Annotated[Word, typer.Option("--conversion", metavar="PCT")] = None,
    ee: Annotated[Word, typer.Option("--ee", metavar="PCT")] = None,
    product: Annotated[
        Words, typer.Option("--product", metavar="SMILES=SHARE", help="Seen product; repeatable.")
    ] = None,
    failed: Annotated[Words, typer.Option("--failed", metavar="MODE", help="Failure mode; repeatable.")] = None,
    motif: Annotated[Word, typer.Option("--motif", metavar="SMARTS", help="What the failure hit.")] = None,
    cause: Annotated[Optional[Cause], typer.Option("--cause")] = None,  # noqa: UP045
    note: Annotated[str, typer.Option("--note", help="Free words.")] = "",
    ref: Annotated[Word, typer.Option("--ref", help="Notebook reference.")] = None,
    project: Annotated[Word, typer.Option("--project")] = None,
    date: Annotated[Word, typer.Option("--date", metavar="YYYY-MM-DD", help="Day of the run; default today.")] = None,
    verdict: Annotated[Optional[Verdict], typer.Option("--verdict")] = None,  # noqa: UP045
) -> None:
    """Add a run to the record."""
    from kb.book import outcome_from_words, parse_date, scheme_from_argument, today

    session = current_session()
    if from_file is not None:
        _record_file(session, from_file)
        return
    if scheme is None:
        raise typer.BadParameter("give a scheme, or --from FILE.json")
    run = Run(
        scheme=scheme_from_argument(scheme),
        conditions=parse_conditions(reagents, bases, acids, additives, solvents, temp, time, conc, scale, atmosphere),
        outcome=outcome_from_words(
            scheme=scheme,
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
        date=parse_date(date) if date else today(),
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
            help="note, verdict, temp, time, yield, split, date...; repeatable.",
        ),
    ],
) -> None:
    """Change a run; the old values, who, when and why are kept."""
    session = current_session()
    with session.opened() as book:
        run = book.amend(code, book.changes_from_words(code, changes), who=session.initials, why=why)
    session.answer(_as_dict(run), f"{run.code} amended (revision {run.revision}).")


def withdraw(
    code: Annotated[str, typer.Argument(help="The run's code.")],
    why: Annotated[str, typer.Option("--why", help="Reason, kept in the history.")],
) -> None:
    """Withdraw a run: it stays in the record but no longer speaks."""
    session = current_session()
    with session.opened() as book:
        run = book.withdraw(code, why=why, who=session.initials)
    session.answer(_as_dict(run), f"{run.code} withdrawn. It stays in the history and can be read with `show`.")


def _as_dict(run: Run) -> dict[str, Any]:
    from kb.record.portable import run_to_dict

    return run_to_dict(run)


def _record_file(session: Session, name: str) -> None:
    from kb.record.portable import run_from_dict

    try:
        text = sys.stdin.read() if name == "-" else Path(name).read_text(encoding="utf-8-sig")
    except UnicodeDecodeError as error:
        raise ImportFileError(f"{name} is not UTF-8 text.", "Save it as UTF-8.", name) from error
    try:
        data = json.loads(text)
    except (json.JSONDecodeError, RecursionError) as error:
        raise ImportFileError(
            f"{name} is no JSON: {error}.", "Give one run as `show --json` prints it.", name
        ) from error
    runs = [run_from_dict(entry) for entry in (data if isinstance(data, list) else [data])]
    if not runs:
        raise InvalidRecord("The file holds no run.", "Give one run as `show --json` prints it.", name)
    _store(session, runs)


def _store(session: Session, runs: Sequence[Run]) -> None:
    with session.opened() as book:
        stored = [book.add(run, who=session.initials) for run in runs]
        remarks = [remark for run in stored for remark in book.remarks(run)]
    if session.as_json:
        session.print_json(_as_dict(stored[0]) if len(stored) == 1 else [_as_dict(r) for r in stored])
    else:
        typer.echo("\n\n".join(render_run(run) for run in stored))
    for finding in remarks:
        session.say(f"{str(finding.severity).upper()}: {finding.title}. {finding.why}")

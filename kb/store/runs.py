"""Runs out of the tables: which ones, in what order, in pages or all of them.

It only reads. `RunFilter` says what is asked in the words of the record; names of materials are compared as
they were written (case apart) and by canonical SMILES, so whoever asks brings the synonyms. Withdrawn runs
are left out unless asked for.
"""

from __future__ import annotations

import datetime as dt
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from enum import StrEnum
from typing import Any
from uuid import UUID

import sqlalchemy as sa

from kb.errors import RecordConflict, RecordNotFound
from kb.record.run import Run
from kb.store import codes
from kb.store.mapping import CHILDREN, table
from kb.store.rows import ComponentRow, FactsRow, FailureRow, RunRow, SolventRow
from kb.store.run_of_rows import run_from_rows

BATCH = 500
"""Runs loaded at a time."""

RUN = table(RunRow)


class Sort(StrEnum):
    """By what runs are sorted; runs that lack it come last."""

    CODE = "code"
    DATE = "date"
    RECORDED = "recorded"
    YIELD = "yield"
    VERDICT = "verdict"
    PROJECT = "project"
    BY = "by"


@dataclass(frozen=True, slots=True, kw_only=True)
class Material:
    """One material by any of its names or by structure, in a role or in any."""

    names: tuple[str, ...] = ()
    smiles: str | None = None
    role: str | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class RunFilter:
    """Which runs are wanted; every part that is given must hold.

    Attributes:
        run_ids: only these; None = any.
        components, solvents: each must be in the flask.
        temp_from_c, temp_to_c: bounds on the most forcing temperature [degC], reflux resolved where facts are
            there.
        since, until: bounds on the day it was run, both included; runs without a date are left out then.
        failed: failure mode; verdict, carbon_class, leaving_group: controlled words.
        by, project, series, reference: as written, case apart.
        with_withdrawn: withdrawn runs too.
        only_conflicts: only runs that wait for somebody to settle a merge.
    """

    run_ids: frozenset[UUID] | None = None
    components: tuple[Material, ...] = ()
    solvents: tuple[Material, ...] = ()
    temp_from_c: float | None = None
    temp_to_c: float | None = None
    since: dt.date | None = None
    until: dt.date | None = None
    failed: str | None = None
    verdict: str | None = None
    carbon_class: str | None = None
    leaving_group: str | None = None
    by: str | None = None
    project: str | None = None
    series: str | None = None
    reference: str | None = None
    with_withdrawn: bool = False
    only_conflicts: bool = False


EVERY_STANDING_RUN = RunFilter()


def select_keys(wanted: RunFilter, sort: Sort = Sort.CODE, descending: bool = False) -> Any:
    """Return the statement for (run_key, run_id) in order; `run_ids` is left to the caller."""
    most_forcing_c = sa.func.coalesce(
        FactsRow.temperature_c,
        sa.case(
            (RunRow.temperature_start_c > RunRow.temperature_end_c, RunRow.temperature_start_c),
            else_=sa.func.coalesce(RunRow.temperature_end_c, RunRow.temperature_start_c),
        ),
    )
    statement = sa.select(RunRow.run_key, RunRow.run_id)
    needs_facts = wanted.temp_from_c, wanted.temp_to_c, wanted.carbon_class, wanted.leaving_group
    if any(part is not None for part in needs_facts):
        statement = statement.outerjoin(FactsRow, FactsRow.run_key == RunRow.run_key)
    clauses: list[sa.ColumnElement[bool]] = []
    if not wanted.with_withdrawn:
        clauses.append(RunRow.withdrawn_why.is_(None))
    if wanted.only_conflicts:
        clauses.append(RunRow.has_conflict.is_(True))
    for column, word in (
        (RunRow.verdict, wanted.verdict),
        (FactsRow.carbon_class, wanted.carbon_class),
        (FactsRow.leaving_group, wanted.leaving_group),
    ):
        if word is not None:
            clauses.append(column == str(word))
    for text_column, text in (
        (RunRow.by_initials, wanted.by),
        (RunRow.project, wanted.project),
        (RunRow.series, wanted.series),
        (RunRow.reference, wanted.reference),
    ):
        if text is not None:
            clauses.append(sa.func.lower(text_column) == text.lower())
    if wanted.temp_from_c is not None:
        clauses.append(most_forcing_c >= wanted.temp_from_c)
    if wanted.temp_to_c is not None:
        clauses.append(most_forcing_c <= wanted.temp_to_c)
    if wanted.since is not None:
        clauses.append(RunRow.run_date >= wanted.since)
    if wanted.until is not None:
        clauses.append(RunRow.run_date <= wanted.until)
    if wanted.failed is not None:
        clauses.append(sa.exists().where(FailureRow.run_key == RunRow.run_key, FailureRow.mode == str(wanted.failed)))
    clauses += [_holds(ComponentRow, material) for material in wanted.components]
    clauses += [_holds(SolventRow, material) for material in wanted.solvents]
    return statement.where(*clauses).order_by(*_order(sort, descending))


def _holds(row_class: type[ComponentRow] | type[SolventRow], material: Material) -> sa.ColumnElement[bool]:
    same: list[sa.ColumnElement[bool]] = [sa.func.lower(row_class.name).in_([n.lower() for n in material.names])]
    if material.smiles is not None:
        same.append(row_class.smiles == material.smiles)
    clauses: list[sa.ColumnElement[bool]] = [row_class.run_key == RunRow.run_key, sa.or_(*same)]
    if material.role is not None and row_class is ComponentRow:
        clauses.append(ComponentRow.role == str(material.role))
    return sa.exists().where(*clauses)


def _order(sort: Sort, descending: bool) -> list[sa.ColumnElement[Any]]:
    by: dict[Sort, sa.ColumnElement[Any]] = {
        Sort.CODE: sa.type_coerce(RunRow.code_number, sa.Integer),
        Sort.DATE: sa.type_coerce(RunRow.run_date, sa.Date),
        Sort.RECORDED: sa.type_coerce(RunRow.recorded_at, RUN.c.recorded_at.type),
        Sort.YIELD: sa.func.coalesce(RunRow.isolated_yield_pct, RunRow.assay_yield_pct),
        Sort.VERDICT: sa.type_coerce(RunRow.verdict, sa.Text),
        Sort.PROJECT: sa.func.lower(RunRow.project),
        Sort.BY: sa.func.lower(RunRow.by_initials),
    }
    first = by[sort].desc() if descending else by[sort].asc()
    ties = [RunRow.code_number, RunRow.code]
    return [first.nulls_last(), *(t.desc() if descending else t.asc() for t in ties)]


def matching(
    connection: sa.Connection, wanted: RunFilter, sort: Sort = Sort.CODE, descending: bool = False
) -> list[tuple[int, UUID]]:
    """Return (run_key, run_id) of all runs wanted, in order."""
    found = [(row[0], row[1]) for row in connection.execute(select_keys(wanted, sort, descending))]
    return found if wanted.run_ids is None else [row for row in found if row[1] in wanted.run_ids]


def load(connection: sa.Connection, run_keys: Sequence[int]) -> list[Run]:
    """Return the runs of these keys, in the order of the keys; keys that are not there are left out."""
    loaded: dict[int, Run] = {}
    for start in range(0, len(run_keys), BATCH):
        chunk = run_keys[start : start + BATCH]
        rows = connection.execute(sa.select(RUN).where(RUN.c.run_key.in_(chunk))).mappings().all()
        children: list[dict[int, list[Any]]] = []
        for child in CHILDREN:
            of_run: dict[int, list[Any]] = {}
            columns = table(child)
            statement = sa.select(columns).where(columns.c.run_key.in_(chunk))
            statement = statement.order_by(columns.c.run_key, columns.c.position)
            for row in connection.execute(statement).mappings().all():
                of_run.setdefault(row["run_key"], []).append(row)
            children.append(of_run)
        for row in rows:
            loaded[row["run_key"]] = run_from_rows(row, [of_run.get(row["run_key"], ()) for of_run in children])
    return [loaded[key] for key in run_keys if key in loaded]


def iter_load(connection: sa.Connection, run_keys: Sequence[int]) -> Iterator[Run]:
    """Yield the runs of these keys in order, a batch in memory at a time."""
    for start in range(0, len(run_keys), BATCH):
        yield from load(connection, run_keys[start : start + BATCH])


def keys_of(connection: sa.Connection, run_ids: Iterable[UUID]) -> dict[UUID, int]:
    """Return the keys of the runs that are there."""
    wanted = list(run_ids)
    found: dict[UUID, int] = {}
    for start in range(0, len(wanted), 10_000):
        chunk = wanted[start : start + 10_000]
        for row in connection.execute(sa.select(RunRow.run_id, RunRow.run_key).where(RunRow.run_id.in_(chunk))):
            found[row[0]] = row[1]
    return found


def get_key(connection: sa.Connection, name: str | UUID) -> int:
    """Return the key of the run that a code or UUID names; withdrawn runs answer too.

    Raises:
        RecordNotFound: no run has it.
        RecordConflict: after a merge several runs have that number; the sentence names them.
    """
    run_id = _as_uuid(name)
    if run_id is not None:
        key = connection.execute(sa.select(RunRow.run_key).where(RunRow.run_id == run_id)).scalar()
        if key is None:
            raise RecordNotFound(f"No run has the UUID {run_id}.", "`sidepath runs` lists them.", str(name))
        return key
    parsed = codes.parse_code(str(name))
    if parsed is None:
        raise RecordNotFound(f"{str(name)[:60]!r} is no code of a run.", "Codes look like R-0042.", str(name))
    number, mark = parsed
    rows = connection.execute(
        sa.select(RunRow.run_key, RunRow.code).where(RunRow.code_number == number).order_by(RunRow.code)
    ).all()
    exact = [row for row in rows if row.code == codes.write_code(number, mark)]
    if exact:
        return exact[0].run_key
    if len(rows) > 1 and not mark:
        raise RecordConflict(
            f"{codes.write_code(number)} means {len(rows)} runs since two books were merged.",
            f"Say which: {' or '.join(row.code for row in rows)}.",
            str(name),
        )
    raise RecordNotFound(
        f"No run is called {codes.write_code(number, mark)}.", "`sidepath runs` lists them.", str(name)
    )


def _as_uuid(name: str | UUID) -> UUID | None:
    if isinstance(name, UUID):
        return name
    bare = name.strip().replace("-", "")
    if len(bare) != 32:
        return None
    try:
        return UUID(bare)
    except ValueError:
        return None

"""Runs to table rows and back, field by field.

It owns the correspondence only: no SQL is sent from here. `run_key`, `code` and the flags of the store are
given by the caller. A row that breaks a rule of the record was not written by this program, so it is reported
as damage.
"""

from __future__ import annotations

import json
from collections.abc import Sequence
from typing import Any

import sqlalchemy as sa

from kb.errors import InvalidRecord, StoreDamaged
from kb.quantity import Duration, Temperature
from kb.record.component import Component, SolventPart
from kb.record.conditions import Conditions
from kb.record.derived import DerivedFacts
from kb.record.outcome import Failure, Outcome, ProductSeen
from kb.record.run import Attachment, Run
from kb.store import rows
from kb.vocabulary import Cause, Fate, Method, Role, Verdict

Values = dict[str, Any]

CHILDREN: tuple[type[rows.Row], ...] = (
    rows.ComponentRow,
    rows.SolventRow,
    rows.ProductSeenRow,
    rows.FailureRow,
    rows.AttachmentRow,
)
"""Tables keyed by (run_key, position), in the order in which `child_values` fills them."""

COMPONENT_FIELDS = (
    "role",
    "name",
    "smiles",
    "equiv",
    "amount_mmol",
    "mass_mg",
    "volume_ml",
    "conc_molar",
    "loading_mol_pct",
)
SOLVENT_FIELDS = ("name", "smiles", "parts")
PRODUCT_FIELDS = ("fate", "smiles", "share", "share_low", "share_high", "method", "protons")
FAILURE_FIELDS = ("mode", "motif", "cause")
ATTACHMENT_FIELDS = ("name", "sha256", "size_bytes")
CHILD_FIELDS = (COMPONENT_FIELDS, SOLVENT_FIELDS, PRODUCT_FIELDS, FAILURE_FIELDS, ATTACHMENT_FIELDS)
FACT_FIELDS = tuple(f for f in DerivedFacts.__dataclass_fields__ if f not in ("run_id", "recipe"))


def table(row_class: type[rows.Row]) -> sa.Table:
    """Return the table of a mapped class, for bulk statements."""
    found = row_class.__table__
    assert isinstance(found, sa.Table)
    return found


def run_values(run: Run) -> Values:
    """Return the columns of `run`, but for `run_key`, `code_number` and `has_conflict`."""
    conditions, outcome = run.conditions, run.outcome
    temperature, time = conditions.temperature, conditions.time
    return {
        "run_id": run.run_id,
        "code": run.code,
        "scheme": run.scheme,
        "verdict": _word(run.verdict),
        "note": run.note,
        "by_initials": run.by,
        "run_date": run.date,
        "reference": run.reference,
        "project": run.project,
        "series": run.series,
        "temperature_text": temperature.text if temperature else None,
        "temperature_start_c": temperature.start_c if temperature else None,
        "temperature_between_c": json.dumps(temperature.between_c) if temperature and temperature.between_c else None,
        "temperature_end_c": temperature.end_c if temperature else None,
        "is_reflux": temperature.is_reflux if temperature else False,
        "time_text": time.text if time else None,
        "time_h": time.h if time else None,
        "conc_molar": conditions.conc_molar,
        "scale_mmol": conditions.scale_mmol,
        "atmosphere": conditions.atmosphere,
        "vessel": conditions.vessel,
        "workup": conditions.workup,
        "isolated_yield_pct": outcome.isolated_yield_pct,
        "assay_yield_pct": outcome.assay_yield_pct,
        "conversion_pct": outcome.conversion_pct,
        "ee_pct": outcome.ee_pct,
        "dr": outcome.dr,
        "recorded_at": run.recorded_at,
        "revision": run.revision,
        "withdrawn_why": run.withdrawn_why,
    }


def child_values(run: Run, run_key: int) -> tuple[list[Values], ...]:
    """Return the rows of each table of CHILDREN."""
    parts: tuple[Sequence[Any], ...] = (
        run.conditions.components,
        run.conditions.solvents,
        run.outcome.products,
        run.outcome.failures,
        run.attachments,
    )
    return tuple(
        [
            {"run_key": run_key, "position": n, **{f: _plain(getattr(part, f)) for f in fields}}
            for n, part in enumerate(sequence)
        ]
        for sequence, fields in zip(parts, CHILD_FIELDS, strict=True)
    )


def run_from_rows(row: sa.RowMapping, children: Sequence[Sequence[sa.RowMapping]]) -> Run:
    """Return the run of its row and its child rows (one sequence per table of CHILDREN, by position).

    Raises:
        StoreDamaged: the rows break a rule of the record.
    """
    components, solvents, products, failures, attachments = children
    try:
        return Run(
            scheme=row["scheme"],
            conditions=Conditions(
                components=tuple(
                    Component(**{**_pick(c, COMPONENT_FIELDS), "role": Role(c["role"])}) for c in components
                ),
                solvents=tuple(SolventPart(**_pick(s, SOLVENT_FIELDS)) for s in solvents),
                temperature=None
                if row["temperature_text"] is None
                else Temperature(
                    text=row["temperature_text"],
                    start_c=row["temperature_start_c"],
                    between_c=tuple(json.loads(row["temperature_between_c"] or "[]")),
                    end_c=row["temperature_end_c"],
                    is_reflux=row["is_reflux"],
                ),
                time=None if row["time_text"] is None else Duration(text=row["time_text"], h=row["time_h"]),
                **_pick(row, ("conc_molar", "scale_mmol", "atmosphere", "vessel", "workup")),
            ),
            outcome=Outcome(
                products=tuple(
                    ProductSeen(
                        **{
                            **_pick(p, PRODUCT_FIELDS),
                            "fate": Fate(p["fate"]),
                            "method": Method(p["method"]) if p["method"] is not None else None,
                        }
                    )
                    for p in products
                ),
                failures=tuple(
                    Failure(
                        mode=f["mode"],
                        motif=f["motif"],
                        cause=Cause(f["cause"]) if f["cause"] is not None else None,
                    )
                    for f in failures
                ),
                **_pick(row, ("isolated_yield_pct", "assay_yield_pct", "conversion_pct", "ee_pct", "dr")),
            ),
            verdict=Verdict(row["verdict"]) if row["verdict"] is not None else None,
            by=row["by_initials"],
            date=row["run_date"],
            attachments=tuple(Attachment(**_pick(a, ATTACHMENT_FIELDS)) for a in attachments),
            **_pick(row, ("note", "reference", "project", "series", "run_id", "code", "recorded_at", "revision")),
            withdrawn_why=row["withdrawn_why"],
        )
    except (InvalidRecord, ValueError, TypeError) as error:
        raise StoreDamaged(
            f"Run {row['code']!s:.40} was damaged in the book ({str(error).rstrip('.')[:200]}).",
            "Run `sidepath verify`; `sidepath history` still shows what was recorded.",
            str(row["run_id"]),
        ) from error


def fact_values(facts: DerivedFacts, run_key: int, recipe_id: int) -> Values:
    """Return the columns of `facts`."""
    return {"run_key": run_key, "recipe_id": recipe_id, **{f: getattr(facts, f) for f in FACT_FIELDS}}


def _pick(row: sa.RowMapping, names: Sequence[str]) -> Values:
    return {name: row[name] for name in names}


def _word(value: Any) -> str | None:
    return None if value is None else str(value)


def _plain(value: Any) -> Any:
    return str(value) if isinstance(value, str) else value

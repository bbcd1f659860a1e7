"""Runs to table rows, field by field; the way back is `run_of_rows.py`.

It owns the correspondence only: no SQL is sent from here. `run_key`, `code` and the flags of the store are
given by the caller.
"""

from __future__ import annotations

import json
from collections.abc import Sequence
from typing import Any

import sqlalchemy as sa

from kb.record.derived import DerivedFacts
from kb.record.run import Run
from kb.store import rows
from kb.store.run_of_rows import CHILD_FIELDS

Values = dict[str, Any]

CHILDREN: tuple[type[rows.Row], ...] = (
    rows.ComponentRow,
    rows.SolventRow,
    rows.ProductSeenRow,
    rows.FailureRow,
    rows.AttachmentRow,
)
"""Tables keyed by (run_key, position), in the order in which `child_values` fills them."""

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


def fact_values(facts: DerivedFacts, run_key: int, recipe_id: int) -> Values:
    """Return the columns of `facts`."""
    return {"run_key": run_key, "recipe_id": recipe_id, **{f: getattr(facts, f) for f in FACT_FIELDS}}


def _word(value: Any) -> str | None:
    return None if value is None else str(value)


def _plain(value: Any) -> Any:
    return str(value) if isinstance(value, str) else value

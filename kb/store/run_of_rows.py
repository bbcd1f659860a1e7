"""Table rows to runs, field by field; the way there is `mapping.py`.

It knows rows as mappings from column to value, whoever read them, and sends no SQL. A row that breaks a rule of the
record was not written by this program, so it is reported as damage.
"""

from __future__ import annotations

import json
from collections.abc import Sequence
from typing import Any, Protocol

from kb.errors import InvalidRecord, StoreDamaged
from kb.quantity import Duration, Temperature
from kb.record.component import Component, SolventPart
from kb.record.conditions import Conditions
from kb.record.outcome import Failure, Outcome, ProductSeen
from kb.record.run import Attachment, Run
from kb.vocabulary import Cause, Fate, Method, Role, Verdict


class Columns(Protocol):
    """A row: values by the name of their column."""

    def __getitem__(self, name: Any, /) -> Any:
        """Return the value of a column."""
        ...


CHILD_TABLES = ("component", "solvent", "product_seen", "failure", "attachment")
"""Tables keyed by (run_key, position), in the order of CHILD_FIELDS."""

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


def run_from_rows(row: Columns, children: Sequence[Sequence[Columns]]) -> Run:
    """Return the run of its row and its child rows (one sequence per table of CHILD_TABLES, by position).

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


def _pick(row: Columns, names: Sequence[str]) -> dict[str, Any]:
    return {name: row[name] for name in names}

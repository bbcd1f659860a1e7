"""Tables and views made by hand, so that judgement can be tested without a book."""

from __future__ import annotations

from typing import Any
from uuid import uuid4

from kb.assess.record_view import RecordView
from kb.assess.table import FactTable, build_table
from kb.materials.profile import ConditionProfile
from kb.record.derived import DerivedFacts
from kb.record.run import Run
from kb.store.derivation import profile_to_json


def facts(**changes: Any) -> DerivedFacts:
    """Return the facts of a secondary bromide with azide in a dipolar aprotic solvent at 60 degC, changed at will."""
    values: dict[str, Any] = {
        "run_id": uuid4(),
        "recipe": "by hand",
        "confidence": "matched",
        "fate": "substitution",
        "carbon_class": "secondary",
        "leaving_group": "bromide",
        "nucleophile_class": "azide",
        "flags": "",
        "beta_hydrogens": 5,
        "substrate": "CCC(C)Br",
        "centre_bits": bytes([1] * 32),
        "base_pkah": 4.7,
        "base_bulk": "unhindered",
        "swain_scott_n": 4.0,
        "acidity": "none",
        "lewis_acid": "none",
        "halophile": "none",
        "protic": False,
        "permittivity": 36.7,
        "et30_kcal_mol": 43.2,
        "temperature_c": 60.0,
        "time_h": 4.0,
    }
    return DerivedFacts(**(values | changes))


def table_of(*rows: tuple[DerivedFacts, dict[str, float], float | None, str | None]) -> FactTable:
    """Return a table of (facts, shares, yield, verdict) rows with codes R-1, R-2, ..."""
    names = [n for n in DerivedFacts.__slots__ if n not in ("run_id", "recipe")]
    columns: dict[str, list[Any]] = {n: [getattr(r[0], n) for r in rows] for n in names}
    columns |= {
        "code": [f"R-{i + 1}" for i in range(len(rows))],
        "shares": [r[1] for r in rows],
        "yield_pct": [r[2] for r in rows],
        "verdict": [r[3] for r in rows],
        "date": [None] * len(rows),
    }
    return build_table(columns)


class RunsByCode:
    """A source of whole runs."""

    def __init__(self, runs: dict[str, Run]) -> None:
        self.runs = runs

    def get(self, code: str) -> Run:
        """Return the run of a code."""
        return self.runs[code]


def view_of(
    table: FactTable, profiles: list[ConditionProfile], failures: list[tuple[tuple[str, str | None], ...]], runs: list[Run]
) -> RecordView:
    """Return a view over rows made by hand."""
    return RecordView(
        table,
        [profile_to_json(p) for p in profiles],
        failures,
        RunsByCode(dict(zip(table.codes, runs, strict=True))),
    )

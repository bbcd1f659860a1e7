"""Tables and views made by hand, so that judgement can be tested without a book."""

from __future__ import annotations

from typing import Any
from uuid import uuid4

import numpy as np

from kb.assess.record_view import RecordView
from kb.assess.table import FATES, FactTable, build_table, columns_of
from kb.materials.profile import ConditionProfile
from kb.record.derived import DerivedFacts
from kb.record.run import Run
from kb.store.derivation import profile_to_json
from kb.vocabulary import Fate


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
    columns = columns_of([r[0] for r in rows])
    for place, (_, shares, _, _) in enumerate(rows):
        for fate, share in shares.items():
            columns["shares"][place, FATES.index(Fate(fate))] = share
    columns["isolated_yield_pct"] = np.array([np.nan if r[2] is None else r[2] for r in rows])
    columns["verdict"] = [r[3] for r in rows]
    return build_table(columns)


class RunsByCode:
    """A source of whole runs."""

    def __init__(self, runs: dict[str, Run]) -> None:
        self.runs = runs

    def get(self, code: str) -> Run:
        """Return the run of a code."""
        return self.runs[code]


def view_of(
    table: FactTable,
    profiles: list[ConditionProfile],
    failures: list[tuple[tuple[str, str | None], ...]],
    runs: list[Run],
) -> RecordView:
    """Return a view over rows made by hand."""
    return RecordView(
        table,
        [profile_to_json(p) for p in profiles],
        failures,
        RunsByCode(dict(zip(table.codes, runs, strict=True))),
    )

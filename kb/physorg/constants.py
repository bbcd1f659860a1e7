"""The published constants that the models stand on, each a row of a table with its source.

It owns the loading of `kb/data/physorg/*.csv` and the physical constants; it owns no chemistry. A constant
is asked for by quantity and key, and comes with its unit, its spread and where it is from, so that whatever
is worked out from it can say so. Invariants: every row has a source, a way it was obtained (`seen` in
print, `memory`, `judged` by us, `common practice`, `definition`), and names the check rows it was set from,
which then no longer count as tests of it. Physical constants are CODATA 2018.
"""

from __future__ import annotations

import csv
from dataclasses import dataclass
from functools import cache
from pathlib import Path

R_J_MOL_K = 8.314462618
"""Molar gas constant [J/(mol K)], CODATA 2018."""
BOLTZMANN_J_K = 1.380649e-23
"""Boltzmann constant [J/K], exact by definition."""
PLANCK_J_S = 6.62607015e-34
"""Planck constant [J s], exact by definition."""
ZERO_CELSIUS_K = 273.15
J_PER_CAL = 4.184
"""Thermochemical calorie."""
REFERENCE_C = 25.0
"""Temperature of every tabulated rate [degC]."""

TABLES = ("leaving_groups", "substrates", "cations", "closures", "media", "alkenes")
OBTAINED = frozenset({"seen", "memory", "judged", "common practice", "definition"})

_FOLDER = Path(__file__).resolve().parent.parent / "data" / "physorg"


@dataclass(frozen=True, slots=True, kw_only=True)
class Constant:
    """One row of a table.

    Attributes:
        quantity, key: what is asked for, e.g. "sn2_class" and "secondary".
        value: in `unit`.
        unit: words.
        sigma: one standard deviation of what we believe of it, in `unit`.
        source: where it is from.
        obtained: a word of OBTAINED.
        set_from: ids of check rows it was set from; empty = set from nothing that is tested.
    """

    quantity: str
    key: str
    value: float
    unit: str
    sigma: float
    source: str
    obtained: str
    set_from: tuple[str, ...] = ()


@cache
def load_constants() -> dict[tuple[str, str], Constant]:
    """Return every constant by (quantity, key).

    Raises:
        ValueError: a table of the installation is malformed (a fault of ours, never of the user).
    """
    found: dict[tuple[str, str], Constant] = {}
    for table in TABLES:
        with (_FOLDER / f"{table}.csv").open(encoding="utf-8", newline="") as handle:
            for line, row in enumerate(csv.DictReader(handle), start=2):
                name = (row["quantity"], row["key"])
                if name in found:
                    raise ValueError(f"{table}.csv line {line}: {name} is there twice.")
                found[name] = Constant(
                    quantity=row["quantity"],
                    key=row["key"],
                    value=float(row["value"]),
                    unit=row["unit"],
                    sigma=float(row["sigma"]),
                    source=row["source"],
                    obtained=row["obtained"],
                    set_from=tuple(row["set_from"].split()),
                )
    return found


def find_constant(quantity: str, key: str) -> Constant | None:
    """Return a constant, or None where the tables are silent."""
    return load_constants().get((quantity, key))


def get_constant(quantity: str, key: str) -> Constant:
    """Return a constant.

    Raises:
        LookupError: the tables hold none of that name.
    """
    found = load_constants().get((quantity, key))
    if found is None:
        raise LookupError(f"No constant {quantity} / {key} in the published tables.")
    return found


def leaving_scale() -> dict[str, float]:
    """Return how readily halides and sulfonates leave in SN2, log10 relative to fluoride (fluoride = 0).

    For comparing groups with one another; groups that leave only once activated or charged are not on the scale.
    """
    groups = ("fluoride", "chloride", "bromide", "iodide", "tosylate", "mesylate", "sulfonate", "triflate")
    base = get_constant("sn2", "fluoride").value
    return {group: round(get_constant("sn2", group).value - base, 3) for group in groups}


def rows_set_from() -> frozenset[str]:
    """Return the ids of all check rows that some constant was set from."""
    return frozenset(row for c in load_constants().values() for row in c.set_from)

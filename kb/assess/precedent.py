"""The recorded runs closest to a plan, and plain words for what differs.

It ranks and words; the likeness itself is `kernel.py`. A precedent's outcome plays no part in its rank, so failures
come up as readily as successes.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from kb.assess.kernel import combine, similarity_parts
from kb.assess.ranking import best_rows
from kb.assess.table import FactTable, flag_words
from kb.record.assessment import Precedent
from kb.vocabulary import Verdict

WORTH_SHOWING = 0.4
"""Least similarity of a precedent that is listed; below it the run says little. A judgement."""


def rank_precedents(similarity: NDArray[np.float64], top: int) -> NDArray[np.intp]:
    """Return row numbers of the `top` most similar runs worth showing, best first; ties keep the record's order."""
    order = best_rows(similarity, top)
    return order[similarity[order] >= WORTH_SHOWING]


def compare(
    plan: FactTable,
    table: FactTable,
    rest: NDArray[np.float64] | None = None,
    risk_differences: NDArray[np.float64] | None = None,
) -> tuple[dict[str, NDArray[np.float64]], NDArray[np.float64]]:
    """Return the parts and the combined similarity (n) of every run to the plan."""
    parts = similarity_parts(plan, table, rest, risk_differences)
    return parts, combine(parts)


def word_precedents(
    plan: FactTable,
    table: FactTable,
    rows: NDArray[np.intp],
    parts: dict[str, NDArray[np.float64]],
    similarity: NDArray[np.float64],
) -> tuple[Precedent, ...]:
    """Turn ranked rows into precedents with words for what differs."""
    return tuple(
        Precedent(
            run=table.codes[row],
            similarity=round(float(similarity[row]), 3),
            parts=tuple((name, round(float(values[row]), 3)) for name, values in parts.items()),
            differs=tuple(differences(plan, table, int(row), parts)),
            split=table.split(int(row)),
            yield_pct=_number(table.yield_pct[row]),
            verdict=Verdict(word) if (word := table.word("verdict", int(row))) else None,
        )
        for row in rows
    )


def _number(value: float) -> float | None:
    return None if np.isnan(value) else float(value)


def differences(plan: FactTable, table: FactTable, row: int, parts: dict[str, NDArray[np.float64]]) -> list[str]:
    """Return words for each part in which a row differs from the plan, least alike part first."""
    words: list[tuple[float, str]] = []

    def say(part: str, text: str) -> None:
        words.append((float(parts[part][row]), text))

    for part, column in (("centre", "carbon_class"), ("leaving group", "leaving_group")):
        mine, theirs = plan.word(column, 0), table.word(column, row)
        if mine != theirs:
            say(
                part,
                _instead(theirs, mine, "no leaving group read" if column == "leaving_group" else "centre not read"),
            )
    gained = sorted(flag_words(int(table.flags[row])) - flag_words(int(plan.flags[0])))
    missing = sorted(flag_words(int(plan.flags[0])) - flag_words(int(table.flags[row])))
    if gained:
        say("centre", "also " + ", ".join(gained))
    if missing:
        say("centre", "not " + ", ".join(missing))
    mine, theirs = plan.nucleophile_word(0), table.nucleophile_word(row)
    if mine != theirs:
        say("nucleophile", _instead(theirs, mine, "no nucleophile"))
    words += _base_words(plan, table, row, parts)
    words += _reagent_words(plan, table, row, parts)
    if plan.protic[0] >= 0 and table.protic[row] >= 0 and plan.protic[0] != table.protic[row]:
        say("solvent", "protic solvent" if table.protic[row] else "aprotic solvent")
    elif parts["solvent"][row] < 0.75 and table.protic[row] >= 0:
        mine_eps, eps = plan.number("permittivity", 0), table.number("permittivity", row)
        if mine_eps is not None and eps is not None:
            say("solvent", "more polar solvent" if eps > mine_eps else "less polar solvent")
    elif table.protic[row] < 0:
        say("solvent", "solvent not recorded")
    mine_t, t = plan.number("temperature_c", 0), table.number("temperature_c", row)
    if t is None:
        say("temperature", "temperature not recorded")
    elif mine_t is not None and abs(t - mine_t) >= 5:
        say("temperature", f"{t:.0f} °C")
    for column, label in (("acidity", "acid"), ("lewis_acid", "Lewis acid"), ("halophile", "halophile")):
        mine, theirs = plan.word(column, 0), table.word(column, row)
        if mine is not None and theirs is not None and mine != theirs:
            say(
                "promoter",
                f"no {label}" if theirs == "none" else f"{theirs} {label}".replace("silver halophile", "silver"),
            )
    if parts["groups at risk"][row] < 1:
        say("groups at risk", "not the same groups at risk")
    if table.substrate[row] != plan.substrate[0]:
        words.append((2.0, "another molecule"))
    return [text for _, text in sorted(words, key=lambda pair: pair[0])]


def _base_words(
    plan: FactTable, table: FactTable, row: int, parts: dict[str, NDArray[np.float64]]
) -> list[tuple[float, str]]:
    mine, theirs = plan.number("base_pkah", 0), table.number("base_pkah", row)
    alike = float(parts["base"][row])
    if mine is None and theirs is None:
        return []
    if theirs is None:
        return [(alike, "no base")]
    if mine is None:
        return [(alike, f"base of pKaH {theirs:.1f}")]
    if abs(mine - theirs) >= 1.0:
        return [(alike, f"{'stronger' if theirs > mine else 'weaker'} base (pKaH {theirs:.1f})")]
    bulk = table.word("base_bulk", row)
    if bulk is not None and bulk != plan.word("base_bulk", 0):
        return [(alike, f"{bulk} base")]
    return []


def _reagent_words(
    plan: FactTable, table: FactTable, row: int, parts: dict[str, NDArray[np.float64]]
) -> list[tuple[float, str]]:
    """Name a reagent that only the run has; what the nucleophile and the base already say is left out."""
    mine, theirs = plan.flasks.sets[int(plan.flask[0])], table.flasks.sets[int(table.flask[row])]
    added, gone = sorted(theirs - mine), sorted(mine - theirs)
    same_class = plan.nucleophile_word(0) == table.nucleophile_word(row)
    if not added or not gone or not same_class:
        return []
    return [(float(parts["reagents"][row]), f"{_name(added[0])}, not {_name(gone[0])}")]


def _name(reagent: str) -> str:
    """Return what the catalogue calls a structure, else the structure itself."""
    from kb.materials.names import by_smiles

    entry = by_smiles(reagent)
    return entry.name if entry is not None else reagent


def _instead(theirs: str | None, mine: str | None, absent: str) -> str:
    if theirs is None:
        return absent
    plain = theirs.replace("_", " ")
    return f"{plain}, not {mine.replace('_', ' ')}" if mine else plain

"""Runs into the tables: new ones in bulk, changed ones one by one, always with all that hangs on them.

Every function here runs inside the caller's write transaction and leaves run, children, word index, facts and
structures saying the same. The history entry is written by the caller in that transaction too
(`history.append`). Keys are given here, counted up under the write lock, so that a bulk insert knows them
before it starts.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from uuid import UUID

import sqlalchemy as sa

from kb.record.run import Run
from kb.store import words
from kb.store.deriving import Encodings, Prepared
from kb.store.mapping import CHILDREN, Values, child_values, fact_values, run_values, table
from kb.store.rows import FactsRow, RecipeRow, RunRow, RunStructureRow, StructureRow

RUN, FACTS, STRUCTURE, PLACE = table(RunRow), table(FactsRow), table(StructureRow), table(RunStructureRow)


@dataclass(frozen=True, slots=True, kw_only=True)
class Placed:
    """A run ready to be written: code and moment given, facts derived."""

    run: Run
    code_number: int
    prepared: Prepared
    has_conflict: bool = False


def insert_runs(connection: sa.Connection, items: Sequence[Placed], encodings: Encodings) -> list[int]:
    """Write new runs; return their keys, which follow one another."""
    if not items:
        return []
    first = next_free(connection, RunRow.run_key)
    keys = list(range(first, first + len(items)))
    connection.execute(sa.insert(RUN), [_columns(item, key) for item, key in zip(items, keys, strict=True)])
    _write_children(connection, [(item.run, key) for item, key in zip(items, keys, strict=True)])
    words.learn(connection, keys)
    write_derived(
        connection, [(key, item.prepared) for item, key in zip(items, keys, strict=True)], encodings
    )
    return keys


def update_run(connection: sa.Connection, run_key: int, item: Placed, encodings: Encodings) -> None:
    """Make a run that is there say what `item` says."""
    words.forget(connection, [run_key])
    connection.execute(sa.update(RUN).where(RUN.c.run_key == run_key).values(**_columns(item, run_key)))
    for child in CHILDREN:
        connection.execute(sa.delete(table(child)).where(table(child).c.run_key == run_key))
    _write_children(connection, [(item.run, run_key)])
    words.learn(connection, [run_key])
    forget_derived(connection, [run_key])
    write_derived(connection, [(run_key, item.prepared)], encodings)


def forget_derived(connection: sa.Connection, run_keys: Iterable[int]) -> None:
    """Take out facts and places of runs; structures stay, others may share them."""
    keys = [{"key": key} for key in run_keys]
    for derived in (FACTS, PLACE):
        connection.execute(sa.delete(derived).where(derived.c.run_key == sa.bindparam("key")), keys)


def write_derived(
    connection: sa.Connection, items: Sequence[tuple[int, Prepared]], encodings: Encodings
) -> None:
    """Write facts, structures and places of runs that have none yet."""
    facts = [(key, prepared.facts) for key, prepared in items if prepared.facts is not None]
    if facts:
        recipes = {name: recipe_id(connection, name) for name in {f.recipe for _, f in facts}}
        connection.execute(sa.insert(FACTS), [fact_values(f, key, recipes[f.recipe]) for key, f in facts])
    smiles = {s for _, prepared in items for _, _, s in prepared.places}
    if not smiles:
        return
    known = known_structures(connection, smiles)
    known |= _insert_structures(connection, sorted(smiles - known.keys()), encodings)
    connection.execute(
        sa.insert(PLACE),
        [
            {"run_key": key, "role": role, "position": position, "structure_id": known[s]}
            for key, prepared in items
            for role, position, s in prepared.places
        ],
    )


def known_structures(connection: sa.Connection, smiles: Iterable[str]) -> dict[str, int]:
    """Return the ids of those structures that the book holds."""
    wanted = list(smiles)
    found: dict[str, int] = {}
    for start in range(0, len(wanted), 5_000):
        chunk = wanted[start : start + 5_000]
        statement = sa.select(StructureRow.smiles, StructureRow.structure_id).where(
            StructureRow.smiles.in_(chunk)
        )
        found.update({row[0]: row[1] for row in connection.execute(statement)})
    return found


def _insert_structures(
    connection: sa.Connection, smiles: Sequence[str], encodings: Encodings
) -> dict[str, int]:
    if not smiles:
        return {}
    first = next_free(connection, StructureRow.structure_id)
    recipe = recipe_id(connection, encodings.recipe) if encodings.recipe is not None else None
    numbered = dict(zip(smiles, range(first, first + len(smiles)), strict=True))
    connection.execute(
        sa.insert(STRUCTURE), [structure_values(s, n, recipe, encodings) for s, n in numbered.items()]
    )
    return numbered


def structure_values(smiles: str, structure_id: int, recipe: int | None, encodings: Encodings) -> Values:
    """Return the columns of `structure`; blobs NULL where the encoder could not take it."""
    encoded = encodings.of(smiles)
    return {
        "structure_id": structure_id,
        "smiles": smiles,
        "recipe_id": recipe,
        "mol_binary": encoded.mol_binary if encoded else None,
        "augmented": encoded.augmented if encoded else None,
        "pattern": encoded.pattern if encoded else None,
        "morgan": encoded.morgan if encoded else None,
    }


def recipe_id(connection: sa.Connection, name: str) -> int:
    """Return the id of a recipe, written down now where it is new."""
    known = connection.execute(sa.select(RecipeRow.recipe_id).where(RecipeRow.name == name)).scalar()
    if known is not None:
        return known
    number = next_free(connection, RecipeRow.recipe_id)
    connection.execute(sa.insert(table(RecipeRow)).values(recipe_id=number, name=name))
    return number


def next_free(connection: sa.Connection, column: sa.orm.InstrumentedAttribute[int]) -> int:
    """Return one more than the highest number in a column; safe under the write lock."""
    return (connection.execute(sa.select(sa.func.max(column))).scalar() or 0) + 1


def taken_numbers(connection: sa.Connection, numbers: Iterable[int]) -> set[int]:
    """Return those code numbers that a run has already."""
    wanted = list(numbers)
    taken: set[int] = set()
    for start in range(0, len(wanted), 10_000):
        chunk = wanted[start : start + 10_000]
        taken |= set(
            connection.execute(sa.select(RunRow.code_number).where(RunRow.code_number.in_(chunk))).scalars()
        )
    return taken


def known_ids(connection: sa.Connection, run_ids: Iterable[UUID]) -> set[UUID]:
    """Return those UUIDs that a run has already."""
    wanted = list(run_ids)
    known: set[UUID] = set()
    for start in range(0, len(wanted), 10_000):
        chunk = wanted[start : start + 10_000]
        known |= set(connection.execute(sa.select(RunRow.run_id).where(RunRow.run_id.in_(chunk))).scalars())
    return known


def _columns(item: Placed, run_key: int) -> Values:
    flags = {"run_key": run_key, "code_number": item.code_number, "has_conflict": item.has_conflict}
    return {**run_values(item.run), **flags}


def _write_children(connection: sa.Connection, items: Iterable[tuple[Run, int]]) -> None:
    by_table: list[list[Values]] = [[] for _ in CHILDREN]
    for run, key in items:
        for rows, more in zip(by_table, child_values(run, key), strict=True):
            rows.extend(more)
    for child, rows in zip(CHILDREN, by_table, strict=True):
        if rows:
            connection.execute(sa.insert(table(child)), rows)

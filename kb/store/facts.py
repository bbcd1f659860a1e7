"""Derived facts and structures out of the tables: by column for the kernel, in batches for the search index.

It reads, and rebuilds what another recipe made. A load never mixes recipes: where a run that stands has no
facts, or has them from another recipe, `IndexStale` is raised instead of a wrong answer.

Shapes of `derived_columns` (n runs, ascending `run_key`): numbers float64, NaN = None; `is_stereocentre`
bool; `protic` int8 (-1 = None); `centre_bits` (n, 4) uint64, zeros where there is none; words, codes and
UUIDs object arrays with None; `shares` (n, 8) float64, molar share per fate in vocabulary order, NaN = not
measured; `date_ordinal` int32, 0 = None.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING, Any

import sqlalchemy as sa

from kb.errors import IndexStale
from kb.progress import Progress
from kb.record.derived import CENTRE_BITS
from kb.store import recording, runs
from kb.store.deriving import Deriving, Encodings
from kb.store.mapping import table
from kb.store.rows import FactsRow, ProductSeenRow, RecipeRow, RunRow, RunStructureRow, StructureRow
from kb.store.values import StoredStructure
from kb.vocabulary import Fate

if TYPE_CHECKING:
    import numpy as np

FACTS, STRUCTURE, PLACE = table(FactsRow), table(StructureRow), table(RunStructureRow)

FLOATS = (
    "beta_hydrogens",
    "centre_atom",
    "base_pkah",
    "swain_scott_n",
    "permittivity",
    "et30_kcal_mol",
    "winstein_y",
    "temperature_c",
    "time_h",
)
WORDS = (
    "confidence",
    "fate",
    "carbon_class",
    "leaving_group",
    "nucleophile_class",
    "flags",
    "substrate",
    "base_bulk",
    "acidity",
    "lewis_acid",
    "halophile",
    "profile_json",
)


def derived_columns(connection: sa.Connection, recipe: str) -> dict[str, np.ndarray]:
    """Return all facts of the runs that stand, by column.

    Args:
        recipe: the recipe that must have made them.

    Raises:
        IndexStale: a run has no facts, or of another recipe.
    """
    import numpy as np

    stale = len(stale_keys(connection, recipe))
    if stale:
        raise IndexStale(f"Runs read by another recipe: {stale}.", "Rebuild them: `sidepath migrate`.", recipe)
    of_run = (RunRow.run_key, RunRow.run_id, RunRow.code, RunRow.run_date, RunRow.verdict, RunRow.isolated_yield_pct, RunRow.assay_yield_pct)  # fmt: skip  # noqa: E501
    of_facts = [FACTS.c[name] for name in (*FLOATS, *WORDS, "centre_bits", "is_stereocentre", "protic")]
    statement = (
        sa.select(*of_run, *of_facts)
        .join(FACTS, FACTS.c.run_key == RunRow.run_key)
        .where(RunRow.withdrawn_why.is_(None))
        .order_by(RunRow.run_key)
    )
    result = connection.execute(statement)
    names = list(result.keys())
    fetched: Any = result.all()
    columns = dict(zip(names, zip(*fetched, strict=True), strict=True)) if fetched else dict.fromkeys(names, ())
    found: dict[str, np.ndarray] = {"run_key": np.array(columns["run_key"], dtype=np.int64)}
    for name in ("run_id", "code", "verdict", *WORDS):
        found[name] = np.empty(len(fetched), dtype=object)
        found[name][:] = columns[name]
    for name in ("isolated_yield_pct", "assay_yield_pct", *FLOATS):
        found[name] = np.array(columns[name], dtype=np.float64)
    found["date_ordinal"] = np.array([d.toordinal() if d else 0 for d in columns["run_date"]], dtype=np.int32)
    found["is_stereocentre"] = np.array(columns["is_stereocentre"], dtype=bool)
    found["protic"] = np.array([-1 if p is None else int(p) for p in columns["protic"]], dtype=np.int8)
    nothing = bytes(CENTRE_BITS // 8)
    packed = b"".join(bits if bits is not None else nothing for bits in columns["centre_bits"])
    found["centre_bits"] = np.frombuffer(packed, dtype="<u8").reshape(len(fetched), CENTRE_BITS // 64)
    found["shares"] = _shares(connection, found["run_key"])
    return found


def _shares(connection: sa.Connection, run_keys: np.ndarray) -> np.ndarray:
    """Return molar shares (n, 8) summed per fate; the sum of nothing measured is NULL, hence NaN."""
    import numpy as np

    shares = np.full((len(run_keys), len(Fate)), np.nan)
    share = ProductSeenRow.share
    statement = (
        sa.select(
            ProductSeenRow.run_key,
            *(sa.func.sum(sa.case((ProductSeenRow.fate == str(fate), share))) for fate in Fate),
        )
        .where(share.is_not(None))
        .group_by(ProductSeenRow.run_key)
    )
    measured: Any = connection.execute(statement).all()
    if measured and len(run_keys):
        table_of_sums = np.array([tuple(row) for row in measured], dtype=np.float64)
        keys = table_of_sums[:, 0].astype(np.int64)  # exact: keys are far below 2 ** 53
        rows = np.minimum(np.searchsorted(run_keys, keys), len(run_keys) - 1)
        stands = run_keys[rows] == keys
        shares[rows[stands]] = table_of_sums[stands, 1:]
    return shares


def stale_keys(connection: sa.Connection, recipe: str) -> list[int]:
    """Return the runs that stand and have no facts of this recipe."""
    statement = (
        sa.select(RunRow.run_key)
        .outerjoin(FACTS, FACTS.c.run_key == RunRow.run_key)
        .outerjoin(RecipeRow, RecipeRow.recipe_id == FACTS.c.recipe_id)
        .where(RunRow.withdrawn_why.is_(None), sa.or_(RecipeRow.name.is_(None), RecipeRow.name != recipe))
        .order_by(RunRow.run_key)
    )
    return list(connection.execute(statement).scalars())


def stale_structures(connection: sa.Connection, recipe: str) -> list[int]:
    """Return the structures that were encoded by another recipe or not at all."""
    statement = (
        sa.select(StructureRow.structure_id)
        .outerjoin(RecipeRow, RecipeRow.recipe_id == StructureRow.recipe_id)
        .where(sa.or_(RecipeRow.name.is_(None), RecipeRow.name != recipe))
    )
    return list(connection.execute(statement).scalars())


def rederive(connection: sa.Connection, run_keys: list[int], deriving: Deriving) -> None:
    """Make facts and places of some runs anew, inside the caller's write transaction."""
    prepared = [
        (key, deriving.prepare(run)) for key, run in zip(run_keys, runs.load(connection, run_keys), strict=True)
    ]
    recording.forget_derived(connection, run_keys)
    recording.write_derived(connection, prepared, Encodings(deriving=deriving))


def reencode(connection: sa.Connection, structure_ids: list[int], deriving: Deriving) -> None:
    """Encode some structures anew, inside the caller's write transaction."""
    recipe = recording.recipe_id(connection, deriving.recipe)
    smiles = connection.execute(
        sa.select(StructureRow.structure_id, StructureRow.smiles).where(StructureRow.structure_id.in_(structure_ids))
    ).all()
    encodings = Encodings(deriving=deriving)
    values = [recording.structure_values(row.smiles, row.structure_id, recipe, encodings) for row in smiles]
    statement = sa.update(STRUCTURE).where(STRUCTURE.c.structure_id == sa.bindparam("key"))
    for row in values:
        connection.execute(statement, {"key": row.pop("structure_id"), **row})


def iter_structures(connection: sa.Connection, after: int, batch: int) -> Iterator[list[StoredStructure]]:
    """Yield the structures with an id beyond `after`, ascending, in batches."""
    last = after
    while True:
        rows = connection.execute(
            sa.select(STRUCTURE).where(STRUCTURE.c.structure_id > last).order_by(STRUCTURE.c.structure_id).limit(batch)
        ).all()
        if rows:
            yield [
                StoredStructure(
                    structure_id=row.structure_id,
                    smiles=row.smiles,
                    mol_binary=row.mol_binary,
                    augmented=row.augmented,
                    pattern=row.pattern,
                    morgan=row.morgan,
                )
                for row in rows
            ]
        if len(rows) < batch:
            return
        last = rows[-1].structure_id


def places(connection: sa.Connection, run_keys: list[int] | None) -> dict[str, np.ndarray]:
    """Return where structures stand, by column: run_key, structure_id, position int64, role object.

    Args:
        run_keys: only these runs; None = all that stand.
    """
    import numpy as np

    statement = sa.select(PLACE).order_by(PLACE.c.run_key, PLACE.c.role, PLACE.c.position)
    if run_keys is None:
        statement = statement.join(RunRow, RunRow.run_key == PLACE.c.run_key).where(RunRow.withdrawn_why.is_(None))
    else:
        statement = statement.where(PLACE.c.run_key.in_(run_keys))
    rows = connection.execute(statement).all()
    found = {
        name: np.array([getattr(row, name) for row in rows], dtype=np.int64)
        for name in ("run_key", "structure_id", "position")
    }
    found["role"] = np.array([row.role for row in rows], dtype=object)
    return found


def rebuild(connection_of: Any, deriving: Deriving, progress: Progress, batch: int) -> int:
    """Make anew whatever another recipe made, a batch per transaction; return how many runs were read again.

    Args:
        connection_of: makes a write transaction (context manager); runs may be added between two of them.
        progress: cancelled = stop after the batch; what was rebuilt stays.
    """
    done = 0
    with connection_of() as connection:
        total = len(stale_keys(connection, deriving.recipe))
    while not progress.cancelled():
        with connection_of() as connection:
            keys = stale_keys(connection, deriving.recipe)[:batch]
            if keys:
                rederive(connection, keys, deriving)
        done += len(keys)
        progress.advance(done, max(total, done), "runs read again")
        if not keys:
            break
    while deriving.encode is not None and not progress.cancelled():
        with connection_of() as connection:
            ids = stale_structures(connection, deriving.recipe)[:batch]
            if ids:
                reencode(connection, ids, deriving)
        if not ids:
            break
    with connection_of() as connection:
        forget_orphans(connection)
    return done


def forget_orphans(connection: sa.Connection) -> None:
    """Take out structures that stand in no run; the last one stays, so that no id is ever given twice."""
    used = sa.select(RunStructureRow.structure_id)
    last = sa.select(sa.func.max(StructureRow.structure_id)).scalar_subquery()
    connection.execute(
        sa.delete(STRUCTURE).where(STRUCTURE.c.structure_id.not_in(used), STRUCTURE.c.structure_id < last)
    )

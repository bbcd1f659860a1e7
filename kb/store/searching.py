"""What a search reads in bulk: the columns of runs, where structures stand, structure blobs, words.

Plain tuples, as few conversions as can be: a search that starts reads a hundred thousand runs before its
first answer. It only reads, everything of one `RunBatch` in one transaction. Values that a search does not
ask about stay in the book.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Any
from uuid import UUID

import sqlalchemy as sa

from kb.errors import IndexStale
from kb.store import history, runs, words
from kb.store.rows import RecipeRow
from kb.store.session import CHANGES, OpenBook
from kb.vocabulary import Role

_KEYS_AT_ONCE = 10_000

_RUN_COLUMNS = """SELECT run.run_key, run.code, run.code_number, CAST(run.run_date AS TEXT), run.verdict, run.project,
    run.by_initials, run.temperature_start_c, run.temperature_end_c, facts.temperature_c, facts.carbon_class,
    facts.leaving_group, facts.fate, facts.nucleophile_class, facts.substrate, facts.centre_atom,
    run.withdrawn_why IS NULL, recipe.name
    FROM run LEFT JOIN facts ON facts.run_key = run.run_key
    LEFT JOIN recipe ON recipe.recipe_id = facts.recipe_id"""
_COMPONENTS = "SELECT t.run_key, t.role, t.name, t.smiles FROM component t"
_SOLVENTS = "SELECT t.run_key, t.name, t.smiles FROM solvent t"
_FAILURES = "SELECT t.run_key, t.mode FROM failure t"
_PLACES = "SELECT t.run_key, t.role, t.position, t.structure_id FROM run_structure t"
_SUBSTRATES = """SELECT run.code, place.structure_id FROM run_structure place JOIN run ON run.run_key = place.run_key
    WHERE place.role = :role AND run.withdrawn_why IS NULL ORDER BY place.run_key"""
_SUBSTRATE_BITS = """SELECT structure.structure_id, structure.morgan, structure.recipe_id FROM structure
    WHERE structure.morgan IS NOT NULL AND structure.structure_id IN
    (SELECT place.structure_id FROM run_structure place WHERE place.role = :role) ORDER BY structure.structure_id"""
_SCREENS = """SELECT structure_id, recipe_id, augmented FROM structure WHERE augmented IS NOT NULL
    ORDER BY structure_id"""
_CODES_WITH = """SELECT DISTINCT run.code FROM run_structure place JOIN run ON run.run_key = place.run_key
    WHERE place.structure_id IN :ids AND place.role IN :roles AND run.withdrawn_why IS NULL"""
_CODES_OF_PLACES = """SELECT place.structure_id, run.code FROM run_structure place
    JOIN run ON run.run_key = place.run_key WHERE place.role IN :roles AND run.withdrawn_why IS NULL"""
_STRUCTURES = """SELECT structure_id, recipe_id, mol_binary, augmented, morgan FROM structure
    WHERE structure_id > :after AND mol_binary IS NOT NULL ORDER BY structure_id"""


@dataclass(frozen=True, slots=True, kw_only=True)
class RunBatch:
    """Rows as the tables hold them, each list ascending by run_key.

    Attributes:
        version: the book's counter of changes at that moment; tip: its last history entry.
        runs: (run_key, code, code_number, run_date as ISO text or None, verdict, project, by_initials,
            temperature_start_c, temperature_end_c, temperature_c of the facts, carbon_class, leaving_group,
            fate, nucleophile_class, substrate, centre_atom, stands, recipe of the facts or None).
        components: (run_key, role, name, smiles). solvents: (run_key, name, smiles). failures: (run_key,
        mode). places: (run_key, role, position, structure_id).
    """

    version: int
    tip: int
    runs: Sequence[Any]
    components: Sequence[Any]
    solvents: Sequence[Any]
    failures: Sequence[Any]
    places: Sequence[Any]


def read_runs(book: OpenBook, since_tip: int | None = None) -> RunBatch:
    """Return the columns of all runs, withdrawn ones included, or of those changed since a history entry.

    Args:
        since_tip: `seq` of the last entry that is known; None = read all.
    """
    with book.reading() as connection:
        changed: list[int] | None = None
        if since_tip is not None:
            ids: list[UUID] = list(history.changed_since(connection, since_tip))
            changed = sorted(runs.keys_of(connection, ids).values())
        return RunBatch(
            version=int(history.read_meta(connection, CHANGES) or 0),
            tip=history.read_tip(connection)[0],
            runs=_fetch(connection, _RUN_COLUMNS, "run", changed),
            components=_fetch(connection, _COMPONENTS, "t", changed),
            solvents=_fetch(connection, _SOLVENTS, "t", changed),
            failures=_fetch(connection, _FAILURES, "t", changed),
            places=_fetch(connection, _PLACES, "t", changed),
        )


def last_structure_id(book: OpenBook) -> int:
    """Return the highest structure id; 0 = none. Ids start at 1 and are never given twice."""
    with book.reading() as connection:
        return connection.execute(sa.text("SELECT max(structure_id) FROM structure")).scalar() or 0


def iter_blobs(book: OpenBook, recipe: str, after: int = 0, batch: int = 256) -> Iterator[list[Sequence[Any]]]:
    """Yield structures with an id beyond `after`, ascending, in batches, all as of one moment.

    Args:
        recipe: what must have encoded them; "" = whatever did.
        batch: structures at a time; so few stay in the processor's cache between being read and taken in.

    Yields:
        four columns: structure_id, mol_binary, augmented, morgan; structures without blobs are
        left out.

    Raises:
        IndexStale: a structure was encoded by another recipe.
    """
    with book.reading() as connection:
        good = None
        if recipe:
            named = sa.select(RecipeRow.recipe_id).where(RecipeRow.name == recipe)
            good = connection.execute(named).scalar()
        stream = connection.execution_options(yield_per=batch).execute(sa.text(_STRUCTURES), {"after": after})
        for rows in stream.partitions(batch):
            ids, recipes, *blobs = zip(*rows, strict=True)
            if recipe and set(recipes) != {good}:
                raise _stale()
            yield [ids, *blobs]


def substrate_fingerprints(book: OpenBook, recipe: str) -> tuple[list[Any], list[int], bytes]:
    """Return where substrates stand, and the Morgan fingerprint of each distinct one.

    A check needs no more of the structures than this, so it is spared reading all of them; and since a group runs
    the same substrate again and again, each is read once.

    Returns:
        (code, structure_id) of the standing runs with a substrate; the ids of the encoded substrates, ascending;
        their fingerprints in that order, one behind the other.

    Raises:
        IndexStale: a structure was encoded by another recipe.
    """
    role = {"role": str(Role.SUBSTRATE)}
    with book.reading() as connection:
        places = list(connection.execute(sa.text(_SUBSTRATES), role).all())
        rows = connection.execute(sa.text(_SUBSTRATE_BITS), role).all()
        if recipe and rows:
            named = sa.select(RecipeRow.recipe_id).where(RecipeRow.name == recipe)
            if {row[2] for row in rows} - {connection.execute(named).scalar()}:
                raise _stale()
    return places, [row[0] for row in rows], b"".join(row[1] for row in rows)


def smiles_of(book: OpenBook, structure_ids: Sequence[int]) -> dict[int, str]:
    """Return the SMILES of some structures; atom numbers of a match count in it."""
    statement = "SELECT structure_id, smiles FROM structure WHERE structure_id IN :ids"
    return {row[0]: row[1] for row in _by_ids(book, statement, structure_ids)}


def molecules_of(book: OpenBook, structure_ids: Sequence[int]) -> dict[int, bytes]:
    """Return the molecule of some structures as RDKit's binary."""
    statement = "SELECT structure_id, mol_binary FROM structure WHERE structure_id IN :ids"
    return {row[0]: row[1] for row in _by_ids(book, statement, structure_ids)}


def screens_of(book: OpenBook, recipe: str) -> tuple[list[int], bytes]:
    """Return the ids of all encoded structures, ascending, and their augmented screens, packed.

    Raises:
        IndexStale: a structure was encoded by another recipe.
    """
    with book.reading() as connection:
        rows = connection.execute(sa.text(_SCREENS)).all()
        if recipe:
            named = sa.select(RecipeRow.recipe_id).where(RecipeRow.name == recipe)
            if {row[1] for row in rows} - {connection.execute(named).scalar()}:
                raise _stale()
    return [row[0] for row in rows], b"".join(row[2] for row in rows)


def codes_with(book: OpenBook, structure_ids: Sequence[int], roles: Sequence[str]) -> set[str]:
    """Return the codes of the standing runs in which one of some structures has one of some roles."""
    return {row[0] for row in _by_ids(book, _CODES_WITH, structure_ids, roles=list(roles))}


def codes_of_places(book: OpenBook, roles: Sequence[str]) -> list[tuple[int, str]]:
    """Return (structure_id, code) wherever a structure has one of some roles in a standing run."""
    statement = sa.text(_CODES_OF_PLACES).bindparams(sa.bindparam("roles", expanding=True))
    with book.reading() as connection:
        return [(row[0], row[1]) for row in connection.execute(statement, {"roles": list(roles)})]


def word_keys(book: OpenBook, wanted: Sequence[Sequence[str]]) -> list[int]:
    """Return the run_key of every run that holds the words, in no order; schemes are not words.

    Args:
        wanted: for each word its alternatives, one of which must begin a word of the run; an alternative of
            several words must occur together.
    """
    with book.reading() as connection:
        return words.keys_with(connection, wanted)


def vocabulary(book: OpenBook) -> list[str]:
    """Return every word of the word index, as it was folded (small letters, no accents)."""
    with book.reading() as connection:
        return words.vocabulary(connection)


def _by_ids(book: OpenBook, statement: str, ids: Sequence[int], **lists: list[str]) -> Iterator[Any]:
    """Yield the rows of a statement that names :ids, a batch of ids at a time, all of one moment."""
    bound: list[Any] = [sa.bindparam(name, expanding=True) for name in ("ids", *lists)]
    with book.reading() as connection:
        for start in range(0, len(ids), _KEYS_AT_ONCE):
            chunk = [int(i) for i in ids[start : start + _KEYS_AT_ONCE]]
            yield from connection.execute(sa.text(statement).bindparams(*bound), {"ids": chunk, **lists})


def _stale() -> IndexStale:
    return IndexStale(
        "Structures in the book were encoded by another recipe.", "Rebuild them: `sidepath migrate`."
    )


def _fetch(connection: sa.Connection, statement: str, table: str, keys: list[int] | None) -> list[Any]:
    order = f" ORDER BY {table}.run_key"
    if keys is None:
        return list(connection.execute(sa.text(statement + order)).all())
    rows: list[Any] = []
    narrowed = sa.text(f"{statement} WHERE {table}.run_key IN :keys{order}").bindparams(
        sa.bindparam("keys", expanding=True)
    )
    for start in range(0, len(keys), _KEYS_AT_ONCE):
        rows += connection.execute(narrowed, {"keys": keys[start : start + _KEYS_AT_ONCE]}).all()
    return rows

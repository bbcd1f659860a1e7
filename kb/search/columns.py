"""The conditions of all runs by column, in memory, so that a search over them is a few array comparisons.

It holds what a search asks about and nothing else; whole runs stay in the book. Row r is one run as it was
when it was read: when a run changes, its old row is marked dead and a new one is added, so rows are never
renumbered while the program runs. Names of materials and failure modes are kept as lists of rows by name
("postings").
"""

from __future__ import annotations

import datetime as dt
from array import array
from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from kb.vocabulary import CarbonClass, LeavingGroup, Role, Verdict

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from kb.store.searching import RunBatch

ROLES = tuple(str(role) for role in Role)
_ROLE_CODE = {role: code for code, role in enumerate(ROLES)}
_VERDICTS = {str(v): code for code, v in enumerate(Verdict, start=1)}
_CLASSES = {str(c): code for code, c in enumerate(CarbonClass, start=1)}
_LEAVING = {str(g): code for code, g in enumerate(LeavingGroup, start=1)}
UNKNOWN = 0
"""Code of a word that is not recorded or not one of the controlled list."""


class Column:
    """Numbers by row that grow at the end.

    Args:
        kind: numpy type of the numbers.
    """

    def __init__(self, kind: Any) -> None:
        self._room = np.zeros(1024, kind)
        self._length = 0

    def extend(self, values: Iterable[Any]) -> None:
        """Add numbers."""
        more = np.array(list(values), self._room.dtype)
        needed = self._length + len(more)
        if needed > len(self._room):
            grown = np.zeros(max(needed, len(self._room) * 3 // 2), self._room.dtype)
            grown[: self._length] = self._room[: self._length]
            self._room = grown
        self._room[self._length : needed] = more
        self._length = needed

    @property
    def values(self) -> NDArray[Any]:
        """Return all numbers, a view."""
        return self._room[: self._length]


class RunColumns:
    """Runs by row, and where structures stand in them.

    Attributes:
        run_key, code_number: int64.
        date: day as an ordinal, int32; 0 = not recorded.
        verdict, carbon_class, leaving_group: codes uint8; 0 = not recorded.
        temperature_c: most forcing temperature, float32; NaN = not recorded.
        centre_atom: centre in the substrate, int32; -1 = none.
        alive: the row is the run as it stands, and not withdrawn.
        recipes: what read the run, by row; None = nothing did.
        place_row, place_structure, place_position: of every place, int64.
        place_role: index into ROLES, uint8.
        codes, substrates, fates, nucleophile_classes: text or None by row.
    """

    def __init__(self) -> None:
        self._run_key, self._code_number = Column(np.int64), Column(np.int64)
        self._date = Column(np.int32)
        self._verdict, self._class, self._leaving = Column(np.uint8), Column(np.uint8), Column(np.uint8)
        self._temperature, self._centre = Column(np.float32), Column(np.int32)
        self._alive = Column(np.bool_)
        self._place_row, self._place_structure = Column(np.int64), Column(np.int64)
        self._place_position, self._place_role = Column(np.int64), Column(np.uint8)
        self.codes: list[str] = []
        self.substrates: list[str | None] = []
        self.recipes: list[str | None] = []
        self.fates: list[str | None] = []
        self.nucleophile_classes: list[str | None] = []
        self._solvents: dict[str, array[int]] = {}
        self._components: dict[tuple[str, str], array[int]] = {}
        self._failures: dict[str, array[int]] = {}
        self._projects: dict[str, array[int]] = {}
        self._row_of: dict[int, int] = {}

    def __len__(self) -> int:
        return len(self.codes)

    run_key = property(lambda self: self._run_key.values)
    code_number = property(lambda self: self._code_number.values)
    date = property(lambda self: self._date.values)
    verdict = property(lambda self: self._verdict.values)
    carbon_class = property(lambda self: self._class.values)
    leaving_group = property(lambda self: self._leaving.values)
    temperature_c = property(lambda self: self._temperature.values)
    centre_atom = property(lambda self: self._centre.values)
    alive = property(lambda self: self._alive.values)
    place_row = property(lambda self: self._place_row.values)
    place_structure = property(lambda self: self._place_structure.values)
    place_position = property(lambda self: self._place_position.values)
    place_role = property(lambda self: self._place_role.values)

    def take_in(self, batch: RunBatch) -> None:
        """Add the runs of a batch; a run that is here already is replaced."""
        if not batch.runs:
            return
        first = len(self)
        columns = list(zip(*batch.runs, strict=True))
        keys = columns[0]
        for key in keys:
            old = self._row_of.get(key)
            if old is not None:
                self.alive[old] = False
        rows = dict(zip(keys, range(first, first + len(keys)), strict=True))
        self._row_of.update(rows)
        self._run_key.extend(keys)
        self.codes += columns[1]
        self._code_number.extend(columns[2])
        self._date.extend(_ordinal(day) for day in columns[3])
        self._verdict.extend(_VERDICTS.get(word, UNKNOWN) for word in columns[4])
        _post(self._projects, ((_fold(p), rows[k]) for k, p in zip(keys, columns[5], strict=True) if p))
        self._temperature.extend(map(_most_forcing, columns[9], columns[7], columns[8]))
        self._class.extend(_CLASSES.get(word, UNKNOWN) for word in columns[10])
        self._leaving.extend(_LEAVING.get(word, UNKNOWN) for word in columns[11])
        self.fates += columns[12]
        self.nucleophile_classes += columns[13]
        self.substrates += columns[14]
        self._centre.extend(-1 if atom is None else int(atom) for atom in columns[15])
        self._alive.extend(map(bool, columns[16]))
        self.recipes += columns[17]
        _post(self._solvents, ((text, rows[k]) for k, n, s in batch.solvents for text in _spellings(n, s)))
        _post(
            self._components,
            (((role, text), rows[k]) for k, role, n, s in batch.components for text in _spellings(n, s)),
        )
        _post(self._failures, ((mode, rows[k]) for k, mode in batch.failures))
        if batch.places:
            of_run, roles, positions, structures = zip(*batch.places, strict=True)
            self._place_row.extend(rows[k] for k in of_run)
            self._place_role.extend(_ROLE_CODE.get(role, len(ROLES)) for role in roles)
            self._place_position.extend(positions)
            self._place_structure.extend(structures)

    def count_stale(self, recipe: str) -> int:
        """Return how many standing runs were not read by this recipe."""
        if set(self.recipes) <= {recipe}:
            return 0
        return sum(stands and made_by != recipe for stands, made_by in zip(self.alive, self.recipes, strict=True))

    def rows_of_keys(self, run_keys: Iterable[int]) -> NDArray[np.bool_]:
        """Return a mask of the rows of these runs; among them rows that were replaced since, which are not `alive`."""
        return np.isin(self.run_key, np.fromiter(run_keys, np.int64))

    def with_solvent(self, names: Sequence[str], smiles: str | None) -> NDArray[np.bool_]:
        """Return which runs hold a solvent by any of these names or by this canonical SMILES."""
        return self._mask(self._solvents.get(spelling) for spelling in _wanted(names, smiles))

    def with_component(
        self, names: Sequence[str], smiles: str | None, roles: Sequence[str]
    ) -> NDArray[np.bool_]:
        """Return which runs hold a component of these roles by any of these names or this canonical SMILES."""
        spellings = _wanted(names, smiles)
        return self._mask(self._components.get((role, text)) for text in spellings for role in roles)

    def with_failure(self, mode: str) -> NDArray[np.bool_]:
        """Return which runs failed in a mode."""
        return self._mask([self._failures.get(mode)])

    def with_project(self, project: str) -> NDArray[np.bool_]:
        """Return which runs belong to a project."""
        return self._mask([self._projects.get(_fold(project))])

    def is_solvent_name(self, name: str) -> bool:
        """Return whether any run names a solvent so."""
        return _fold(name) in self._solvents

    def is_component_name(self, name: str) -> bool:
        """Return whether any run names a component so."""
        return any((role, _fold(name)) in self._components for role in ROLES)

    def _mask(self, postings: Iterable[array[int] | None]) -> NDArray[np.bool_]:
        mask = np.zeros(len(self), bool)
        for rows in postings:
            if rows is not None:
                mask[np.array(rows, np.int64)] = True
        return mask


def verdict_code(verdict: Verdict) -> int:
    """Return the code that the column of verdicts holds for a word."""
    return _VERDICTS[str(verdict)]


def class_code(carbon_class: CarbonClass) -> int:
    """Return the code that the column of carbon classes holds for a word."""
    return _CLASSES[str(carbon_class)]


def leaving_code(leaving_group: LeavingGroup) -> int:
    """Return the code that the column of leaving groups holds for a word."""
    return _LEAVING[str(leaving_group)]


def role_code(role: Role) -> int:
    """Return the code that the column of roles holds for a word."""
    return _ROLE_CODE[str(role)]


def _fold(name: str) -> str:
    return " ".join(name.split()).casefold()


def _spellings(name: str | None, smiles: str | None) -> set[str]:
    """Return the spellings under which a material is filed: its name, case apart, and its SMILES to the letter."""
    return {spelling for spelling in (name and _fold(name), smiles and "=" + smiles) if spelling}


def _wanted(names: Sequence[str], smiles: str | None) -> set[str]:
    return {_fold(name) for name in names} | ({"=" + smiles} if smiles else set())


def _post(postings: dict[Any, array[int]], items: Iterable[tuple[Any, int]]) -> None:
    for key, row in items:
        rows = postings.get(key)
        if rows is None:
            rows = postings[key] = array("q")
        rows.append(row)


def _ordinal(day: str | dt.date | None) -> int:
    if day is None:
        return 0
    return (dt.date.fromisoformat(day[:10]) if isinstance(day, str) else day).toordinal()


def _most_forcing(derived: float | None, start: float | None, end: float | None) -> float:
    """Return the derived temperature, else the higher of the two recorded, else NaN [degC]."""
    if derived is not None:
        return derived
    recorded = [t for t in (start, end) if t is not None]
    return max(recorded) if recorded else float("nan")

"""How a store comes to derived facts: the callables it was opened with, and what they made of one run.

The store knows no chemistry. It is handed `derive` (run to facts), `dissect` (run to its structures) and
`encode` (structure to what the search index keeps), each named by the recipe, and calls them before it takes
the write lock. A run whose chemistry cannot be read is kept all the same, as unresolved: a record that loses
what it cannot understand is none.
"""

from __future__ import annotations

import logging
from collections.abc import Callable, Iterable
from dataclasses import dataclass, field

from kb.errors import ChemistryError
from kb.record.derived import DerivedFacts
from kb.record.run import Run
from kb.store.values import Encoded
from kb.vocabulary import Confidence

log = logging.getLogger(__name__)

Derive = Callable[[Run], DerivedFacts]
Dissect = Callable[[Run], Iterable[tuple[str, int, str]]]
Encode = Callable[[str], Encoded]


@dataclass(frozen=True, slots=True, kw_only=True)
class Prepared:
    """What was derived from one run; `facts` None where the store has no `derive`.

    Attributes:
        facts: derived facts.
        places: (role, position, canonical SMILES), each role and position once.
    """

    facts: DerivedFacts | None = None
    places: tuple[tuple[str, int, str], ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Deriving:
    """The callables and their recipe; all may be missing, then nothing is derived.

    Attributes:
        processes: how many processes may derive many runs at once; 1 = all is done where it is asked for.
    """

    recipe: str = ""
    derive: Derive | None = None
    dissect: Dissect | None = None
    encode: Encode | None = None
    processes: int = 1

    def prepare(self, run: Run) -> Prepared:
        """Return the facts and structures of a run; unresolved where its chemistry cannot be read."""
        facts: DerivedFacts | None = None
        places: dict[tuple[str, int], str] = {}
        if self.derive is not None:
            try:
                facts = self.derive(run)
            except ChemistryError as error:
                log.warning("run %s kept without facts: %s", run.run_id, type(error).__name__)
                facts = DerivedFacts(run_id=run.run_id, recipe=self.recipe, confidence=Confidence.UNRESOLVED)
        if self.dissect is not None:
            try:
                places = {(str(role), position): smiles for role, position, smiles in self.dissect(run)}
            except ChemistryError as error:
                log.warning("run %s kept without structures: %s", run.run_id, type(error).__name__)
        return Prepared(facts=facts, places=tuple((r, p, s) for (r, p), s in places.items()))

    def encoded(self, smiles: str) -> Encoded | None:
        """Return what the index keeps of a structure; None where there is no encoder or it cannot take it."""
        if self.encode is None:
            return None
        try:
            return self.encode(smiles)
        except ChemistryError as error:
            log.warning("a structure of %d characters was not encoded: %s", len(smiles), type(error).__name__)
            return None


@dataclass(frozen=True, slots=True, kw_only=True)
class Encodings:
    """What the index keeps of some structures, worked out before the write lock is taken.

    A structure that was not foreseen is encoded when it is asked for: slower for those who wait, never wrong.
    """

    deriving: Deriving
    by_smiles: dict[str, Encoded | None] = field(default_factory=dict)

    @property
    def recipe(self) -> str | None:
        """Return the recipe; None where nothing is encoded."""
        return self.deriving.recipe if self.deriving.encode is not None else None

    def foresee(self, smiles: Iterable[str]) -> None:
        """Encode structures now."""
        for one in smiles:
            self.of(one)

    def of(self, smiles: str) -> Encoded | None:
        """Return what the index keeps of a structure; None where it could not be encoded."""
        if smiles not in self.by_smiles:
            self.by_smiles[smiles] = self.deriving.encoded(smiles)
        return self.by_smiles[smiles]

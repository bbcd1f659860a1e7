"""A book of many runs that the whole check can be asked of, made once and kept in pytest's cache.

The runs are the demo book's, taken again and again with other chain lengths and temperatures; facts are the demo
run's with those changes, so that a hundred thousand need no hundred thousand readings. Structures are encoded
as any book's are, under the program's own recipe.
"""

from __future__ import annotations

import dataclasses
import datetime as dt
import json
import random
import shutil
from collections.abc import Iterator
from functools import lru_cache
from pathlib import Path
from typing import Any
from uuid import UUID

from kb.book import build_demo, open_book
from kb.book.chemistry import store_options
from kb.progress import Silent
from kb.quantity import Temperature
from kb.record.derived import DerivedFacts
from kb.record.run import Run
from kb.store.derivation import account_of_run, current_recipe, dissect
from kb.store.store import Store

CHAINS = 60
"""Chain lengths that make other molecules of a demo substrate."""


def demo_book_of(n: int, cache: Path) -> Path:
    """Return the file of a book of n runs, made now if it is not there."""
    recipe = "".join(c if c.isalnum() else "-" for c in current_recipe())
    folder = cache / f"demo-runs-{n}-{recipe}"
    place = folder / "book.sidepath"
    if not (folder / "done").exists():
        shutil.rmtree(folder, ignore_errors=True)
        folder.mkdir(parents=True)
        demo, _ = build_demo(str(folder / "demo.sidepath"), Silent())
        with open_book(demo, read_only=True) as book:
            base = list(book.store.iter_runs())
        made = _Made(base)
        with Store.create(place, **{**store_options(), "derive": made.derive, "dissect": made.dissect}) as store:
            store.add_many(made.runs(n), "XX")
        (folder / "done").touch()
    return place


def lengthened(smiles: str, by: int) -> str:
    """Return a structure with a longer chain on its first atom, where that is a methyl; else as it is."""
    return f"{'C' * by}{smiles}" if smiles.startswith("CC") else smiles


class _Made:
    """Runs made from a few, and how their facts follow from those of the few."""

    def __init__(self, base: list[Run]) -> None:
        self.base = [run for run in base if run.withdrawn_why is None]
        self._facts = lru_cache(maxsize=None)(lambda number: account_of_run(self.base[number]).facts)
        self._places = lru_cache(maxsize=None)(lambda number: dissect(self.base[number]))

    def runs(self, n: int) -> Iterator[Run]:
        chance = random.Random(5)
        for number in range(n):
            run = self.base[number % len(self.base)]
            conditions = run.conditions
            if conditions.temperature is not None and conditions.temperature.end_c is not None:
                t = conditions.temperature.end_c + self._warmer(number)
                conditions = dataclasses.replace(
                    conditions, temperature=Temperature(text=f"{t:g} C", start_c=t, end_c=t)
                )
            left, *rest = run.scheme.split(">", 1)
            yield dataclasses.replace(
                run,
                run_id=UUID(int=number + 1),
                code=None,
                scheme=">".join([lengthened(left, self._by(number)), *rest]),
                conditions=conditions,
                attachments=(),
                date=dt.date(2016, 1, 1) + dt.timedelta(days=chance.randrange(3500)),
            )

    def derive(self, run: Run) -> DerivedFacts:
        number = run.run_id.int - 1
        facts = self._facts(number % len(self.base))
        changes: dict[str, Any] = {"run_id": run.run_id}
        by = self._by(number)
        if facts.substrate is not None and lengthened(facts.substrate, by) != facts.substrate:
            changes["substrate"] = lengthened(facts.substrate, by)
            changes["centre_atom"] = None if facts.centre_atom is None else facts.centre_atom + by
        if facts.temperature_c is not None:
            warmer = self._warmer(number)
            changes["temperature_c"] = facts.temperature_c + warmer
            values = json.loads(facts.profile_json)
            values["temperature_c"] = changes["temperature_c"]
            changes["profile_json"] = json.dumps(values, separators=(",", ":"), sort_keys=True)
        return dataclasses.replace(facts, **changes)

    def dissect(self, run: Run) -> list[tuple[str, int, str]]:
        number = run.run_id.int - 1
        by = self._by(number)
        return [
            (role, position, lengthened(smiles, by) if str(role) == "substrate" else smiles)
            for role, position, smiles in self._places(number % len(self.base))
        ]

    def _by(self, number: int) -> int:
        return (number // len(self.base)) % CHAINS

    def _warmer(self, number: int) -> int:
        return random.Random(number).randrange(-15, 16)

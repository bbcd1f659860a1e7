"""Routes of the small record book: the real reading and reckoning on its invented answers.

`ROUTE` is a convergent route with every kind of step on the fake book's runs; `a_route_file` writes it.
"""

from __future__ import annotations

import threading
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from kb.book.routes import open_route, recheck_step
from kb.errors import RecordNotFound
from kb.record.plan import Plan
from kb.route.sequence import Route, Step
from tui.jobs import current_progress
from tui.ports import Imagined
from tui.route_state import imagine

MESYLATE = "C[C@H](OS(C)(=O)=O)[C@H]1CCCO1"
ROUTE = f"""
title = "Invented route"
target = "10 mmol"
product = "CCO"
money = "EUR"
[material.mesylate]
molar_mass = 100.0
price_per_g = 5
[material.bulk]
molar_mass = 200.0
[[step]]
name = "azide"
from = "mesylate"
run = ["R-0001", "R-0002"]
[[step]]
name = "swap"
plan = {{ scheme = "{MESYLATE}", reagents = ["NaN3=1.5"], solvents = ["EtOH"], temperature = "80 C" }}
[[step]]
name = "side"
from = "bulk"
yield = "40 (30 to 50)"
cheap_input = true
[[step]]
name = "join"
from = ["swap", {{ name = "side", equiv = 1.5 }}]
yield = 50
"""


def a_route_file(folder: Path, text: str = ROUTE, name: str = "route.toml") -> Path:
    """Write a route file and return its path."""
    place = folder / name
    place.write_text(text, encoding="utf-8")
    return place


class RouteAnswers:
    """What the fake book answers about routes; `gate` and `broken` work here too."""

    gate: threading.Event | None
    example: Path | None = None

    def _maybe_fail(self, call: str) -> None:
        raise NotImplementedError

    def open_route(self, path: str) -> Route:
        self._maybe_fail("open_route")
        book: Any = self
        return open_route(book, Path(path), current_progress())

    def imagine_route(self, route: Route, edits: Mapping[str, str]) -> Imagined:
        self._maybe_fail("imagine_route")
        book: Any = self
        return imagine(route, edits, book, self._recheck)

    def _recheck(self, step: Step, plan: Plan) -> Step:
        book: Any = self
        return recheck_step(book, step, plan)

    def route_example(self) -> str:
        if self.example is None:
            raise RecordNotFound(
                "The example rests on runs of the demo book, and another book is open.", "Open it."
            )
        return str(self.example)

    def recent_routes(self) -> Sequence[str]:
        self._maybe_fail("recent_routes")
        return tuple(self.__dict__.setdefault("recent", []))

    def remember_route(self, path: str) -> None:
        recent = self.__dict__.setdefault("recent", [])
        recent[:] = [path, *(p for p in recent if p != path)]

    def save_page(self, thing: object, path: str) -> str:
        self._maybe_fail("save_page")
        self.__dict__.setdefault("pages", {})[path] = thing
        return path

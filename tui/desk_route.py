"""The desk's questions about routes: a file looked up in the book, what-ifs on it, the page of it.

It owns which of `kb.book` answers which question of `tui.ports`; how books are lent is the desk's. Steps that were
checked with other conditions are kept, so that typing a yield does not check them again. Nothing here writes to the
book or to the route file.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from contextlib import AbstractContextManager
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, cast

from kb.errors import InvalidRecord
from kb.record.plan import Plan
from tui.jobs import current_progress

if TYPE_CHECKING:
    from kb.book import Book
    from kb.route.sequence import Route, Step
    from tui.ports import BookPort, Imagined

    Lending = Callable[[], AbstractContextManager[Book]]

KEPT = 32
"""How many steps with other conditions are remembered."""
PAGE_ENDINGS = (".html", ".htm", ".md")


class RouteRecord:
    """What a desk answers about routes."""

    _rechecked: list[tuple[Step, Plan, Step]]

    def _lend_for_routes(self) -> AbstractContextManager[Book]:
        """Lend the book that checks."""
        raise NotImplementedError

    def open_route(self, path: str) -> Route:
        """Return the route of a file, its yields looked up."""
        from kb.book.routes import open_route

        self._rechecked = []
        with self._lend_for_routes() as book:
            return open_route(book, Path(path), current_progress())

    def imagine_route(self, route: Route, edits: Mapping[str, str]) -> Imagined:
        """Return a route reckoned with edits."""
        from tui.route_state import imagine

        return imagine(route, edits, cast("BookPort", self), self._recheck)

    def _recheck(self, step: Step, plan: Plan) -> Step:
        from kb.book.routes import recheck_step

        kept = getattr(self, "_rechecked", [])
        for asked, its_plan, found in kept:
            if asked.name == step.name and asked.plan == step.plan and its_plan == plan:
                return replace(found, inputs=step.inputs, forgiven=step.forgiven, cost_per_mmol=step.cost_per_mmol)
        with self._lend_for_routes() as book:
            found = recheck_step(book, step, plan)
        self._rechecked = [*kept[1 - KEPT :], (step, plan, found)]
        return found

    def route_example(self) -> str:
        """Return the file of the shipped route."""
        from kb.book.demo import demo_route

        with self._lend_for_routes() as book:
            return str(demo_route(book))

    def recent_routes(self) -> Sequence[str]:
        """Return the route files that were opened lately."""
        from kb.book.recent import recent_routes

        return recent_routes()

    def remember_route(self, path: str) -> None:
        """Put a route file at the head of that list."""
        from kb.book.recent import remember_route

        remember_route(path)

    def save_page(self, thing: object, path: str) -> str:
        """Write a page; return where it is."""
        from kb.book import save_page

        place = Path(path).expanduser()
        if place.suffix.lower() not in PAGE_ENDINGS:
            raise InvalidRecord(f"{place.name!r} is no name for a page.", "Let it end in .html or .md.", path)
        if place.exists():
            raise InvalidRecord(f"{place.name} is there already.", "Name another file; nothing is overwritten.", path)
        with self._lend_for_routes() as book:
            save_page(book, thing, place)
        return str(place)

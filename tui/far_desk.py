"""The desk whose slow questions are answered in a back room: what the running interface works with.

It owns which question goes there and by which lane. Questions that touch a row or two, and everything that writes, stay
in this process, so that what was recorded never hangs on another one. Where no second process can be had, it is a
plain desk: everything works, only typing is less smooth.
"""

from __future__ import annotations

import logging
import threading
from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING, Any

from kb.chem.facts import Reading
from kb.chem.layout import SchemeDrawing
from kb.progress import Silent
from kb.record.assessment import Assessment, Estimate
from kb.record.component import Component, SolventPart
from kb.record.plan import Plan
from kb.record.run import Run
from kb.vocabulary import Role
from tui.backroom import BackRoom, NoBackRoom
from tui.desk import Desk, load_chemistry
from tui.drawings import draw_elsewhere, draw_here
from tui.jobs import working_for
from tui.ports import FindPage, FindQuery, Imagined, Offer, RunPage, RunQuery

if TYPE_CHECKING:
    from kb.route.sequence import Route

log = logging.getLogger(__name__)

CHECKING, FINDING, LOOKING, READING = "checking", "finding", "looking", "reading"
"""Lanes of the back room: what is in one waits for one another, never for another lane."""


class FarDesk(Desk):
    """A desk with a back room.

    Raises:
        StoreMissing, StoreRefused, ...: as opening a book does.
    """

    def __init__(self, place: str | None, read_only: bool = False) -> None:
        self._loading = threading.Lock()
        self._room: BackRoom | None = None
        try:
            self._room = BackRoom(place)  # it loads chemistry while the book is opened here
        except NoBackRoom as why:
            log.warning("no back room: %s", why)
        try:
            super().__init__(place, read_only)
        except BaseException:
            if self._room is not None:
                self._room.close()
            raise
        if self._room is None:
            self._work_here()
        else:
            draw_elsewhere(self._drawn)

    @property
    def room(self) -> BackRoom | None:
        """Return the back room; None where there is none."""
        return self._room

    def _far(self, lane: str, method: str, *args: Any, **options: Any) -> Any:
        """Ask in the back room, or here where there is none."""
        if self._room is not None:
            try:
                return self._room.ask(lane, method, *args, **options)
            except NoBackRoom as why:
                log.warning("no back room any more: %s", why)
                self._work_here()
        return getattr(super(), method)(*args, **options)

    def _work_here(self) -> None:
        with self._loading:
            self._room = None
            draw_elsewhere(None)
            load_chemistry()

    def _drawn(self, text: str) -> SchemeDrawing:
        if self._room is not None:
            try:
                with working_for(Silent()):  # what a stopped search found is drawn all the same
                    drawing: SchemeDrawing = self._room.ask(READING, "scheme_drawing", text)
                return drawing
            except NoBackRoom:
                self._work_here()
        return draw_here(text)

    def read_scheme(self, text: str) -> Reading:
        """Read a scheme."""
        reading: Reading = self._far(READING, "read_scheme", text)
        return reading

    def scheme_text(self, text: str) -> str:
        """Return the scheme that a text or a name stands for."""
        return str(self._far(READING, "scheme_text", text))

    def resolve_component(self, text: str, role: Role) -> Component:
        """Return a component from "NAME" or "NAME=EQUIV"."""
        component: Component = self._far(CHECKING, "resolve_component", text, role)
        return component

    def resolve_solvent(self, text: str) -> SolventPart:
        """Return a solvent from "NAME" or "NAME:PARTS"."""
        solvent: SolventPart = self._far(CHECKING, "resolve_solvent", text)
        return solvent

    def lookup(self, text: str, kind: str) -> Sequence[Offer]:
        """Return catalogue names near the text; none when the text is a name already."""
        offers: Sequence[Offer] = self._far(READING, "lookup", text, kind)
        return offers

    def remarks(self, run: Run) -> Sequence[str]:
        """Return what does not add up in a run, a sentence each."""
        remarks: Sequence[str] = self._far(READING, "remarks", run)
        return remarks

    def check(self, plan: Plan, *, top: int = 8) -> Assessment:
        """Return everything known about a plan."""
        assessment: Assessment = self._far(CHECKING, "check", plan, top=top)
        return assessment

    def what_if(self, plan: Plan, temperatures_c: Sequence[float]) -> Sequence[tuple[float, Estimate]]:
        """Return the estimate at other temperatures [degC]."""
        points: Sequence[tuple[float, Estimate]] = self._far(CHECKING, "what_if", plan, temperatures_c)
        return points

    def page(self, query: RunQuery) -> RunPage:
        """Return a page of runs."""
        is_searched = bool(query.words or query.verdict or query.failed)
        page: RunPage = self._far(FINDING if is_searched else LOOKING, "page", query)
        return page

    def find(self, query: FindQuery) -> FindPage:
        """Return a page of what matches."""
        page: FindPage = self._far(FINDING, "find", query)
        return page

    def open_route(self, path: str) -> Route:
        """Return the route of a file, its yields looked up."""
        route: Route = self._far(CHECKING, "open_route", path)
        return route

    def imagine_route(self, route: Route, edits: Mapping[str, str]) -> Imagined:
        """Return a route reckoned with edits."""
        found: Imagined = self._far(CHECKING, "imagine_route", route, edits)
        return found

    def close(self) -> None:
        """Let go of the book here and in the back room."""
        if self._room is not None:
            draw_elsewhere(None)
            self._room.close()
        super().close()

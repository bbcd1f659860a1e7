"""Long work shows how far it is and is stopped by a key; a stop leaves the screen in plain words and usable."""

from __future__ import annotations

import asyncio
import threading

from kb.errors import Cancelled
from kb.record.assessment import Assessment
from kb.record.plan import Plan
from tests.tui.driving import driven, on_screen, pressed, settled
from tests.tui.fake_book import FakeBook, a_run
from tui.jobs import current_progress
from tui.ports import FindHit, FindPage, FindQuery, RunPage, RunQuery
from tui.widgets.estimate import EstimateBars


class SlowBook(FakeBook):
    """Works until it is told to stop, unless the word asked for is quick."""

    def __init__(self) -> None:
        super().__init__()
        self.began = threading.Event()
        self.stopped = 0
        self.is_slow = True

    def _work_until_stopped(self) -> None:
        progress = current_progress()
        progress.advance(45_000, 100_000, "runs read")
        self.began.set()
        while not progress.cancelled():
            threading.Event().wait(0.005)
        self.stopped += 1

    def find(self, query: FindQuery) -> FindPage:
        if query.words == "quick":
            return super().find(query)
        self._work_until_stopped()
        return FindPage(total=1, hits=(FindHit(run=a_run(1)),), notes=("The search was stopped: others may fit too.",))

    def check(self, plan: Plan, *, top: int = 8) -> Assessment:
        if self.is_slow:
            self._work_until_stopped()
            raise Cancelled("The check was stopped.", "Check again to go on.")
        return super().check(plan, top=top)

    def page(self, query: RunQuery) -> RunPage:
        if query.words:
            self._work_until_stopped()
            raise Cancelled("Stopped.", "Ask again to go on.")
        return super().page(query)


async def until_shown(app: object, words: str) -> None:
    """Wait until something stands on the screen while work goes on."""
    for _ in range(2000):
        if words in on_screen(app):  # type: ignore[arg-type]
            return
        await asyncio.sleep(0.005)
    raise AssertionError(f"{words!r} was never shown")


async def test_a_search_shows_how_far_it_is_and_escape_stops_it_with_what_was_found() -> None:
    book = SlowBook()
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f4")
        app.screen.query_one("#find-words").value = "emulsion"  # type: ignore[attr-defined]
        await pilot.press("f9")
        await until_shown(app, "45,000 of 100,000 runs read, Esc stops")
        await pilot.press("escape")
        await settled(pilot)
        assert book.stopped == 1
        assert "The search was stopped" in " ".join(on_screen(app).split())
        assert "1 to 1 of 1" in on_screen(app)
        assert "Esc stops" not in on_screen(app)


async def test_escape_does_nothing_while_nothing_runs() -> None:
    async with driven() as (app, pilot):
        await pressed(pilot, "escape")
        assert app.current_mode == "planning"


async def test_a_check_is_stopped_and_asked_again_by_key() -> None:
    book = SlowBook()
    async with driven(book) as (app, pilot):
        app.screen.query_one("#field-scheme").value = "CCBr"  # type: ignore[attr-defined]
        await until_shown(app, "Esc stops")
        await pilot.press("escape")
        await settled(pilot)
        assert "press Ctrl+R" in app.screen.query_one(EstimateBars).waiting
        book.is_slow = False
        await pressed(pilot, "ctrl+r")
        assert "press Ctrl+R" not in on_screen(app)
        assert "subst" in on_screen(app)


async def test_a_list_being_narrowed_is_stopped_in_words() -> None:
    book = SlowBook()
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f3")
        app.screen.query_one("#runs-filter").value = "emulsion"  # type: ignore[attr-defined]
        await until_shown(app, "Esc stops")
        await pilot.press("escape")
        await settled(pilot)
        assert "Stopped." in on_screen(app)
        assert "R-0012" in on_screen(app), "the list is still there"


async def test_a_newer_question_stops_the_older_one() -> None:
    book = SlowBook()
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f4")
        await pilot.pause()
        app.screen.query_one("#find-words").value = "emulsion"  # type: ignore[attr-defined]
        await pilot.press("f9")
        while not book.began.is_set():
            await pilot.pause(0.005)
        await typed_without_waiting(pilot, "quick")
        await settled(pilot)
        assert book.stopped == 1
        assert "The search was stopped" not in on_screen(app), "its answer is stale"


async def typed_without_waiting(pilot: object, words: str) -> None:
    app = pilot.app  # type: ignore[attr-defined]
    app.screen.query_one("#find-words").value = words
    await pilot.press("f9")  # type: ignore[attr-defined]


async def test_leaving_the_program_does_not_wait_for_work() -> None:
    book = SlowBook()
    async with driven(book) as (app, pilot):
        app.screen.query_one("#field-scheme").value = "CCBr"  # type: ignore[attr-defined]
        while not book.began.is_set():
            await pilot.pause(0.005)
        await pilot.press("ctrl+q")
        await pilot.pause()
    assert book.is_closed
    assert book.stopped == 1



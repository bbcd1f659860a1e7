"""Runs: paged, filtered, sorted; the run under the cursor beside the list.

Amended and withdrawn with a reason.
"""

from __future__ import annotations

from kb.errors import StoreBusy
from kb.vocabulary import Verdict
from tests.tui.driving import driven, on_screen, pressed, settled, typed
from tests.tui.fake_book import FakeBook, a_run
from tui.screens.entry import EntryScreen
from tui.screens.planning import PlanningScreen
from tui.screens.run_detail import RunScreen
from tui.screens.runs import RunsScreen
from tui.widgets.tables import RunTable


async def test_pages_filters_and_orders() -> None:
    book = FakeBook(runs=150)
    book.runs["R-0003"] = a_run(3, verdict=Verdict.FAILED, note="emulsion at work-up")
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f3")
        table = app.screen.query_one(RunTable)
        assert table.row_count == 100
        assert "1 to 100 of 150; by date, falling" in on_screen(app)
        assert "R-0150" in on_screen(app)
        await pressed(pilot, "n")
        assert "101 to 150 of 150" in on_screen(app)
        assert app.screen.check_action("next_page", ()) is None
        await pressed(pilot, "b")
        assert table.code == "R-0150"
        await pressed(pilot, "s", "r")
        assert "by code, rising" in on_screen(app)
        assert table.codes[0] == "R-0001"
        await pressed(pilot, "v", "v", "v")
        assert table.codes == ("R-0003",)
        await pressed(pilot, "v")
        assert table.row_count == 100
        await pressed(pilot, "slash")
        await typed(pilot, "#runs-filter", "emulsion")
        await settled(pilot)
        assert table.codes == ("R-0003",)
        await typed(pilot, "#runs-filter", "no such words")
        await settled(pilot)
        assert "0 to 0 of 0" in on_screen(app)
        assert "No run is chosen." in on_screen(app)
        assert app.screen.check_action("amend", ()) is None


async def test_the_run_under_the_cursor_is_drawn_and_opened() -> None:
    async with driven() as (app, pilot):
        await pressed(pilot, "f3")
        assert "isolated yield" in on_screen(app)
        await pressed(pilot, "down")
        assert "Run R-0011" in on_screen(app)
        await pressed(pilot, "enter")
        assert isinstance(app.screen, RunScreen)
        assert "JM: recorded" in on_screen(app)
        await pressed(pilot, "ctrl+l")
        assert "S:3" in on_screen(app)
        await pressed(pilot, "p")
        assert isinstance(app.screen, PlanningScreen)
        assert app.screen.form.state["reagent"] == "NaN3=1.5"
        assert app.screen.form.state["temperature"] == "61 C"


async def test_withdrawing_asks_why_and_the_run_stays_in_the_history() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f3")
        await pressed(pilot, "w", "escape")
        assert not book.runs["R-0012"].is_withdrawn
        await pressed(pilot, "w", "enter")
        assert "Write something first." in on_screen(app)
        await pressed(pilot, *"wrong flask", "enter")
        assert book.runs["R-0012"].withdrawn_why == "wrong flask"
        assert app.screen.query_one(RunTable).row_count == 11
        await pressed(pilot, "x")
        assert app.screen.query_one(RunTable).row_count == 12
        await pressed(pilot, "ctrl+home")
        assert "withdrawn" in on_screen(app)
        assert app.screen.check_action("withdraw", ()) is None


async def test_amending_asks_why_and_keeps_the_history() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f3")
        await pressed(pilot, "a")
        assert isinstance(app.screen, EntryScreen)
        assert "Amend R-0012" in on_screen(app)
        app.screen.query_one("#field-isolated").value = "66"
        await settled(pilot)
        await pressed(pilot, "ctrl+s")
        await pressed(pilot, *"dried again", "enter")
        assert isinstance(app.screen, RunsScreen)
        assert book.runs["R-0012"].outcome.isolated_yield_pct == 66
        assert book.changes["R-0012"][0].why == "dried again"
        assert "66 %" in on_screen(app)


async def test_trouble_and_a_read_only_book() -> None:
    book = FakeBook(read_only=True)
    book.broken["page"] = StoreBusy("The book is busy.", "Try again.")
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f3")
        assert "The book is busy." in on_screen(app)
        book.broken.clear()
        await pressed(pilot, "s")
        assert "The book is busy." not in on_screen(app)
        assert app.screen.check_action("amend", ()) is None
        assert app.screen.check_action("withdraw", ()) is None
        book.broken["withdraw"] = StoreBusy("Somebody else writes.", "Try again.")


async def test_a_run_that_is_gone_is_told_on_its_screen() -> None:
    async with driven() as (app, pilot):
        await app.push_screen(RunScreen("R-9999"))
        await settled(pilot)
        assert "No run is called R-9999." in on_screen(app)
        assert app.screen.check_action("plan_again", ()) is None
        await pressed(pilot, "escape")
        assert isinstance(app.screen, PlanningScreen)

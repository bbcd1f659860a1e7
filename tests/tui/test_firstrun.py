"""First run: without a book the three ways are offered; every trouble with a book is told in plain words."""

from __future__ import annotations

import pytest

from kb.errors import SchemaBehind, SidepathError, StoreDamaged
from tests.tui.driving import driven, on_screen, pressed, typed
from tests.tui.fake_book import FakeBook, FakeOpener
from tui.screens.firstrun import FirstRunScreen
from tui.screens.planning import PlanningScreen


async def test_the_demo_is_one_key_away() -> None:
    opener = FakeOpener()
    async with driven(opener=opener) as (app, pilot):
        assert isinstance(app.screen, FirstRunScreen)
        await pressed(pilot, "escape")
        assert "No book is open yet." in on_screen(app)
        await pressed(pilot, "enter")
        assert isinstance(app.screen, PlanningScreen)
        assert "12 runs" in on_screen(app)
        assert opener.asked == ["open None", "demo"]


async def test_a_new_book_is_made_where_it_is_said() -> None:
    opener = FakeOpener()
    async with driven(opener=opener) as (app, pilot):
        await typed(pilot, "#first-new-path", "")
        await pressed(pilot, "enter")
        assert "Say where to keep the new book." in on_screen(app)
        await typed(pilot, "#first-new-path", "ours.sidepath")
        await pressed(pilot, "enter")
        assert isinstance(app.screen, PlanningScreen)
        assert "0 runs" in on_screen(app)
        assert "create ours.sidepath" in opener.asked


async def test_another_book_is_opened_from_any_place_and_the_old_one_let_go() -> None:
    first, second = FakeBook(), FakeBook(runs=3)
    opener = FakeOpener(first)
    async with driven(opener=opener) as (app, pilot):
        await pressed(pilot, "ctrl+o")
        await typed(pilot, "#first-open-path", "")
        await pressed(pilot, "enter")
        assert "Say which book to open." in on_screen(app)
        await typed(pilot, "#first-open-path", "busy.sidepath")
        await pressed(pilot, "enter")
        assert "held by another writer" in on_screen(app)
        opener.book = second
        await typed(pilot, "#first-open-path", "other.sidepath")
        await pressed(pilot, "enter")
        assert "3 runs" in on_screen(app)
        assert first.is_closed
        await pressed(pilot, "ctrl+o")
        await pressed(pilot, "escape")
        assert isinstance(app.screen, PlanningScreen)


@pytest.mark.parametrize(
    "error",
    [
        StoreDamaged("book.sidepath is no record book.", "Restore a backup."),
        SchemaBehind("The book is older than the program.", "Run `sidepath migrate`."),
    ],
    ids=["damaged", "behind"],
)
async def test_a_book_that_cannot_be_opened_is_told_with_what_to_do(error: SidepathError) -> None:
    async with driven(opener=FakeOpener(error=error)) as (app, pilot):
        assert isinstance(app.screen, FirstRunScreen)
        assert error.message in on_screen(app)
        assert error.hint in on_screen(app)
        await pressed(pilot, "ctrl+d")
        assert isinstance(app.screen, PlanningScreen)

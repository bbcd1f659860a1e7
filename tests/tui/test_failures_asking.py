"""The place *failures* while it asks: progress, stopping, errors in place, answers that are out of date."""

from __future__ import annotations

import threading
from typing import Any

from kb.errors import StoreBusy
from tests.tui.driving import driven, on_screen, pressed, settled, words
from tests.tui.fake_book import FakeBook
from tui.messages import RunStored
from tui.screens.failures import FailuresPlace
from tui.screens.planning import PlanningScreen


async def let_go(pilot: Any, book: FakeBook) -> None:
    """Let what is held go on, and wait for it."""
    assert book.hold is not None
    book.hold.set()
    await settled(pilot)


async def held(pilot: Any) -> None:
    """Wait until a held question has reported."""
    for _ in range(300):
        await pilot.pause(0.02)
        if "5 of 12" in on_screen(pilot.app):
            return
    raise AssertionError("nothing was reported")


async def test_a_replay_reports_and_is_stopped_and_says_so() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5", "3")
        book.hold = threading.Event()
        await pilot.press("f9")
        await held(pilot)
        assert "5 of 12 runs looked at Escape stops" in words(app)
        assert app.screen.check_action("look", ()) is None
        await pilot.press("escape")
        await settled(pilot)
        assert "Stopped before the end" in words(app)
        assert app.screen.check_action("stop", ()) is False


async def test_one_can_work_elsewhere_while_a_replay_runs() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5", "3")
        book.hold = threading.Event()
        await pilot.press("f9")
        await held(pilot)
        await pilot.press("f2")
        await pilot.pause(0.05)
        assert isinstance(app.screen, PlanningScreen)
        await pilot.press("f5")
        await let_go(pilot, book)
        assert "3 of 5 failures" in words(app)


async def test_a_short_question_that_is_stopped_says_how_to_ask_again() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5")
        book.hold = threading.Event()
        await pilot.press("4")
        await held(pilot)
        await pilot.press("escape")
        await settled(pilot)
        assert "Stopped. F9 looks again." in words(app)
        book.hold.set()
        await pressed(pilot, "f9")
        assert "12 runs in 3 combinations; 1 hold two runs or fewer, 1 contradict" in words(app)


async def test_an_error_is_told_in_place_in_every_part_and_another_key_tries_again() -> None:
    book = FakeBook()
    parts = (("1", "recurring"), ("2", "tally"), ("3", "replay"), ("4", "coverage"), ("5", "calibration"))
    for _, kind in parts:
        book.broken[kind] = StoreBusy("The book is held by another writer.", "Try again in a moment.")
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5")
        for key, kind in parts:
            await pressed(pilot, key, "f9")
            assert "✗ The book is held by another writer." in words(app), kind
            assert "F9 tries again." in words(app)
            await pressed(pilot, "r", "a", "s")
            assert isinstance(app.screen, FailuresPlace)
            del book.broken[kind]
            await pressed(pilot, "f9")
            assert "held by another" not in words(app), kind
            assert app.screen.view.audit is not None


async def test_an_error_leaves_the_answer_before_in_view() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5")
        book.broken["recurring"] = StoreBusy("The book is held by another writer.", "Try again.")
        await pressed(pilot, "f9")
        assert "9 failures in 12 runs" in words(app)
        assert "✗ The book is held by another writer." in words(app)


async def test_a_fault_of_the_program_is_told_and_the_place_stays_usable() -> None:
    book = FakeBook()
    book.broken["coverage"] = RuntimeError("planted")
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5", "4")
        assert "Something went wrong inside the program" in words(app)
        assert "planted" not in words(app)
        del book.broken["coverage"]
        await pressed(pilot, "f9")
        assert "12 runs in 3 combinations" in words(app)


async def test_a_change_of_the_record_is_noticed() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5", "3", "f9")
        await pressed(pilot, "1")
        assert book.asked.count("recurring") == 1
        app.post_message(RunStored("R-0013"))
        await settled(pilot)
        await pressed(pilot, "f3", "f5")
        assert book.asked.count("recurring") == 2
        await pressed(pilot, "3")
        assert book.asked.count("replay") == 1
        assert "The record has changed since; F9 looks again." in words(app)
        await pressed(pilot, "f9")
        assert "has changed since" not in words(app)


async def test_another_book_starts_anew_and_the_answer_on_its_way_is_dropped() -> None:
    book, other = FakeBook(), FakeBook()
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5", "3")
        book.hold = threading.Event()
        await pilot.press("f9")
        await held(pilot)
        app.use_book(other)
        await settled(pilot)
        assert "F9 starts" in words(app)
        assert app.screen.view.audit is None
        await pressed(pilot, "1")
        assert "9 failures in 12 runs" in words(app)
        assert other.asked == ["recurring"]


async def test_a_run_that_cannot_be_fetched_is_told_in_place() -> None:
    async with driven() as (app, pilot):
        await pressed(pilot, "f5")
        app.book.broken["get"] = StoreBusy("The book is held by another writer.", "Try again in a moment.")
        await pressed(pilot, "r")
        assert "held by another writer" in words(app)

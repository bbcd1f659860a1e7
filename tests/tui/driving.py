"""Driving the interface in tests: an application on a fake book, and waiting until every answer is shown."""

from __future__ import annotations

import asyncio
from collections.abc import AsyncIterator
from contextlib import asynccontextmanager
from typing import Any

from textual.pilot import Pilot
from textual.widgets import Static

from tests.tui.fake_book import FakeBook, FakeOpener
from tui.application import SidepathApp
from tui.screens.firstrun import FirstRunScreen

SIZE = (100, 30)


@asynccontextmanager
async def driven(
    book: FakeBook | None = None, size: tuple[int, int] = SIZE, opener: FakeOpener | None = None, theme: str = ""
) -> AsyncIterator[tuple[SidepathApp, Pilot[Any]]]:
    """Run the application on a book; leave it when the test is done."""
    app = SidepathApp(opener or FakeOpener(book or FakeBook()), who="JM", theme=theme)
    async with app.run_test(size=size) as pilot:
        while app.book is None and not isinstance(app.screen, FirstRunScreen):
            await settled(pilot)
        await settled(pilot)
        yield app, pilot


async def settled(pilot: Pilot[Any], rounds: int = 2) -> None:
    """Wait until no question is open or about to be asked, no worker runs, and their answers are shown."""
    app: Any = pilot.app
    quiet = 0
    for _ in range(1500):
        await pilot._wait_for_screen()
        is_asking = getattr(app.screen, "is_asking", False)
        is_working = any(not worker.is_finished for worker in app.workers)
        quiet = 0 if is_asking or is_working else quiet + 1
        if quiet >= rounds:
            await asyncio.sleep(0.04)  # classes and layouts are applied on the screen's own timer
            await pilot._wait_for_screen()
            return
        await asyncio.sleep(0.01)
    raise AssertionError("the interface did not come to rest")


async def pressed(pilot: Pilot[Any], *keys: str) -> None:
    """Press keys one after the other, and wait until the last has shown."""
    await pilot.press(*keys)
    await settled(pilot)


async def typed(pilot: Pilot[Any], selector: str, text: str) -> None:
    """Put a text into a line as a paste would, and wait for the answer."""
    line: Any = pilot.app.screen.query_one(selector)
    line.focus()
    await pilot.pause()
    line.value = text
    await settled(pilot)


def on_screen(app: SidepathApp) -> str:
    """Return everything that the screen shows, as text."""
    strips = app.screen._compositor.render_strips()
    return "\n".join("".join(segment.text for segment in strip) for strip in strips)


def words(app: SidepathApp) -> str:
    """Return what is on the screen, its spaces made one."""
    return " ".join(on_screen(app).split())


def said(app: SidepathApp, selector: str) -> str:
    """Return the words of one line of the screen."""
    return " ".join(str(app.screen.query_one(selector, Static).render()).split())

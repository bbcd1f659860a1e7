"""Driving the interface in tests: an application on a fake book, and waiting until every answer is shown."""

from __future__ import annotations

import asyncio
from collections.abc import AsyncIterator
from contextlib import asynccontextmanager, suppress
from typing import Any

from textual.pilot import Pilot
from textual.worker import WorkerFailed

from tests.tui.fake_book import FakeBook, FakeOpener
from tui.application import SidepathApp

SIZE = (100, 30)


@asynccontextmanager
async def driven(
    book: FakeBook | None = None, size: tuple[int, int] = SIZE, opener: FakeOpener | None = None, theme: str = ""
) -> AsyncIterator[tuple[SidepathApp, Pilot[Any]]]:
    """Run the application on a book; leave it when the test is done."""
    app = SidepathApp(opener or FakeOpener(book or FakeBook()), who="JM", theme=theme)
    async with app.run_test(size=size) as pilot:
        await settled(pilot)
        yield app, pilot


async def settled(pilot: Pilot[Any], rounds: int = 3) -> None:
    """Wait until no worker runs, no question is open and what they said is on the screen."""
    for _ in range(rounds):
        await pilot._wait_for_screen()
        await asyncio.sleep(0.015)
        with suppress(WorkerFailed):  # a planted fault; what the screen makes of it is the test's matter
            await pilot.app.workers.wait_for_complete()
    await pilot._wait_for_screen()


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

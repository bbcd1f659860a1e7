"""The interface in a browser: only its own page may talk to it, and a real browser shows it and types into it."""

from __future__ import annotations

import asyncio
import base64
import json
import os
import shutil
import socket
import struct
import subprocess
import sys
import time
import zlib
from collections.abc import AsyncIterator, Iterator
from contextlib import asynccontextmanager, closing
from pathlib import Path
from typing import Any

import pytest

from kb.book import open_book
from tui.plan_state import PLAN_DRAFT
from tui.serving import is_from_here, make_server, page_rules

aiohttp = pytest.importorskip("aiohttp", reason="needs textual-serve (the extra `browser`)")
pytest.importorskip("textual_serve", reason="needs textual-serve (the extra `browser`)")

CHROMIUM = next(filter(None, map(shutil.which, ("chromium", "chromium-browser", "google-chrome"))), None)
PATIENCE_S = 120.0


@pytest.mark.parametrize(
    ("host", "origin", "is_let_in"),
    [
        ("127.0.0.1:8317", None, True),
        ("localhost:8317", "http://127.0.0.1:8317", True),
        ("[::1]:8317", "http://[::1]:8317", True),
        ("127.0.0.1:8317", "http://127.0.0.1:9000", False),
        ("127.0.0.1:8317", "https://example.org", False),
        ("127.0.0.1:8317", "null", False),
        ("rebound.example.org:8317", None, False),
        ("rebound.example.org:8317", "http://rebound.example.org:8317", False),
        ("", None, False),
    ],
)
def test_only_this_machine_and_its_own_page_are_let_in(host: str, origin: str | None, is_let_in: bool) -> None:
    assert is_from_here(host, origin, 8317) is is_let_in


def test_the_page_may_load_nothing_from_elsewhere() -> None:
    places = {word for rule in page_rules(8317).split(";") for word in rule.split()[1:] if "://" in word}
    assert places
    assert all(place.split("://")[1] in ("127.0.0.1:8317", "localhost:8317") for place in places)


def free_port() -> int:
    with closing(socket.socket()) as listening:
        listening.bind(("127.0.0.1", 0))
        return int(listening.getsockname()[1])


async def test_another_page_is_refused_before_anything_is_started() -> None:
    from aiohttp import web

    port = free_port()
    server = make_server("false", "127.0.0.1", port)
    runner = web.AppRunner(await server._make_app())
    await runner.setup()
    await web.TCPSite(runner, "127.0.0.1", port).start()
    address = f"http://127.0.0.1:{port}"
    try:
        async with aiohttp.ClientSession() as session:
            async with session.get(address) as page:
                assert page.status == 200
                assert "frame-ancestors 'none'" in page.headers["Content-Security-Policy"]
            for headers in ({"Origin": "http://example.org"}, {"Host": "example.org"}):
                async with session.get(f"{address}/ws", headers=headers) as refused:
                    assert refused.status == 403
                    assert "own machine only" in await refused.text()
            async with session.get(address, headers={"Host": "example.org"}) as refused:
                assert refused.status == 403
    finally:
        await runner.cleanup()


@pytest.fixture
def served(tmp_path: Path) -> Iterator[tuple[Path, int]]:
    place, port = tmp_path / "group.sidepath", free_port()
    with open_book(place, create=True):
        pass
    command = [sys.executable, "-m", "kb", "--book", str(place), "--as", "JM", "tui", "--serve", "--port", str(port)]
    with (tmp_path / "server.log").open("wb") as log:
        server = subprocess.Popen(command, stdout=log, stderr=log)
    try:
        for _ in range(int(PATIENCE_S * 10)):
            with closing(socket.socket()) as trying:
                if trying.connect_ex(("127.0.0.1", port)) == 0:
                    break
            assert server.poll() is None, (tmp_path / "server.log").read_text()
            time.sleep(0.1)
        yield place, port
    finally:
        server.terminate()
        server.wait(30)


class Browser:
    """A page of a headless Chromium, driven over its debugging line."""

    def __init__(self, line: Any) -> None:
        self._line = line
        self._number = 0
        self.asked_elsewhere: list[str] = []

    async def do(self, method: str, **parameters: Any) -> dict[str, Any]:
        self._number += 1
        await self._line.send_json({"id": self._number, "method": method, "params": parameters})
        while True:
            answer = await asyncio.wait_for(self._line.receive_json(), PATIENCE_S)
            if answer.get("method") == "Network.responseReceived":
                self.asked_elsewhere.append(answer["params"]["response"]["url"])
            if answer.get("id") == self._number:
                assert "error" not in answer, answer
                return dict(answer["result"])

    async def picture(self) -> bytes:
        return base64.b64decode((await self.do("Page.captureScreenshot", format="png"))["data"])

    async def click(self, x: int, y: int) -> None:
        for kind in ("mousePressed", "mouseReleased"):
            await self.do("Input.dispatchMouseEvent", type=kind, x=x, y=y, button="left", clickCount=1)

    async def type_letters(self, letters: str) -> None:
        for letter in letters:
            code = ord(letter.upper())
            await self.do("Input.dispatchKeyEvent", type="keyDown", text=letter, key=letter, windowsVirtualKeyCode=code)
            await self.do("Input.dispatchKeyEvent", type="keyUp", key=letter, windowsVirtualKeyCode=code)


@asynccontextmanager
async def browser(folder: Path) -> AsyncIterator[Browser]:
    assert CHROMIUM is not None
    command = [
        CHROMIUM, "--headless=new", "--no-sandbox", "--disable-gpu", "--disable-dev-shm-usage", "--no-first-run",
        "--remote-debugging-port=0", "--remote-allow-origins=*", f"--user-data-dir={folder}",
        "--window-size=1100,760", "about:blank",
    ]  # fmt: skip
    with (folder.parent / "chromium.log").open("wb") as log:
        program = subprocess.Popen(command, stdout=log, stderr=log)
    try:
        told = folder / "DevToolsActivePort"
        for _ in range(int(PATIENCE_S * 10)):
            if told.exists() and told.read_text().strip():
                break
            assert program.poll() is None, "Chromium ended"
            await asyncio.sleep(0.1)
        port = told.read_text().split()[0]
        async with aiohttp.ClientSession() as session:
            async with session.get(f"http://127.0.0.1:{port}/json") as listed:
                pages = [one for one in json.loads(await listed.text()) if one["type"] == "page"]
            async with session.ws_connect(pages[0]["webSocketDebuggerUrl"], max_msg_size=0) as line:
                yield Browser(line)
    finally:
        program.terminate()
        program.wait(30)


def colours(png: bytes) -> int:
    """Return how many different pixel rows a picture has: one for an empty page, many for one with text."""
    at, data, height = 8, b"", 0
    while at < len(png):
        length, kind = struct.unpack(">I4s", png[at : at + 8])
        if kind == b"IHDR":
            height = struct.unpack(">I", png[at + 12 : at + 16])[0]
        if kind == b"IDAT":
            data += png[at + 8 : at + 8 + length]
        at += length + 12
    rows = zlib.decompress(data)
    stride = len(rows) // height
    return len({rows[row * stride : (row + 1) * stride] for row in range(height)})


@pytest.mark.skipif(CHROMIUM is None, reason="needs Chromium (Debian: apt-get install chromium)")
async def test_a_browser_shows_the_interface_and_types_into_it(served: tuple[Path, int], tmp_path: Path) -> None:
    place, port = served
    (tmp_path / "profile").mkdir()
    async with browser(tmp_path / "profile") as page:
        await page.do("Network.enable")
        await page.do("Page.enable")
        await page.do("Page.navigate", url=f"http://127.0.0.1:{port}/")
        drawn = 0
        deadline = time.monotonic() + PATIENCE_S
        while drawn < 120 and time.monotonic() < deadline:
            await asyncio.sleep(0.5)
            drawn = colours(await page.picture())
        assert drawn >= 120, "nothing but an empty page"
        await page.click(250, 45)  # the line of the scheme
        await page.type_letters("CCCBr")
        typed = None
        while typed != "CCCBr" and time.monotonic() < deadline:
            await asyncio.sleep(0.5)
            with open_book(place, read_only=True) as book:
                draft = book.store.drafts.find(PLAN_DRAFT)
            typed = draft.content["scheme"] if draft else None
        if folder := KEEP_PICTURES:
            (Path(folder) / "browser.png").write_bytes(await page.picture())
        assert typed == "CCCBr"
        assert all(f":{port}/" in url for url in page.asked_elsewhere if url.startswith("http")), page.asked_elsewhere


KEEP_PICTURES = os.environ.get("SIDEPATH_PICTURES")
"""A folder for what the browser showed, to be looked at; read here, since tests start without such names."""

"""Pages in a real browser: drawn at desktop, phone and print size, no console error, no request, notes inert.

A page is loaded with every host name mapped to nowhere, and the browser's own network log tells whether it tried.
Skipped where the Debian package `chromium` is not installed.
"""

from __future__ import annotations

import json
import subprocess
from pathlib import Path

import pytest
from exchange.shown import HOSTILE, ROUTE, hostile_run

from kb.book import build_demo, demo_plan, open_book
from kb.book.routes import resolve_route
from kb.book.whole import find_recurring_failures
from kb.exchange.report import build_page, write_page
from kb.progress import Silent
from kb.route.ledger import reckon
from kb.route.routefile import draft_route

CHROMIUM = Path("/usr/bin/chromium")
pytestmark = pytest.mark.skipif(not CHROMIUM.exists(), reason="needs the Debian package chromium")


def _chromium(tmp_path: Path, page: Path, *options: str) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [
            str(CHROMIUM),
            "--headless",
            "--no-sandbox",
            "--disable-gpu",
            "--disable-extensions",
            "--disable-component-update",
            "--disable-background-networking",
            "--no-first-run",
            "--hide-scrollbars",
            "--enable-logging=stderr",
            f"--user-data-dir={tmp_path / 'profile'}",
            f"--log-net-log={tmp_path / 'net.json'}",
            "--host-resolver-rules=MAP * ~NOTFOUND",
            *options,
            page.as_uri(),
        ],
        capture_output=True,
        text=True,
        timeout=90,
        check=True,
    )


@pytest.fixture(scope="module")
def pages(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Path]:
    folder = tmp_path_factory.mktemp("pages")
    path, _ = build_demo(str(folder / "demo.sidepath"), Silent())
    with open_book(path, read_only=True) as book:
        things = {
            "assessment": book.check(demo_plan()),
            "recurring": find_recurring_failures(book),
            "route": reckon(resolve_route(book, draft_route(ROUTE))),
            "hostile": hostile_run(),
        }
    for kind, thing in things.items():
        write_page(build_page(thing, HOSTILE if kind == "hostile" else "a book"), folder / f"{kind}.html")
    return {kind: folder / f"{kind}.html" for kind in things}


def _size(png: Path) -> tuple[int, int]:
    head = png.read_bytes()[:24]
    assert head[:8] == b"\x89PNG\r\n\x1a\n"
    return int.from_bytes(head[16:20], "big"), int.from_bytes(head[20:24], "big")


@pytest.mark.parametrize(("kind", "width"), [("assessment", 1200), ("recurring", 390), ("hostile", 800)])
def test_a_page_is_drawn_without_a_complaint(pages: dict[str, Path], tmp_path: Path, kind: str, width: int) -> None:
    shot = tmp_path / "shot.png"
    done = _chromium(tmp_path, pages[kind], f"--window-size={width},1400", f"--screenshot={shot}")
    assert _size(shot) == (width, 1400)
    assert shot.stat().st_size > 20_000
    assert "CONSOLE" not in done.stderr, done.stderr


def _asked(tmp_path: Path, page: Path) -> list[str]:
    """Return the outside addresses that loading a page led to."""
    _chromium(tmp_path, page, "--dump-dom")
    log = (tmp_path / "net.json").read_text(encoding="utf-8", errors="replace").rstrip()
    events = json.loads(log if log.endswith("}") else log.rstrip(",") + "]}")["events"]
    urls = [event["params"].get("url", "") for event in events if isinstance(event.get("params"), dict)]
    return [url for url in urls if "evil.example" in url]


def test_a_page_asks_the_network_for_nothing(pages: dict[str, Path], tmp_path: Path) -> None:
    """Held against a page that does ask, so that silence means something."""
    careless = tmp_path / "careless.html"
    careless.write_text('<img src="http://evil.example/z.png">', encoding="utf-8")
    assert _asked(tmp_path, careless)
    assert not _asked(tmp_path, pages["hostile"])


def test_a_complaint_would_be_noticed(tmp_path: Path) -> None:
    broken = tmp_path / "broken.html"
    broken.write_text("<script>nothing.of.the.sort()</script>", encoding="utf-8")
    assert "CONSOLE" in _chromium(tmp_path, broken, "--dump-dom").stderr


def test_hostile_notes_do_not_come_alive(pages: dict[str, Path], tmp_path: Path) -> None:
    dom = _chromium(tmp_path, pages["hostile"], "--dump-dom").stdout
    assert "<script" not in dom and "<iframe" not in dom and "<img" not in dom
    assert "&lt;script&gt;alert(1)" in dom
    assert hostile_run().note.split()[0].startswith("<script>")


def test_a_page_does_not_run_over_on_a_phone(pages: dict[str, Path], tmp_path: Path) -> None:
    """A probe beside the page measures it: the page itself runs no script."""
    for kind in ("assessment", "recurring", "route"):
        probe = tmp_path / "probe.html"
        probe.write_text(
            f'<iframe id="f" src="{pages[kind].as_uri()}" width="390" height="900"></iframe><pre id="out"></pre>'
            "<script>f.onload=()=>{const d=f.contentDocument.documentElement;"
            'out.textContent="wide "+d.scrollWidth}</script>',
            encoding="utf-8",
        )
        dom = _chromium(tmp_path, probe, "--allow-file-access-from-files", "--dump-dom").stdout
        assert "wide " in dom
        assert int(dom.split("wide ")[1].split("<")[0]) <= 390, kind


def test_a_page_prints(pages: dict[str, Path], tmp_path: Path) -> None:
    pdf = tmp_path / "page.pdf"
    _chromium(tmp_path, pages["assessment"], f"--print-to-pdf={pdf}", "--no-pdf-header-footer")
    assert pdf.read_bytes()[:5] == b"%PDF-"
    assert pdf.read_bytes().count(b"/Type /Page\n") + pdf.read_bytes().count(b"/Type /Page ") <= 6

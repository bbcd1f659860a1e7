"""How the place *route* looks: snapshots at 100x30 and 80x24 in the dark and the light theme, a wide one beside.

After a change that is meant, look at the new pictures and run with `--snapshot-update`.
"""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest
from pytest_textual_snapshot import SVGImageExtension
from syrupy.assertion import SnapshotAssertion

from tests.tui.driving import driven, pressed, settled, typed
from tests.tui.fake_book import FakeBook
from tests.tui.fake_routes import a_route_file
from tests.tui.test_looks import picture
from tui.screens import route
from tui.themes import DARK, LIGHT

LOOKS = [(size, theme) for size in ((100, 30), (80, 24)) for theme in (DARK.name, LIGHT.name)]
LOOKS.append(((160, 50), DARK.name))


@pytest.mark.parametrize(("size", "theme"), LOOKS, ids=[f"{w}x{h}-{theme}" for (w, h), theme in LOOKS])
async def test_the_place_looks_as_it_did(
    size: tuple[int, int], theme: str, snapshot: SnapshotAssertion, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(route, "SETTLE_S", 0.01)
    monkeypatch.chdir(tmp_path)
    seen = snapshot.use_extension(SVGImageExtension)
    book: Any = FakeBook()
    async with driven(book, size=size, theme=theme) as (app, pilot):
        await pressed(pilot, "f6")
        assert picture(app) == seen(name="empty")
        book.remember_route("lab/amine.toml")
        await pressed(pilot, "o")
        app.screen.query_one("#route-path").value = "lab/amide.toml"
        await pressed(pilot, "enter")
        assert picture(app) == seen(name="files")
        await typed(pilot, "#route-path", str(a_route_file(tmp_path)))
        await pressed(pilot, "enter")
        await settled(pilot, 5)
        await pressed(pilot, "down")
        assert picture(app) == seen(name="route")
        await typed(pilot, "#field-yield", "82 (75 to 89)")
        await typed(pilot, "#field-solvent", "DMX")
        await settled(pilot, 4)
        assert picture(app) == seen(name="what-if")
        await pressed(pilot, "escape", "up", "enter")
        await settled(pilot, 4)
        assert picture(app) == seen(name="runs-behind")

"""How the place *failures* looks: snapshots of its parts at 100x30 and 80x24 in the dark and the light theme."""

from __future__ import annotations

import pytest
from pytest_textual_snapshot import SVGImageExtension
from syrupy.assertion import SnapshotAssertion

from tests.tui.driving import driven, pressed, settled
from tests.tui.fake_book import FakeBook
from tests.tui.test_looks import picture
from tui.themes import DARK, LIGHT

PARTS = (
    ("recurring", ("f5",)),
    ("runs-behind", ("r", "down")),
    ("tally", ("escape", "2")),
    ("hindsight", ("3", "f9", "down", "down")),
    ("coverage", ("4",)),
    ("trust", ("5", "f9")),
    ("adopt", ("1", "a")),
)


@pytest.mark.parametrize("theme", [DARK.name, LIGHT.name])
@pytest.mark.parametrize("size", [(100, 30), (80, 24)], ids=["100x30", "80x24"])
async def test_every_part_looks_as_it_did(
    size: tuple[int, int], theme: str, snapshot: SnapshotAssertion
) -> None:
    seen = snapshot.use_extension(SVGImageExtension)
    async with driven(FakeBook(), size=size, theme=theme) as (app, pilot):
        for name, keys in PARTS:
            await pressed(pilot, *keys)
            await settled(pilot, 5)
            assert picture(app) == seen(name=name)

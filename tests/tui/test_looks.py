"""How each place looks: snapshots at 100x30 and 80x24 in the dark and the light theme.

One application per size and theme visits all places. After a change that is meant, look at the new pictures
and run with `--snapshot-update`. The pictures are Textual's own SVG, with its running number of the
terminal taken out.
"""

from __future__ import annotations

import re
from typing import Any

import pytest
from pytest_textual_snapshot import SVGImageExtension
from syrupy.assertion import SnapshotAssertion

from tests.tui.driving import driven, pressed, settled, typed
from tests.tui.fake_book import MESYLATE, FakeBook
from tui.screens import entry
from tui.themes import DARK, LIGHT


def picture(app: Any) -> str:
    """Return the screen as SVG that is the same for the same screen, and that refers to nothing outside."""
    svg = re.sub(r"terminal-\d+", "terminal-0", app.export_screenshot(title="Sidepath"))
    return re.sub(r"@font-face \{.*?\}", "", svg, flags=re.DOTALL)


class FixedDate:
    """A calendar that stands still."""

    class date:
        @staticmethod
        def today() -> Any:
            import datetime

            return datetime.date(2026, 3, 2)


@pytest.mark.parametrize("theme", [DARK.name, LIGHT.name])
@pytest.mark.parametrize("size", [(100, 30), (80, 24)], ids=["100x30", "80x24"])
async def test_every_place_looks_as_it_did(
    size: tuple[int, int], theme: str, snapshot: SnapshotAssertion, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(entry, "dt", FixedDate)
    seen = snapshot.use_extension(SVGImageExtension)
    async with driven(FakeBook(), size=size, theme=theme) as (app, pilot):
        screen = app.screen
        for field, text in (("scheme", MESYLATE), ("reagent", "NaN3=1.5"), ("temperature", "80 C")):
            screen.query_one(f"#field-{field}").value = text
        await typed(pilot, "#field-solvent", "EtOH")
        await settled(pilot)
        assert picture(app) == seen(name="planning")
        await pressed(pilot, "f9")
        await settled(pilot, 5)
        screen = app.screen
        for name, value in (("p0-value", "1.80"), ("p0-protons", "2"), ("p1-value", "0.10")):
            screen.query_one(f"#{name}").value = value
        await settled(pilot)
        assert picture(app) == seen(name="entry")
        await pressed(pilot, "escape", "f3")
        app.clear_notifications()
        await settled(pilot)
        assert picture(app) == seen(name="runs")
        await pressed(pilot, "f4")
        await typed(pilot, "#find-substructure", "OS(C)(=O)=O")
        await pressed(pilot, "enter")
        await settled(pilot, 6)
        assert picture(app) == seen(name="finding")

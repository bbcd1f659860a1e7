"""A working day in one go, on the fake book and on a real one.

Plan, be warned, change the solvent, run it, find it.
"""

from __future__ import annotations

from pathlib import Path

from textual.widgets import Select

from tests.tui.driving import driven, on_screen, pressed, settled, typed
from tests.tui.fake_book import MESYLATE, FakeBook
from tui.application import SidepathApp
from tui.screens.entry import EntryScreen
from tui.screens.planning import PlanningScreen
from tui.widgets.cards import HitCard
from tui.widgets.findings import FindingsList
from tui.widgets.product_rows import ProductEntry


async def test_plan_warned_changed_run_recorded_and_found() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await typed(pilot, "#field-scheme", MESYLATE)
        await typed(pilot, "#field-reagent", "NaN3=1.5")
        await typed(pilot, "#field-solvent", "EtOH")
        await typed(pilot, "#field-temperature", "80 C")
        assert "serious: the solvent competes" in on_screen(app)
        await typed(pilot, "#field-solvent", "DMF")
        assert "serious" not in on_screen(app)
        await pressed(pilot, "f9")
        await settled(pilot)
        assert isinstance(app.screen, EntryScreen)
        for name, value in (("p0-value", "1.80"), ("p0-protons", "2"), ("p1-value", "0.10")):
            app.screen.query_one(f"#{name}").value = value
        app.screen.query_one("#field-verdict", Select).value = "worked"
        await settled(pilot)
        assert "90 % (89–91)" in on_screen(app)
        await pressed(pilot, "ctrl+s")
        assert isinstance(app.screen, PlanningScreen)
        assert book.runs["R-0013"].outcome.split
        await pressed(pilot, "f4")
        await typed(pilot, "#find-substructure", "OS(C)(=O)=O")
        await pressed(pilot, "enter")
        await settled(pilot, 5)
        assert "R-0013" in [card.hit.run.code for card in app.screen.query(HitCard)]


async def test_the_same_on_a_real_book(tmp_path: Path) -> None:
    """The chemistry here is common practice: azide displaces a primary bromide.

    In acid a tert-butyl ether is lost.
    """
    from tui.opening import DeskOpener

    opener = DeskOpener()
    opener.create(str(tmp_path / "group.sidepath")).close()
    app = SidepathApp(opener, place=str(tmp_path / "group.sidepath"), who="JM")
    async with app.run_test(size=(160, 50)) as pilot:
        for _ in range(100):
            await settled(pilot)
            if app.book is not None and isinstance(app.screen, PlanningScreen):
                break
        await typed(pilot, "#field-scheme", "CC(C)(C)OCCCBr>>CC(C)(C)OCCCN=[N+]=[N-]")
        await typed(pilot, "#field-reagent", "NaN3=1.5")
        await typed(pilot, "#field-acid", "HCl=5")
        await typed(pilot, "#field-solvent", "1,4-dioxane")
        await typed(pilot, "#field-temperature", "60 C")
        await settled(pilot, 6)
        findings = app.screen.query_one(FindingsList)
        assert any("ether" in f.title.lower() and f.atoms for f in findings.findings), findings.findings
        app.screen.query_one("#field-acid").value = ""
        await typed(pilot, "#field-solvent", "DMF")
        await settled(pilot, 6)
        assert not any("ether is cleaved" in f.title.lower() for f in findings.findings)
        await pressed(pilot, "f9")
        await settled(pilot, 6)
        assert isinstance(app.screen, EntryScreen)
        entries = list(app.screen.query(ProductEntry))
        wanted = next(e.number for e in entries if str(e.row.fate) == "substitution")
        other = next(e.number for e in entries if str(e.row.fate) == "elimination")
        app.screen.query_one(f"#p{wanted}-value").value = "1.90"
        app.screen.query_one(f"#p{wanted}-protons").value = "2"
        app.screen.query_one(f"#p{other}-value").value = "0.05"
        app.screen.query_one("#field-verdict", Select).value = "worked"
        await settled(pilot, 4)
        await pressed(pilot, "ctrl+s")
        await settled(pilot, 6)
        assert isinstance(app.screen, PlanningScreen), on_screen(app)
        await pressed(pilot, "f4")
        await typed(pilot, "#find-substructure", "CC(C)(C)OC")
        await pressed(pilot, "enter")
        await settled(pilot, 8)
        hits = [card.hit for card in app.screen.query(HitCard)]
        assert len(hits) == 1
        assert hits[0].atoms
        shares = {str(fate): share for fate, share in hits[0].run.outcome.split.items()}
        assert 0.9 < shares["substitution"] < 1.0  # 0.95 to 0.05 by the integrals above
        app.book.close()

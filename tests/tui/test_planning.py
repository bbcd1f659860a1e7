"""Planning.

The answer follows the typing, errors stand where they belong, and every action can be done by key.
"""

from __future__ import annotations

import threading

import pytest

from kb.errors import StoreBusy
from kb.record.finding import Finding
from tests.tui.driving import driven, on_screen, pressed, settled, typed
from tests.tui.fake_book import AZIDE_SCHEME, MESYLATE, FakeBook
from tui.screens.entry import EntryScreen
from tui.screens.finding_detail import FindingScreen
from tui.screens.planning import PlanningScreen
from tui.screens.run_detail import RunScreen
from tui.widgets.advice import AdviceList
from tui.widgets.estimate import EstimateBars
from tui.widgets.findings import FindingsList
from tui.widgets.shelf import Shelf
from tui.widgets.structure import SchemeView
from tui.widgets.tables import PrecedentTable


async def planned(pilot, solvent: str = "DMF") -> PlanningScreen:
    """Fill the form as a chemist would."""
    screen = pilot.app.screen
    for field, text in (("scheme", MESYLATE), ("reagent", "NaN3=1.5"), ("temperature", "80 C")):
        screen.query_one(f"#field-{field}").value = text
    await typed(pilot, "#field-solvent", solvent)
    assert isinstance(screen, PlanningScreen)
    return screen


async def test_the_answer_follows_the_typing() -> None:
    async with driven() as (app, pilot):
        await planned(pilot)
        text = on_screen(app)
        assert "secondary carbon" in text
        assert "84 %" in text
        assert "azide: keep chlorinated" in text
        assert "R-0001" in text
        view = app.screen.query_one("#plan-drawing", SchemeView)
        assert [str(kind) for kind in view.mark_kinds] == ["centre", "leaving"]


async def test_a_change_of_solvent_brings_and_takes_a_warning() -> None:
    async with driven() as (app, pilot):
        await planned(pilot, "EtOH")
        assert "serious: the solvent competes" in on_screen(app)
        await typed(pilot, "#field-solvent", "DMF")
        assert "serious" not in on_screen(app)


async def test_a_bad_scheme_is_told_in_its_place_and_the_old_answer_goes() -> None:
    async with driven() as (app, pilot):
        await planned(pilot)
        await typed(pilot, "#field-scheme", "C1CC")
        text = on_screen(app)
        assert "is no SMILES" in text
        assert "84 %" not in text
        assert app.screen.query_one("#reading").has_class("-bad")


async def test_bad_fields_are_flagged_and_the_rest_is_still_checked() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await planned(pilot)
        await typed(pilot, "#field-temperature", "warm")
        assert app.screen.query_one("#field-temperature").has_class("-bad")
        assert "warm" in str(app.screen.query_one("#form-trouble").render())
        assert book.checked[-1].conditions.temperature is None
        assert "84 %" in on_screen(app)
        await typed(pilot, "#field-temperature", "60 C")
        assert not app.screen.query_one("#field-temperature").has_class("-bad")


async def test_an_unknown_name_is_told_with_the_nearest() -> None:
    async with driven() as (app, pilot):
        await planned(pilot)
        await typed(pilot, "#field-reagent", "NaN4")
        assert "Did you mean NaN3" in on_screen(app)


async def test_trouble_with_the_book_is_told_at_the_foot_and_goes_again() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        book.broken["check"] = StoreBusy("Another writer holds the book.", "Try again in a moment.")
        await typed(pilot, "#field-scheme", MESYLATE)
        assert "Another writer holds the book." in on_screen(app)
        book.broken.clear()
        await typed(pilot, "#field-time", "4 h")
        assert "Another writer" not in on_screen(app)


async def test_a_fault_of_the_program_leaves_the_screen_usable() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        book.broken["check"] = ZeroDivisionError("planted")
        await typed(pilot, "#field-scheme", MESYLATE)
        assert "Something went wrong inside" in on_screen(app)
        assert "Traceback" not in on_screen(app)
        book.broken.clear()
        await typed(pilot, "#field-time", "4 h")
        assert "84 %" in on_screen(app)


async def test_a_slow_check_never_holds_the_typing_and_its_stale_answer_is_dropped() -> None:
    book = FakeBook()
    book.gate = threading.Event()
    async with driven(book) as (app, pilot):
        app.screen.query_one("#field-scheme").focus()
        app.screen.query_one("#field-scheme").value = MESYLATE
        await pilot.pause(0.1)
        app.screen.query_one("#field-solvent").value = "EtOH"
        await pilot.pause(0.1)
        app.screen.query_one("#field-solvent").focus()
        await pilot.press("end", "backspace", "backspace", "backspace", "backspace", *"DMF")
        assert app.screen.query_one("#field-solvent").value == "DMF"
        await pilot.pause(0.1)
        assert book.checked == []
        book.gate.set()
        await settled(pilot, 5)
        assert [s.name for s in book.checked[-1].conditions.solvents] == ["DMF"]
        assert len(book.checked) == 2  # the first, and the newest; none of those between
        assert "serious" not in on_screen(app)


async def test_enter_on_a_finding_tells_all_and_opens_the_runs_behind() -> None:
    async with driven() as (app, pilot):
        await planned(pilot, "EtOH")
        app.screen.query_one(FindingsList).focus()
        await pressed(pilot, "home")
        view = app.screen.query_one("#plan-drawing", SchemeView)
        assert "motif" in [str(kind) for kind in view.mark_kinds]
        await pressed(pilot, "enter")
        assert isinstance(app.screen, FindingScreen)
        text = on_screen(app)
        for words in ("faster than azide", "lost in 2, survived in 1", "polar aprotic", "invented for the tests"):
            assert words in text
        app.screen.query_one("#finding-runs").focus()
        await pressed(pilot, "enter")
        assert isinstance(app.screen, RunScreen)
        assert "R-0001" in on_screen(app)
        await pressed(pilot, "escape", "escape")
        assert isinstance(app.screen, PlanningScreen)


async def test_the_runs_behind_the_estimate_are_two_keys_away() -> None:
    async with driven() as (app, pilot):
        await planned(pilot)
        app.screen.query_one(EstimateBars).focus()
        await pressed(pilot, "enter")
        assert isinstance(app.focused, PrecedentTable)
        await pressed(pilot, "enter")
        assert isinstance(app.screen, RunScreen)


async def test_the_estimate_without_precedents_says_so() -> None:
    async with driven(FakeBook(runs=0)) as (app, pilot):
        await planned(pilot)
        app.screen.query_one(EstimateBars).focus()
        await pressed(pilot, "enter")
        assert any("no own runs" in n.message for n in app._notifications)


async def test_the_shelf_turns_to_advice_and_to_the_temperature_plot() -> None:
    async with driven() as (app, pilot):
        await planned(pilot)
        await pressed(pilot, "f7")
        assert isinstance(app.focused, AdviceList)
        assert "60 °C instead of 80 °C" in on_screen(app)
        await pressed(pilot, "enter")
        assert "Matched pairs" in on_screen(app)
        await pressed(pilot, "escape", "f7")
        assert app.screen.query_one(Shelf).is_temperature_in_view
        assert "bath temperature" in on_screen(app)
        await pressed(pilot, "f7")
        assert app.screen.query_one(Shelf).index == 0


async def test_a_plan_without_a_temperature_says_what_the_plot_needs() -> None:
    async with driven() as (app, pilot):
        await typed(pilot, "#field-scheme", MESYLATE)
        await pressed(pilot, "f7", "f7")
        assert "Give a temperature in numbers" in on_screen(app)


async def test_trouble_with_the_temperatures_is_told() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await planned(pilot)
        book.broken["what_if"] = StoreBusy("The book is busy.", "Try again.")
        await pressed(pilot, "f7", "f7")
        assert "The book is busy." in on_screen(app)


async def test_a_wide_screen_shows_the_whole_shelf() -> None:
    async with driven(size=(160, 50)) as (app, pilot):
        await planned(pilot)
        text = on_screen(app)
        for words in ("Closest runs", "One change", "bath temperature"):
            assert words in text


async def test_the_run_key_opens_the_entry_form_with_the_plan() -> None:
    async with driven() as (app, pilot):
        await pressed(pilot, "f9")
        assert isinstance(app.screen, PlanningScreen)
        await planned(pilot)
        await pressed(pilot, "f9")
        assert isinstance(app.screen, EntryScreen)
        assert app.screen.form.step.state["solvent"] == "DMF"


async def test_a_read_only_book_is_shown_and_cannot_be_written() -> None:
    book = FakeBook(read_only=True)
    async with driven(book) as (app, pilot):
        await planned(pilot)
        assert "read only" in on_screen(app)
        assert app.screen.check_action("run_it", ()) is None
        await pressed(pilot, "f9")
        assert isinstance(app.screen, PlanningScreen)
        assert book.drafts == {}


async def test_edits_are_undone_and_done_again() -> None:
    async with driven() as (_, pilot):
        screen = await planned(pilot)
        await typed(pilot, "#field-solvent", "EtOH")
        await pressed(pilot, "ctrl+z")
        assert screen.form.state["solvent"] == "DMF"
        await pressed(pilot, "ctrl+y")
        assert screen.form.state["solvent"] == "EtOH"
        await pressed(pilot, "ctrl+n")
        assert not any(screen.form.state.values())
        await pressed(pilot, "ctrl+z")
        assert screen.form.state["scheme"] == MESYLATE


async def test_undo_without_edits_says_so() -> None:
    async with driven() as (app, pilot):
        await pressed(pilot, "ctrl+z")
        assert any("Nothing to undo" in n.message for n in app._notifications)


async def test_atom_numbers_come_and_go() -> None:
    async with driven() as (app, pilot):
        await planned(pilot)
        view = app.screen.query_one("#plan-drawing", SchemeView)
        assert "S:3" not in on_screen(app)
        await pressed(pilot, "ctrl+l")
        assert view.numbers
        assert "S:3" in on_screen(app)


async def test_the_form_is_kept_and_taken_up_on_the_next_start() -> None:
    book = FakeBook()
    async with driven(book) as (_, pilot):
        await planned(pilot)
    assert book.drafts["plan"]["scheme"] == MESYLATE
    async with driven(book) as (app, pilot):
        assert isinstance(app.screen, PlanningScreen)
        assert app.screen.form.state["solvent"] == "DMF"
        assert "84 %" in on_screen(app)


async def test_a_name_stands_for_its_structure() -> None:
    book = FakeBook()
    async with driven(book) as (_, pilot):
        await typed(pilot, "#field-scheme", "2-bromobutane")
        assert book.checked[-1].scheme == "CCC(C)Br"


async def test_names_are_completed_from_the_catalogue_and_enter_takes_them() -> None:
    async with driven() as (app, pilot):
        line = app.screen.query_one("#field-solvent")
        line.focus()
        await pressed(pilot, *"dm")
        assert line._suggestion == "dmF"
        await pressed(pilot, "enter")
        assert line.value == "dmF"
        assert app.focused is not line


async def test_the_last_entry_of_a_line_is_completed() -> None:
    async with driven() as (app, pilot):
        line = app.screen.query_one("#field-reagent")
        line.focus()
        await pressed(pilot, *"NaI=0.1; Na", "N")
        assert line._suggestion == "NaI=0.1; NaN3"


async def test_a_name_that_only_resembles_is_offered_and_taken_by_the_arrow(monkeypatch: pytest.MonkeyPatch) -> None:
    from tui.ports import Offer

    book = FakeBook()
    monkeypatch.setattr(book, "lookup", lambda text, kind: [Offer(name="NaN3"), Offer(name="NaI")])
    async with driven(book) as (app, pilot):
        line = app.screen.query_one("#field-reagent")
        line.focus()
        await pressed(pilot, *"sodium az")
        assert "→ takes NaN3; or NaI" in on_screen(app)
        await pressed(pilot, "enter")
        assert line.value == "sodium az"
        line.focus()
        await pressed(pilot, "end", "z")
        await pressed(pilot, "right")
        assert line.value == "NaN3"


async def test_arrow_keys_walk_through_the_lines() -> None:
    async with driven() as (app, pilot):
        app.screen.query_one("#field-reagent").focus()
        await pressed(pilot, "down")
        assert app.focused.id == "field-base"
        await pressed(pilot, "up", "up")
        assert app.focused.id == "field-scheme"


async def test_a_whole_scheme_is_drawn_with_its_arrow() -> None:
    async with driven(size=(160, 50)) as (app, pilot):
        await typed(pilot, "#field-scheme", AZIDE_SCHEME)
        await typed(pilot, "#field-reagent", "NaN3=1.5")
        text = on_screen(app)
        assert "▶" in text
        assert "NaN3 (1.5)" in text


async def test_the_highlight_stays_on_a_finding_that_is_still_there() -> None:
    async with driven() as (app, pilot):
        await planned(pilot, "EtOH")
        findings = app.screen.query_one(FindingsList)
        findings.focus()
        await pressed(pilot, "end")
        held = findings.highlighted_finding
        assert isinstance(held, Finding)
        await typed(pilot, "#field-solvent", "DMF")
        assert findings.highlighted_finding is not None
        assert findings.highlighted_finding.rule_id == held.rule_id

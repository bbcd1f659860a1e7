"""The place *failures* on the fake book: what each part shows, its orders and choices, the runs behind every figure."""

from __future__ import annotations

from textual.widgets import Input, OptionList

from tests.tui.driving import driven, on_screen, pressed, said, settled, words
from tests.tui.fake_book import FakeBook
from tui.screens.failures import FailuresPlace
from tui.screens.failures_runs import RunsBehindScreen
from tui.screens.planning import PlanningScreen
from tui.screens.run_detail import RunScreen
from tui.widgets.figures import FigurePlot, FigureTable
from tui.widgets.recurring_view import RecurringView
from tui.widgets.structure import SchemeView


async def test_the_place_is_one_key_away_from_every_other() -> None:
    async with driven() as (app, pilot):
        for place in ("f2", "f3", "f4"):
            await pressed(pilot, place, "f5")
            assert app.current_mode == "failures"
            assert "▸F5 Failures" in on_screen(app)


async def test_kinds_of_failure_are_told_with_their_motif_drawn_and_marked() -> None:
    async with driven(size=(120, 40)) as (app, pilot):
        await pressed(pilot, "f5")
        assert "9 failures in 12 runs; 9 of them recur, as 3 kinds." in words(app)
        seen = said(app, "#recurring-words")
        assert "They share: tertiary alkyl ether; a strong acid is present." in seen
        assert "12.5 mmol lost over the 2 that record a scale; 3.5 days of reaction time." in seen
        assert "2 had an earlier record (the last: R-0007 after R-0001)." in seen
        assert "Projects: Larch 2, Tern 1." in seen
        assert "No house rule covers it." in seen
        assert "warns of 2 failures, with 1 false alarm" in seen
        assert "▲ what they share" in words(app)
        drawing = app.screen.query_one("#recurring-drawing", SchemeView).drawing
        assert drawing is not None and drawing.left[0].drawing is not None
        assert drawing.left[0].drawing.marks[0].atoms == (1, 4, 5)
        await pressed(pilot, "down")
        assert "House rules: hot-sulfonates-abcd warns of 2." in said(app, "#recurring-words")
        await pressed(pilot, "down")
        assert "Nothing in the molecule is shared" in words(app)
        assert "Projects: not recorded." in said(app, "#recurring-words")


async def test_kinds_are_ordered_by_cost_by_count_and_by_date_and_the_cursor_stays_on_its_kind() -> None:
    async with driven() as (app, pilot):
        await pressed(pilot, "f5")
        view = app.screen.query_one(RecurringView)
        assert [c.mode for c in view._clusters] == ["group-loss", "elimination", "emulsion"]
        await pressed(pilot, "s")
        assert [c.mode for c in view._clusters] == ["elimination", "group-loss", "emulsion"]
        assert view.cluster is not None and view.cluster.mode == "group-loss"
        await pressed(pilot, "s")
        assert "by latest" in on_screen(app)
        assert [c.mode for c in view._clusters] == ["group-loss", "elimination", "emulsion"]


async def test_the_runs_behind_a_kind_are_one_key_away_in_groups() -> None:
    async with driven() as (app, pilot):
        await pressed(pilot, "f5", "r")
        screen = app.screen
        assert isinstance(screen, RunsBehindScreen)
        assert "▸3 went wrong so" in words(app)
        await pressed(pilot, "down")
        assert "R-0004, 2026-01-05" in words(app)
        assert screen.shown_run is not None and screen.shown_run.code == "R-0004"
        groups = [g.title for g in screen._held.groups]
        assert groups == [
            "went wrong so",
            "had an earlier record",
            "came through there",
            "failures the rule warns of",
            "false alarms of the rule",
            "the rule cannot tell",
        ]
        for _ in range(4):
            await pressed(pilot, "s")
        assert "▸1 false alarms of the rule" in words(app)
        assert screen.shown_run.code == "R-0002"
        await pressed(pilot, "enter")
        assert isinstance(app.screen, RunScreen)
        await pressed(pilot, "escape")
        await pressed(pilot, "escape")
        assert isinstance(app.screen, FailuresPlace)


async def test_counts_are_shown_by_quarter_mode_and_class_with_a_plot_and_their_runs() -> None:
    async with driven() as (app, pilot):
        await pressed(pilot, "f5", "2")
        assert "9 failures in 12 runs." in words(app)
        assert "By quarter (s: failure mode)" in words(app)
        assert "2025-Q2 3 7 75 %" in words(app)
        assert "█" in str(app.screen.query_one("#tally-plot", FigurePlot).render())
        await pressed(pilot, "down", "enter")
        assert "Quarter: 2025-Q2" in words(app)
        assert "▸3 failed" in words(app)
        await pressed(pilot, "escape", "s")
        assert "elimination 4 4" in words(app)
        await pressed(pilot, "s")
        assert "By carbon class (s: quarter)" in words(app)
        await pressed(pilot, "r")
        assert "Carbon class: secondary" in words(app)


async def test_a_replay_waits_for_its_key_and_shows_numbers_curve_and_runs() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5", "3")
        assert "F9 starts" in words(app)
        assert "replay" not in book.asked
        await pressed(pilot, "f9")
        assert "3 of 5 failures would have been warned of" in words(app)
        assert "Left out: 1 undated" in words(app)
        assert "in use 60 % 75 % 1" in words(app)
        plot = app.screen.query_one("#hindsight-plot", FigurePlot)
        assert "●" in str(plot.render()) and "◆" not in str(plot.render())
        await pressed(pilot, "down")
        assert "◆" in str(plot.render())
        await pressed(pilot, "up", "r")
        screen = app.screen
        assert isinstance(screen, RunsBehindScreen)
        assert {g.title: g.codes for g in screen._held.groups} == {
            "failures warned of": ("R-0004", "R-0007", "R-0009"),
            "failures missed": ("R-0001", "R-0008"),
            "successes warned of": ("R-0003",),
            "successes left in peace": ("R-0002", "R-0012"),
        }
        assert "after R-0001; elimination" in words(app)


async def test_another_threshold_mode_or_quarter_has_its_own_runs() -> None:
    async with driven() as (app, pilot):
        await pressed(pilot, "f5", "3", "f9")
        app.screen.query_one("#hindsight-table", FigureTable).move_cursor(row=99)
        await pressed(pilot, "enter")
        assert "Warned from a worry of 0.90" in words(app)
        assert app.screen._held.groups[0].codes == ("R-0007",)
        await pressed(pilot, "escape", "s")
        assert "By failure mode (s: quarter)" in words(app)
        await pressed(pilot, "enter")
        assert "Failure mode: elimination" in words(app)
        await pressed(pilot, "escape", "s", "enter")
        assert "Quarter: 2025-Q1" in words(app)
        assert [g.codes for g in app.screen._held.groups] == [("R-0001",), ("R-0003",), ("R-0002",)]


async def test_coverage_marks_thin_and_torn_cells_by_sign_and_shows_their_runs() -> None:
    async with driven() as (app, pilot):
        await pressed(pilot, "f5", "4")
        lines = on_screen(app).splitlines()
        assert any("secondary" in line and "⇅" in line for line in lines)
        assert any("tertiary" in line and "◌" in line for line in lines)
        assert not any("primary" in line and ("⇅" in line or "◌" in line) for line in lines)
        await pressed(pilot, "r")
        assert "secondary, bromide, azide, polar-aprotic" in words(app)
        await pressed(pilot, "s")
        assert "▸2 like flasks that disagree" in words(app)
        assert "20 % of what was wanted" in words(app)
        await pressed(pilot, "escape", "s")
        assert "Thin combinations" in on_screen(app)
        await pressed(pilot, "s")
        assert "like flasks disagree ⇅" in on_screen(app)
        await pressed(pilot, "s")
        assert "fullest first" in on_screen(app)


async def test_an_experiment_is_told_with_its_reason_and_taken_to_planning() -> None:
    async with driven() as (app, pilot):
        await pressed(pilot, "f5", "4")
        seen = words(app)
        assert "1. tertiary, bromide, azide, aprotic solvent, 25 °C (like R-0008)" in seen
        assert "Its own doubt: ±20 points now, ±15 after." in seen
        app.screen.query_one(OptionList).focus()
        await pressed(pilot, "enter")
        assert isinstance(app.screen, RunsBehindScreen)
        assert app.screen._held.groups[0].codes == ("R-0008",)
        await pressed(pilot, "escape", "p")
        assert isinstance(app.screen, PlanningScreen)
        assert app.screen.query_one("#field-temperature", Input).value == "58 C"


async def test_the_latest_run_of_a_kind_is_taken_to_planning() -> None:
    async with driven() as (app, pilot):
        await pressed(pilot, "f5", "p")
        assert isinstance(app.screen, PlanningScreen)
        assert app.screen.query_one("#field-temperature", Input).value == "57 C"


async def test_trust_tells_in_words_in_a_plot_and_by_run() -> None:
    async with driven(size=(120, 40)) as (app, pilot):
        await pressed(pilot, "f5", "5")
        assert "F9 starts" in words(app)
        await pressed(pilot, "f9")
        assert "4 of 12 runs were each expected from the book without it." in words(app)
        assert "The main share missed by 22.5 points on 4 runs" in said(app, "#trust-words")
        plot = str(app.screen.query_one("#trust-plot", FigurePlot).render())
        assert "·" in plot and "●" not in plot  # no bin holds enough runs for a mean
        await pressed(pilot, "down", "r")
        groups = {g.title: g.codes for g in app.screen._held.groups}
        assert groups == {"outside their interval": ("R-0002",), "inside it": ("R-0004", "R-0001")}
        assert "85 % expected, 20 % found" in words(app)
        await pressed(pilot, "escape", "s")
        assert "above 10 1 10.0" in words(app)
        await pressed(pilot, "r")
        assert "Close runs: 0.25 to 1" in words(app)


async def test_parts_are_reached_by_mouse() -> None:
    async with driven() as (app, pilot):
        await pressed(pilot, "f5")
        await pilot.click("#failures-tabs", offset=(20, 0))
        await settled(pilot)
        assert app.screen.view.KIND == "tally"
        await pilot.click("#place-tabs", offset=(40, 0))
        await settled(pilot)
        assert app.current_mode == "failures"


async def test_tables_fit_their_columns_to_the_room() -> None:
    async with driven(size=(80, 24)) as (app, pilot):
        await pressed(pilot, "f5")
        table = app.screen.query_one("#recurring-table", FigureTable)
        assert [str(c.label) for c in table.columns.values()] == [
            "Went wrong",
            "Where",
            "Runs",
            "Earlier",
            "Lost",
            "Rule",
        ]
        assert table.virtual_size.width <= table.size.width
        await pilot.resize_terminal(160, 50)
        await settled(pilot)
        assert [str(c.label) for c in table.columns.values()][2] == "Under"
        assert table.virtual_size.width <= table.size.width
        assert table.row == 0

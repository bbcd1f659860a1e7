"""The place *failures* on the fake book: every action, every error path, what is behind every figure."""

from __future__ import annotations

import threading
from typing import Any

from textual.widgets import Input, OptionList, Static

from kb.errors import StoreBusy
from tests.tui.driving import driven, on_screen, pressed, settled
from tests.tui.fake_audits import a_cluster, a_recurrence
from tests.tui.fake_book import NASTY, FakeBook
from tests.tui.fake_runs import a_run
from tui.messages import RunStored
from tui.screens.copying import CopyScreen
from tui.screens.failures import FailuresPlace
from tui.screens.failures_adopt import AdoptScreen
from tui.screens.failures_runs import RunsBehindScreen
from tui.screens.planning import PlanningScreen
from tui.screens.run_detail import RunScreen
from tui.widgets.figures import FigurePlot, FigureTable
from tui.widgets.recurring_view import RecurringView
from tui.widgets.structure import SchemeView


def words(app: Any) -> str:
    """Return what is on the screen, its spaces made one."""
    return " ".join(on_screen(app).split())


def said(app: Any, selector: str) -> str:
    """Return the words of one line of the screen."""
    return " ".join(str(app.screen.query_one(selector, Static).render()).split())


async def let_go(pilot: Any, book: FakeBook) -> None:
    """Let what is held go on, and wait for it."""
    assert book.hold is not None
    book.hold.set()
    await settled(pilot)


async def held(pilot: Any) -> None:
    """Wait until a held question has reported."""
    for _ in range(300):
        await pilot.pause(0.02)
        if "5 of 12" in on_screen(pilot.app):
            return
    raise AssertionError("nothing was reported")


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


async def test_nobody_is_named_in_any_part() -> None:
    async with driven(size=(160, 50)) as (app, pilot):
        app.book_words = ""
        await pressed(pilot, "f5")
        for keys in (("1",), ("2",), ("3", "f9"), ("4",), ("5", "f9")):
            await pressed(pilot, *keys)
            assert "JM" not in on_screen(app)


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


async def test_a_run_that_cannot_be_fetched_is_told_in_place() -> None:
    async with driven() as (app, pilot):
        await pressed(pilot, "f5")
        app.book.broken["get"] = StoreBusy("The book is held by another writer.", "Try again in a moment.")
        await pressed(pilot, "r")
        assert "held by another writer" in words(app)


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


async def test_a_replay_reports_and_is_stopped_and_says_so() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5", "3")
        book.hold = threading.Event()
        await pilot.press("f9")
        await held(pilot)
        assert "5 of 12 runs looked at Escape stops" in words(app)
        assert app.screen.check_action("look", ()) is None
        await pilot.press("escape")
        await settled(pilot)
        assert "Stopped before the end" in words(app)
        assert app.screen.check_action("stop", ()) is False


async def test_one_can_work_elsewhere_while_a_replay_runs() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5", "3")
        book.hold = threading.Event()
        await pilot.press("f9")
        await held(pilot)
        await pilot.press("f2")
        await pilot.pause(0.05)
        assert isinstance(app.screen, PlanningScreen)
        await pilot.press("f5")
        await let_go(pilot, book)
        assert "3 of 5 failures" in words(app)


async def test_a_short_question_that_is_stopped_says_how_to_ask_again() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5")
        book.hold = threading.Event()
        await pilot.press("4")
        await held(pilot)
        await pilot.press("escape")
        await settled(pilot)
        assert "Stopped. F9 looks again." in words(app)
        book.hold.set()
        await pressed(pilot, "f9")
        assert "12 runs in 3 combinations; 1 hold two runs or fewer, 1 contradict" in words(app)


async def test_an_error_is_told_in_place_in_every_part_and_another_key_tries_again() -> None:
    book = FakeBook()
    parts = (("1", "recurring"), ("2", "tally"), ("3", "replay"), ("4", "coverage"), ("5", "calibration"))
    for _, kind in parts:
        book.broken[kind] = StoreBusy("The book is held by another writer.", "Try again in a moment.")
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5")
        for key, kind in parts:
            await pressed(pilot, key, "f9")
            assert "✗ The book is held by another writer." in words(app), kind
            assert "F9 tries again." in words(app)
            await pressed(pilot, "r", "a", "s")
            assert isinstance(app.screen, FailuresPlace)
            del book.broken[kind]
            await pressed(pilot, "f9")
            assert "held by another" not in words(app), kind
            assert app.screen.view.audit is not None


async def test_an_error_leaves_the_answer_before_in_view() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5")
        book.broken["recurring"] = StoreBusy("The book is held by another writer.", "Try again.")
        await pressed(pilot, "f9")
        assert "9 failures in 12 runs" in words(app)
        assert "✗ The book is held by another writer." in words(app)


async def test_a_fault_of_the_program_is_told_and_the_place_stays_usable() -> None:
    book = FakeBook()
    book.broken["coverage"] = RuntimeError("planted")
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5", "4")
        assert "Something went wrong inside the program" in words(app)
        assert "planted" not in words(app)
        del book.broken["coverage"]
        await pressed(pilot, "f9")
        assert "12 runs in 3 combinations" in words(app)


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


async def test_a_proposed_rule_is_adopted_after_its_trial_was_seen() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5", "a")
        assert isinstance(app.screen, AdoptScreen)
        seen = words(app)
        assert "acidity >= strong" in seen
        assert "on this book it warns of 2 failures, with 1 false alarm" in seen
        assert "R-0001, R-0004" in seen and "False alarms R-0002" in seen
        assert "signed JM" in seen
        app.screen.query_one("#adopt-title", Input).value = "Ethers die in acid"
        await pressed(pilot, "enter")
        assert book.adopted == [
            ("Ethers die in acid", "In 3 runs of this book: a labile group elsewhere was lost.", "JM")
        ]
        assert any("ethers-wxyz adopted" in n.message for n in app._notifications)
        assert book.asked.count("recurring") == 2
        assert "covered" in on_screen(app)
        assert app.screen.check_action("adopt", ()) is None


async def test_adopting_wants_a_title_and_a_reason_and_can_be_left() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5", "a")
        app.screen.query_one("#adopt-why", Input).value = " "
        await pilot.click("#adopt-go")
        await settled(pilot)
        assert isinstance(app.screen, AdoptScreen)
        assert "Give it a title and a reason first." in words(app)
        await pressed(pilot, "escape")
        assert isinstance(app.screen, FailuresPlace)
        await pressed(pilot, "a")
        await pilot.click("#adopt-cancel")
        await settled(pilot)
        assert isinstance(app.screen, FailuresPlace)
        assert not book.adopted


async def test_a_rule_that_the_book_refuses_is_told_in_place() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5", "a")
        app.screen.query_one("#adopt-title", Input).value = "refused"
        await pressed(pilot, "enter")
        assert "This rule cannot be kept." in words(app)
        assert not book.adopted


async def test_a_read_only_book_offers_no_adoption() -> None:
    async with driven(FakeBook(read_only=True)) as (app, pilot):
        await pressed(pilot, "f5")
        assert "read only" in on_screen(app)
        assert app.screen.check_action("adopt", ()) is None
        await pressed(pilot, "a")
        assert isinstance(app.screen, FailuresPlace)


async def test_only_a_kind_with_a_proposal_can_be_adopted_and_only_there() -> None:
    async with driven() as (app, pilot):
        await pressed(pilot, "f5")
        assert app.screen.check_action("adopt", ()) is True
        await pressed(pilot, "down", "down")
        assert app.screen.check_action("adopt", ()) is None
        await pressed(pilot, "2")
        assert app.screen.check_action("adopt", ()) is False
        assert app.screen.check_action("plan_it", ()) is False


async def test_a_change_of_the_record_is_noticed() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5", "3", "f9")
        await pressed(pilot, "1")
        assert book.asked.count("recurring") == 1
        app.post_message(RunStored("R-0013"))
        await settled(pilot)
        await pressed(pilot, "f3", "f5")
        assert book.asked.count("recurring") == 2
        await pressed(pilot, "3")
        assert book.asked.count("replay") == 1
        assert "The record has changed since; F9 looks again." in words(app)
        await pressed(pilot, "f9")
        assert "has changed since" not in words(app)


async def test_another_book_starts_anew_and_the_answer_on_its_way_is_dropped() -> None:
    book, other = FakeBook(), FakeBook()
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5", "3")
        book.hold = threading.Event()
        await pilot.press("f9")
        await held(pilot)
        app.use_book(other)
        await settled(pilot)
        assert "F9 starts" in words(app)
        assert app.screen.view.audit is None
        await pressed(pilot, "1")
        assert "9 failures in 12 runs" in words(app)
        assert other.asked == ["recurring"]


async def test_parts_are_reached_by_mouse() -> None:
    async with driven() as (app, pilot):
        await pressed(pilot, "f5")
        await pilot.click("#failures-tabs", offset=(20, 0))
        await settled(pilot)
        assert app.screen.view.KIND == "tally"
        await pilot.click("#place-tabs", offset=(40, 0))
        await settled(pilot)
        assert app.current_mode == "failures"


async def test_parts_are_copied_as_markdown_json_and_smiles() -> None:
    async with driven() as (app, pilot):
        await pressed(pilot, "f5", "f8")
        assert isinstance(app.screen, CopyScreen)
        await pressed(pilot, "enter")
        assert app.clipboard == "CC(C)(C)OCCCBr"
        app.screen.action_copy_as("JSON")
        await settled(pilot)
        assert '"title": "Group loss: tertiary alkyl ether, a strong acid is present"' in app.clipboard
        app.screen.action_copy_as("Markdown")
        await settled(pilot)
        assert app.clipboard == "## Recurrence (invented)"
        await pressed(pilot, "2")
        app.screen.action_copy_as("Markdown")
        await settled(pilot)
        assert "| 2025-Q2 | 3 | 7 | 75 % |" in app.clipboard
        app.screen.action_copy_as("RXN")
        await settled(pilot)
        assert any("no RXN to copy" in n.message for n in app._notifications)
        await pressed(pilot, "3", "f8")
        assert any("nothing here to copy" in n.message for n in app._notifications)


async def test_a_book_without_failures_says_so() -> None:
    book = FakeBook()
    empty = a_recurrence().__class__(clusters=(), runs=12, failures=1, in_clusters=0, unplaced=0)
    book.recurring = lambda progress: empty  # type: ignore[method-assign]
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5")
        assert "nothing recurs in this book" in words(app)
        await pressed(pilot, "r", "a", "p", "s")
        assert isinstance(app.screen, FailuresPlace)


async def test_hostile_words_of_the_record_show_as_text() -> None:
    book = FakeBook()
    nasty = a_cluster(place=NASTY, projects=((NASTY, 2),), runs=("[red]R[/red]",))
    found = a_recurrence().__class__(clusters=(nasty,), runs=1, failures=1, in_clusters=1, unplaced=0)
    book.recurring = lambda progress: found  # type: ignore[method-assign]
    book.runs["[red]R[/red]"] = a_run(1, code="[red]R[/red]", note=NASTY)
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5")
        assert "[red]not red[/red]" in on_screen(app)
        assert "\x1b" not in on_screen(app) and "\u202e" not in on_screen(app)
        await pressed(pilot, "r")
        assert "[red]R[/red]" in on_screen(app)
        assert "\x1b" not in on_screen(app) and "\u202e" not in on_screen(app)


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

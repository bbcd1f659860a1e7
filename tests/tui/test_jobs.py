"""Jobs: the newest question wins, progress does not flood, edits are taken back in steps."""

from __future__ import annotations

import pytest

from tui.jobs import EditLog, LatestOnly, ThreadProgress


def test_only_the_newest_question_waits() -> None:
    box: LatestOnly[str] = LatestOnly()
    assert box.ask("a") == (1, "a")
    assert box.ask("b") is None
    assert box.ask("c") is None
    assert not box.is_current(1)
    assert box.finish() == (3, "c")
    assert box.is_busy
    assert box.is_current(3)
    assert box.finish() is None
    assert not box.is_busy


def test_forgetting_makes_answers_on_their_way_stale() -> None:
    box: LatestOnly[str] = LatestOnly()
    box.ask("a")
    box.ask("b")
    box.forget()
    assert not box.is_current(1)
    assert box.finish() is None
    assert box.ask("c") == (4, "c")


def test_progress_passes_few_reports_and_always_the_last() -> None:
    reports: list[int] = []
    progress = ThreadProgress(lambda done, total, note: reports.append(done), every_s=60)
    for done in range(1001):
        progress.advance(done, 1000)
    assert reports[-1] == 1000
    assert len(reports) <= 2


def test_progress_can_be_asked_to_stop() -> None:
    progress = ThreadProgress(lambda *_: None)
    assert not progress.cancelled()
    progress.cancel()
    assert progress.cancelled()


def test_edits_of_one_field_in_a_row_are_one_step(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(EditLog, "MERGE_S", 1.0)
    log = EditLog({"a": "", "b": ""})
    for moment, text in enumerate(("D", "DM", "DMF")):
        log.note("a", {"a": text, "b": ""}, now=0.1 * moment)
    log.note("b", {"a": "DMF", "b": "x"}, now=0.4)
    log.note("a", {"a": "THF", "b": "x"}, now=9.0)
    assert log.undo() == {"a": "DMF", "b": "x"}
    assert log.undo() == {"a": "DMF", "b": ""}
    assert log.undo() == {"a": "", "b": ""}
    assert log.undo() is None
    assert log.redo() == {"a": "DMF", "b": ""}


def test_an_edit_after_undo_drops_what_was_undone() -> None:
    log = EditLog({"a": ""})
    log.note("a", {"a": "1"}, now=0)
    log.undo()
    log.note("a", {"a": "2"}, now=5)
    assert log.redo() is None
    assert log.undo() == {"a": ""}


def test_the_log_does_not_grow_for_ever() -> None:
    log = EditLog({"a": ""}, limit=5)
    for number in range(50):
        log.note("a", {"a": str(number)}, now=10.0 * number)
    steps = 0
    while log.undo() is not None:
        steps += 1
    assert steps == 4

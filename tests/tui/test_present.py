"""Presentation: words and bars say what the values say, and nothing that was typed can act."""

from __future__ import annotations

import json

import pytest
from hypothesis import given
from hypothesis import strategies as st

from kb.plain import plain
from kb.record.conditions import Conditions
from kb.record.finding import Evidence, Finding, Interval
from kb.record.run import Run
from kb.vocabulary import Fate, FindingKind, Severity
from tests.tui.fake_book import MESYLATE, NASTY, FakeBook, a_run
from tui import present
from tui.copy_texts import assessment_texts, run_texts
from tui.plan_state import read_plan


@pytest.mark.parametrize(
    ("share", "text"), [(0.84, "84 %"), (0.0, "0 %"), (0.003, "<1 %"), (0.005, "0 %"), (0.006, "1 %"), (1.0, "100 %")]
)
def test_shares_are_whole_percent(share: float, text: str) -> None:
    assert present.percent(share) == text


def test_a_bar_is_solid_to_the_lower_bound_and_shaded_to_the_upper() -> None:
    assert present.bar_cells(Interval(mean=0.5, low=0.2, high=0.8), 10) == "██▒▒▒┃▒▒··"


@given(st.floats(0, 1), st.floats(0, 1), st.floats(0, 1), st.integers(min_value=1, max_value=80))
def test_a_bar_is_always_as_wide_as_asked_and_has_one_mean(a: float, b: float, c: float, width: int) -> None:
    low, mean, high = sorted((a, b, c))
    bar = present.bar_cells(Interval(mean=mean, low=low, high=high), width)
    assert len(bar) == width
    assert bar.count("┃") == 1


def test_effects_are_told_in_points() -> None:
    assert present.points_words(Interval(mean=0.06, low=-0.02, high=0.11)) == "+6 (-2 to +11) points"


def test_a_severity_is_told_by_mark_and_by_word() -> None:
    marks = set(present.SEVERITY_MARKS.values())
    assert len(marks) == len(Severity)
    for severity in Severity:
        finding = Finding(rule_id="x", kind=FindingKind.LIABILITY, severity=severity, title="t", why="w")
        assert f"{severity}: t" in present.finding_line(finding)


def test_uncertain_findings_say_so() -> None:
    finding = Finding(
        rule_id="x", kind=FindingKind.LIABILITY, severity=Severity.NOTE, title="t", why="w", is_uncertain=True
    )
    assert "cannot tell" in present.finding_line(finding)


@pytest.mark.parametrize(
    ("evidence", "words"),
    [
        (None, ""),
        (Evidence(lost=0, survived=0), "No run of this book"),
        (
            Evidence(lost=5, survived=2, chance=Interval(mean=0.7, low=0.5, high=0.9)),
            "70\N{NO-BREAK SPACE}% (50 to 90)",
        ),
    ],
)
def test_evidence_is_told_in_a_line(evidence: Evidence | None, words: str) -> None:
    assert words in present.evidence_words(evidence)


def test_what_was_not_recorded_is_left_out_and_zero_is_shown() -> None:
    from kb.record.outcome import Outcome

    words = dict(present.run_lines(Run(scheme="CCBr", outcome=Outcome(isolated_yield_pct=0))))
    assert words["isolated yield"] == "0 %"
    assert "ee" not in words
    assert words["conditions"] == "conditions not recorded"


def test_the_arrow_carries_reagents_above_and_solvent_temperature_time_below() -> None:
    assert present.arrow_words(a_run().conditions) == ("NaN3 (1.5)", "DMF, 51 °C")
    assert present.arrow_words(Conditions()) == ("", "")


def test_untrusted_text_comes_out_without_controls_or_direction_marks() -> None:
    run = a_run(note=NASTY, reference=NASTY[:200], project="\u202eevil", by="\x1b]0;x\x07")
    for _, value in present.run_lines(run):
        assert not any(ord(c) < 32 and c not in "\n\t" for c in value)
        assert not any(c in value for c in "\u202e\u2066\u2069\x1b\x07\x9b")
    for cell in present.run_cells(run):
        assert plain(cell) == cell


def test_a_note_is_shown_to_its_last_character() -> None:
    assert dict(present.run_lines(a_run(note=NASTY)))["note"].count("long") == 2000


def test_a_checked_plan_is_copied_in_three_kinds() -> None:
    book = FakeBook()
    read = read_plan({"scheme": MESYLATE, "reagent": "NaN3=1.5", "solvent": "EtOH"}, book)
    texts = assessment_texts(book.check(read.plan))
    assert texts["SMILES"] == MESYLATE
    assert "| substitution | 45 % | 31 to 53 |" in texts["Markdown"]
    assert "local safety rules" in texts["Markdown"]
    assert json.loads(texts["JSON"])["findings"][0]["id"] == "invented-solvolysis"


def test_a_run_is_copied_in_three_kinds_and_cannot_break_out_of_the_markdown() -> None:
    texts = run_texts(a_run(note="a | b\n# heading <script>", reference="`x`"))
    assert "<script>" not in texts["Markdown"]
    assert "\n# heading" not in texts["Markdown"]
    assert json.loads(texts["JSON"])["note"].startswith("a | b")


def test_fates_all_have_words() -> None:
    assert set(present.FATE_WORDS) == set(Fate) == set(present.FATE_SHORT)

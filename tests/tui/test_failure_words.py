"""Audits as cells, lines and groups of runs: pure, on invented values."""

from __future__ import annotations

import datetime as dt
from dataclasses import replace

import pytest

from tests.tui.fake_audits import a_calibration, a_cluster, a_coverage, a_recurrence, a_replay, a_tally
from tests.tui.fake_runs import NASTY
from tui.failure_words import (
    ORDERS,
    behind,
    cell_behind,
    cell_cells,
    cell_mark,
    chosen_cells,
    cluster_behind,
    cluster_cells,
    cluster_lines,
    hindsight_behind,
    point_cells,
    reliability_lines,
    replay_notes,
    rule_word,
    support_lines,
    tally_behind,
    tally_cells,
    tally_markdown,
    trust_behind,
)
from tui.widgets.tally_view import whole_ticks


@pytest.mark.parametrize(
    ("covered", "has_proposal", "word"),
    [
        ((), True, "proposed"),
        ((), False, "none"),
        ((("x", 3),), False, "covered"),
        ((("x", 2),), True, "in part"),
    ],
)
def test_a_kind_says_how_it_stands_to_the_house_rules(
    covered: tuple[tuple[str, int], ...], has_proposal: bool, word: str
) -> None:
    cluster = a_cluster(covered_by=covered)
    assert rule_word(cluster if has_proposal else replace(cluster, proposal=None)) == word


def test_what_was_not_recorded_is_left_empty_and_never_zero() -> None:
    cells = cluster_cells(a_cluster(lost_mmol=0.0, lost_mmol_runs=0, last=None))
    assert cells == (
        "group loss",
        "tertiary alkyl ether",
        "a strong acid is present",
        "3",
        "2",
        "",
        "",
        "proposed",
    )
    assert not any("mmol" in line for line in cluster_lines(a_cluster(lost_mmol=0.0, lost_mmol_runs=0)))
    assert tally_cells(replace(a_tally().ways[0][1][0], runs=3, failed=(), fine=())) == (
        "2025-Q1",
        "0",
        "3",
        "",
    )


def test_no_share_is_given_of_modes_since_runs_that_worked_have_none() -> None:
    assert [tally_cells(t)[-1] for t in dict(a_tally().ways)["failure mode"]] == ["", ""]
    assert "| elimination | 4 | 4 |  |" in tally_markdown(a_tally())


def test_each_order_puts_its_own_kind_first() -> None:
    costly = a_cluster(name="a", lost_mmol=9.0, runs=("R-1",), last=dt.date(2024, 1, 1))
    frequent = a_cluster(name="b", lost_mmol=1.0, runs=("R-1", "R-2", "R-3"), last=dt.date(2024, 2, 1))
    late = a_cluster(name="c", lost_mmol=2.0, runs=("R-1", "R-2"), last=dt.date(2025, 1, 1))
    undated = a_cluster(name="d", lost_mmol=0.0, runs=("R-1",), last=None)
    kinds = (undated, late, frequent, costly)
    assert [min(kinds, key=key).name for _, key in ORDERS] == ["a", "b", "c"]  # type: ignore[type-var]


def test_a_figure_without_runs_has_nothing_behind_it() -> None:
    assert behind("nothing") is None
    held = cluster_behind(a_cluster(repeats=(), came_through=(), proposal=None))
    assert held is not None and [g.title for g in held.groups] == ["went wrong so"]


def test_every_group_has_a_note_for_each_run_or_none() -> None:
    recurrence, replay, coverage, trust = a_recurrence(), a_replay(), a_coverage(), a_calibration()
    every = [cluster_behind(c) for c in recurrence.clusters]
    every += [tally_behind(way, t) for way, words in a_tally().ways for t in words]
    every.append(hindsight_behind("x", replay.runs, lambda r: r.warned))
    every += [cell_behind(c, coverage.contradictions) for c in coverage.cells]
    every += [
        trust_behind(cells[0], held) for cells, held in (*reliability_lines(trust), *support_lines(trust))
    ]
    for one in every:
        assert one is not None
        for group in one.groups:
            assert group.codes and len(group.notes) in (0, len(group.codes))


def test_the_runs_at_a_threshold_add_up_to_what_the_curve_says() -> None:
    replay = a_replay()
    for point in replay.curve:
        held = hindsight_behind("x", replay.runs, lambda r, p=point: r.worry >= p.threshold)  # type: ignore[misc]
        assert held is not None
        counts = {g.title: len(g.codes) for g in held.groups}
        assert counts.get("failures warned of", 0) == point.warned
        assert counts.get("successes warned of", 0) == point.false_alarms
        assert sum(counts.values()) == replay.failures + replay.successes
    assert point_cells(replay.curve[-1])[2] == "100 %"


def test_a_replay_says_what_it_left_out_and_that_it_was_stopped() -> None:
    assert replay_notes(replace(a_replay(), undated=0)) == ""
    assert replay_notes(a_replay(stopped=True)).startswith("Stopped before the end")
    assert "1 undated" in replay_notes(a_replay())


def test_cells_are_marked_by_sign_and_chosen_by_it() -> None:
    coverage = a_coverage()
    assert [cell_mark(c, coverage.contradictions) for c in coverage.cells] == ["⇅", "", "◌"]
    assert [c.carbon_class for c in chosen_cells(coverage, "thin")] == ["tertiary"]
    assert [c.carbon_class for c in chosen_cells(coverage, "contradictory")] == ["secondary"]
    assert cell_cells(coverage.cells[0], ())[4:8] == ("4", "2", "90 %", "80±8")
    assert cell_cells(coverage.cells[2], ())[6:8] == ("", "")


def test_every_run_of_a_calibration_stands_in_one_row_of_each_table() -> None:
    found = a_calibration()
    for lines in (reliability_lines(found), support_lines(found)):
        runs = [m.run for _, held in lines for m in held]
        assert sorted(runs) == sorted(m.run for m in found.main_shares)
        assert [int(cells[1]) for cells, _ in lines] == [len(held) for _, held in lines]


def test_words_of_people_cannot_act() -> None:
    lines = cluster_lines(a_cluster(place=NASTY, projects=((NASTY, 1),)))
    assert not any("\x1b" in line or "\u202e" in line or "\x07" in line for line in lines)


@pytest.mark.parametrize(
    ("most", "ticks"), [(1, [0, 1]), (7, [0, 2, 4, 6]), (84, [0, 20, 40, 60, 80]), (0, [0])]
)
def test_ticks_of_counts_are_whole_numbers(most: int, ticks: list[int]) -> None:
    assert whole_ticks(most) == ticks

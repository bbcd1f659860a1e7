"""Views of the record: what is kept, what is shared, and that a cut speaks for its own rows only."""

from __future__ import annotations

import datetime as dt

import numpy as np
from tables_by_hand import RunsByCode, facts, table_of

from kb.assess.record_view import RecordView
from kb.materials.profile import ConditionProfile
from kb.record.run import Run
from kb.store.derivation import profile_to_json

SUBSTRATES = ("CCBr", "CC(C)(C)OC", "CC(C)(C)OCC", "CCCl")


class CountingRuns(RunsByCode):
    """A source that says how often it was asked, one by one and for several."""

    def __init__(self, runs: dict[str, Run]) -> None:
        super().__init__(runs)
        self.asked: list[tuple[str, ...]] = []

    def get(self, code: str) -> Run:
        self.asked.append((code,))
        return super().get(code)

    def many(self, codes: list[str]) -> list[Run]:
        self.asked.append(tuple(codes))
        return [self.runs[code] for code in codes]


def a_view() -> tuple[RecordView, CountingRuns]:
    table = table_of(*((facts(substrate=s), {}, None, None) for s in SUBSTRATES))
    table.date[:] = [
        dt.date(2024, 1, 1).toordinal(),
        0,
        dt.date(2024, 3, 1).toordinal(),
        dt.date(2024, 2, 1).toordinal(),
    ]
    cold, hot = ConditionProfile(temperature_c=0.0), ConditionProfile(temperature_c=80.0)
    runs = CountingRuns({code: Run(scheme=s, code=code) for code, s in zip(table.codes, SUBSTRATES, strict=True)})
    failures = [(), (("group-loss", None),), (("group-loss", "CO"), ("stalled", None)), ()]
    return RecordView(table, [profile_to_json(p) for p in (cold, hot, cold, hot)], failures, runs), runs


def test_a_motif_is_found_in_the_rows_that_hold_it() -> None:
    view, _ = a_view()
    assert view.rows_with_motif("OC(C)(C)C").tolist() == [1, 2]
    assert view.rows_with_motif("[nonsense").tolist() == []


def test_a_cut_numbers_its_own_rows() -> None:
    view, _ = a_view()
    cut = view.only(np.array([False, False, True, True]))
    assert cut.table.codes == ("R-3", "R-4")
    assert cut.rows_with_motif("OC(C)(C)C").tolist() == [0]
    assert cut.failures == [(("group-loss", "CO"), ("stalled", None)), ()]
    assert cut.profile(1).temperature_c == 80.0


def test_a_date_leaves_out_what_came_later_and_what_has_none() -> None:
    view, _ = a_view()
    assert view.until(dt.date(2024, 2, 1)).table.codes == ("R-1", "R-4")
    assert view.until(None) is view


def test_several_runs_are_read_in_one_go_and_kept_for_every_cut() -> None:
    view, runs = a_view()
    view.fetch([0, 2])
    assert runs.asked == [("R-1", "R-3")]
    cut = view.only(np.array([True, False, True, False]))
    assert [cut.run(0).scheme, cut.run(1).scheme] == ["CCBr", "CC(C)(C)OCC"]
    cut.fetch([0, 1])
    assert len(runs.asked) == 1


def test_a_condition_line_is_asked_once_per_distinct_profile() -> None:
    view, _ = a_view()
    asked: list[float | None] = []

    def is_hot(profile: ConditionProfile) -> bool | None:
        asked.append(profile.temperature_c)
        return None if profile.temperature_c is None else profile.temperature_c > 50

    assert view.told("hot", is_hot, [0, 1, 2, 3]).tolist() == [0, 1, 0, 1]
    assert view.only(np.array([False, True, True, False])).told("hot", is_hot, [0, 1]).tolist() == [1, 0]
    assert asked == [0.0, 80.0]


def test_what_cannot_be_told_is_not_told() -> None:
    view, _ = a_view()
    assert view.told("open", lambda _: None, [0, 1]).tolist() == [-1, -1]


def test_failure_modes_by_row() -> None:
    view, _ = a_view()
    assert view.modes == ("group-loss", "stalled")
    assert view.failed_in("group-loss").tolist() == [False, True, True, False]
    assert view.failed_in("never heard of").tolist() == [False] * 4
    assert view.has_failure.tolist() == [False, True, True, False]


def test_memory_is_a_view_s_own_and_knowledge_is_shared() -> None:
    view, _ = a_view()
    cut = view.only(np.array([True, True, False, False]))
    view.memory["which runs may speak"] = 4
    view.known["of a row"] = 1
    assert cut.memory == {}
    assert cut.known == {"of a row": 1}

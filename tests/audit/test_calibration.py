"""A book measured against itself: on invented tables whose law is known, and on the demo book."""

from __future__ import annotations

import json

import numpy as np
from tables_by_hand import facts, table_of, view_of

from kb.assess.record_view import RecordView
from kb.audit.calibration import calibrate
from kb.book import Book
from kb.materials.profile import ConditionProfile
from kb.record.run import Run

TERTIARY = {"carbon_class": "tertiary", "substrate": "CC(C)(C)Br", "centre_bits": bytes([170] * 32)}


def a_view(count: int = 40, noise: float = 0.02, *, repeats: bool = False) -> RecordView:
    """Return runs of two classes in which elimination takes over with the temperature, half a class each."""
    random = np.random.default_rng(3)
    rows = []
    for place in range(count):
        is_tertiary = place % 2 == 1
        t = 20.0 + 80.0 * (place // 2) / max(count // 2 - 1, 1)
        share = (0.7 if is_tertiary else 0.95) - 0.008 * (t - 20) + noise * random.standard_normal()
        share = float(np.clip(share, 0.01, 0.99))
        own = TERTIARY if is_tertiary else {}
        own = own | {} if repeats else own | {"substrate": f"{'C' * (place + 1)}Br"}
        rows.append(
            (
                facts(temperature_c=t, **own),
                {"substitution": share, "elimination": 1 - share},
                80 * share,
                "worked",
            )
        )
    runs = [Run(scheme="CBr")] * count
    return view_of(table_of(*rows), [ConditionProfile()] * count, [()] * count, runs)


def test_a_law_that_the_kernel_can_see_is_found_and_beats_the_plain_means() -> None:
    found = calibrate(a_view()).main_share
    assert found.runs == 40
    assert found.error is not None
    assert found.error < 0.8 * min(found.same_class_error, found.all_runs_error)


def test_more_noise_gives_more_error() -> None:
    quiet, loud = calibrate(a_view(noise=0.01)).main_share, calibrate(a_view(noise=0.2)).main_share
    assert quiet.error < loud.error


def test_each_figure_is_expected_without_its_own_run() -> None:
    # Two runs that nothing else is like: each can only be expected from the other, and they disagree.
    rows = [
        (facts(substrate=s), {"substitution": x, "elimination": 1 - x}, None, None)
        for s, x in (("CBr", 1.0), ("CCBr", 0.0))
    ]
    view = view_of(table_of(*rows), [ConditionProfile()] * 2, [()] * 2, [Run(scheme="CBr")] * 2)
    found = calibrate(view).main_share
    assert found.error > 50
    assert found.same_class_error == 100  # the mean of the others is the other run
    assert found.all_runs_error == 100


def test_leaving_out_the_substrate_takes_its_repeats_away() -> None:
    view = a_view(repeats=True)
    apart, together = calibrate(view), calibrate(view, with_substrate=True)
    assert together.main_share.error > apart.main_share.error
    assert "its substrate" in together.words[0]


def test_a_sample_is_the_same_each_time_and_says_how_many_were_asked() -> None:
    view = a_view()
    first, second = calibrate(view, most=15), calibrate(view, most=15)
    assert first == second
    assert first.asked == 15
    assert "15 of 40" in first.words[0]


def test_an_empty_book_says_that_nothing_can_be_said() -> None:
    view = view_of(table_of(), [], [], [])
    found = calibrate(view)
    assert found.main_share.error is None
    assert "too few" in " ".join(found.words)


def test_runs_without_a_measured_split_are_not_counted_as_splits() -> None:
    rows = [(facts(temperature_c=20.0 + k), {}, 60.0 + k, "worked") for k in range(8)]
    view = view_of(table_of(*rows), [ConditionProfile()] * 8, [()] * 8, [Run(scheme="CBr")] * 8)
    found = calibrate(view)
    assert found.main_share.runs == 0
    assert found.yields.runs == 8


def test_progress_is_told_and_a_stop_leaves_figures_of_what_was_done() -> None:
    class Impatient:
        done = 0

        def advance(self, done: int, total: int | None, note: str = "") -> None:
            self.done = done

        def cancelled(self) -> bool:
            return self.done >= 5

    found = calibrate(a_view(), progress=Impatient())
    assert (found.asked, found.stopped) == (5, True)


def test_rows_for_the_plot_count_every_run_once() -> None:
    found = calibrate(a_view())
    assert sum(row.runs for row in found.reliability) == found.main_share.runs
    assert sum(row[2] for row in found.by_support) == found.main_share.runs
    json.dumps(found.as_dict())


def test_the_demo_book_is_expected_better_than_by_its_means_with_honest_intervals(demo: Book) -> None:
    found = calibrate(demo.view(), demo.finder().tanimoto_of_runs)
    for measure in (found.main_share, found.yields):
        assert measure.error < 0.85 * min(measure.same_class_error, measure.all_runs_error)
        assert 0.74 <= measure.coverage <= 0.86
    assert found.main_fate_right > 0.75

"""The columns that judgement reads: coding, cutting and stacking keep every value at its row."""

from __future__ import annotations

import numpy as np
import pytest
from tables_by_hand import facts, table_of

from kb.assess.table import FATES, FactTable, code_of, flag_words, one_row, stack, with_profiles
from kb.vocabulary import Fate

PROFILES = ('{"reagents":["O"],"temperature_c":20.0}', '{"reagents":["N"]}', "{}")


def a_table() -> FactTable:
    rows = [
        (
            facts(carbon_class="primary", nucleophile_class="azide", profile_json=PROFILES[0]),
            {"substitution": 0.9},
            80.0,
            "worked",
        ),
        (facts(carbon_class=None, nucleophile_class=None, profile_json=PROFILES[1]), {}, None, None),
        (
            facts(carbon_class="tertiary", nucleophile_class="amine", profile_json=PROFILES[0]),
            {"elimination": 0.5},
            110.0,
            "failed",
        ),
        (facts(flags="allylic,ring", temperature_c=None, profile_json=PROFILES[2]), {}, 5.0, "partly"),
    ]
    return table_of(*rows)


def described(table: FactTable, row: int) -> tuple[object, ...]:
    """Return what a row says, in words, whatever its codes are."""
    return (
        table.codes[row],
        table.word("carbon_class", row),
        table.nucleophile_word(row),
        table.number("temperature_c", row),
        flag_words(int(table.flags[row])),
        table.profiles[int(table.profile[row])],
        table.flasks.sets[int(table.flask[row])],
        table.split(row),
        table.word("verdict", row),
        float(np.nan_to_num(table.yield_pct[row], nan=-1)),
    )


def test_what_was_not_recorded_stays_so() -> None:
    table = a_table()
    assert table.word("carbon_class", 1) is None
    assert table.nucleophile_word(1) is None
    assert table.number("temperature_c", 3) is None
    assert table.word("verdict", 1) is None


def test_a_fate_nobody_mentioned_counts_as_none_where_others_were_measured() -> None:
    table = a_table()
    assert table.shares[0, FATES.index(Fate.ELIMINATION)] == 0
    assert np.isnan(table.shares[1]).all()


def test_equal_conditions_are_coded_once() -> None:
    table = a_table()
    assert table.profile.tolist() == [0, 1, 0, 2]
    assert table.flasks.sets == (frozenset({"O"}), frozenset({"N"}), frozenset())


@pytest.mark.parametrize("keep", [[2, 0], [3], []])
def test_rows_cut_out_keep_all_they_say(keep: list[int]) -> None:
    table = a_table()
    cut = table.rows(np.array(keep, dtype=int))
    assert [described(cut, i) for i in range(len(cut))] == [described(table, row) for row in keep]


def test_a_mask_cuts_in_the_record_s_order() -> None:
    table = a_table()
    assert table.rows(np.array([True, False, False, True])).codes == ("R-1", "R-4")


def test_the_first_rows_are_those_and_share_their_memory() -> None:
    table = a_table()
    first = table.first(2)
    assert [described(first, i) for i in range(2)] == [described(table, i) for i in range(2)]
    assert np.shares_memory(first.shares, table.shares)


def test_stacked_tables_say_what_they_said_apart() -> None:
    table = a_table()
    plan = one_row(facts(nucleophile_class="thiolate", profile_json='{"reagents":["S"]}'))
    both = stack(plan, table)
    assert both.nucleophile_word(0) == "thiolate"
    assert both.flasks.sets[int(both.flask[0])] == frozenset({"S"})
    assert [described(both, i + 1) for i in range(len(table))] == [described(table, i) for i in range(len(table))]


def test_other_profiles_can_be_given_to_the_same_rows() -> None:
    table = with_profiles(a_table(), ['{"reagents":["Cl"]}'] * 4)
    assert len(table.profiles) == 1
    assert table.flasks.sets[int(table.flask[2])] == frozenset({"Cl"})


def test_a_word_of_a_later_program_is_no_word() -> None:
    assert code_of("carbon_class", "quaternary") == -1
    assert code_of("carbon_class", None) == -1

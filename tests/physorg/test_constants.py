"""The tables: a source in every row, values that repeat the published rows they claim, orders that textbooks teach."""

from __future__ import annotations

import csv
import math
import re
from pathlib import Path

import pytest

from kb.physorg.constants import OBTAINED, find_constant, get_constant, load_constants, rows_set_from
from kb.vocabulary import LeavingGroup

DATA = Path(__file__).resolve().parent.parent / "data" / "check_values.csv"
with DATA.open(encoding="utf-8", newline="") as _handle:
    ROWS = {row["id"]: row for row in csv.DictReader(_handle)}


@pytest.mark.parametrize("constant", load_constants().values(), ids=lambda c: f"{c.quantity}/{c.key}")
def test_every_row_says_where_it_is_from(constant) -> None:  # type: ignore[no-untyped-def]
    assert constant.source.strip()
    assert constant.unit.strip()
    assert constant.obtained in OBTAINED
    assert constant.sigma >= 0
    assert math.isfinite(constant.value)


SECOND_HAND = re.compile(r"teaching|answer page|q&a|same page|read at |\b\w+\.(com|net|de|online|ai)\b", re.IGNORECASE)


def test_every_source_is_a_print_and_no_page_about_one() -> None:
    said = [(n, r["source"] + " " + r["note"]) for n, r in ROWS.items()]
    said += [(f"{c.quantity}/{c.key}", c.source) for c in load_constants().values()]
    assert [name for name, words in said if SECOND_HAND.search(words)] == []
    assert all(r["source"].strip() for r in ROWS.values())


def test_rows_named_as_used_exist() -> None:
    for name in rows_set_from():
        assert name in ROWS or name.startswith("hydrolysis:"), name


@pytest.mark.parametrize(
    ("quantity", "key", "row"),
    [
        *[("n", k, r) for k, r in (("azide", "SS10"), ("cyanide", "SS16"), ("iodide", "SS15"), ("fluoride", "SS04"))],
        *[("n", k, r) for k, r in (("hydroxide", "SS12"), ("carboxylate", "SS05"), ("thiosulfate", "SS18"))],
        *[
            ("y", k, r)
            for k, r in (("ethanol", "YV02"), ("water", "YV08"), ("methanol", "YV04"), ("acetic acid", "YV03"))
        ],
        *[("pkah", k, r) for k, r in (("azide", "PK01"), ("cyanide", "PK02"), ("carbonate_base", "PK10"))],
        *[("pkah", k, r) for k, r in (("alkoxide", "PK48"), ("tertiary_alkoxide", "PK52"), ("hydroxide", "PK44"))],
    ],
)
def test_values_repeat_the_published_rows(quantity: str, key: str, row: str) -> None:
    assert get_constant(quantity, key).value == pytest.approx(float(ROWS[row]["value"]), abs=0.02)


@pytest.mark.parametrize(
    ("quantity", "key", "row", "base"),
    [
        ("sn2", "tosylate", "LG01", "LG03"),
        ("sn2", "iodide", "LG02", "LG03"),
        ("sn2", "chloride", "LG04", "LG03"),
        ("sn2", "fluoride", "LG05", "LG03"),
    ],
)
def test_leaving_groups_repeat_the_textbook_average(quantity: str, key: str, row: str, base: str) -> None:
    # Rows LG01 to LG05 give F = 1; bromide is 10 000 in the same list (textbook; its row is not in the file).
    against_bromide = math.log10(float(ROWS[row]["value"]) / 10_000)
    assert get_constant(quantity, key).value == pytest.approx(against_bromide, abs=0.02)


@pytest.mark.parametrize(
    ("key", "row"),
    [("triflate", "LG07"), ("tosylate", "LG08"), ("iodide", "LG10"), ("bromide", "LG11"), ("fluoride", "LG13")],
)
def test_ionisation_repeats_noyce_and_virgilio(key: str, row: str) -> None:
    assert get_constant("ionisation", key).value == pytest.approx(math.log10(float(ROWS[row]["value"])), abs=0.02)


def test_converted_n_keeps_the_order_of_methyl_iodide_in_methanol() -> None:
    # Pearson, Sobel & Songstad 1968 (rows SS19 to SS37): order only, the scale being another one.
    names = (
        ("nitrate", "SS20"), ("fluoride", "SS21"), ("carboxylate", "SS22"), ("thioether", "SS24"),
        ("phenoxide", "SS27"), ("alkoxide", "SS29"), ("tertiary_amine", "SS33"), ("iodide", "SS35"),
        ("phosphine", "SS36"), ("thiolate", "SS37"),
    )  # fmt: skip
    published = [float(ROWS[r]["value"]) for _, r in names]
    ours = [get_constant("n", k).value for k, _ in names]
    assert published == sorted(published)
    assert ours == sorted(ours)


def test_solvents_stand_in_the_order_of_their_ionising_power() -> None:
    order = ("nonpolar", "weakly-polar", "polar-aprotic", "ethanol", "methanol", "80 % ethanol", "formic acid", "water")
    values = [get_constant("y", k).value for k in order]
    assert values == sorted(values)


def test_every_leaving_group_word_has_rates_or_is_refused() -> None:
    silent = {g for g in LeavingGroup if find_constant("sn2", g) is None}
    assert silent == {LeavingGroup.NITRO, LeavingGroup.OTHER}
    for group in set(LeavingGroup) - silent:
        assert find_constant("e2", group) is not None
        assert find_constant("ionisation", group) is not None


def test_an_unknown_constant_is_refused() -> None:
    with pytest.raises(LookupError):
        get_constant("sn2", "hope")

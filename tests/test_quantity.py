"""Temperatures, times and amounts as chemists write them.

Conversions are the definitions of the units (SI); rt = 22 degC, overnight = 16 h and the like are common practice and
marked so in `kb/quantity`.
"""

from __future__ import annotations

import subprocess
import sys

import pytest
from hypothesis import given
from hypothesis import strategies as st

from kb.errors import QuantityError, SidepathError
from kb.quantity import (
    Temperature,
    format_amount,
    format_concentration,
    format_duration,
    format_equiv,
    format_number,
    format_temperature,
    parse_amount,
    parse_amount_mmol,
    parse_concentration,
    parse_duration,
    parse_equiv,
    parse_loading_mol_pct,
    parse_number,
    parse_percent,
    parse_temperature,
)


@pytest.mark.parametrize(
    ("text", "start_c", "end_c"),
    [
        ("60C", 60, 60),
        ("60 °C", 60, 60),
        ("60 ºC", 60, 60),  # ordinal sign typed for a degree sign
        ("60℃", 60, 60),
        ("60 deg C", 60, 60),
        ("333 K", 59.85, 59.85),
        ("140 F", 60, 60),
        ("-40 F", -40, -40),  # the two scales meet there
        ("-78 °C", -78, -78),
        ("−78 °C", -78, -78),  # U+2212
        ("60,5 °C", 60.5, 60.5),
        ("rt", 22, 22),
        ("r.t.", 22, 22),
        ("RT", 22, 22),
        ("ambient", 22, 22),
        ("room temperature", 22, 22),
        ("0C to rt", 0, 22),
        ("0 °C–rt", 0, 22),
        ("0 -> 25 °C", 0, 25),
        ("0 → 25 °C", 0, 25),
        ("rt/60", 22, 60),
        ("273 to 298 K", -0.15, 24.85),
        ("20-25C", 20, 25),
        ("-78--40 C", -78, -40),
        ("60", 60, 60),
        ("60 °C (bath)", 60, 60),
        ("ca. 60 C", 60, 60),
        ("ice bath", 0, 0),
        ("reflux (66 °C)", 66, 66),
    ],
)
def test_a_temperature_is_read_as_it_is_written(text: str, start_c: float, end_c: float) -> None:
    found = parse_temperature(text)
    assert (found.start_c, found.end_c) == (pytest.approx(start_c), pytest.approx(end_c))
    assert found.text == text
    assert not found.is_reflux


def test_reflux_has_no_number_until_a_solvent_gives_one() -> None:
    assert parse_temperature("reflux").is_reflux
    assert parse_temperature("reflux").high_c is None
    warming = parse_temperature("0C to reflux")
    assert (warming.start_c, warming.end_c, warming.high_c, warming.low_c) == (0, None, None, 0)


def test_a_programme_keeps_what_lies_between() -> None:
    found = parse_temperature("0 to 80 to rt")
    assert (found.high_c, found.low_c, found.between_c) == (80, 0, (80,))


@pytest.mark.parametrize(
    ("text", "why"),
    [
        ("", "empty"),
        ("warm", "not one I can read"),
        ("nan", "not one I can read"),
        ("inf C", "not one I can read"),
        ("1e999 C", "not finite"),
        ("-300 C", "below absolute zero"),
        ("-1 K", "below absolute zero"),
        ("-500 F", "below absolute zero"),
        ("5000 C", "above 1000"),
        ("333", "no unit"),
        ("1,500 K", "two ways"),
        ("60 X", "not one I can read"),
        ("\x1b[31m60C", "control characters"),
        ("6" * 300, "characters long"),
    ],
)
def test_a_nonsense_temperature_is_refused_with_the_reason(text: str, why: str) -> None:
    with pytest.raises(QuantityError) as refused:
        parse_temperature(text)
    assert why in refused.value.message
    assert refused.value.hint
    assert "\x1b" not in str(refused.value)


@given(st.floats(min_value=-273.15, max_value=1000))
def test_a_temperature_comes_back_from_its_own_writing(value_c: float) -> None:
    written = format_temperature(Temperature(text="", start_c=value_c, end_c=value_c))
    again = parse_temperature(written)
    assert again.start_c == pytest.approx(value_c, rel=1e-8, abs=1e-6)
    assert format_temperature(again) == written


@given(st.floats(min_value=-100, max_value=300), st.floats(min_value=-100, max_value=300))
def test_a_programme_comes_back_from_its_own_writing(start_c: float, end_c: float) -> None:
    again = parse_temperature(format_temperature(Temperature(text="", start_c=start_c, end_c=end_c)))
    assert again.start_c == pytest.approx(start_c, rel=1e-8, abs=1e-6)
    assert again.end_c == pytest.approx(end_c, rel=1e-8, abs=1e-6)


@pytest.mark.parametrize("text", ["rt", "0C to rt", "reflux", "333 K", "-78 °C", "rt to reflux", "reflux (66 °C)"])
def test_words_stay_beside_the_number_and_are_read_again(text: str) -> None:
    first = parse_temperature(text)
    again = parse_temperature(format_temperature(first))
    assert (again.start_c, again.end_c, again.is_reflux) == (first.start_c, first.end_c, first.is_reflux)


@pytest.mark.parametrize(
    ("text", "hours"),
    [
        ("4 h", 4),
        ("30 min", 0.5),
        ("90 s", 0.025),
        ("2 d", 48),
        ("1 week", 168),
        ("1 h 30 min", 1.5),
        ("1h30min", 1.5),
        ("0,5 h", 0.5),
        ("2-3 h", 2.5),
        ("overnight", 16),  # common practice
        ("o/n", 16),
        ("16 h (overnight)", 16),
        ("over weekend", 64),  # common practice
        ("until complete", None),
    ],
)
def test_a_time_is_read_as_it_is_written(text: str, hours: float | None) -> None:
    found = parse_duration(text)
    assert found.h == (pytest.approx(hours) if hours is not None else None)
    assert found.text == text


@pytest.mark.parametrize(
    ("text", "why"),
    [
        ("4", "no unit"),
        ("-1 h", "negative"),
        ("1e9 h", "longer than a year"),
        ("3 moons", "unit I do not know"),
        ("1 h 2 h", "unit twice"),
        ("3-2 h", "backwards"),
        ("soon", "not one I can read"),
    ],
)
def test_a_nonsense_time_is_refused_with_the_reason(text: str, why: str) -> None:
    with pytest.raises(QuantityError, match=why):
        parse_duration(text)


@given(st.floats(min_value=0, max_value=8000))
def test_a_time_comes_back_from_its_own_writing(hours: float) -> None:
    written = format_duration(parse_duration(f"{hours!r} h")) if hours else "0 h"
    assert parse_duration(written).h == pytest.approx(hours, rel=1e-8, abs=1e-6)


@pytest.mark.parametrize(
    ("text", "molar"),
    [("0.2 M", 0.2), ("200 mM", 0.2), ("0,2 mol/L", 0.2), ("0.2 mol L-1", 0.2), ("0.2 mol·L⁻¹", 0.2), ("50 µM", 5e-5)],
)
def test_a_concentration_is_read_as_it_is_written(text: str, molar: float) -> None:
    assert parse_concentration(text) == pytest.approx(molar)


@pytest.mark.parametrize(
    ("text", "equiv"),
    [("1.5 equiv", 1.5), ("1,5 eq", 1.5), ("2 eq.", 2), ("1.5", 1.5), ("5 mol%", 0.05), ("0", 0)],
)
def test_equivalents_are_read_as_they_are_written(text: str, equiv: float) -> None:
    assert parse_equiv(text) == pytest.approx(equiv)


def test_loadings_and_percentages_are_read_as_they_are_written() -> None:
    assert parse_loading_mol_pct("5 mol%") == 5
    assert parse_loading_mol_pct("0.5 mol %") == 0.5
    assert parse_loading_mol_pct("0.05 equiv") == 5
    assert parse_percent("8,5 %") == 8.5
    assert parse_percent("0.88") == 0.88  # a percentage, never a fraction


@pytest.mark.parametrize(
    ("text", "field", "value"),
    [
        ("5 mmol", "amount_mmol", 5),
        ("0.2 mol", "amount_mmol", 200),
        ("250 mg", "mass_mg", 250),
        ("1,2 g", "mass_mg", 1200),
        ("3 mL", "volume_ml", 3),
        ("50 µL", "volume_ml", 0.05),
    ],
)
def test_an_amount_is_read_into_the_field_of_its_unit(text: str, field: str, value: float) -> None:
    found = parse_amount(text)
    assert getattr(found, field) == pytest.approx(value)
    others = {"amount_mmol", "mass_mg", "volume_ml"} - {field}
    assert all(getattr(found, other) is None for other in others)
    assert getattr(parse_amount(format_amount(found)), field) == pytest.approx(value)


@pytest.mark.parametrize(
    ("parse", "text", "why"),
    [
        (parse_concentration, "0.2", "no unit"),
        (parse_concentration, "2 N", "normality"),
        (parse_concentration, "100 M", "more than any liquid"),
        (parse_concentration, "-1 M", "negative"),
        (parse_equiv, "cat", "not one I can read"),
        (parse_equiv, "-1", "negative"),
        (parse_equiv, "1e9", "more than anyone adds"),
        (parse_equiv, "nan", "not one I can read"),
        (parse_equiv, "1,500", "two ways"),
        (parse_loading_mol_pct, "5", "no unit"),
        (parse_percent, "101", "above 100"),
        (parse_percent, "-1", "negative"),
        (parse_amount, "5", "no unit"),
        (parse_amount, "5 oz", "unit I do not know"),
        (parse_amount_mmol, "5 mg", "no amount of substance"),
        (parse_number, "--1", "not a number"),
    ],
)
def test_a_nonsense_amount_is_refused_with_the_reason(parse: object, text: str, why: str) -> None:
    assert callable(parse)
    with pytest.raises(QuantityError, match=why):
        parse(text)


@given(st.floats(min_value=0, max_value=9_999))
def test_amounts_come_back_from_their_own_writing(value: float) -> None:
    assert parse_number(format_number(value)) == pytest.approx(value, rel=1e-8)
    assert parse_equiv(format_equiv(value)) == pytest.approx(value, rel=1e-8)
    molar = value / 200
    assert parse_concentration(format_concentration(molar)) == pytest.approx(molar, rel=1e-8)


@given(st.text(max_size=40))
def test_no_text_at_all_gives_anything_but_a_value_or_a_refusal(text: str) -> None:
    for parse in (parse_temperature, parse_duration, parse_equiv, parse_concentration, parse_amount, parse_percent):
        try:
            parse(text)
        except SidepathError as refused:
            assert refused.message.endswith(".")


def test_quantities_load_without_rdkit() -> None:
    check = "import sys, kb.quantity; sys.exit('rdkit' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", check], check=False).returncode == 0

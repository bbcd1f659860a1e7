"""The condition language: what it takes, what it refuses in plain words, and three-valued answers."""

from __future__ import annotations

import pickle

import pytest
from conditions_by_hand import a_profile
from hypothesis import given
from hypothesis import strategies as st

from kb.assess.predicate import parse_predicate
from kb.assess.rulefile import load_rules
from kb.errors import QueryError, SidepathError
from kb.materials.profile import ConditionProfile

WARM_BASE = a_profile("reagent=alkoxide; base_pkah=16; base_bulk=unhindered; temperature_c=80; solvent=alcohol")


@pytest.mark.parametrize(
    ("line", "facts", "expected"),
    [
        ("acidity >= strong", "acidity=strong", True),
        ("acidity >= strong", "acidity=weak", False),
        ("acidity < strong", "acidity=weak", True),
        ("acidity in (none, weak)", "acidity=none", True),
        ("acidity == none", "acidity=weak", False),
        ("lewis_acid != none", "lewis_acid=mild", True),
        ("nucleophile not in (weak, none)", "nucleophile=good", True),
        ("reagent in (hydroxide, alkoxide)", "reagent=alkoxide", True),
        ("reagent in (alkoxide)", "reagent=tertiary_alkoxide", True),
        ("reagent == azide", "reagent=alkoxide", False),
        ("reagent not in (amine)", "reagent=primary_amine", False),
        ("base_pkah >= 15", "base_pkah=15", True),
        ("9 <= base_pkah <= 11.4", "base_pkah=10.7", True),
        ("9 <= base_pkah <= 11.4", "base_pkah=15.7", False),
        ("base_pkah >= 15", "reagent=iodide", False),
        ("not base_pkah >= 15", "reagent=iodide", True),
        ("60 <= temperature_c", "temperature_c=60", True),
        ("temperature_c > -78", "temperature_c=-78", False),
        ("solvent in (polar-aprotic)", "solvent=polar-aprotic", True),
        ('solvent in ("polar-aprotic", alcohol)', "solvent=alcohol", True),
        ("water and not metal_catalyst", "water=yes; metal_catalyst=no", True),
        ("water == true", "water=no", False),
        ("not (water or alcohol)", "water=no; alcohol=no", True),
        ("oxidant in (ddq, can)", "oxidant=can", True),
        ("halophile == silver", "halophile=silver", True),
    ],
)
def test_a_line_is_answered_from_known_facts(line: str, facts: str, expected: bool) -> None:
    assert parse_predicate(line).evaluate(a_profile(facts)) is expected


@pytest.mark.parametrize(
    ("line", "profile", "missing"),
    [
        ("temperature_c >= 60", a_profile(), ("temperature not given",)),
        ("prolonged", a_profile(prolonged=None), ("time not given",)),
        ("solvent in (alcohol)", a_profile(has_unknown_solvent=True), ("solvent not given or not recognised",)),
        (
            "reagent in (azide)",
            a_profile("reagent=alkoxide", has_unknown_reagent=True),
            ("a reagent could not be classified",),
        ),
        (
            "base_pkah >= 9",
            a_profile(has_unknown_reagent=True),
            ("a reagent could not be classified",),
        ),
        ("acidity >= strong", ConditionProfile(), ("solvent not given or not recognised",)),
        (
            "temperature_c >= 60 and prolonged",
            a_profile(prolonged=None),
            ("temperature not given", "time not given"),
        ),
    ],
)
def test_what_is_not_recorded_is_unknown_and_named(
    line: str, profile: ConditionProfile, missing: tuple[str, ...]
) -> None:
    predicate = parse_predicate(line)
    assert predicate.evaluate(profile) is None
    assert predicate.unknowns(profile) == missing


def test_a_false_part_settles_a_line_whatever_is_missing() -> None:
    cold_acid = a_profile("acidity=strong")
    assert parse_predicate("reagent in (hydroxide) and temperature_c >= 60").evaluate(cold_acid) is False
    assert parse_predicate("acidity >= strong or temperature_c >= 60").evaluate(cold_acid) is True


def test_one_missing_thing_decides_only_where_something_speaks_for_the_line() -> None:
    line = parse_predicate("reagent in (hydroxide) and temperature_c >= 60")
    assert line.deciding_gaps(a_profile("reagent=hydroxide")) == ("temperature not given",)
    assert line.deciding_gaps(a_profile("reagent=azide")) == ()
    assert line.deciding_gaps(ConditionProfile()) == ()


def test_two_missing_things_decide_nothing() -> None:
    line = parse_predicate("reagent in (hydroxide) and temperature_c >= 60 and prolonged")
    assert line.deciding_gaps(a_profile("reagent=hydroxide", prolonged=None)) == ()


def test_an_absence_that_holds_speaks_for_nothing() -> None:
    line = parse_predicate("not water and temperature_c >= 60")
    assert line.deciding_gaps(a_profile()) == ()


def test_reasons_name_what_is_there_and_mark_limits_as_judged() -> None:
    line = parse_predicate("reagent in (hydroxide, alkoxide) and base_pkah >= 15 and temperature_c >= 60 and not water")
    assert line.reasons(WARM_BASE) == (
        "alkoxide present",
        "pKaH of the strongest base 16, judged limit 15",
        "temperature 80 °C, judged limit 60 °C",
    )


def test_only_the_branch_that_holds_gives_reasons() -> None:
    line = parse_predicate("acidity >= strong or (reagent in (alkoxide) and solvent in (alcohol))")
    assert line.reasons(WARM_BASE) == ("alkoxide present", "alcohol as solvent")


@pytest.mark.parametrize(
    ("line", "sentence"),
    [
        ("acidity >= strong or lewis_acid >= strong", "a strong acid is present or a strong Lewis acid is present"),
        ("not metal_catalyst", "no metal catalyst is present"),
        ("solvent in (alcohol, water)", "the solvent is alcohol or water"),
        ("reagent in (hydroxide) and temperature_c >= 60", "hydroxide is present and the temperature is 60 °C or more"),
    ],
)
def test_a_line_is_said_in_plain_english(line: str, sentence: str) -> None:
    said = parse_predicate(line).as_sentence()
    assert sentence in said
    assert ("judged limits" in said) is ("60" in line)


def test_every_shipped_line_can_be_said() -> None:
    for rule in load_rules():
        said = rule.when.as_sentence()
        assert said.startswith("Applies when ")
        assert "_" not in said, said


@pytest.mark.parametrize(
    ("line", "nearest"),
    [
        ("acidty >= strong", "acidity"),
        ("acidity >= strng", "strong"),
        ("reagent in (hydroxid)", "hydroxide"),
        ("solvent in (alcohl)", "alcohol"),
        ("temprature_c >= 60", "temperature_c"),
    ],
)
def test_an_unknown_word_is_refused_with_the_nearest_good_one(line: str, nearest: str) -> None:
    with pytest.raises(QueryError) as caught:
        parse_predicate(line)
    assert nearest in caught.value.hint


@pytest.mark.parametrize(
    "line",
    [
        "",
        "   ",
        "temperature_c",
        "temperature_c >= warm",
        "temperature_c in (1, 2)",
        "temperature_c >= nan",
        "temperature_c >= 1e999",
        "water > 3",
        "reagent >= azide",
        "acidity >= (weak, strong)",
        "__import__('os').system('true')",
        "().__class__",
        "lambda: 1",
        "[x for x in y]",
        "f'{acidity}'",
        "acidity is strong",
        "acidity := strong",
        "a = 3",
        "water; water",
        "1 >= 2",
        "strong >= weak",
        "x" * 5000,
        "(" * 300 + "water" + ")" * 300,
        " and ".join(["water"] * 400),
        "\x00water",
        "\x1b[31mwater",
        "water\u202e",
    ],
)
def test_anything_else_is_refused_in_plain_words(line: str) -> None:
    with pytest.raises(QueryError) as caught:
        parse_predicate(line)
    assert caught.value.message.endswith(".")
    assert len(caught.value.message) < 200
    assert pickle.loads(pickle.dumps(caught.value)).message == caught.value.message


@given(st.text(max_size=80))
def test_no_text_gives_anything_but_a_predicate_or_a_plain_refusal(text: str) -> None:
    try:
        parse_predicate(text)
    except SidepathError:
        return


FACTS = st.fixed_dictionaries(
    {
        "acidity": st.sampled_from(["none", "weak", "strong", None]),
        "base_pkah": st.one_of(st.none(), st.floats(-5, 40)),
        "temperature_c": st.one_of(st.none(), st.floats(-100, 250)),
        "water": st.sampled_from([True, False, None]),
        "has_unknown_reagent": st.booleans(),
        "has_unknown_solvent": st.booleans(),
        "reagent_classes": st.frozensets(st.sampled_from(["azide", "hydroxide", "amine"])),
        "solvent_classes": st.frozensets(st.sampled_from(["alcohol", "polar-aprotic", "nonpolar"])),
    }
)
LINES = st.sampled_from([rule.when.text for rule in load_rules()])


@given(FACTS, LINES)
def test_negation_turns_the_answer_round(facts: dict[str, object], line: str) -> None:
    profile = ConditionProfile(**facts)  # type: ignore[arg-type]
    answer = parse_predicate(line).evaluate(profile)
    opposite = parse_predicate(f"not ({line})").evaluate(profile)
    assert opposite is (None if answer is None else not answer)


@given(FACTS, LINES)
def test_learning_a_temperature_never_contradicts_a_certain_answer(facts: dict[str, object], line: str) -> None:
    before = parse_predicate(line).evaluate(ConditionProfile(**(facts | {"temperature_c": None})))  # type: ignore[arg-type]
    after = parse_predicate(line).evaluate(ConditionProfile(**(facts | {"temperature_c": 75.0})))  # type: ignore[arg-type]
    assert before is None or after is before


@given(FACTS, LINES)
def test_gaps_are_told_only_where_the_answer_is_open(facts: dict[str, object], line: str) -> None:
    profile, predicate = ConditionProfile(**facts), parse_predicate(line)  # type: ignore[arg-type]
    is_open = predicate.evaluate(profile) is None
    assert bool(predicate.unknowns(profile)) is is_open
    assert is_open or not predicate.deciding_gaps(profile)
    assert set(predicate.deciding_gaps(profile)) <= set(predicate.unknowns(profile))

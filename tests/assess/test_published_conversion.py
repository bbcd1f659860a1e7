"""What a step makes of its time: the unreacted share, its words, and the fates that a structure allows.

Rates are those of the tables (sources in kb/data/physorg); what is tested is the arithmetic and that slow steps are
told as slow. Fluorides, cyclopropyl and neopentyl halides are slow (Streitwieser, Chem. Rev. 1956, 56, 571; memory).
"""

from __future__ import annotations

import dataclasses

import pytest

from kb.assess.published import PublishedEstimate, published_estimate
from kb.chem.reading import read_scheme
from kb.materials.profile import ConditionProfile
from kb.physorg.competition import compete, compete_quickly
from kb.physorg.conversion import in_words
from kb.physorg.possible import possible_fates
from kb.vocabulary import Fate
from tests.assess.published_rows import a_step, rows, step_of_row

ACETONE = {"solvent_classes": frozenset({"polar-aprotic", "ketone"}), "has_unknown_solvent": False}
WATER = {"solvent_classes": frozenset({"protic", "water"}), "has_unknown_solvent": False, "winstein_y": 3.49}
IODIDE = ConditionProfile(reagent_classes=frozenset({"iodide"}), nucleophile_class="iodide", **ACETONE)  # type: ignore[arg-type]


def asked(scheme: str, profile: ConditionProfile) -> PublishedEstimate:
    reading = read_scheme(scheme)
    return published_estimate(reading, reading.substrate or "", profile)


@pytest.mark.parametrize(
    ("scheme", "profile"),
    [
        ("CCCCF.[I-]>>CCCCI", IODIDE),
        ("CC(C)(C)CCl.[I-]>>CC(C)(C)CI", IODIDE),
        ("ClC1CC1.[I-]>>IC1CC1", IODIDE),
        ("CCCCBr>>CCCCO", ConditionProfile(temperature_c=25.0, **WATER)),  # type: ignore[arg-type]
    ],
)
def test_a_slow_step_is_told_as_starting_material(scheme: str, profile: ConditionProfile) -> None:
    found = asked(scheme, profile)
    assert found.half_life_h is not None and found.half_life_h.mean > 100
    assert found.fates[0][0] is Fate.UNREACTED
    assert sum(i.mean for _, i in found.fates) == pytest.approx(1, abs=0.001)
    assert found.of_what_reacts[0][0] is Fate.SUBSTITUTION
    assert Fate.UNREACTED not in dict(found.of_what_reacts)
    assert "mostly starting material after 24 h (no time given)" in found.note


def test_the_time_of_the_plan_counts() -> None:
    short, long = (
        dict(asked("CCCCCl.[I-]>>CCCCI", dataclasses.replace(IODIDE, time_h=t)).fates)[Fate.UNREACTED]
        for t in (0.1, 1000.0)
    )
    assert short.mean > 0.5 > long.mean
    note = asked("CCCCCl.[I-]>>CCCCI", dataclasses.replace(IODIDE, time_h=5.0)).note
    assert "after 5 h" in note and "no time given" not in note


def test_after_one_half_life_about_half_is_left() -> None:
    step = a_step("CCCCBr", "Br", "NaN3", "EtOH", 25.0)
    half_life = compete(step).half_life_h
    assert half_life is not None
    left = dict(compete(step, half_life.mean).fates_after)[Fate.UNREACTED]
    assert left.mean == pytest.approx(0.5, abs=0.08)
    assert left.low < 0.4 < 0.6 < left.high


def test_reacted_shares_keep_their_ratio() -> None:
    # Not exactly, since fast samples weigh more; the tests of published splits use what reacts alone.
    result = compete(a_step("CC(C)Br", "Br", "NaOEt", "EtOH", 25.0), 1000.0)
    after, split = dict(result.fates_after), dict(result.fates)
    ratio = after[Fate.ELIMINATION].mean / after[Fate.SUBSTITUTION].mean
    assert ratio == pytest.approx(split[Fate.ELIMINATION].mean / split[Fate.SUBSTITUTION].mean, rel=0.15)


def test_without_a_half_life_nothing_is_said_of_what_is_left() -> None:
    found = asked("CCCCO", ConditionProfile(reagent_classes=frozenset({"thionyl_chloride"})))
    assert found.fates and found.half_life_h is None
    assert found.fates == found.of_what_reacts
    assert "shares are of what reacts" in found.note


def test_the_quick_way_agrees() -> None:
    step = a_step("CCCCCl", "Cl", "NaN3", "EtOH", 25.0)
    quick = compete_quickly(step, 24.0)
    assert quick is not None
    full = dict(compete(step, 24.0).fates_after)
    for fate, share in quick.shares:
        assert share == pytest.approx(full[fate].mean, abs=0.05)


@pytest.mark.parametrize(
    ("hours", "words"),
    [
        (743, "740 h"), (0.02, "1.2 min"), (17e3, "17,000 h"),
        (1e-6, "less than a minute"), (4e6, "more than a million h"),
    ],
)  # fmt: skip
def test_times_in_words(hours: float, words: str) -> None:
    assert in_words(hours) == words


@pytest.mark.parametrize(
    ("smiles", "impossible"),
    [
        ("BrCC(=O)OCC", {Fate.ELIMINATION, Fate.REARRANGED, Fate.TRANSPOSED}),
        ("BrCc1ccccc1", {Fate.ELIMINATION, Fate.REARRANGED, Fate.TRANSPOSED}),
        ("CBr", {Fate.ELIMINATION, Fate.REARRANGED, Fate.TRANSPOSED}),
        ("CC(C)(C)CBr", {Fate.ELIMINATION, Fate.TRANSPOSED}),
        ("CCBr", {Fate.REARRANGED, Fate.TRANSPOSED}),
        ("C=CCBr", {Fate.TRANSPOSED}),
    ],
)
def test_fates_that_a_structure_forbids(smiles: str, impossible: set[Fate]) -> None:
    step = a_step(smiles, "Br", "NaOEt", "EtOH", 25.0)
    assert not impossible & possible_fates(step)
    assert not impossible & {fate for fate, share in compete(step).fates if share.high > 0}
    assert {Fate.SUBSTITUTION, Fate.UNREACTED} <= possible_fates(step)


@pytest.mark.parametrize(
    ("smiles", "allowed"),
    [
        ("CC(C)Br", Fate.ELIMINATION),
        ("CC(C)(C)CBr", Fate.REARRANGED),
        ("BrCC1CC1", Fate.REARRANGED),
        ("CC=CCBr", Fate.TRANSPOSED),
        ("CC=CCBr", Fate.ELIMINATION),  # 1,4-loss to butadiene
        ("C#CCBr", Fate.TRANSPOSED),
    ],
)
def test_fates_that_a_structure_allows(smiles: str, allowed: Fate) -> None:
    assert allowed in possible_fates(a_step(smiles, "Br", "NaOEt", "EtOH", 25.0))


def test_the_model_never_gives_what_it_calls_impossible() -> None:
    asked_of = 0
    for name in (n for n, r in rows().items() if n.startswith(("SE", "ZH")) and r["leaving_group"]):
        try:
            step = step_of_row(name)
        except (KeyError, ValueError):
            continue  # words that the rows' own table does not translate
        asked_of += 1
        assert {fate for fate, _ in compete(step).fates} <= possible_fates(step), name
    assert asked_of > 25


def test_the_estimate_hands_over_what_is_possible() -> None:
    found = asked("BrCC(=O)OCC.[I-]>>ICC(=O)OCC", IODIDE)
    assert Fate.ELIMINATION not in found.possible
    assert asked("not a scheme", IODIDE).possible == frozenset(Fate)


def test_it_is_told_in_at_most_six_plain_lines() -> None:
    profile = ConditionProfile(
        reagent_classes=frozenset({"alkoxide"}), base_pkah=15.9, base_bulk="unhindered", temperature_c=55.0,
        solvent_classes=frozenset({"protic", "alcohol"}), has_unknown_solvent=False, winstein_y=-2.03,
    )  # fmt: skip
    lines = asked("C[C@H](Br)CCCCCC", profile).as_lines()
    assert 4 <= len(lines) <= 6
    assert all(line.endswith(".") and "\n" not in line for line in lines)
    whole = " ".join(lines)
    for part in ("elimination", "half-life", "Of the alkenes", "drawn centre", "Sources:"):
        assert part in whole
    refused = asked("C=CBr", profile)
    assert refused.as_lines() == (refused.note,)

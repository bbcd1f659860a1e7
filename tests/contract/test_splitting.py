"""`split`: integrals to molar shares, assay yield, RT ln(ratio)."""

from __future__ import annotations

import math

import pytest

from tests.asking import ask, is_plain_refusal, widest

R_KJ = 8.314462618e-3  # CODATA 2018 molar gas constant [kJ/(mol K)]


def test_an_answer_has_the_keys_of_the_contract() -> None:
    said = ask("split", "substitution=1.00/2", "elimination=0.15/1", "--json").json
    assert set(said) >= {"shares", "assay_yield_pct", "delta_delta_g_kj_mol"}
    assert set(said["shares"]) == {"substitution", "elimination"}
    for share in said["shares"].values():
        assert set(share) == {"mean", "low", "high"} and share["low"] < share["mean"] < share["high"]
    assert said["assay_yield_pct"] is None


def test_protons_turn_integrals_into_moles() -> None:
    shares = ask("split", "substitution=1.00/2", "elimination=0.25/1", "unreacted=0.25/1", "--json").json["shares"]
    assert {label: share["mean"] for label, share in shares.items()} == {
        "substitution": 0.5,
        "elimination": 0.25,
        "unreacted": 0.25,
    }


def test_the_barrier_difference_is_rt_ln_ratio_of_the_two_largest_products() -> None:
    words = ("split", "substitution=8/1", "unreacted=5/1", "elimination=2/1")
    warm = ask(*words, "--temp", "60C", "--json").json
    assert warm["delta_delta_g_kj_mol"] == pytest.approx(R_KJ * 333.15 * math.log(4), abs=0.002)
    assert warm["compared"] == ["substitution", "elimination"]
    assert (warm["temperature_c"], warm["temperature_assumed"]) == (60.0, False)
    assumed = ask(*words, "--json").json
    assert (assumed["temperature_c"], assumed["temperature_assumed"]) == (25.0, True)
    assert "25 °C assumed" in ask(*words).out


def test_a_product_that_was_not_seen_gives_no_barrier_difference() -> None:
    said = ask("split", "substitution=1/1", "elimination=0/1", "--json").json
    assert said["delta_delta_g_kj_mol"] is None
    assert said["shares"]["elimination"]["mean"] == 0


def test_the_assay_yield_is_reckoned_against_a_weighed_standard() -> None:
    words = ("--standard", "0.9/3", "--standard-mmol", "0.2", "--scale", "1 mmol", "--of", "substitution")
    said = ask("split", "elimination=0.15/1", "substitution=1.00/2", *words, "--json").json
    assert said["assay_yield_pct"] == pytest.approx(100 * (1.00 / 2) / (0.9 / 3) * 0.2 / 1.0, abs=0.01)
    assert said["assay_of"] == "substitution"


def test_areas_need_no_count_and_integrals_need_all_or_none() -> None:
    areas = [ask("split", a, "b=20", "--areas", "--json").json["shares"]["a"]["mean"] for a in ("a=80", "a=80/2")]
    assert areas == pytest.approx([0.8, 2 / 3], abs=1e-4)
    uncounted = ask("split", "a=80,b=20", "--json")
    assert uncounted.json["shares"]["a"]["mean"] == 0.8 and "No protons were counted" in uncounted.err
    mixed = ask("split", "a=1.0/2", "b=0.3")
    assert mixed.status == 1 and "how many protons" in mixed.err


@pytest.mark.parametrize(
    "words",
    [
        ("a",),
        ("=1/2",),
        ("a=/2",),
        ("a=x/2",),
        ("a=1/0",),
        ("a=1/-1",),
        ("a=-1/2", "b=1/1"),
        ("a=0/1", "b=0/1"),
        ("a=nan/1",),
        ("a=1e400/1",),
        ("a=1/1", "a=2/1"),
        ("a=1/1", "--standard", "1/1"),
        ("a=1/1", "--of", "a"),
        ("a=1/1", "--standard", "1/1", "--standard-mmol", "0", "--scale", "1 mmol"),
        ("a=1/1", "--standard", "1/1", "--standard-mmol", "1", "--scale", "5 kg"),
        ("a=1/1", "--standard", "1/1", "--standard-mmol", "1", "--scale", "1", "--of", "z"),
        ("a=1/1", "b=1/1", "--temp", "-400C"),
        ("a=1/1", "b=1/1", "--temp", "reflux"),
        ("a=1/1", "--error", "-3"),
        ("a=1/1", "--standard", ""),
    ],
)
def test_what_cannot_be_reckoned_is_refused(words: tuple[str, ...]) -> None:
    answer = ask("split", *words)
    assert answer.status == 1 and is_plain_refusal(answer)
    assert answer.out == ""


def test_no_signal_is_a_usage_error_and_the_text_fits() -> None:
    assert ask("split").status == 2
    assert widest(ask("split", *(f"{'x' * 40}{n}=1/1" for n in range(3))).out) <= 80

"""`split --series` and the mass balance: what heat does to a split, and what became of the material.

Source of the series: K. A. Cooper, E. D. Hughes, C. K. Ingold, B. J. MacNulty, J. Chem. Soc. 1948, 2038 (rows SE19 and
SE20 of tests/data/check_values.csv, from memory there): tert-butyl chloride in 80 % ethanol, 16.8 % isobutene at 25 °C
and 36.3 % at 65.3 °C. The rest is arithmetic.
"""

from __future__ import annotations

import math

import pytest

from tests.asking import ask, is_plain_refusal

R_KJ = 8.314462618e-3  # CODATA 2018 molar gas constant [kJ/(mol K)]
COLD, HOT = "25C:substitution=83.2,elimination=16.8", "65.3C:substitution=63.7,elimination=36.3"


def test_two_temperatures_give_the_difference_of_the_barriers() -> None:
    said = ask("split", "--series", COLD, "--series", HOT, "--json").json
    cold, hot = math.log(16.8 / 83.2), math.log(36.3 / 63.7)
    enthalpy = R_KJ * (hot - cold) / (1 / 298.15 - 1 / 338.45)
    assert said["compared"] == ["substitution", "elimination"]
    assert said["delta_delta_h_kj_mol"]["mean"] == pytest.approx(enthalpy, abs=0.02)
    entropy = 1000 * (R_KJ * cold + enthalpy / 298.15)
    assert said["delta_delta_s_j_mol_k"]["mean"] == pytest.approx(entropy, abs=0.3)
    assert said["delta_delta_h_kj_mol"]["low"] < enthalpy < said["delta_delta_h_kj_mol"]["high"]


def test_a_target_is_found_where_it_lies_and_said_to_be_outside_what_was_measured() -> None:
    between = ask("split", "--series", COLD, "--series", HOT, "--target", "elimination=25", "--json").json
    assert 25 < between["target_c"]["mean"] < 65.3
    assert between["extrapolated"] is False
    colder = ask("split", "--series", COLD, "--series", HOT, "--target", "elimination=10")
    assert "outside the 25 to 65.3 °C that were measured" in " ".join(colder.out.split())
    own = ask("split", "--series", COLD, "--series", HOT, "--target", "elimination=16.8", "--json").json
    assert own["target_c"]["mean"] == pytest.approx(25, abs=0.1)
    other = ask("split", "--series", COLD, "--series", HOT, "--target", "substitution=83.2", "--json").json
    assert other["target_c"]["mean"] == pytest.approx(25, abs=0.1)


def test_a_worse_integral_widens_the_interval() -> None:
    def width(error: str) -> float:
        h = ask("split", "--series", COLD, "--series", HOT, "--error", error, "--json").json["delta_delta_h_kj_mol"]
        return float(h["high"] - h["low"])

    assert width("6") == pytest.approx(2 * width("3"), rel=0.05)


def test_three_temperatures_show_how_well_a_line_fits() -> None:
    middle = "45C:substitution=90,elimination=10"
    said = ask("split", "--series", COLD, "--series", middle, "--series", HOT, "--json").json
    assert said["residual"] > 0.3
    assert ask("split", "--series", COLD, "--series", HOT, "--json").json["residual"] == 0


@pytest.mark.parametrize(
    "words",
    [
        ("--series", COLD),
        ("--series", COLD, "--series", "65C:substitution=60"),
        ("--series", COLD, "--series", "65C:substitution=60,elimination=0"),
        ("--series", COLD, "--series", HOT, "--target", "ether=10"),
        ("--series", COLD, "--series", HOT, "--target", "elimination=100"),
        ("--series", "hot", "--series", HOT),
        ("--series", COLD, "--series", HOT, "substitution=1/2"),
        ("--target", "elimination=10"),
    ],
)
def test_what_gives_no_line_is_refused_in_a_sentence(words: tuple[str, ...]) -> None:
    assert is_plain_refusal(ask("split", *words))


def test_a_standard_gives_a_mass_balance() -> None:
    # 1.80 H / 2 = 0.90 and 0.30 H / 3 = 0.10 beside 3.00 H / 3 = 1.00 for 0.5 mmol: 0.45 and 0.05 mmol of 1 mmol.
    words = ("--standard", "3.00/3", "--standard-mmol", "0.5", "--scale", "1")
    answer = ask("split", "product=1.80/2", "starting=0.30/3", *words, "--json").json
    assert answer["assay_yield_pct"] == pytest.approx(45.0)
    assert answer["recovered_pct"]["mean"] == pytest.approx(50.0)
    text = " ".join(ask("split", "product=1.80/2", "starting=0.30/3", *words).out.split())
    assert "mass balance: 50 %" in text and "in no signal that was given" in text
    over = " ".join(ask("split", "product=5.40/2", "starting=0.30/3", *words).out.split())
    assert "more than was charged" in over
    assert "mass balance" not in ask("split", "product=1.80/2", "starting=0.30/3").out
